"""FIT_RAINBOW_P, FIT_HARVEY_COLLIER_P, FIT_BOX_COX and FIT_ROWS as cells: reference cases, options, header and rows
left out. The core's tests compare the figures themselves."""

from __future__ import annotations

import pytest

from sheetfuncs.functions.evaluate import evaluate, why
from tests.reference.reference_cases import load_case

# Invented: boxes packed in an hour, by number of packers and by belt speed.
PACKERS = [2.0, 3.0, 3.0, 4.0, 5.0, 6.0, 6.0, 7.0, 8.0, 9.0, 9.0, 10.0, 11.0, 12.0]
SPEED = [1.0, 1.5, 1.2, 2.0, 1.1, 1.9, 1.3, 2.2, 1.4, 1.6, 2.4, 1.7, 2.1, 1.2]
BOXES = [21.0, 30.0, 28.0, 47.0, 44.0, 63.0, 55.0, 82.0, 76.0, 88.0, 104.0, 103.0, 125.0, 117.0]
RESPONSE = [[v] for v in BOXES]
PREDICTORS = [list(row) for row in zip(PACKERS, SPEED, strict=True)]


def ranges(name):
    case = load_case(name)
    cells = case.cells()
    return [row[:1] for row in cells], [row[1:] for row in cells]


def r_result(name, method, **args):
    found = [r for r in load_case(name).results if r["method"] == method
             and all(r["args"].get(key) == value for key, value in args.items())]
    assert len(found) == 1
    return found[0]


@pytest.mark.parametrize("name", ["trees", "cars", "prestige", "longley", "hartnagel"])
def test_rainbow_against_R(name):
    expected = r_result(name, "rainbow", order_by="row order")["p"]
    assert evaluate("FIT_RAINBOW_P", *ranges(name)) == pytest.approx(expected, rel=1e-7)
    nearest = r_result(name, "rainbow", order_by="mahalanobis")["p"]
    assert evaluate("FIT_RAINBOW_P", *ranges(name), middle="Nearest") == pytest.approx(nearest, rel=1e-7)


def test_the_order_column_may_be_a_predictor():
    response, predictors = ranges("gesell")
    expected = r_result("gesell", "rainbow", order_by="age")["p"]
    assert evaluate("FIT_RAINBOW_P", response, predictors, order=predictors) == pytest.approx(expected, rel=1e-7)
    expected = r_result("gesell", "harvey_collier", order_by="age")["p"]
    assert evaluate("FIT_HARVEY_COLLIER_P", response, predictors, order=predictors) == pytest.approx(expected, rel=1e-7)


def test_box_cox_of_the_cherry_trees_against_mpmath():
    exact = load_case("trees").exact["box_cox"]
    ((power, low, high, against_0, against_1),) = evaluate("FIT_BOX_COX", *ranges("trees"))
    assert (power, low, high) == pytest.approx([float(exact["lambda"]), *map(float, exact["ci95"])], rel=1e-9)
    r = r_result("trees", "box_cox")
    assert against_0 == pytest.approx(r["LR_lambda_0"]["p"], rel=1e-7)
    assert against_1 == pytest.approx(r["LR_lambda_1"]["p"], rel=1e-7)
    ((_, wider_low, wider_high, _, _),) = evaluate("FIT_BOX_COX", *ranges("trees"), level=0.99)
    assert wider_low < low < power < high < wider_high


def test_box_cox_refusals_are_true_cell_errors():
    assert evaluate("FIT_BOX_COX", [[v - 50.0] for v in BOXES], PREDICTORS) == "#N/A"
    assert why("FIT_BOX_COX", [[v - 50.0] for v in BOXES], PREDICTORS).startswith("Powers need a positive response")
    assert evaluate("FIT_BOX_COX", RESPONSE, PREDICTORS, intercept=False) == "#N/A"


def test_rainbow_with_too_small_a_middle():
    assert evaluate("FIT_RAINBOW_P", RESPONSE, PREDICTORS, 0.2) == "#NUM!"
    assert evaluate("FIT_RAINBOW_P", RESPONSE, PREDICTORS, 1.0) == "#VALUE!"


def test_rows_beside_the_functions_for_one_column():
    table = evaluate("FIT_ROWS", [["Boxes"], *RESPONSE], [["Packers", "Speed"], *PREDICTORS])
    assert table[0][-3:] == ["DFBETAS intercept", "DFBETAS Packers", "DFBETAS Speed"]
    columns = {heading: [row[i] for row in table[1:]] for i, heading in enumerate(table[0])}
    for name, heading in (("FIT_FITTED", "fitted"), ("FIT_RESIDUALS", "residual"), ("FIT_LEVERAGE", "leverage"),
                          ("FIT_COOKS_DISTANCE", "Cook's distance"), ("FIT_DFFITS", "DFFITS")):
        assert columns[heading] == [row[0] for row in evaluate(name, RESPONSE, PREDICTORS)]
    for kind in ("internally studentized", "externally studentized", "leave-one-out"):
        expected = [row[0] for row in evaluate("FIT_RESIDUALS", RESPONSE, PREDICTORS, kind)]
        assert columns[f"{kind} residual"] == expected


def test_rows_against_R_covratio_and_dfbetas():
    r = r_result("stackloss", "influence")
    table = evaluate("FIT_ROWS", *ranges("stackloss"))
    covratio = [row[table[0].index("COVRATIO")] for row in table[1:]]
    assert covratio == pytest.approx(r["covratio"], rel=1e-9)
    airflow = [row[table[0].index("DFBETAS Air.Flow")] for row in table[1:]]
    assert airflow == pytest.approx(r["dfbetas"]["Air.Flow"], rel=1e-9, abs=1e-12)


def test_rows_left_out_keep_their_place_and_undefined_cells_are_errors():
    response = [*RESPONSE[:3], [None], *RESPONSE[3:], [99.0]]
    lone = [[p, s, 0.0] for p, s in PREDICTORS]
    predictors = [*lone[:3], [1.0, 1.0, 1.0], *lone[3:], [8.0, 1.4, 1.0]]  # the last row alone has a 1
    table = evaluate("FIT_ROWS", response, predictors)
    assert len(table) == len(response)
    assert set(table[3]) == {"#N/A"}
    assert table[-1][1] == 0.0
    assert table[-1][2:5] == ["#NUM!"] * 3
    assert table[-1][5] == pytest.approx(1.0, abs=1e-12)
    assert set(table[-1][6:]) == {"#NUM!"}
    assert all(type(cell) is float for row in [*table[:3], *table[4:-1]] for cell in row)
