Option Explicit

' What the buttons do. Only subs stand here: a formula in a cell cannot call a sub.

Private Const TITLE As String = "sheetfuncs"

Private mLink As PythonLink

Public Sub OnCheckSelection(ByVal control As IRibbonControl)
    Perform "import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.check_selection()"
End Sub

Public Sub OnCheckAgain(ByVal control As IRibbonControl)
    Perform "import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.check_again()"
End Sub

Public Sub OnWhyThisValue(ByVal control As IRibbonControl)
    Perform "import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.why_this_value()"
End Sub

Public Sub OnHealth(ByVal control As IRibbonControl)
    Perform "import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.show_health()"
End Sub

Public Sub CleanUp()
    ' On macOS, xlwings calls this by its name when Python is done.
    Dim report As String
    RestoreScreen
    If mLink Is Nothing Then Exit Sub
    report = mLink.TakeLog()
    If report <> "" Then ShowFailure report
End Sub

Private Sub Perform(ByVal statement As String)
    On Error GoTo Failed
    If ActiveWorkbook Is Nothing Then
        MsgBox "No workbook is open that can be checked. Open one (in Protected View: choose Enable Editing first), " & _
            "and press the button again.", vbInformation, TITLE
        Exit Sub
    End If
    If mLink Is Nothing Then Set mLink = New PythonLink
    mLink.Perform statement
    Exit Sub
Failed:
    ShowFailure Err.Description
End Sub

Private Sub ShowFailure(ByVal description As String)
    RestoreScreen
    MsgBox "This could not be done. " & LastLine(description), vbExclamation, TITLE
End Sub

Private Function LastLine(ByVal report As String) As String
    ' The last line of a report is its sentence; those above it are places in a program.
    Dim lines() As String, place As Long
    lines = Split(Replace(report, vbCr, vbLf), vbLf)
    For place = UBound(lines) To LBound(lines) Step -1
        If Trim$(lines(place)) <> "" Then Exit For
    Next place
    If place >= LBound(lines) Then LastLine = Left$(Trim$(lines(place)), 600)
End Function

Private Sub RestoreScreen()
    On Error Resume Next
    Application.StatusBar = False
    Application.ScreenUpdating = True
End Sub
