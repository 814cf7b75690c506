"""Files to and fro: formulas of other programs resolve when Calc loads them, and what Calc saves has plain names."""

from __future__ import annotations

import os
import re
import zipfile
from contextlib import contextmanager
from pathlib import Path

import formula_books as books
import pytest
from office import Calc, load_uno

import sheetfuncs
from sheetfuncs.hosts.files import Request, check_book, evaluate_cell
from sheetfuncs.workbook.formula_names import write_plain_names

pytestmark = pytest.mark.libreoffice

XLSX, XLSM, ODS = "Calc MS Excel 2007 XML", "Calc MS Excel 2007 VBA XML", "calc8"
CALC_NAMES = b"ORG.SHEETFUNCS"


@contextmanager
def loaded(calc, path: Path, **options):
    document = calc.open(path, **options)
    try:
        yield document
    finally:
        document.close(True)


def sheet_of(document):
    return document.Sheets.getByName("Orders")


def cell(document, address: str):
    return sheet_of(document).getCellRangeByName(address)


def shown(document) -> dict[str, object]:
    """What the cells with formulas of ours show, by address."""
    values = {}
    for address, right in books.expected().items():
        found = cell(document, address)
        assert found.getError() == 0, (address, found.FormulaLocal, found.String)
        values[address] = found.String if isinstance(right, str) else found.Value
    return values


def assert_right(document) -> None:
    for address, value in shown(document).items():
        right = books.expected()[address]
        assert value == (right if isinstance(right, str) else pytest.approx(right, rel=1e-12, abs=1e-13)), address


def texts_in(path: Path) -> bytes:
    with zipfile.ZipFile(path) as package:
        return b"".join(package.read(name) for name in package.namelist() if name.endswith(".xml"))


def plain_formulas() -> dict[str, str]:
    """By address, the formulas that a file from Calc holds when all is plain."""
    plain = {formula.first: formula.spelled("{}") for formula in books.FORMULAS if formula is not books.SHARED}
    for row in (6, 7, 8):  # Calc writes shared formulas out
        plain[f"E{row}"] = f"FIT_DURBIN_WATSON(A{row - 4}:A${books.LAST},B{row - 4}:C${books.LAST})"
    plain["E11"] = plain["E11"].replace("NOBODYS", "nobodys")  # Calc's spelling of what it does not know
    return plain


def assert_plain(path: Path, without: tuple[str, ...] = ()) -> None:
    found = {address: formula for address, (formula, _) in books.cells_in(path).items() if formula}
    assert found == {address: formula for address, formula in plain_formulas().items() if address not in without}
    assert books.names_in(path)["Spread"].replace("$Orders.", "Orders!") == books.NAME.spelled("{}")
    assert CALC_NAMES not in texts_in(path)


def skip_unless_calc_writes_names_of_its_own(path: Path) -> None:
    """7.4 does; 25.2 writes plain names by itself, so that there is nothing to mend."""
    if CALC_NAMES not in texts_in(path):
        pytest.skip("this LibreOffice writes plain names by itself")


def save_as(calc, document, path: Path, form: str) -> None:
    document.storeAsURL(path.as_uri(), calc.properties(FilterName=form))


@pytest.mark.parametrize("spelling", books.SPELLINGS)
def test_formulas_of_other_programs_calculate_after_loading(calc, tmp_path, spelling):
    path = books.write_book(tmp_path / "book.xlsx", spelling)
    with loaded(calc, path) as document:
        assert_right(document)
        assert cell(document, "E11").Value == books.STORED  # nobody's function keeps its stored value
        assert not document.isModified()
        assert document.UndoManager.getAllUndoActionTitles() == ()
        cell(document, "A5").Value = 30.0
        hours = [*books.HOURS[:3], [30.0], *books.HOURS[4:]]
        right = sheetfuncs.evaluate("FIT_DURBIN_WATSON", hours, books.PANELS)
        assert cell(document, "E2").Value == pytest.approx(right, rel=1e-12)
        assert document.isModified()


@pytest.mark.parametrize("spelling", books.SPELLINGS)
def test_defined_names_and_rules_resolve_too(calc, tmp_path, spelling):
    path = books.write_book(tmp_path / "book.xlsx", spelling, without=(books.OTHER,))
    with loaded(calc, path) as document:
        right = sheetfuncs.evaluate("FIT_VIF", books.PANELS, 1)
        assert cell(document, "E10").Value == pytest.approx(2 * right, rel=1e-12)
        (rule,) = sheet_of(document).ConditionalFormats.getConditionalFormats()
        assert rule.getByIndex(0).Formula1.startswith("FIT_DURBIN_WATSON($A$2")
        assert not document.isModified()


def test_names_wait_where_another_function_would_lose_its_stored_value(calc, tmp_path):
    with loaded(calc, books.write_book(tmp_path / "book.xlsx", "plain")) as document:
        assert (cell(document, "E10").Value, cell(document, "E11").Value) == (books.STORED, books.STORED)


def test_calls_into_another_addin_keep_their_stored_values(calc, tmp_path):
    path = books.write_book(tmp_path / "book.xlsx", "linked", link="file:///C:\\Add-ins\\other.xlam")
    with loaded(calc, path) as document:
        assert cell(document, "E2").FormulaLocal.startswith("=[1]!FIT_DURBIN_WATSON(")
        assert cell(document, "E2").Value == books.STORED


def test_on_a_protected_sheet_array_formulas_stay_and_the_others_calculate(calc, tmp_path):
    path = books.write_book(tmp_path / "book.xlsx", "future", protected=True)
    with loaded(calc, path) as document:
        assert sheet_of(document).isProtected()
        assert cell(document, "E2").Value == pytest.approx(books.expected()["E2"], rel=1e-12)
        assert "_xlfn.fit_residuals" in cell(document, "G2").FormulaLocal
        assert not document.isModified()


def test_rows_behind_a_filter_calculate_too(calc, tmp_path):
    path = books.write_book(tmp_path / "book.xlsx", "future", filtered=True)
    with loaded(calc, path) as document:
        assert sheet_of(document).Rows.getByIndex(6).IsFiltered
        assert_right(document)


@pytest.mark.parametrize("spelling", ["plain", "linked"])
def test_a_read_only_document_calculates_and_counts_as_unchanged(calc, tmp_path, spelling):
    path = books.write_book(tmp_path / "book.xlsx", spelling)
    with loaded(calc, path, ReadOnly=True) as document:
        assert_right(document)
        assert not document.isModified()


@pytest.mark.parametrize("spelling", books.SPELLINGS)
def test_saving_gives_plain_names_that_every_reader_evaluates(calc, tmp_path, spelling):
    path = books.write_book(tmp_path / "book.xlsx", spelling)
    with loaded(calc, path) as document:
        document.store()
    assert_plain(path)
    value = books.cells_in(path)["E2"][1]
    assert float(value) == pytest.approx(books.expected()["E2"], rel=1e-12)
    again = evaluate_cell(f"={books.cells_in(path)['E2'][0]}", path)
    assert again == pytest.approx(books.expected()["E2"], rel=1e-12)  # Calc writes at most 15 digits of the data
    assert write_plain_names(path) == 0
    with loaded(calc, path) as document:
        assert_right(document)


def test_saving_again_and_again_raises_no_question(calc, tmp_path):
    import unohelper
    from com.sun.star.task import XInteractionHandler

    asked = []

    class Asked(unohelper.Base, XInteractionHandler):
        def handle(self, request):
            asked.append(request)
            request.getContinuations()[0].select()

    path = books.write_book(tmp_path / "book.xlsx", "plain")
    with loaded(calc, path) as document:
        for value in (40.0, 41.0, 42.0):
            cell(document, "A5").Value = value
            document.storeSelf(calc.properties(InteractionHandler=Asked()))
            assert_plain(path)
            assert float(books.cells_in(path)["A5"][1]) == value
            assert not document.isModified()
    assert asked == []
    assert [other.name for other in tmp_path.iterdir()] == ["book.xlsx"]


def test_the_saved_file_keeps_the_time_that_calc_knows(calc, tmp_path):
    path = books.write_book(tmp_path / "book.xlsx", "plain")
    times = []
    with loaded(calc, path) as document, _settings_away(calc):
        document.store()
        times.append(os.stat(path).st_mtime_ns)
    skip_unless_calc_writes_names_of_its_own(path)
    assert write_plain_names(path, keep_time=True) > 0
    assert os.stat(path).st_mtime_ns == times[0]


@contextmanager
def _settings_away(calc):
    """Without the file that says which Python the worker runs in."""
    settings = calc.folder / "settings.json"
    away = settings.rename(settings.with_suffix(".away"))
    try:
        yield
    finally:
        away.rename(settings)


def test_without_the_worker_the_saved_file_stays_and_is_mended_next_time(calc, tmp_path):
    path = books.write_book(tmp_path / "book.xlsx", "plain")
    with loaded(calc, path) as document:
        with _settings_away(calc):
            cell(document, "E1").String = "Noted in Calc"
            document.store()
        assert b"Noted in Calc" in texts_in(path)
        skip_unless_calc_writes_names_of_its_own(path)
        cell(document, "E1").String = "Noted again"
        document.store()
    assert_plain(path)


def test_macro_workbooks_are_treated_alike(calc, tmp_path):
    source = books.write_book(tmp_path / "book.xlsx", "compiled")
    path = tmp_path / "book.xlsm"
    with loaded(calc, source) as document:
        save_as(calc, document, path, XLSM)
    assert_plain(path)
    with loaded(calc, path) as document:
        assert_right(document)


def test_by_way_of_ods_and_back(calc, tmp_path):
    source = books.write_book(tmp_path / "book.xlsx", "linked", without=(books.OTHER,))
    middle, last = tmp_path / "book.ods", tmp_path / "again.xlsx"
    with loaded(calc, source) as document:
        save_as(calc, document, middle, ODS)
    assert CALC_NAMES in texts_in(middle)  # an .ods file is left as Calc wrote it
    with loaded(calc, middle) as document:
        assert_right(document)
        assert not document.isModified()
        save_as(calc, document, last, XLSX)
    assert_plain(last, without=(books.OTHER.first,))


@pytest.fixture(scope="module")
def bare_calc(tmp_path_factory):
    """A LibreOffice without our extension, for what a colleague who has none sees and saves."""
    load_uno()
    program = Calc(tmp_path_factory.mktemp("bare") / "profile")
    try:
        yield program
    finally:
        program.stop()


@pytest.mark.parametrize("form", [XLSX, ODS])
def test_by_way_of_a_colleague_without_the_extension(calc, bare_calc, tmp_path, form):
    calculated = ("G2", "H2", "E6", "E7", "E8")  # array and shared formulas, which Calc calculates at once
    saved = {}
    for spelling in books.SPELLINGS:
        path = books.write_book(tmp_path / f"{spelling}.xlsx", spelling, without=(books.OTHER,))
        saved[spelling] = path.with_suffix(".ods") if form == ODS else path.with_suffix(".again.xlsx")
        with loaded(bare_calc, path) as document:
            assert [cell(document, address).Value for address in ("E2", "E3", "E4", "E10")] == [books.STORED] * 4
            assert [cell(document, address).String for address in calculated] == ["#NAME?"] * 5
            save_as(bare_calc, document, saved[spelling], form)
            document.calculateAll()
            assert cell(document, "E2").String == "#NAME?"
    for spelling, path in saved.items():
        with loaded(calc, path) as document:
            assert_right(document)
            if (spelling, form) != ("linked", XLSX):  # there Calc drops a defined name whose link it lost
                right = sheetfuncs.evaluate("FIT_VIF", books.PANELS, 1)
                assert cell(document, "E10").Value == pytest.approx(2 * right, rel=1e-12)
                save_as(calc, document, tmp_path / "last.xlsx", XLSX)
                assert_plain(tmp_path / "last.xlsx", without=(books.OTHER.first,))


def test_from_excel_by_the_files_host_to_calc_and_back(calc, tmp_path):
    path = books.write_book(tmp_path / "book.xlsx", "linked")
    request = Request(book=path, range_text=f"Orders!A1:C{books.LAST}", in_place=True)
    check_book(request)
    with loaded(calc, path) as document:
        assert_right(document)
        assert document.Sheets.ElementNames == ("Orders", "Check of Orders")
        document.store()
    assert_plain(path)
    ours = re.findall(rb'<definedName [^>]*name="_sheetfuncs_[^>]*>', texts_in(path))
    assert len(ours) > 10
    assert all(b' hidden="true"' in name for name in ours)  # Calc 7.4 itself writes them for all to see
    done = check_book(request)
    assert done.replaced
    assert_plain(path)
    with loaded(calc, path) as document:
        assert_right(document)
