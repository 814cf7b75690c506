"""Run by the Python that has `uno`: open a workbook with its macros, calculate it, print cells as JSON.

Arguments: workbook, profile folder, then how many rows and columns.
"""

import contextlib
import json
import os
import signal
import subprocess
import sys
import time

import uno
from com.sun.star.beans import PropertyValue

WITH_MACROS = uno.getConstantByName("com.sun.star.document.MacroExecMode.ALWAYS_EXECUTE_NO_WARN")


def option(name, value):
    made = PropertyValue()
    made.Name, made.Value = name, value
    return made


def connected(resolver, pipe):
    for _ in range(300):
        with contextlib.suppress(Exception):
            return resolver.resolve(f"uno:pipe,name={pipe};urp;StarOffice.ComponentContext")
        time.sleep(0.1)
    raise SystemExit("LibreOffice did not answer")


def cells(context, path, rows, columns):
    desktop = context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context)
    options = (option("Hidden", True), option("MacroExecutionMode", WITH_MACROS))
    book = desktop.loadComponentFromURL(uno.systemPathToFileUrl(path), "_blank", 0, options)
    book.calculateAll()
    sheet = book.Sheets.getByIndex(0)
    return [[sheet.getCellByPosition(column, row).String for column in range(columns)] for row in range(rows)]


def main(path, profile, rows, columns):
    pipe = f"sheetfuncs-{os.getpid()}"
    office = subprocess.Popen(
        ["soffice", f"-env:UserInstallation={uno.systemPathToFileUrl(profile)}", "--headless", "--norestore",
         f"--accept=pipe,name={pipe};urp;"],
        stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, start_new_session=True,
    )
    try:
        local = uno.getComponentContext()
        resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
        print(json.dumps(cells(connected(resolver, pipe), path, int(rows), int(columns))))
    finally:
        os.killpg(office.pid, signal.SIGKILL)
        office.wait()


main(*sys.argv[1:])
