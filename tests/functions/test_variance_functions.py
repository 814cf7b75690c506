"""The functions on variance, autocorrelation, robust errors and condition: against R, and their options."""

from __future__ import annotations

import numpy as np
import pytest
from reference_cases import as_number, load_case

from sheetfuncs.functions.evaluate import evaluate, why

CASES = ["hartnagel", "prestige", "stackloss", "syn_noint_a", "trees"]


def blocks(case):
    cells = case.cells()
    return [[row[0]] for row in cells], [row[1:] for row in cells]


def r_result(case, method, **args):
    found = [
        r for r in case.results if r["method"] == method and all(r["args"].get(key) == v for key, v in args.items())
    ]
    assert len(found) == 1
    return found[0]


@pytest.mark.parametrize("name", CASES)
def test_p_values_against_R(name):
    case = load_case(name)
    data, options = blocks(case), {"intercept": case.intercept}
    expected = {
        ("FIT_WHITE_P", ()): r_result(case, "white"),
        ("FIT_LJUNG_BOX_P", (4,)): r_result(case, "ljung_box", lag=4),
        ("FIT_GOLDFELD_QUANDT_P", ()):
            r_result(case, "goldfeld_quandt", fraction=0, alternative="greater", order_by="row order"),
        ("FIT_GOLDFELD_QUANDT_P", ("two-sided",)):
            r_result(case, "goldfeld_quandt", fraction=0, alternative="two.sided", order_by="row order"),
    }
    for (function, own), result in expected.items():
        assert evaluate(function, *data, *own, **options) == pytest.approx(as_number(result["p"]), rel=1e-7), function


def test_goldfeld_quandt_sorted_by_a_predictor_and_with_rows_left_out():
    case = load_case("stackloss")
    data = blocks(case)
    result = r_result(case, "goldfeld_quandt", fraction=0.2, alternative="less", order_by="Air.Flow")
    for sorted_by in ("Air.Flow", " air.flow ", 1, 1.0):
        p = evaluate("FIT_GOLDFELD_QUANDT_P", *data, "less", 0.2, sorted_by)
        assert p == pytest.approx(result["p"], rel=1e-7)
    assert "give its header, or its place from 1 to 3" in why("FIT_GOLDFELD_QUANDT_P", *data, None, None, "Wind")
    prestige = blocks(load_case("prestige"))
    assert why("FIT_GOLDFELD_QUANDT_P", *prestige, None, None, "type") == (
        "type is a category: sort by a predictor of numbers."
    )


@pytest.mark.parametrize("name", [name for name in CASES if name != "prestige"])  # R has another base level there
def test_robust_coefficients_against_R(name):
    case = load_case(name)
    ordinary = evaluate("FIT_COEFFICIENTS", *blocks(case), intercept=case.intercept)
    for word, result in (
        *((kind, r_result(case, "hc_se", type=kind)) for kind in ("HC0", "HC1", "HC2", "HC3", "HC4")),
        ("Newey-West", r_result(case, "newey_west", rule_of_thumb=True, small_sample_n_over_n_minus_p=False)),
    ):
        table = evaluate("FIT_COEFFICIENTS", *blocks(case), word, intercept=case.intercept)
        assert [row[:2] for row in table] == [row[:2] for row in ordinary]
        terms = {case.term(term): term for term in result["std_errors"]}
        for term, estimate, error, t, p, low, high in table:
            name_in_r = terms[term]
            assert error == pytest.approx(result["std_errors"][name_in_r], rel=1e-8)
            assert t == pytest.approx(result["t"][name_in_r], rel=1e-8)
            assert p == pytest.approx(result["p"][name_in_r], rel=1e-6)
            assert (low + high) / 2 == pytest.approx(estimate, rel=1e-9)
            assert low < estimate < high


def test_robust_coefficients_where_they_do_not_apply():
    data = blocks(load_case("syn_lev1_a"))
    assert evaluate("FIT_COEFFICIENTS", *data, "hc3") == "#N/A"
    assert "has leverage 1" in why("FIT_COEFFICIENTS", *data, "hc3")
    assert isinstance(evaluate("FIT_COEFFICIENTS", *data, "hc1"), list)
    perfect = blocks(load_case("syn_perfect_a"))
    assert evaluate("FIT_COEFFICIENTS", *perfect, "hc3") == evaluate("FIT_COEFFICIENTS", *perfect)


def test_newey_west_follows_the_order():
    response, predictors = blocks(load_case("syn_ar1_a"))
    rng = np.random.default_rng(1)
    rows = 1 + rng.permutation(len(response) - 1)
    shuffled = [[block[0], *(block[i] for i in rows)] for block in (response, predictors)]
    order = [["time"], *([float(i)] for i in rows)]
    expected = evaluate("FIT_COEFFICIENTS", response, predictors, "newey-west")
    in_order = evaluate("FIT_COEFFICIENTS", *shuffled, "newey-west", order=order)
    for ours, theirs in zip(in_order, expected, strict=True):
        assert ours[1:] == pytest.approx(theirs[1:], rel=1e-9)
    assert evaluate("FIT_COEFFICIENTS", *shuffled, "newey-west")[0][2] != pytest.approx(expected[0][2], rel=1e-3)


def test_autocorrelation_and_its_default_lags():
    case = load_case("hartnagel")  # 38 rows: seven lags
    table = evaluate("FIT_AUTOCORRELATION", *blocks(case))
    assert [row[0] for row in table] == [1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0]
    assert table[0][1] == pytest.approx(r_result(case, "durbin_watson")["rho1"], rel=1e-9)
    assert [row[2] for row in table] == pytest.approx([1.96 / np.sqrt(38)] * 7, rel=1e-4)
    assert [row[3] for row in table] == sorted(row[3] for row in table)
    assert len(evaluate("FIT_AUTOCORRELATION", *blocks(case), 30)) == 30
    assert evaluate("FIT_AUTOCORRELATION", *blocks(case), 38) == "#NUM!"
    assert evaluate("FIT_LJUNG_BOX_P", *blocks(case)) == evaluate("FIT_LJUNG_BOX_P", *blocks(case), 7)
    assert evaluate("FIT_LJUNG_BOX_P", *blocks(case), 38) == "#NUM!"
    statistic = 38 * sum(row[1] ** 2 for row in table[:4])
    assert statistic == pytest.approx(r_result(case, "box_pierce", lag=4)["statistic"], rel=1e-9)


def test_condition_against_R_and_the_columns_that_move_together():
    case = load_case("publicschools")
    predictors = blocks(case)[1]
    predictors = [row for i, row in enumerate(predictors) if i == 0 or i - 1 in case.used]
    expected = r_result(case, "condition_indices", scaling="columns to unit length, intercept included, not centred")
    table = evaluate("FIT_CONDITION", predictors)
    assert [row[0] for row in table] == pytest.approx(expected["condition_indices"][::-1], rel=1e-9)
    assert [row[1] for row in table] == ["intercept, Income and Income2", "", ""]
    centred = evaluate("FIT_CONDITION", predictors, "about the means")
    expected = r_result(case, "condition_indices", scaling="centred, intercept excluded, columns to unit length")
    assert [row[0] for row in centred] == pytest.approx(expected["condition_indices"][::-1], rel=1e-9)
    assert len(evaluate("FIT_CONDITION", predictors, None, False)) == 2
    assert evaluate("FIT_CONDITION", predictors, "about the means", False) == "#NUM!"
    scaled = [predictors[0], *([row[0] * 1e9, row[1] * 1e-9] for row in predictors[1:])]
    assert [row[1] for row in evaluate("FIT_CONDITION", scaled)] == [row[1] for row in table]
