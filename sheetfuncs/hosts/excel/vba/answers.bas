' From what Python answers to what a cell takes. Private: a formula in a cell can call nothing of this.

Private Function Server() As Object
    If mLink Is Nothing Then Set mLink = New PythonLink
    Set Server = mLink.Server()
End Function

Private Function ForCell(ByVal given As Variant, ByVal mayBeText As Boolean) As Variant
    ' One value, or an array of one or two dimensions: texts that stand for errors become true error values.
    ' A single text that is neither an error nor a text that was asked for becomes #VALUE!.
    If IsArray(given) Then
        If DimensionsOf(given) = 1 Then
            ForCell = RowForCells(given)
        Else
            ForCell = TableForCells(given)
        End If
    ElseIf VarType(given) <> vbString Then
        ForCell = given
    ElseIf Left$(given, 1) = "#" And Not IsEmpty(ErrorNamed(given)) Then
        ForCell = ErrorNamed(given)
    ElseIf mayBeText And Left$(given, 9) <> "Traceback" Then
        ForCell = given
    Else
        ForCell = CVErr(xlErrValue)
    End If
End Function

Private Function RowForCells(ByVal cells As Variant) As Variant
    Dim place As Long
    For place = LBound(cells) To UBound(cells)
        If IsErrorText(cells(place)) Then cells(place) = ErrorNamed(cells(place))
    Next place
    RowForCells = cells
End Function

Private Function TableForCells(ByVal cells As Variant) As Variant
    Dim row As Long, column As Long
    For row = LBound(cells, 1) To UBound(cells, 1)
        For column = LBound(cells, 2) To UBound(cells, 2)
            If IsErrorText(cells(row, column)) Then cells(row, column) = ErrorNamed(cells(row, column))
        Next column
    Next row
    TableForCells = cells
End Function

Private Function IsErrorText(ByVal given As Variant) As Boolean
    If VarType(given) = vbString Then
        If Left$(given, 1) = "#" Then IsErrorText = Not IsEmpty(ErrorNamed(given))
    End If
End Function

Private Function ErrorNamed(ByVal text As String) As Variant
    ' The error value with this text; Empty for any other text.
    Select Case text
        Case "#N/A": ErrorNamed = CVErr(xlErrNA)
        Case "#NUM!": ErrorNamed = CVErr(xlErrNum)
        Case "#VALUE!": ErrorNamed = CVErr(xlErrValue)
        Case "#REF!": ErrorNamed = CVErr(xlErrRef)
        Case "#NAME?": ErrorNamed = CVErr(xlErrName)
        Case "#DIV/0!": ErrorNamed = CVErr(xlErrDiv0)
        Case "#NULL!": ErrorNamed = CVErr(xlErrNull)
        Case {other_errors}: ErrorNamed = CVErr(xlErrValue)
    End Select
End Function

Private Function DimensionsOf(ByRef cells As Variant) As Long
    Dim last As Long
    On Error Resume Next
    last = UBound(cells, 2)
    DimensionsOf = IIf(Err.Number = 0, 2, 1)
End Function
