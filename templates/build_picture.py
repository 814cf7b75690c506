"""Makes the picture of README.md from a demonstration workbook: `python templates/build_picture.py`.

Needs LibreOffice and poppler's pdftoppm. Letters differ a little from machine to machine with the fonts, so this
picture is not compared with a new one; make it anew when the first screen changes.
"""

import subprocess
import tempfile
from pathlib import Path

from sheetfuncs.hosts.files import Request, check_book

FOLDER = Path(__file__).parent
BOOK = FOLDER / "order-hours-unequal-spread.xlsx"
PICTURE = FOLDER / "order-hours-sheet.png"
DPI = 110
# The first screen on its page, in inches: left, top, width, height.
LEFT, TOP, WIDTH, HEIGHT = 0.45, 0.35, 10.85, 5.05


def build(picture: Path) -> Path:
    """Check the workbook, print it, and cut the first screen of the diagnostics sheet out."""
    with tempfile.TemporaryDirectory() as folder:
        checked, printed = Path(folder) / "book.xlsx", Path(folder) / "book.pdf"
        check_book(Request(book=BOOK, range_text="Panels", out=checked))
        profile = (Path(folder) / "profile").as_uri()
        run("soffice", "--headless", f"-env:UserInstallation={profile}", "--convert-to", "pdf", "--outdir", folder,
            str(checked))
        page = str(page_with(printed, "What to do next"))
        frame = [str(round(DPI * inches)) for inches in (LEFT, TOP, WIDTH, HEIGHT)]
        place = [part for pair in zip(("-x", "-y", "-W", "-H"), frame, strict=True) for part in pair]
        run("pdftoppm", "-png", "-singlefile", "-r", str(DPI), "-f", page, "-l", page, *place, str(printed),
            str(picture.with_suffix("")))
    return picture


def page_with(printed: Path, text: str) -> int:
    pages = run("pdftotext", str(printed), "-").split("\f")
    return next(number for number, page in enumerate(pages, 1) if text in page)


def run(*command: str) -> str:
    return subprocess.run(command, check=True, capture_output=True, text=True, timeout=180).stdout


if __name__ == "__main__":
    print(build(PICTURE))
