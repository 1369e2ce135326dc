"""The part of the VBA that does not depend on the catalogue: calling Python, and cells in and out.

The text is plain ASCII, because VBA reads a module in the code page of the
machine. ``{...}`` is filled in by ``vba.py``.
"""

SUPPORT = r"""
' The link to Python, kept so that a formula does not look up the configuration again.
Private tb_python As Object
' What the last fault said, and when Python last refused to start.
Private tb_fault As String
Private tb_refused As Date

Private Const TB_PYTHON_MODULE As String = "{module}"
Private Const TB_MARKER_TAIL As String = "{tail}"
' Seconds for which Python is not asked to start again after it refused.
Private Const TB_PATIENCE As Long = 30

' An argument as a plain value. Value2 gives dates and currencies as the numbers that they are;
' an argument that was left out, or an empty cell, stays empty; several areas are no table.
Private Function TbArg(Optional ByVal tb_value As Variant) As Variant
    If IsMissing(tb_value) Then
        TbArg = Empty
    ElseIf TypeName(tb_value) = "Range" Then
        TbArg = TbValues(tb_value)
    Else
        TbArg = tb_value
    End If
End Function

Private Function TbValues(ByVal tb_range As Object) As Variant
    If tb_range.Areas.Count > 1 Then
        TbValues = CVErr({VALUE})
    Else
        TbValues = tb_range.Value2
    End If
End Function

' What a wrapper shows after a fault; the text is kept for the macro TbLastFault.
Private Function TbFailed(ByVal tb_text As String) As Variant
    tb_fault = tb_text
    TbFailed = CVErr({VALUE})
End Function

' The call itself. Where Python was closed in the meantime it is started once more.
Private Function TbCall(ByVal tb_name As String, ByRef tb_args As Variant) As Variant
    Dim tb_answer As Variant
    If Not TbAsk(tb_name, tb_args, tb_answer) Then
        Set tb_python = Nothing
        If Not TbAsk(tb_name, tb_args, tb_answer) Then
            Set tb_python = Nothing
            TbCall = CVErr({VALUE})
            Exit Function
        End If
    End If
    TbCall = TbShow(tb_answer)
End Function

Private Function TbAsk(ByVal tb_name As String, ByRef tb_args As Variant, _
        ByRef tb_answer As Variant) As Boolean
    On Error GoTo tb_broken
    If tb_python Is Nothing Then TbStart
    tb_answer = tb_python.CallUDF(TB_PYTHON_MODULE, tb_name, tb_args)
    TbAsk = True
    Exit Function
tb_broken:
    tb_fault = Err.Description
    TbAsk = False
End Function

' Starts Python. After a refusal every formula would wait for another; for a while they fail at once.
Private Sub TbStart()
    If tb_refused > 0 Then
        If DateDiff("s", tb_refused, Now) < TB_PATIENCE Then Err.Raise 1000, "thrustbook", tb_fault
    End If
    tb_refused = Now
    Set tb_python = XLPy
    tb_refused = 0
End Sub

' An answer for the cell: a single value, or a table counted from 1 in both directions. A table
' is given whole: Excel with dynamic arrays spills it, older Excel shows its first value, and an
' array formula over several cells is cropped, or filled up with #N/A, by Excel itself. Cropping
' here would make {{=SUM(TB_X(...))}} a sum of a part.
Private Function TbShow(ByRef tb_answer As Variant) As Variant
    Dim tb_out() As Variant
    Dim i As Long, j As Long, m As Long, n As Long
    If Not IsArray(tb_answer) Then
        TbShow = TbCell(tb_answer)
        Exit Function
    End If
    If TbIsRow(tb_answer) Then
        n = UBound(tb_answer) - LBound(tb_answer) + 1
        ReDim tb_out(1 To 1, 1 To n)
        For j = 1 To n
            tb_out(1, j) = TbCell(tb_answer(LBound(tb_answer) + j - 1))
        Next j
    Else
        m = UBound(tb_answer, 1) - LBound(tb_answer, 1) + 1
        n = UBound(tb_answer, 2) - LBound(tb_answer, 2) + 1
        ReDim tb_out(1 To m, 1 To n)
        For i = 1 To m
            For j = 1 To n
                tb_out(i, j) = TbCell(tb_answer(LBound(tb_answer, 1) + i - 1, LBound(tb_answer, 2) + j - 1))
            Next j
        Next i
    End If
    TbShow = tb_out
End Function

Private Function TbIsRow(ByRef tb_answer As Variant) As Boolean
    Dim n As Long
    On Error GoTo tb_one
    n = UBound(tb_answer, 2)
    TbIsRow = False
    Exit Function
tb_one:
    TbIsRow = True
End Function

' One value: a marker becomes the error that it names, and what would look like a blank or a
' zero becomes one too.
Private Function TbCell(ByVal tb_value As Variant) As Variant
    If IsEmpty(tb_value) Or IsNull(tb_value) Then
        TbCell = CVErr({VALUE})
    ElseIf VarType(tb_value) <> vbString Then
        TbCell = tb_value
    ElseIf Right$(tb_value, Len(TB_MARKER_TAIL)) <> TB_MARKER_TAIL Then
        TbCell = tb_value
    Else
        Select Case Left$(tb_value, Len(tb_value) - Len(TB_MARKER_TAIL))
{cases}
            Case Else
                TbCell = tb_value
        End Select
    End If
End Function
"""

MACROS = r"""
' Macro: what went wrong when every formula shows #VALUE!.
Public Sub TbLastFault()
    If tb_fault = "" Then
        MsgBox "No fault since Excel was started.", vbInformation, "thrustbook"
    Else
        MsgBox tb_fault, vbExclamation, "thrustbook: the last fault"
    End If
End Sub

' Macro: lets go of Python and calculates anew, for instance after an update.
Public Sub TbRestart()
    On Error Resume Next
    Set tb_python = Nothing
    KillPy
    tb_refused = 0
    tb_fault = ""
    Application.CalculateFull
End Sub
"""
