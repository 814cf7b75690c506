"""Time of reading a range of 1,000,000 rows and 11 columns, beside other ways to read it.

    python tests/benchmarks/read_range.py [rows] [book.xlsx]

Prints one line a way: seconds of processor time, cells a second, and the most memory it took. Each way runs in a
process of its own.
"""

from __future__ import annotations

import resource
import subprocess
import sys
import tempfile
import time
import zipfile
from pathlib import Path

import numpy as np

COLUMNS = 11
_CONTENT_TYPES = """<?xml version="1.0" encoding="UTF-8" standalone="yes"?>
<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types">
<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>
<Default Extension="xml" ContentType="application/xml"/>
<Override PartName="/xl/workbook.xml"
 ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.sheet.main+xml"/>
<Override PartName="/xl/worksheets/sheet1.xml"
 ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.worksheet+xml"/>
<Override PartName="/xl/styles.xml"
 ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.styles+xml"/>
<Override PartName="/xl/sharedStrings.xml"
 ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.sharedStrings+xml"/>
</Types>"""
_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"
_PARTS = {
    "[Content_Types].xml": _CONTENT_TYPES,
    "_rels/.rels": f'<Relationships xmlns="{_PACKAGE}"><Relationship Id="rId1" Type="{_OFFICE}/officeDocument" '
    'Target="xl/workbook.xml"/></Relationships>',
    "xl/workbook.xml": f'<workbook xmlns="{_MAIN}" xmlns:r="{_OFFICE}"><sheets><sheet name="Data" sheetId="1" '
    'r:id="rId1"/></sheets></workbook>',
    "xl/_rels/workbook.xml.rels": f'<Relationships xmlns="{_PACKAGE}">'
    f'<Relationship Id="rId1" Type="{_OFFICE}/worksheet" Target="worksheets/sheet1.xml"/>'
    f'<Relationship Id="rId2" Type="{_OFFICE}/styles" Target="styles.xml"/>'
    f'<Relationship Id="rId3" Type="{_OFFICE}/sharedStrings" Target="sharedStrings.xml"/></Relationships>',
    "xl/styles.xml": f'<styleSheet xmlns="{_MAIN}"><fonts count="1"><font/></fonts><fills count="1"><fill/></fills>'
    '<borders count="1"><border/></borders><cellStyleXfs count="1"><xf/></cellStyleXfs><cellXfs count="3">'
    '<xf numFmtId="0"/><xf numFmtId="14" applyNumberFormat="1"/><xf numFmtId="2" applyNumberFormat="1"/></cellXfs>'
    "</styleSheet>",
    "xl/sharedStrings.xml": f'<sst xmlns="{_MAIN}">'
    + "".join(f"<si><t>{text}</t></si>" for text in ["Day", "Site", *(f"x{i}" for i in range(9)), "north", "south"])
    + "</sst>",
}


def write_book(path: Path, rows: int) -> None:
    """A workbook as programs write it: a header, a date, a category, seven full floats, two short numbers."""
    rng = np.random.default_rng(1)
    letters = "ABCDEFGHIJK"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED, compresslevel=3) as archive:
        for name, text in _PARTS.items():
            archive.writestr(name, text)
        with archive.open("xl/worksheets/sheet1.xml", "w", force_zip64=True) as part:
            part.write(
                f'<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n<worksheet xmlns="{_MAIN}">'
                f'<dimension ref="A1:K{rows + 1}"/><sheetData>'.encode()
            )
            header = "".join(f'<c r="{c}1" t="s"><v>{i}</v></c>' for i, c in enumerate(letters))
            part.write(f'<row r="1" spans="1:11">{header}</row>'.encode())
            for start in range(2, rows + 2, 10_000):
                stop = min(start + 10_000, rows + 2)
                floats = rng.normal(50, 12, size=(stop - start, 7)).tolist()
                lines = []
                for r, values in zip(range(start, stop), floats, strict=True):
                    cells = "".join(
                        f'<c r="{c}{r}" s="2"><v>{v!r}</v></c>' for c, v in zip("CDEFGHI", values, strict=True)
                    )
                    lines.append(
                        f'<row r="{r}" spans="1:11"><c r="A{r}" s="1"><v>{45000 + r % 3000}</v></c>'
                        f'<c r="B{r}" t="s"><v>{11 + r % 2}</v></c>{cells}'
                        f'<c r="J{r}"><v>{r % 97}</v></c><c r="K{r}"><v>{(r % 1000) / 8}</v></c></row>'
                    )
                part.write("".join(lines).encode())
            part.write(b"</sheetData></worksheet>")


def read_ours(path: str) -> None:
    from sheetfuncs.workbook.read import open_book
    from sheetfuncs.workbook.selection import resolve

    with open_book(path) as book:
        book.read(resolve(book, "Data!A:K"))


def read_one_by_one(path: str) -> None:
    """Our reader with the XML parser for every cell."""
    from sheetfuncs.workbook import read

    read.scan_cells = lambda chunks, reader: reader.read_part(chunks)
    read_ours(path)


def read_calamine(path: str) -> None:
    """Values only: no error kinds, formats or hidden rows."""
    import python_calamine

    python_calamine.CalamineWorkbook.from_path(path).get_sheet_by_index(0).to_python()


def read_calamine_rows(path: str) -> None:
    """The same, a row at a time."""
    import python_calamine

    for _ in python_calamine.CalamineWorkbook.from_path(path).get_sheet_by_index(0).iter_rows():
        pass


def inflate_only(path: str) -> None:
    """The least any reader needs: the sheet's bytes, inflated and checked."""
    from sheetfuncs.workbook.archive import Archive

    with open(path, "rb") as file:
        for _ in Archive(file, path).chunks("xl/worksheets/sheet1.xml"):
            pass


WAYS = {f.__name__: f for f in (inflate_only, read_ours, read_one_by_one, read_calamine, read_calamine_rows)}


def main() -> None:
    if len(sys.argv) == 3 and sys.argv[1] in WAYS:
        start = time.process_time()
        WAYS[sys.argv[1]](sys.argv[2])
        print(time.process_time() - start, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss // 1024)
        return
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000
    with tempfile.TemporaryDirectory() as folder:
        path = Path(sys.argv[2]) if len(sys.argv) > 2 else Path(folder, "big.xlsx")
        if not path.exists():
            write_book(path, rows)
        print(f"{rows:,} x {COLUMNS} cells, {path.stat().st_size / 1e6:.0f} MB")
        for name in WAYS:
            run = subprocess.run(
                [sys.executable, __file__, name, str(path)], capture_output=True, text=True, check=True
            )
            seconds, megabytes = run.stdout.split()
            rate = rows * COLUMNS / float(seconds) / 1e6
            print(f"{name:20s} {float(seconds):7.2f} s  {rate:6.2f} million cells/s  {megabytes:>6s} MB at most")


if __name__ == "__main__":
    main()
