"""The VBA module with the relink macro: our formulas bound again in a workbook from elsewhere.

Excel keeps a call of an add-in's function with a reference to the file the
add-in was in, such as ``'C:\\old\\thrustbook.xlam'!TB_BEND(``. Where that file
is not, or where a program that knows no add-ins wrote the plain name, the cell
shows #NAME? until its formula is entered again. The macro does that, for our
functions only, and leaves every other formula as it is.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Final

from ...catalogue.registry import CATALOGUE

MODULE_NAME: Final = "thrustbook_relink"

_TEXT = r'''Attribute VB_Name = "{module}"
' Binds the functions of thrustbook anew in the active workbook. Generated: do not edit.
Option Explicit

' Macro: run it as thrustbook.xlam!TbRelink from the list of macros (Alt+F8).
Public Sub TbRelink()
    If ActiveWorkbook Is Nothing Then
        MsgBox "There is no workbook open.", vbExclamation, "thrustbook"
    Else
        MsgBox TbRelinkBook(ActiveWorkbook, Application), vbInformation, "thrustbook"
    End If
End Sub

' Enters every formula with one of our functions again, and gives the report. A formula that
' Excel does not take stays as it was.
Private Function TbRelinkBook(ByVal tb_book As Object, ByVal tb_app As Object) As String
    Dim tb_sheet As Object, tb_cells As Object, tb_cell As Object, tb_name As Object
    Dim tb_mode As Long, tb_done As Long, tb_left As String, tb_whole As Boolean
    tb_mode = tb_app.Calculation
    tb_app.Calculation = -4135
    On Error GoTo tb_out
    For Each tb_sheet In tb_book.Worksheets
        Set tb_cells = TbFormulaCells(tb_sheet)
        If Not tb_cells Is Nothing Then
            If tb_sheet.ProtectContents Then
                tb_left = tb_left & vbLf & tb_sheet.Name & " (the sheet is protected)"
            Else
                For Each tb_cell In tb_cells
                    TbRelinkCell tb_cell, tb_sheet.Name, tb_done, tb_left
                Next tb_cell
            End If
        End If
    Next tb_sheet
    For Each tb_name In tb_book.Names
        TbRelinkName tb_name, tb_done, tb_left
    Next tb_name
    tb_whole = True
tb_out:
    If Not tb_whole Then tb_left = tb_left & vbLf & "the rest: " & Err.Description
    tb_app.Calculation = tb_mode
    TbRelinkBook = tb_done & " formulas with functions of thrustbook were entered again."
    If tb_left <> "" Then TbRelinkBook = TbRelinkBook & vbLf & "Left as they were:" & Left$(tb_left, 800)
End Function

' The cells with formulas; Nothing where there are none, for which Excel raises an error.
Private Function TbFormulaCells(ByVal tb_sheet As Object) As Object
    On Error GoTo tb_none
    Set TbFormulaCells = tb_sheet.UsedRange.SpecialCells(-4123)
    Exit Function
tb_none:
    Set TbFormulaCells = Nothing
End Function

Private Sub TbRelinkCell(ByVal tb_cell As Object, ByVal tb_sheet As String, _
        ByRef tb_done As Long, ByRef tb_left As String)
    Dim tb_kind As Long, tb_calls As Long, tb_old As String, tb_new As String
    On Error GoTo tb_refused
    tb_kind = TbKind(tb_cell)
    If tb_kind = 0 Then Exit Sub
    If tb_kind = 1 Then
        tb_old = tb_cell.Formula2
    ElseIf tb_kind = 2 Then
        tb_old = tb_cell.FormulaArray
    Else
        tb_old = tb_cell.Formula
    End If
    If InStr(1, tb_old, "TB_", vbTextCompare) = 0 Then Exit Sub
    tb_new = TbPlain(tb_old, tb_calls)
    If tb_calls = 0 Then Exit Sub
    If tb_kind = 1 Then
        tb_cell.Formula2 = tb_new
    ElseIf tb_kind = 2 Then
        tb_cell.CurrentArray.FormulaArray = tb_new
    Else
        tb_cell.Formula = tb_new
    End If
    tb_done = tb_done + 1
    Exit Sub
tb_refused:
    tb_left = tb_left & vbLf & tb_sheet & "!" & tb_cell.Address & ": " & Err.Description
End Sub

' How a cell keeps its formula: 0 not at all (a part of another cell's array), 1 in Excel with
' dynamic arrays, 2 as an array formula over a range, 3 in older Excel.
Private Function TbKind(ByVal tb_cell As Object) As Long
    If TbIsSpilled(tb_cell) Then
        TbKind = 0
    ElseIf tb_cell.HasArray And Not TbSpills(tb_cell) Then
        TbKind = 0
        If tb_cell.Address = tb_cell.CurrentArray.Cells(1, 1).Address Then TbKind = 2
    ElseIf TbKnowsFormula2(tb_cell) Then
        TbKind = 1
    Else
        TbKind = 3
    End If
End Function

Private Function TbIsSpilled(ByVal tb_cell As Object) As Boolean
    Dim tb_parent As String
    On Error GoTo tb_no
    tb_parent = tb_cell.SpillParent.Address
    TbIsSpilled = (tb_parent <> tb_cell.Address)
    Exit Function
tb_no:
    TbIsSpilled = False
End Function

Private Function TbSpills(ByVal tb_cell As Object) As Boolean
    On Error GoTo tb_no
    TbSpills = tb_cell.HasSpill
    Exit Function
tb_no:
    TbSpills = False
End Function

Private Function TbKnowsFormula2(ByVal tb_cell As Object) As Boolean
    Dim tb_text As String
    On Error GoTo tb_no
    tb_text = tb_cell.Formula2
    TbKnowsFormula2 = True
    Exit Function
tb_no:
    TbKnowsFormula2 = False
End Function

Private Sub TbRelinkName(ByVal tb_name As Object, ByRef tb_done As Long, ByRef tb_left As String)
    Dim tb_calls As Long, tb_old As String, tb_new As String
    On Error GoTo tb_refused
    tb_old = tb_name.RefersTo
    tb_new = TbPlain(tb_old, tb_calls)
    If tb_calls = 0 Then Exit Sub
    tb_name.RefersTo = tb_new
    tb_done = tb_done + 1
    Exit Sub
tb_refused:
    tb_left = tb_left & vbLf & "name " & tb_name.Name & ": " & Err.Description
End Sub

' A formula without what stands in front of our functions: [1]!, 'C:\path\thrustbook.xlam'!,
' thrustbook.xlam!, _xll. and the like. Texts, other functions and references stay as they are.
Private Function TbPlain(ByVal tb_text As String, ByRef tb_calls As Long) As String
    Dim i As Long, k As Long, tb_out As String, tb_token As String
    i = 1
    Do While i <= Len(tb_text)
        k = TbTokenEnd(tb_text, i)
        tb_token = Mid$(tb_text, i, k - i + 1)
        If TbIsPrefix(tb_token) And Mid$(tb_text, k + 1, 1) = "!" And TbNameAt(tb_text, k + 2) <> "" Then
            i = k + 2
        ElseIf TbNameAt(tb_text, i) <> "" Then
            tb_out = tb_out & TbNameAt(tb_text, i)
            tb_calls = tb_calls + 1
            i = k + 1
        Else
            tb_out = tb_out & tb_token
            i = k + 1
        End If
    Loop
    TbPlain = tb_out
End Function

' Where the token ends that begins at i: a text, a quoted name, a word with its brackets, or one character.
Private Function TbTokenEnd(ByVal tb_text As String, ByVal i As Long) As Long
    Dim k As Long, tb_quote As String
    tb_quote = Mid$(tb_text, i, 1)
    If tb_quote = """" Or tb_quote = "'" Then
        k = i + 1
        Do While k <= Len(tb_text)
            If Mid$(tb_text, k, 1) = tb_quote Then
                If Mid$(tb_text, k + 1, 1) <> tb_quote Then Exit Do
                k = k + 1
            End If
            k = k + 1
        Loop
        If k > Len(tb_text) Then k = Len(tb_text)
    Else
        k = i - 1
        Do While k < Len(tb_text)
            If Mid$(tb_text, k + 1, 1) = "[" Then
                k = TbBracketEnd(tb_text, k + 1)
            ElseIf TbIsWord(Mid$(tb_text, k + 1, 1)) Then
                k = k + 1
            Else
                Exit Do
            End If
        Loop
        If k < i Then k = i
    End If
    TbTokenEnd = k
End Function

' Where the bracket closes that opens at i; in a table reference ' takes the next character as it is.
Private Function TbBracketEnd(ByVal tb_text As String, ByVal i As Long) As Long
    Dim k As Long, tb_depth As Long
    k = i
    Do While k <= Len(tb_text)
        Select Case Mid$(tb_text, k, 1)
            Case "["
                tb_depth = tb_depth + 1
            Case "]"
                tb_depth = tb_depth - 1
                If tb_depth = 0 Then Exit Do
            Case "'"
                k = k + 1
        End Select
        k = k + 1
    Loop
    If k > Len(tb_text) Then k = Len(tb_text)
    TbBracketEnd = k
End Function

Private Function TbIsWord(ByVal tb_char As String) As Boolean
    TbIsWord = InStr(1, " +-*/^&=<>(){{}},;:@#%!'""" & vbTab & vbCr & vbLf, tb_char, vbBinaryCompare) = 0
End Function

Private Function TbIsPrefix(ByVal tb_token As String) As Boolean
    TbIsPrefix = (Left$(tb_token, 1) = "'") Or TbIsWord(Left$(tb_token, 1))
End Function

' The name of the function of ours that is called at i, without _xll. and the like; else nothing.
Private Function TbNameAt(ByVal tb_text As String, ByVal i As Long) As String
    Dim k As Long, tb_word As String
    TbNameAt = ""
    k = i
    Do While k <= Len(tb_text)
        If Not TbIsWord(Mid$(tb_text, k, 1)) Then Exit Do
        k = k + 1
    Loop
    If Mid$(tb_text, k, 1) <> "(" Then Exit Function
    tb_word = Mid$(tb_text, i, k - i)
    Do While LCase$(Left$(tb_word, 3)) = "_xl" And InStr(1, tb_word, ".", vbBinaryCompare) > 0
        tb_word = Mid$(tb_word, InStr(1, tb_word, ".", vbBinaryCompare) + 1)
    Loop
    If TbIsOurs(UCase$(tb_word)) Then TbNameAt = UCase$(tb_word)
End Function

Private Function TbIsOurs(ByVal tb_word As String) As Boolean
    Select Case tb_word
{cases}
            TbIsOurs = True
        Case Else
            TbIsOurs = False
    End Select
End Function
'''


def relink_module(names: Iterable[str] = CATALOGUE) -> str:
    """Write the module, lines ended as Windows ends them."""
    quoted = [f'"{name}"' for name in names]
    lines = [", ".join(quoted[i : i + 5]) for i in range(0, len(quoted), 5)]
    cases = "        Case " + ", _\n            ".join(lines)
    return _TEXT.format(module=MODULE_NAME, cases=cases).replace("\n", "\r\n")
