"""What the plan says: the check's own numbers, the sentences, the jumps, and room for every text."""

from __future__ import annotations

import math
import re

import numpy as np
import pytest
from report_cases import AREA, CASES, SHEET, TITLE, orders, perfect, planned, row_of, saturated, values_in

import sheetfuncs
from sheetfuncs.core.fingerprint import data_fingerprint
from sheetfuncs.judgement.uses import uses
from sheetfuncs.report.first_screen import CAUTION
from sheetfuncs.report.layout import COLUMN_PIXELS, LAST, ROW_POINTS
from sheetfuncs.report.links import to_area, to_row
from sheetfuncs.report.names import ENTRY
from sheetfuncs.report.statistics import METHODS, place_of
from sheetfuncs.report.text import text_width


@pytest.fixture(scope="module", params=list(CASES))
def case(request):
    check = CASES[request.param]()
    return check, planned(check)


def test_terms_are_those_of_the_fit(case):
    check, plan = case
    low, high = check.fit.interval(check.settings.level)
    start = row_of(plan, "Term")
    for j, term in enumerate(check.design.terms):
        label = "Intercept" if term == "intercept" else term
        row = next(cell.row for cell in plan.cells if cell.value == label and cell.row > start)
        expected = [label, check.fit.coefficients[j]]
        if check.fit.has_error_bars:
            expected += [low[j], high[j], check.fit.standard_errors[j], check.fit.t[j], check.fit.df,
                         check.fit.p_values[j]]
        assert values_in(plan, row)[: len(expected)] == expected


def test_every_statistic_stands_on_the_sheet(case):
    check, plan = case
    texts = [cell.value for cell in plan.cells if isinstance(cell.value, str)]
    for result in check.statistics:
        name = place_of(result)[2]
        label = f"{name}, {result.variant}" if result.variant else name
        rows = [cell.row for cell in plan.cells if cell.value == label]
        assert rows, label
        on_rows = [value for row in rows for value in values_in(plan, row)]
        if result.applies:
            assert result.statistic in on_rows
            assert result.p is None or result.p in on_rows
        else:
            assert f"Does not apply: {result.reason}" in texts


def test_every_assumption_and_use_is_on_the_first_screen(case):
    check, plan = case
    end = row_of(plan, CAUTION)
    first = [cell.value for cell in plan.cells if cell.row <= end]
    for evidence in check.evidence:
        assert evidence.question in first
        assert evidence.p is None or evidence.p in first
    for use in uses(check.evidence, nothing_left=check.fit.nothing_left()):
        assert use.sentence in first


def test_the_first_screen_needs_no_scrolling(case):
    # 1,280 x 720 pixels with some 150 for the host's own bars; 52 for row numbers and the scroll bar.
    _, plan = case
    end = row_of(plan, CAUTION)
    assert sum(plan.heights.get(row, ROW_POINTS) for row in range(1, end + 1)) * 96 / 72 <= 570
    assert sum(plan.widths[column] for column in range(1, LAST + 1)) <= 1280 - 52


def test_no_number_is_missing_or_infinite(case):
    _, plan = case
    values = [cell.value for cell in plan.cells] + [value for column in plan.columns for value in column.values]
    assert all(math.isfinite(value) for value in values if isinstance(value, float))


def test_no_text_is_cut(case):
    """A text that does not wrap fits its cells, or runs into empty ones; headings of figures may be cut by the next."""
    _, plan = case
    taken = {(cell.row, cell.column) for cell in plan.cells if cell.value is not None}
    for cell in plan.cells:
        if not isinstance(cell.value, str) or cell.style.wrap or cell.row > plan.print_rows:
            continue
        last = cell.last_column or cell.column
        while (cell.row, last + 1) not in taken and last < LAST:
            last += 1
        room = (last - cell.column + 1) * COLUMN_PIXELS
        assert text_width(cell.value, cell.style.size, cell.style.bold) <= room, cell.value


def test_numbers_fit_their_column(case):
    """No host shows #### where the formatted number is narrower than the column."""
    _, plan = case
    shown = [(cell.value, cell.style) for cell in plan.cells if isinstance(cell.value, float)]
    shown += [(value, column.style) for column in plan.columns for value in column.values if isinstance(value, float)]
    for value, style in shown:
        text = _formatted(value, style.number_format)
        assert text_width(text, style.size, style.bold) < COLUMN_PIXELS - 5, (value, style.number_format)


def _formatted(value: float, number_format: str) -> str:
    last = number_format.split(";")[-1]
    if "E+" in last:
        return f"{value:.{last.partition('.')[2].count('0') - 2}e}"
    return f"{value:,.{last.partition('.')[2].count('0')}f}"


def test_cells_do_not_overlap(case):
    _, plan = case
    seen: set[tuple[int, int]] = set()
    for cell in plan.cells:
        for column in range(cell.column, (cell.last_column or cell.column) + 1):
            assert (cell.row, column) not in seen, cell
            seen.add((cell.row, column))
    for column in plan.columns:
        area = {(column.row + place, column.column) for place in range(len(column.values))}
        assert not area & seen
        seen |= area


def test_charts_cover_no_cell_and_not_each_other(case):
    _, plan = case
    taken = {(cell.row, column) for cell in plan.cells for column in range(cell.column, (cell.last_column or 0) + 1)}
    for chart in plan.charts:
        place = chart.place
        covered = {
            (row, column) for row in range(place.first_row, place.last_row + 1)
            for column in range(place.first_column, place.last_column + 1)
        }
        assert not covered & taken
        taken |= covered
        points = sum(plan.heights.get(row, ROW_POINTS) for row in range(place.first_row, place.last_row + 1))
        assert chart.height <= points * 96 / 72


def test_charts_show_figures_of_this_sheet_under_names_in_cells(case):
    _, plan = case
    columns = {column.area for column in plan.columns}
    names = {(cell.row, cell.column): cell.value for cell in plan.cells}
    for chart in plan.charts:
        assert chart.title.endswith("?")
        for series in chart.series:
            assert {series.x, series.y} <= columns
            assert isinstance(names[series.name.first_row, series.name.first_column], str)
            assert series.name.first_row == series.y.first_row - 1


def test_page_breaks_keep_charts_whole(case):
    _, plan = case
    for chart in plan.charts:
        assert not any(chart.place.first_row <= row < chart.place.last_row for row in plan.breaks)


def test_rows_to_look_at_lead_to_the_data():
    check = orders()
    plan = planned(check)
    links = {cell.value: cell.link for cell in plan.cells if cell.link and isinstance(cell.value, int)}
    assert check.flagged
    for flag in check.flagged:
        assert links[flag.row] == f"'{SHEET}'!B{flag.row}"
        reason = next(cell for cell in plan.cells if cell.value == flag.reason)
        assert values_in(plan, reason.row)[1:4] == [
            check.design.response[flag.index], check.fit.fitted[flag.index], check.fit.residuals[flag.index],
        ]


def test_rows_left_out_are_listed_with_their_reason():
    check = orders()
    plan = planned(check)
    assert [excluded.row for excluded in check.observations.ledger.excluded] == [5, 34]
    for excluded in check.observations.ledger.excluded:
        row = next(cell.row for cell in plan.cells if cell.value == excluded.row and cell.link)
        assert excluded.reason[1:] in values_in(plan, row)[1]


def test_many_rows_left_out_are_counted_by_reason():
    y = np.arange(200.0) + np.sin(np.arange(200.0))
    x = np.arange(200.0) ** 1.5
    y[10:90], x[100:120] = np.nan, np.nan
    plan = planned(sheetfuncs.check(y, x))
    texts = " ".join(str(cell.value) for cell in plan.cells)
    assert "80 rows" in texts
    assert "rows 11 to 90" in texts
    assert "rows 101 to 120" in texts


@pytest.mark.parametrize("make", [perfect, saturated])
def test_a_fit_that_leaves_nothing_says_so_and_draws_no_noise(make):
    check = make()
    plan = planned(check)
    assert all(chart.kind == "bars" for chart in plan.charts)  # collinearity does not depend on the response
    texts = [cell.value for cell in plan.cells if isinstance(cell.value, str)]
    assert check.fit.nothing_left() in texts
    assert "Not tested." in texts


def test_many_rows_are_thinned_the_same_way_each_time_and_it_is_said():
    draws = np.random.default_rng(12)
    x = draws.normal(size=12_000)
    y = x + draws.normal(size=12_000)
    y[7_000] += 12.0
    check = sheetfuncs.check(y, x, names=["x"])
    plan = planned(check)
    assert plan == planned(check)
    assert max(len(series.y.address) and series.y.last_row - series.y.first_row for chart in plan.charts
               for series in chart.series) < 5_100
    texts = " ".join(str(cell.value) for cell in plan.cells)
    assert "of 12,000 rows, a fixed random choice (seed 1)" in texts
    shown = {series.x for series in plan.charts[0].series}
    fitted = [value for column in plan.columns if column.area in shown for value in column.values]
    assert fitted.count(check.fit.fitted[7_000]) == 1


def test_beyond_the_limit_no_copy_stands_on_the_sheet_and_it_is_said():
    draws = np.random.default_rng(13)
    x = draws.normal(size=20_001)
    plan = planned(sheetfuncs.check(x + draws.normal(size=20_001), x, names=["x"]))
    assert not any(cell.formula for cell in plan.cells)
    assert any("20,001 rows are too many to copy" in str(cell.value) for cell in plan.cells)


def test_every_method_of_a_check_has_a_place():
    known = {method for _, method, _ in METHODS}
    assert {result.method for result in orders().statistics} <= known


def test_data_area_and_sheet_lead_to_a_cell():
    assert to_area("Jobs", "$B$3:$F$64") == "'Jobs'!B3"
    assert to_area("It's", "b:f") == "'It''s'!B1"
    assert to_row("A!1", "3:64", 9) == "'A!1'!A9"


def test_the_settings_stand_in_cells_and_in_the_plan():
    check = orders(level=0.9)
    plan = planned(check)
    texts = [cell.value for cell in plan.cells]
    assert {f"{SHEET}!{AREA}", "Weight (kg); Holes", 0.9} <= set(texts)
    fingerprint = data_fingerprint(check.design)
    shown = plan.settings["shown"]
    assert plan.settings == {**check.settings.to_dict(), "fingerprint": fingerprint, "shown": shown}
    cells = {(cell.row, cell.column): cell.value for cell in plan.cells}
    for place, value in enumerate(shown.values(), 1):
        row, column = re.search(r"\$([A-Z]+)\$(\d+)$", plan.names[f"{ENTRY}{place}"]).group(2, 1)
        assert cells[int(row), ord(column) - 64] == value
    assert f"SHA-256 {fingerprint}" in texts
    assert plan.title == TITLE
