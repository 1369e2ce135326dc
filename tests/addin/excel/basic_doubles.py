"""Doubles in Basic: xlwings' link to Python, and the objects of Excel that the relink macro touches."""

from __future__ import annotations

STANDARD = "Rem Attribute VBA_ModuleType=VBAModule\nOption VBASupport 1\n"
CLASS = "Option ClassModule\nOption VBASupport 1\n"

PYTHON = (
    CLASS
    + """
Public Function CallUDF(ByVal m As String, ByVal f As String, ByVal a As Variant) As Variant
    CallUDF = Answer(m, f, a)
End Function
"""
)

LINK = (
    STANDARD
    + r"""Option Explicit
Public link_log As String
Public link_mode As String
Public link_starts As Long
Public link_faults As Long

Public Function XLPy() As Object
    link_starts = link_starts + 1
    If link_mode = "refuse" Then Err.Raise 1000, "link", "Python cannot be started"
    Set XLPy = New Python
End Function

Public Sub KillPy()
End Sub

Public Sub Start(ByVal mode As String)
    link_mode = mode
    link_log = ""
    link_starts = 0
    link_faults = 0
End Sub

Public Function Answer(ByVal m As String, ByVal f As String, ByVal a As Variant) As Variant
    Dim t(0 To 1, 0 To 2) As Variant
    Dim c(0 To 1, 0 To 0) As Variant
    link_log = m & " " & f & Told(a)
    Select Case link_mode
        Case ""
            Answer = Told(a)
        Case "number"
            Answer = 1.5
        Case "text"
            Answer = "a text"
        Case "long text"
            Answer = String(3000, "x") & "#"
        Case "true"
            Answer = True
        Case "empty"
            Answer = Empty
        Case "row"
            Answer = Array(1.5, "#NUM! (see TB_WHY)", "x", False, "#N/A (see TB_WHY)")
        Case "column"
            c(0, 0) = -2.5
            c(1, 0) = "#REF! (see TB_WHY)"
            Answer = c
        Case "table"
            t(0, 0) = 1.5
            t(0, 1) = "#VALUE! (see TB_WHY)"
            t(0, 2) = "note"
            t(1, 0) = Empty
            t(1, 1) = ""
            t(1, 2) = "#NULL! (see TB_WHY)"
            Answer = t
        Case "raise"
            link_faults = link_faults + 1
            Err.Raise 1000, "link", "Traceback (most recent call last)"
        Case "raise once"
            link_faults = link_faults + 1
            If link_faults = 1 Then Err.Raise 1000, "link", "the server is not there"
            Answer = 2.5
        Case Else
            Answer = link_mode
    End Select
End Function

' A value in words: kind, bounds and contents.
Public Function Told(ByVal v As Variant) As String
    Dim i As Long, j As Long, s As String
    If IsArray(v) Then
        If Rows(v) Then
            s = "(" & LBound(v) & " to " & UBound(v) & ")["
            For i = LBound(v) To UBound(v)
                If i > LBound(v) Then s = s & ", "
                s = s & Told(v(i))
            Next i
        Else
            s = "(" & LBound(v, 1) & " to " & UBound(v, 1) & "; "
            s = s & LBound(v, 2) & " to " & UBound(v, 2) & ")["
            For i = LBound(v, 1) To UBound(v, 1)
                If i > LBound(v, 1) Then s = s & "; "
                For j = LBound(v, 2) To UBound(v, 2)
                    If j > LBound(v, 2) Then s = s & ", "
                    s = s & Told(v(i, j))
                Next j
            Next i
        End If
        Told = s & "]"
    ElseIf IsError(v) Then
        Told = "error " & CStr(CLng(v))
    ElseIf IsEmpty(v) Then
        Told = "empty"
    ElseIf VarType(v) = vbString Then
        Told = "'" & v & "'"
    ElseIf VarType(v) = vbBoolean Then
        Told = IIf(v, "TRUE", "FALSE")
    Else
        Told = CStr(v)
    End If
End Function

Private Function Rows(ByVal v As Variant) As Boolean
    Dim n As Long
    On Error GoTo one
    n = UBound(v, 2)
    Rows = False
    Exit Function
one:
    Rows = True
End Function
"""
)

CELL = (
    CLASS
    + """
Public Address As String
Public HasArray As Boolean
Public Spilled As Boolean
Public Parent As String
Public Modern As Boolean
Public Refuses As Boolean
Public Text As String
Public Writes As Long

Public Property Get SpillParent() As Object
    Dim c As Object
    If Parent = "" Then Err.Raise 1004, "Excel", "no spill"
    Set c = New Cell
    c.Address = Parent
    Set SpillParent = c
End Property

Public Property Get HasSpill() As Boolean
    If Not Modern Then Err.Raise 438, "Excel", "not in this version"
    HasSpill = Spilled
End Property

Public Property Get Formula() As String
    Formula = Text
End Property
Public Property Let Formula(ByVal t As String)
    Keep t
End Property

Public Property Get Formula2() As String
    If Not Modern Then Err.Raise 438, "Excel", "not in this version"
    Formula2 = Text
End Property
Public Property Let Formula2(ByVal t As String)
    Keep t
End Property

Public Property Get FormulaArray() As String
    FormulaArray = Text
End Property
Public Property Let FormulaArray(ByVal t As String)
    Keep t
End Property

Public Property Get CurrentArray() As Object
    Set CurrentArray = Me
End Property
Public Function Cells(ByVal i As Long, ByVal j As Long) As Object
    Dim c As Object
    Set c = New Cell
    c.Address = "$A$1"
    Set Cells = c
End Function

Private Sub Keep(ByVal t As String)
    If Refuses Then Err.Raise 1004, "Excel", "Excel does not take it"
    Text = t
    Writes = Writes + 1
End Sub
"""
)

SHEET = (
    CLASS
    + """
Public Name As String
Public ProtectContents As Boolean
Public Kept As Object

Public Property Get UsedRange() As Object
    Set UsedRange = Me
End Property
Public Function SpecialCells(ByVal kind As Long) As Object
    If Kept Is Nothing Then Err.Raise 1004, "Excel", "no cells were found"
    Set SpecialCells = Kept
End Function
"""
)

BOOK = (
    CLASS
    + """
Public Worksheets As Object
Public Names As Object
Public Calculation As Long
Public ModesSeen As String
"""
)

NAME = (
    CLASS
    + """
Public Name As String
Public RefersTo As String
"""
)
