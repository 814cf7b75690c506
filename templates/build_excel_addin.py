"""Builds the add-in for Excel, and the workbook with our functions in cells: `python templates/build_excel_addin.py`.

Both come out the same, byte for byte, at each build with the same versions of sheetfuncs, xlwings, pyopenvba and
XlsxWriter. `sheetfuncs excel install` builds the add-in anew, for the xlwings that is installed there.
"""

from pathlib import Path

from demo_books import order_hours_functions

from sheetfuncs.hosts.excel.addin import build_addin

ADDIN = "sheetfuncs.xlam"


def build(folder: Path) -> list[Path]:
    """Writes both files into `folder`, which must exist, and returns their paths."""
    build_addin(folder / ADDIN)
    return [folder / ADDIN, order_hours_functions.write(folder)]


if __name__ == "__main__":
    for path in build(Path(__file__).parent):
        print(path)
