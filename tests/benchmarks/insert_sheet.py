"""How long a 20 MB workbook takes to gain a sheet, beside the plain copying of its zip entries, in one run.

    python tests/benchmarks/insert_sheet.py [MEGABYTES]

The aim: at most three times copying the entries plus reading the range. Copying means what the standard library can
do without inflating: every entry's compressed bytes read and written, and fsynced as a saved file is.
"""

from __future__ import annotations

import io
import os
import random
import statistics
import sys
import tempfile
import time
import zipfile
from collections.abc import Callable
from pathlib import Path

sys.path[:0] = [str(Path(__file__).parents[2]), str(Path(__file__).parents[1] / "workbook")]

import xlsxwriter  # noqa: E402
from workbook_build import sheet_to_insert  # noqa: E402

from sheetfuncs.workbook import insert_sheet  # noqa: E402

ROUNDS = 7


def build(path: Path, megabytes: float) -> None:
    """Invented numbers without a pattern, so that they do not shrink away; the seed is fixed."""
    numbers = random.Random(20)
    rows = int(megabytes * 1e6 / 85)
    with xlsxwriter.Workbook(path, {"constant_memory": True}) as book:
        for name in ("Data", "More"):
            sheet = book.add_worksheet(name)
            sheet.write_row(0, 0, [f"column {place}" for place in range(8)])
            for row in range(1, rows // 2):
                sheet.write_row(row, 0, [numbers.gauss(100, 15) for _ in range(8)])


def copy_entries(source: Path, target: Path) -> None:
    with zipfile.ZipFile(source) as archive, open(source, "rb") as raw, open(target, "wb") as out:
        for info in archive.infolist():
            raw.seek(info.header_offset)
            out.write(raw.read(30 + len(info.orig_filename) + info.compress_size))
        out.flush()
        os.fsync(out.fileno())


def timed(action: Callable[[], object]) -> float:
    start = time.perf_counter()
    action()
    return time.perf_counter() - start


def main() -> None:
    megabytes = float(sys.argv[1]) if len(sys.argv) > 1 else 20.0
    guest = sheet_to_insert("Check of Data", rows=500)
    with tempfile.TemporaryDirectory() as folder:
        book, target = Path(folder, "book.xlsx"), Path(folder, "target.xlsx")
        build(book, megabytes)
        copying, inserting = [], []
        for _ in range(ROUNDS):  # in turns, so that a busy machine disturbs both alike
            copying.append(timed(lambda: copy_entries(book, target)))
            inserting.append(timed(lambda: insert_sheet(book, io.BytesIO(guest), after="Data", out=target)))
        again = timed(lambda: insert_sheet(target, io.BytesIO(guest), replace="Check of Data", out=target))
        print(f"workbook               {book.stat().st_size / 1e6:8.1f} MB")
        for name, seconds in (("copying its entries", copying), ("inserting the sheet", inserting)):
            print(f"{name:<22} {min(seconds) * 1e3:8.1f} ms at best, {statistics.median(seconds) * 1e3:.1f} ms median")
        print(f"replacing the sheet    {again * 1e3:8.1f} ms")
        print(f"ratio at best          {min(inserting) / min(copying):8.2f}")


if __name__ == "__main__":
    main()
