"""Functions with one cell a row: as high as the response, with a heading, #N/A for rows left out, #NUM! undefined."""

from __future__ import annotations

import numpy as np
import pytest

from sheetfuncs.functions.evaluate import evaluate
from sheetfuncs.functions.registry import REGISTRY

ROW_FUNCTIONS = [f for f in REGISTRY.values() if f.returns == "column" and f.name != "FIT_VIF"]
HEADINGS = {
    "FIT_FITTED": "fitted", "FIT_RESIDUALS": "residual", "FIT_NORMAL_SCORES": "normal score",
    "FIT_LEVERAGE": "leverage", "FIT_COOKS_DISTANCE": "Cook's distance", "FIT_DFFITS": "DFFITS",
}
SCALED_KINDS = ["internally studentized", "externally studentized", "leave-one-out"]

functions = pytest.mark.parametrize("name", HEADINGS)

# Invented: litres drawn from a tank, by hours open and valve setting.
HOURS = [1.0, 2.5, 3.0, 4.5, 5.0, 6.5, 7.0, 8.5, 9.0]
VALVE = [2.0, 1.0, 3.0, 2.0, 1.0, 3.0, 1.0, 2.0, 3.0]
LITRES = [5.2, 6.9, 11.8, 13.1, 11.2, 19.6, 15.3, 21.9, 25.1]


def columns(litres=LITRES, hours=HOURS, valve=VALVE) -> tuple[list[list[object]], list[list[object]]]:
    return [[v] for v in litres], [list(row) for row in zip(hours, valve, strict=True)]


def test_they_are_all_here():
    assert [f.name for f in ROW_FUNCTIONS] == list(HEADINGS)


@functions
def test_a_header_row_gives_the_heading(name):
    response, predictors = columns()
    bare = evaluate(name, response, predictors)
    headed = evaluate(name, [["Litres"], *response], [["Hours", "Valve"], *predictors])
    assert headed == [[HEADINGS[name]], *bare]
    assert len(bare) == len(LITRES)


@pytest.mark.parametrize("kind", SCALED_KINDS)
def test_a_kind_of_residual_is_in_the_heading(kind):
    response, predictors = columns()
    headed = evaluate("FIT_RESIDUALS", [["Litres"], *response], [["Hours", "Valve"], *predictors], kind)
    assert headed[0] == [f"{kind} residual"]


@functions
def test_the_response_decides_on_the_header(name):
    response, predictors = columns()
    assert evaluate(name, [["Litres"], *response], [["Hours", None], *predictors])[0] == [HEADINGS[name]]
    assert evaluate(name, [[1.0], *response], [["Hours", "Valve"], *predictors]) == "#VALUE!"


@functions
def test_rows_left_out_keep_their_place(name):
    response, predictors = columns()
    whole = evaluate(name, response, predictors)
    with_gaps = [*response[:2], [None], *response[2:5], [7.0], *response[5:], [3.0]]
    beside = [*predictors[:2], [3.0, 1.0], *predictors[2:5], ["#DIV/0!", 2.0], *predictors[5:], [4.0, ""]]
    found = evaluate(name, with_gaps, beside)
    assert [i for i, row in enumerate(found) if row == ["#N/A"]] == [2, 6, 11]
    assert [row for row in found if row != ["#N/A"]] == whole


@functions
def test_blank_rows_below_the_data_are_na(name):
    response, predictors = columns()
    found = evaluate(name, [*response, *[[None]] * 5], [*predictors, *[[None, None]] * 5])
    assert found == [*evaluate(name, response, predictors), *[["#N/A"]] * 5]


@functions
def test_a_heading_stands_where_the_header_does(name):
    response, predictors = columns()
    found = evaluate(name, [[None], ["Litres"], *response], [["", ""], ["Hours", "Valve"], *predictors])
    assert found == [["#N/A"], [HEADINGS[name]], *evaluate(name, response, predictors)]


def lone_row() -> tuple[list[list[object]], list[list[object]]]:
    """The last row is the only one of its valve setting: leverage 1."""
    return columns(valve=[0.0] * 8 + [1.0])


@pytest.mark.parametrize("kind", SCALED_KINDS)
def test_leverage_one_leaves_scaled_residuals_undefined(kind):
    found = evaluate("FIT_RESIDUALS", *lone_row(), kind)
    assert found[8] == ["#NUM!"]
    assert all(type(row[0]) is float for row in found[:8])


def test_leverage_one():
    assert evaluate("FIT_LEVERAGE", *lone_row())[8] == [pytest.approx(1.0, abs=1e-12)]
    assert evaluate("FIT_RESIDUALS", *lone_row())[8] == [0.0]
    for name in ("FIT_COOKS_DISTANCE", "FIT_DFFITS"):
        found = evaluate(name, *lone_row())
        assert found[8] == ["#NUM!"]
        assert all(type(row[0]) is float for row in found[:8])
    assert evaluate("FIT_PRESS", *lone_row()) == "#NUM!"
    assert "(leverage 1): row 9." in evaluate("FIT_WHY", *lone_row())


def test_leave_one_out_residuals_are_those_of_refitting():
    response, predictors = columns()
    found = evaluate("FIT_RESIDUALS", response, predictors, "leave-one-out")
    for i in range(len(LITRES)):
        others, beside = response[:i] + response[i + 1:], predictors[:i] + predictors[i + 1:]
        predicted = evaluate("FIT_PREDICT", others, beside, [predictors[i]])[0][0]
        assert found[i][0] == pytest.approx(LITRES[i] - predicted, rel=1e-9)
    assert evaluate("FIT_PRESS", response, predictors) == pytest.approx(sum(row[0] ** 2 for row in found), rel=1e-12)


def test_fitted_and_residuals_add_up():
    response, predictors = columns()
    fitted, residuals = evaluate("FIT_FITTED", response, predictors), evaluate("FIT_RESIDUALS", response, predictors)
    assert [f[0] + r[0] for f, r in zip(fitted, residuals, strict=True)] == pytest.approx(LITRES, rel=1e-14)
    design = np.column_stack([np.ones(9), HOURS, VALVE])
    expected = design @ np.linalg.lstsq(design, np.array(LITRES), rcond=None)[0]
    assert [f[0] for f in fitted] == pytest.approx(expected.tolist(), rel=1e-12)


def test_normal_scores_rank_the_residuals():
    response, predictors = columns()
    residuals = [row[0] for row in evaluate("FIT_RESIDUALS", response, predictors)]
    scores = [row[0] for row in evaluate("FIT_NORMAL_SCORES", response, predictors)]
    assert np.argsort(scores).tolist() == np.argsort(residuals).tolist()
    assert sum(scores) == pytest.approx(0.0, abs=1e-12)


def test_a_perfect_fit_has_no_scaled_residuals():
    response, predictors = columns(litres=[2 * h + 1 for h in HOURS])
    assert evaluate("FIT_RESIDUALS", response, predictors) == [[0.0]] * 9
    assert evaluate("FIT_RESIDUALS", response, predictors, "externally studentized") == [["#NUM!"]] * 9
    assert evaluate("FIT_NORMAL_SCORES", response, predictors) == "#NUM!"
    coefficients = evaluate("FIT_COEFFICIENTS", response, predictors)
    assert [row[3:] for row in coefficients] == [["#NUM!"] * 4] * 3
