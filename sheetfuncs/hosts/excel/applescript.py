"""The script through which Excel for macOS starts Python: the only door out of Excel's sandbox.

A script of our own in the place of xlwings', which hands the text that VBA gives it to a shell. Any macro of any
workbook can call a script that stands in this folder, and a workbook can bear any name. So which Python runs, what it
may be asked and where errors go are written into the script, and a name reaches the shell in quotes. It takes the six
fields that the add-in's VBA (vba/PythonLink.cls) joins by "|" and uses three of them.
"""

from __future__ import annotations

import re
from pathlib import PurePath

from sheetfuncs.hosts.excel.vba_project import modules

_ASKED = re.compile(r'^ +Perform "([^"]+)"$', re.MULTILINE)


def statements() -> list[str]:
    """What Python may be asked to do, letter for letter as the buttons' VBA asks it."""
    return [statement for module in modules("") for statement in _ASKED.findall(module.source)]


def script_text(interpreter: str, log: PurePath) -> str:
    """The source of the script, in plain letters only, whatever the letters of the paths."""
    allowed = ", ".join(_literal(statement) for statement in statements())
    return f"""-- Starts the Python of sheetfuncs for Excel. Written by: sheetfuncs excel install

on VbaHandler(parameterString)
	set allowedStatements to {{{allowed}}}
	set interpreterPath to {_literal(interpreter)}
	set logPath to {_literal(str(log))}
	set theFields to splitFields(parameterString)
	if (count of theFields) is not 6 then error "The name of this workbook cannot be handed to Python."
	set theStatement to item 3 of theFields
	if theStatement is not in allowedStatements then error "This is nothing that sheetfuncs does."
	set bookOption to quoted form of ("--wb=" & item 4 of theFields)
	set applicationOption to quoted form of ("--app=" & item 5 of theFields)
	set theCommand to quoted form of interpreterPath & " -P -B -u -W ignore -c " & quoted form of theStatement
	set theCommand to theCommand & " " & bookOption & " --from_xl=1 " & applicationOption
	do shell script theCommand & " > /dev/null 2> " & quoted form of logPath & " &"
	return "started"
end VbaHandler

on splitFields(joinedText)
	set oldDelimiters to AppleScript's text item delimiters
	set AppleScript's text item delimiters to "|"
	set theFields to text items of joinedText
	set AppleScript's text item delimiters to oldDelimiters
	return theFields
end splitFields
"""


def _literal(text: str) -> str:
    """A text as an expression in plain letters, since nothing says in which encoding macOS reads the file."""
    parts, plain = [], ""
    for letter in text:
        if " " <= letter <= "~":
            plain += f"\\{letter}" if letter in '"\\' else letter
        else:
            parts += [f'"{plain}"', f"(character id {ord(letter)})"]
            plain = ""
    parts.append(f'"{plain}"')
    return "(" + " & ".join(parts) + ")" if len(parts) > 1 else parts[0]
