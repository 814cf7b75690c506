"""The stored demonstration workbooks: rebuilt and compared, and each one shows what it is for and nothing else.

The statistics come from statsmodels and scipy on values read by openpyxl, so that no part of sheetfuncs is asked
about its own demonstration. The tests on the errors are those of
Breusch and Pagan (1979), studentized as in Koenker (1981); White (1980); Durbin and Watson (1950, 1951);
Breusch (1978) and Godfrey (1978); Shapiro and Wilk (1965); Jarque and Bera (1980); Ramsey (1969), RESET; Cook (1977).
The limits on their p-values are our own choice: far from any usual level on the side that each workbook is for.
"""

import datetime
import importlib
import itertools
import math
import shutil
import subprocess
import sys
import warnings
import zipfile
import zlib
from pathlib import Path

import numpy as np
import openpyxl
import pytest

TEMPLATES = Path(__file__).parents[2] / "templates"
KILN, DRYER, ORDERS = "kiln-energy-clean.xlsx", "dryer-gas-time-order.xlsx", "order-hours-unequal-spread.xlsx"
BOOKS = [KILN, DRYER, ORDERS]
# book: data sheet, table and its range, defined name of the same range
STUDIES = {
    KILN: ("Firings", "Firings", "D4:G52", "Firing_study"),
    DRYER: ("Drying days", "DryingDays", "B4:F64", "Drying_study"),
    ORDERS: ("Orders", "Panels", "D4:G74", "Panel_study"),
}
LEVERAGE_ROW, OUTLIER_ROW = 27, 51  # worksheet rows of ORDERS
LEFT_OUT = {15: "G", 38: "G", 62: "F", 73: "D"}  # worksheet row of ORDERS: the column with the gap


@pytest.fixture(scope="module")
def rebuilt(tmp_path_factory):
    """The folder with freshly built workbooks."""
    folder = tmp_path_factory.mktemp("demo")
    sys.path.insert(0, str(TEMPLATES))
    try:
        paths = importlib.import_module("build_demo_books").build(folder)
    finally:
        sys.path.remove(str(TEMPLATES))
    assert [path.name for path in paths] == BOOKS
    return folder


def entries(path):
    """Every zip entry in order: name, time stamp, method and the bytes behind the compression."""
    with zipfile.ZipFile(path) as package:
        return [(item.filename, item.date_time, item.compress_type, package.read(item)) for item in package.infolist()]


@pytest.mark.parametrize("book", BOOKS)
def test_rebuilt_entries_are_the_stored_ones(rebuilt, book):
    fresh, stored = entries(rebuilt / book), entries(TEMPLATES / book)
    assert [item[:3] for item in fresh] == [item[:3] for item in stored]
    for (name, *_, new), (*_, old) in zip(fresh, stored, strict=True):
        assert new == old, f"{book}: {name} differs; run templates/build_demo_books.py and look at the difference"


@pytest.mark.skipif(
    zlib.ZLIB_RUNTIME_VERSION != "1.2.13" or sys.platform == "win32",
    reason="another zlib compresses to other bytes, and Windows writes another system code into the package",
)
@pytest.mark.parametrize("book", BOOKS)
def test_rebuilt_file_is_the_stored_one_byte_for_byte(rebuilt, book):
    assert (rebuilt / book).read_bytes() == (TEMPLATES / book).read_bytes()


def read(path, *, unread="extension is not supported", **options):
    """A workbook by openpyxl, which warns about what it cannot hold: here the data bar's extension."""
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message=f".*{unread}", category=UserWarning)
        return openpyxl.load_workbook(path, **options)


@pytest.fixture(scope="module")
def values():
    """The workbooks as a reader without a spreadsheet program sees them: stored values in place of formulas."""
    return {book: read(TEMPLATES / book, data_only=True) for book in BOOKS}


@pytest.mark.parametrize("book", BOOKS)
def test_first_sheet_says_that_the_data_are_invented(values, book):
    first = values[book].worksheets[0]
    assert first["B4"].value == "Invented data for demonstration"
    assert "there is no such firm" in first["C6"].value
    assert values[book].properties.description == "Invented data for demonstration"


@pytest.mark.parametrize("book", BOOKS)
def test_opens_on_the_data_which_are_a_table_and_a_named_range(values, book):
    title, table, area, name = STUDIES[book]
    sheet = values[book][title]
    assert values[book].active is sheet
    assert sheet.tables[table].ref == area
    first, last = area.split(":")
    absolute = f"${first[0]}${first[1:]}:${last[0]}${last[1:]}"
    assert values[book].defined_names[name].attr_text.split("!")[1] == absolute
    above = int(first[1:]) - 1
    assert all(cell.value is None for cell in sheet[above])
    assert sheet["B2"].value


def formulas_of(workbook):
    """Every formula cell with its sheet's title."""
    for sheet in workbook.worksheets:
        for row in sheet.iter_rows():
            yield from ((sheet.title, cell) for cell in row if cell.data_type == "f")


@pytest.mark.parametrize("book", BOOKS)
def test_holds_what_an_insertion_must_not_lose(book):
    names = [item[0] for item in entries(TEMPLATES / book)]
    workbook = read(TEMPLATES / book)
    data = workbook[STUDIES[book][0]]
    assert len(workbook.worksheets) >= 4
    assert any(name.startswith("xl/charts/chart") for name in names)
    assert any(name.startswith("xl/tables/table") for name in names)
    assert len(list(formulas_of(workbook))) > 100
    assert len(list(data.conditional_formatting)) >= 2
    assert len(data.data_validations.dataValidation) >= 2
    assert data.freeze_panes == "C5"
    assert data.print_area
    assert data.print_title_rows


def test_orders_also_hold_a_comment_a_hidden_sheet_and_a_chart_sheet():
    workbook = read(TEMPLATES / ORDERS)
    assert workbook["Orders"].cell(OUTLIER_ROW, 4).comment is not None
    assert workbook["Lists"].sheet_state == "hidden"
    assert [sheet.title for sheet in workbook.chartsheets] == ["Time by area"]


def cells(values, book):
    """Header and data rows of the study, each row led by its worksheet row number."""
    title, _, area, _ = STUDIES[book]
    block = values[book][title][area]
    return [cell.value for cell in block[0]], [(row[0].row, *(cell.value for cell in row)) for row in block[1:]]


def kiln_design(values):
    _, rows = cells(values, KILN)
    kilns = list(dict.fromkeys(row[4] for row in rows))
    assert kilns == ["Brick kiln", "Roller kiln", "Car kiln"]
    x = [[1.0, row[2], row[3], *(float(row[4] == kiln) for kiln in kilns[1:])] for row in rows]
    return np.array([row[1] for row in rows], float), np.array(x, float)


def dryer_design(values):
    _, rows = cells(values, DRYER)
    return np.array([row[2] for row in rows], float), np.array([[1.0, *row[3:6]] for row in rows], float)


def order_design(values, without=()):
    """Response, design and worksheet rows of the complete rows."""
    _, rows = cells(values, ORDERS)
    used = [row for row in rows if row[0] not in LEFT_OUT and row[0] not in without]
    x = np.array([[1.0, *row[2:]] for row in used], float)
    return np.array([row[1] for row in used], float), x, [row[0] for row in used]


def figures(y, x):
    """Statistics and p-values of one least-squares fit, by the libraries that publish the tests above."""
    from scipy import stats
    from statsmodels.regression.linear_model import OLS
    from statsmodels.stats import diagnostic, stattools
    from statsmodels.stats.outliers_influence import variance_inflation_factor

    fit = OLS(y, x).fit()
    influence = fit.get_influence()
    order_one = np.column_stack([x, np.concatenate([[0.0], fit.resid[:-1]])])
    godfrey = len(y) * OLS(fit.resid, order_one).fit().rsquared
    return {
        "breusch_pagan_p": diagnostic.het_breuschpagan(fit.resid, x)[1],
        "durbin_watson": stattools.durbin_watson(fit.resid),
        "breusch_godfrey_p": stats.chi2.sf(godfrey, 1),
        "shapiro_wilk_p": stats.shapiro(fit.resid).pvalue,
        "jarque_bera_p": stattools.jarque_bera(fit.resid)[1],
        "reset_p": float(diagnostic.linear_reset(fit, power=3, use_f=True).pvalue),
        "largest_vif": max(variance_inflation_factor(x, j) for j in range(1, x.shape[1])),
        "cooks_distance": influence.cooks_distance[0],
        "leverage": influence.hat_matrix_diag,
        "studentized": influence.resid_studentized_external,
        "fit": fit,
    }


def assert_nothing_against(found, *names):
    for name in names:
        assert found[name] > 0.2, f"{name} = {found[name]:.4f}"


def test_kiln_shows_no_violation(values):
    y, x = kiln_design(values)
    found = figures(y, x)
    assert len(y) == 48
    assert_nothing_against(found, "breusch_pagan_p", "breusch_godfrey_p", "shapiro_wilk_p", "jarque_bera_p", "reset_p")
    assert 1.7 < found["durbin_watson"] < 2.3
    assert found["largest_vif"] < 2
    assert found["cooks_distance"].max() < 0.25
    assert np.abs(found["studentized"]).max() < 3


def test_dryer_shows_serial_correlation_and_nothing_else(values):
    y, x = dryer_design(values)
    found = figures(y, x)
    assert len(y) == 60
    # far below 1.48, the lower 5 % point for 60 rows and 3 predictors (Savin and White 1977; value from memory)
    assert 0.6 < found["durbin_watson"] < 0.9
    assert found["breusch_godfrey_p"] < 1e-4
    assert_nothing_against(found, "breusch_pagan_p", "shapiro_wilk_p", "jarque_bera_p", "reset_p")
    assert found["largest_vif"] < 2
    assert found["cooks_distance"].max() < 0.25


def test_dryer_days_are_true_dates_without_a_gap(values):
    _, rows = cells(values, DRYER)
    days = [row[1] for row in rows]
    assert all(isinstance(day, datetime.datetime) for day in days)
    assert {later - earlier for earlier, later in itertools.pairwise(days)} == {datetime.timedelta(days=1)}


def test_orders_show_unequal_spread_with_and_without_the_two_rows(values):
    y, x, _ = order_design(values)
    assert len(y) == 66
    found = figures(y, x)
    assert found["breusch_pagan_p"] < 0.01
    assert 1.6 < found["durbin_watson"] < 2.4
    assert found["breusch_godfrey_p"] > 0.2
    assert found["largest_vif"] < 2
    y, x, _ = order_design(values, without=(LEVERAGE_ROW, OUTLIER_ROW))
    rest = figures(y, x)
    assert rest["breusch_pagan_p"] < 0.001
    assert_nothing_against(rest, "breusch_godfrey_p", "jarque_bera_p", "reset_p")
    assert rest["shapiro_wilk_p"] > 0.1  # errors of unequal spread, pooled, have heavier ends
    assert rest["cooks_distance"].max() < 0.25


def test_orders_have_one_leverage_row_and_one_outlier(values):
    y, x, rows = order_design(values)
    found = figures(y, x)
    far, off = rows.index(LEVERAGE_ROW), rows.index(OUTLIER_ROW)
    others = [i for i in range(len(rows)) if i not in (far, off)]
    assert found["leverage"][far] > 0.35 > 0.2 > np.delete(found["leverage"], far).max()
    assert found["studentized"][off] > 5
    assert found["cooks_distance"][far] > 1
    assert found["cooks_distance"][off] > 3 * found["cooks_distance"][others].max()


def test_orders_have_three_empty_cells_and_one_error(values):
    header, rows = cells(values, ORDERS)
    gaps = {row[0]: "DEFG"[i] for row in rows for i in range(len(header)) if row[1 + i] in (None, "#N/A")}
    assert gaps == LEFT_OUT
    sheet = values[ORDERS]["Orders"]
    assert sheet["F62"].value == "#N/A"
    assert read(TEMPLATES / ORDERS)["Orders"]["F62"].value == "=NA()"
    assert [sheet[cell].value for cell in ("G15", "G38", "D73")] == [None, None, None]


ALWAYS_RECALCULATE = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load"><prop oor:name="OOXMLRecalcMode" oor:op="fuse">
<value>0</value></prop></item></oor:items>"""


@pytest.mark.libreoffice
@pytest.mark.skipif(shutil.which("soffice") is None, reason="the soffice program is not installed")
def test_stored_values_of_formulas_are_those_of_a_spreadsheet_program(values, tmp_path):
    profile = tmp_path / "profile" / "user"
    profile.mkdir(parents=True)
    (profile / "registrymodifications.xcu").write_text(ALWAYS_RECALCULATE, encoding="utf-8")
    command = ["soffice", f"-env:UserInstallation={profile.parent.as_uri()}", "--headless", "--convert-to", "xlsx"]
    paths = [str(TEMPLATES / book) for book in BOOKS]
    subprocess.run([*command, "--outdir", str(tmp_path), *paths], check=True, capture_output=True, timeout=300)
    for book in BOOKS:
        again = read(tmp_path / book, unread="(extension is not supported|Unable to read chart)", data_only=True)
        for title, cell in formulas_of(read(TEMPLATES / book)):
            stored = values[book][title][cell.coordinate].value
            fresh = again[title][cell.coordinate].value
            assert same(stored, fresh), f"{book}, {title}!{cell.coordinate}: {stored!r} against {fresh!r}"


def same(stored, fresh):
    if isinstance(stored, int | float) and isinstance(fresh, int | float):
        return math.isclose(stored, fresh, rel_tol=1e-9, abs_tol=1e-9)
    return (stored or None) == (fresh or None)
