"""Other error bars, columns that move together, and the figures about left-out rows, as they stand on the sheet."""

from __future__ import annotations

import re
from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from report_cases import CASES, drawn, leverage_one, moving_together, orders, parts, perfect, planned, row_of, values_in

import sheetfuncs
from sheetfuncs.report.first_screen import CAUTION
from sheetfuncs.report.layout import COLUMN_PIXELS
from sheetfuncs.report.near_dependencies import TITLE as TOGETHER
from sheetfuncs.report.robust_errors import NOTE
from sheetfuncs.report.robust_errors import TITLE as ERROR_BARS
from sheetfuncs.report.statistics import AS_ABOVE, METHODS, degrees_text
from sheetfuncs.report.text import text_width


def texts_of(plan):
    return [cell.value for cell in plan.cells if isinstance(cell.value, str)]


def lines_below(plan, title, count):
    """What stands on the first `count` lines of figures below a heading."""
    first = row_of(plan, title)
    rows = sorted({cell.row for cell in plan.cells if cell.row > first and isinstance(cell.value, float)})
    return [values_in(plan, row) for row in rows[:count]]


@pytest.mark.parametrize("name", [name for name in CASES if CASES[name]().fit.has_error_bars])
def test_a_line_a_term_with_the_covariances_own_figures(name):
    check = CASES[name]()
    plan = planned(check)
    kinds = [check.covariance("hc_se", type="HC3"), check.covariance("newey_west")]
    for j, line in enumerate(lines_below(plan, ERROR_BARS, check.fit.p)):
        expected = [check.fit.standard_errors[j]]
        for kind in kinds:
            figures = [kind.standard_errors[j], kind.low[j], kind.high[j]] if kind.applies else [np.nan] * 3
            expected += [value if np.isfinite(value) else "–" for value in figures]
        assert line[1:] == expected
    for kind in kinds:
        said = kind.note if kind.applies else kind.reason
        assert any(said in text for text in texts_of(plan))


def test_each_kind_says_when_it_is_meant():
    assert re.search(r"HC3 .*unequal\s+spread", NOTE)
    assert re.search(r"Newey-West .*neighbours .*related", NOTE)


def test_a_kind_that_does_not_apply_says_why():
    check = leverage_one()
    [remark] = [text for text in texts_of(planned(check)) if text.startswith("HC3 does not apply")]
    assert "Row 4 has leverage 1" in remark
    assert "Newey-West: lag" in remark


def test_no_other_error_bars_where_there_are_none_at_all():
    assert ERROR_BARS not in texts_of(planned(perfect()))


def test_groups_of_columns_are_named_with_their_index():
    check = moving_together()
    plan = planned(check)
    lines = lines_below(plan, TOGETHER, 3)
    assert [line[0] for line in lines] == [
        "Length of the part as drawn (mm) and Length of the part as measured (mm)", "Mass, dry (kg) and Mass, wet (kg)",
        "Intercept and Kiln temperature (K)",
    ]
    slopes = check.condition_centred.near_dependencies
    with_level = [one for one in check.condition.near_dependencies if one.terms[0] == "intercept"]
    assert [line[1] for line in lines] == [one.index for one in (*slopes, *with_level)]
    assert [("slopes are not harmed" in line[2]) for line in lines] == [False, False, True]


def test_the_first_screen_names_the_strongest_group():
    check = moving_together()
    plan = planned(check)
    end = row_of(plan, CAUTION)
    said = [cell.value for cell in plan.cells if cell.row < end and "move together" in str(cell.value)]
    assert len(said) == 1
    assert "Length of the part as d… and Length of the part as m… move together (condition index" in said[0]


def test_many_columns_in_a_group_are_counted_on_the_first_screen():
    draws = np.random.default_rng(15)
    columns = draws.normal(size=(50, 7))
    columns[:, 6] = columns[:, :6].sum(axis=1) + 0.01 * draws.normal(size=50)
    check = sheetfuncs.check(draws.normal(size=50), columns, names=[f"gauge {j}" for j in range(7)])
    size = next(one.size for one in check.evidence if one.assumption == "collinearity")
    assert "gauge 0, gauge 1, gauge 2, gauge 3 and 3 more move together" in size


def test_unrelated_columns_are_said_to_be_so_with_both_indices():
    check = orders()
    assert not check.condition_centred.near_dependencies
    assert not check.condition.near_dependencies
    [said] = [text for text in texts_of(planned(check)) if text.startswith("No group of columns moves together")]
    about, as_they_are = check.condition_centred.number, check.condition.number
    assert f"{about:.2f} about their means and {as_they_are:.2f} as they are" in said


def test_a_strong_index_without_a_group_is_not_said_to_be_none():
    condition = orders().condition
    strong = replace(condition, indices=np.array([1.0, 2.0, 45.0]), near_dependencies=())
    texts = texts_of(planned(replace(orders(), condition=strong)))
    assert not any(text.startswith("No group of columns") for text in texts)
    assert any("45.0 as they are; from 30 on it counts as strong" in text for text in texts)


def test_left_out_rows_and_residual_mean_among_the_fits_figures():
    check = orders(intercept=False)
    plan = planned(check)
    press = check.statistic("press")
    _, share, note = values_in(plan, row_of(plan, "R² on left-out rows"))
    assert share == press.details["predicted_r_squared"]
    assert "PRESS" in note
    _, mean, note = values_in(plan, row_of(plan, "Residual mean"))
    assert mean == pytest.approx(check.fit.residuals.mean(), rel=1e-12)
    assert "without an intercept" in note


def test_left_out_rows_that_nothing_predicts():
    plan = planned(leverage_one())
    _, share, note = values_in(plan, row_of(plan, "R² on left-out rows"))
    assert share == "–"
    assert note.startswith("Leverage 1")


def test_a_negative_share_is_explained():
    draws = np.random.default_rng(16)
    check = sheetfuncs.check(draws.normal(size=20), draws.normal(size=(20, 5)))
    plan = planned(check)
    _, share, note = values_in(plan, row_of(plan, "R² on left-out rows"))
    assert share < 0
    assert note.endswith("Negative: the response's mean predicts better.")


def test_a_note_is_not_repeated_on_the_next_row():
    check = orders()
    plan = planned(check)
    names = {name for _, _, name in METHODS}
    rows = sorted(cell.row for cell in plan.cells if str(cell.value).partition(", ")[0] in names and cell.column == 3)
    last = [values_in(plan, row)[-1] for row in rows]
    assert AS_ABOVE in last
    assert last[0] != AS_ABOVE
    assert all(one != other or one == AS_ABOVE for one, other in pairwise(last))
    exact = [line for line in (values_in(plan, row) for row in rows) if str(line[0]).startswith("Durbin-Watson, exact")]
    assert [line[-1] == AS_ABOVE for line in exact] == [False, True, True]


def test_a_row_to_look_at_is_drawn_once():
    check = orders()
    chart = planned(check).charts[0]
    columns = {column.area: column.values for column in planned(check).columns}
    plain, flagged = columns[chart.series[0].y], columns[chart.series[1].y]
    assert len(plain) + len(flagged) == check.fit.n
    assert set(flagged) == {check.fit.residuals[flag.index] for flag in check.flagged}
    assert not set(plain) & set(flagged)


@pytest.mark.parametrize("n", [60, 1_000])
def test_the_farthest_rows_carry_their_worksheet_row(n):
    """Columns for few rows, points for many; labels in words, as hosts differ on a point's category."""
    draws = np.random.default_rng(17)
    x = draws.normal(size=n)
    y = x + 0.1 * draws.normal(size=n)
    columns = np.zeros((n, 9))
    columns[:, 0] = x
    columns[np.arange(0, 56, 7), np.arange(1, 9)] = 5.0  # each of these rows alone moves its own coefficient
    columns[np.arange(1, 57, 7), np.arange(1, 9)] = 1.0
    check = sheetfuncs.check(y, columns)
    assert len(check.flagged) > 6
    plan = planned(check)
    [chart] = [chart for chart in plan.charts if chart.title.startswith("How far does each row move")]
    labels = [label for label in chart.series[1].labels if label]
    assert len(labels) == 6
    assert set(labels) <= {str(flag.row) for flag in check.flagged}
    number = plan.charts.index(chart) + 1
    xml = parts(drawn(plan))[f"xl/charts/chart{number}.xml"].decode()
    assert re.findall(r"<a:t>(\d+)</a:t>", xml) == labels


def test_more_than_5000_rows_rest_on_anderson_darling():
    draws = np.random.default_rng(18)
    x = draws.normal(size=5_001)
    check = sheetfuncs.check(x + draws.normal(size=5_001), x, names=["x"])
    [normality] = [one for one in check.evidence if one.assumption == "normality"]
    assert normality.test.startswith("Anderson-Darling")
    assert normality.p == check.statistic("anderson_darling").p
    assert not check.statistic("shapiro_wilk").applies


def test_degrees_of_freedom_of_many_rows_stand_in_their_column():
    draws = np.random.default_rng(19)
    x = draws.normal(size=120_000)
    check = sheetfuncs.check(x + draws.normal(size=120_000), x, names=["x"])
    assert degrees_text((1.0, 2_000_000.0)) == "1 and 2,000,000"
    pairs = [cell for cell in planned(check).cells if cell.value == degrees_text(check.statistic("rainbow").df)]
    assert pairs
    for pair in pairs:
        assert pair.value == "60,000 and 59,998"
        assert pair.style.wrap
        assert max(text_width(word, 9) for word in pair.value.split()) < COLUMN_PIXELS - 5
