"""The results in a real spreadsheet program: LibreOffice opens and prints each, and its own workbooks are hosts too."""

from __future__ import annotations

import io
import re
import shutil
import subprocess
from pathlib import Path

import pytest
from test_insert_lossless import findings, raw_entries
from workbook_build import opened, sheet_to_insert
from workbook_hosts import HOSTS

from sheetfuncs.workbook import find_our_sheets, insert_sheet

SOFFICE, PDFTOTEXT = shutil.which("soffice"), shutil.which("pdftotext")
TITLE = "Check of Data"
pytestmark = [
    pytest.mark.libreoffice,
    pytest.mark.slow,
    pytest.mark.skipif(SOFFICE is None, reason="LibreOffice (soffice) is not installed"),
]


def convert(files: list[Path], form: str, folder: Path) -> None:
    """All files in one run, with a profile of their own so that a running LibreOffice is left alone."""
    profile = folder / "profile"
    command = [str(SOFFICE), f"-env:UserInstallation={profile.as_uri()}", "--headless", "--norestore"]
    command += ["--convert-to", form, "--outdir", str(folder), *map(str, files)]
    done = subprocess.run(command, capture_output=True, text=True, timeout=600, check=False)
    assert done.returncode == 0, done.stderr
    assert "Error" not in done.stdout + done.stderr


def inserted(book: bytes, **options) -> bytes:
    out = io.BytesIO()
    insert_sheet(io.BytesIO(book), io.BytesIO(sheet_to_insert(TITLE)), out=out, **{"after": "Data", **options})
    return out.getvalue()


def saved(folder: Path, books: dict[str, bytes]) -> list[Path]:
    folder.mkdir()
    paths = []
    for name, book in books.items():
        path = folder / (re.sub(r"\W+", "-", name) + (".xlsm" if "macros" in name else ".xlsx"))
        path.write_bytes(book)
        paths.append(path)
    return paths


@pytest.mark.skipif(PDFTOTEXT is None, reason="pdftotext is not installed")
def test_every_result_prints_with_the_new_sheet(tmp_path):
    books = saved(tmp_path / "books", {name: inserted(build()) for name, build in HOSTS.items()})
    convert(books, "pdf", tmp_path)
    for book in books:
        page = tmp_path / f"{book.stem}.pdf"
        text = subprocess.run([str(PDFTOTEXT), str(page), "-"], capture_output=True, text=True, check=True).stdout
        assert "Do the errors grow with the size?" in text, book.stem
        assert "2.236 kWh" in text, book.stem
        assert "=not a formula" in text, book.stem


def test_workbooks_that_libreoffice_wrote_are_hosts_like_others(tmp_path):
    kinds = ("plain", "charts_and_pictures", "active_and_hidden", "notes_and_rules", "dressed", "many_formats")
    sources = saved(tmp_path / "sources", {kind: HOSTS[f"xlsxwriter: {kind}"]() for kind in kinds})
    rewritten = tmp_path / "rewritten"
    rewritten.mkdir()
    convert(sources, "xlsx:Calc MS Excel 2007 XML", rewritten)
    for source in sources:
        host = (rewritten / source.name).read_bytes()
        book = inserted(host)
        assert len(inserted(book, replace=TITLE)) == len(book)
        old, new = raw_entries(host), raw_entries(book)
        changed = {entry.split("/")[-1] for entry in old if old[entry] != new[entry]}
        assert changed <= {"workbook.xml", "workbook.xml.rels", "[Content_Types].xml", "styles.xml", "app.xml"}
        assert list(new)[: len(old)] == list(old)
        assert findings(book, tmp_path) - findings(host, tmp_path) == {}
        before, after = opened(host), opened(book)
        assert [title for title in after.sheetnames if title != TITLE] == before.sheetnames
        for sheet in before.worksheets:
            assert list(after[sheet.title].values) == list(sheet.values)


def test_our_sheet_is_still_ours_after_libreoffice_saved_it(tmp_path):
    (book,) = saved(tmp_path / "books", {"plain": inserted(HOSTS["xlsxwriter: plain"]())})
    convert([book], "xlsx:Calc MS Excel 2007 XML", tmp_path)
    saved_again = tmp_path / "plain.xlsx"
    assert [ours.settings for ours in find_our_sheets(saved_again)] == [{"range": "Data!A1:B4"}]
    replaced = inserted(saved_again.read_bytes(), replace=TITLE)
    assert opened(replaced).sheetnames == ["Data", TITLE, "Other"]
