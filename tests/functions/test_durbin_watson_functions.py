"""The Durbin-Watson functions against published bounds and against each other."""

from __future__ import annotations

import pytest
from reference_cases import load_case

from sheetfuncs.functions.evaluate import evaluate, why


@pytest.mark.parametrize(
    ("arguments", "published"),
    # Savin and White 1977, Econometrica 45:1989-1996, tables II and III: rows, predictors, significance.
    [((15, 2, 0.05), (0.946, 1.543)), ((50, 1, 0.05), (1.503, 1.585)), ((100, 5, 0.01), (1.441, 1.647))],
)
def test_bounds_against_Savin_and_White(arguments, published):
    [[lower, upper]] = evaluate("FIT_DURBIN_WATSON_BOUNDS", *arguments)
    assert (lower, upper) == pytest.approx(published, abs=0.0006)
    if arguments[2] == 0.05:
        assert evaluate("FIT_DURBIN_WATSON_BOUNDS", *arguments[:2]) == [[lower, upper]]


def test_bounds_without_an_intercept_lie_lower():
    with_one, without = (evaluate("FIT_DURBIN_WATSON_BOUNDS", 15, 2, None, i)[0] for i in (True, False))
    assert without[0] < with_one[0]


def test_bounds_need_more_rows_than_coefficients():
    assert evaluate("FIT_DURBIN_WATSON_BOUNDS", 5, 4) == evaluate("FIT_DURBIN_WATSON_BOUNDS", 4, 3) == "#NUM!"
    assert why("FIT_DURBIN_WATSON_BOUNDS", 5, 4) == "5 rows leave nothing to bound with 4 predictors: give more rows."
    assert isinstance(evaluate("FIT_DURBIN_WATSON_BOUNDS", 6, 4), list)
    assert isinstance(evaluate("FIT_DURBIN_WATSON_BOUNDS", 5, 4, None, False), list)


def test_bounds_need_both_counts():
    assert evaluate("FIT_DURBIN_WATSON_BOUNDS", 15) == evaluate("FIT_DURBIN_WATSON_BOUNDS", 15, [[None]]) == "#VALUE!"
    assert "predictor_count is missing" in why("FIT_DURBIN_WATSON_BOUNDS", 15)


@pytest.mark.parametrize("name", ["hartnagel", "syn_ar1_a", "syn_noint_a"])
def test_p_against_Imhof(name):
    case = load_case(name)
    exact = case.facts["dw_exact"]
    response, predictors = [[row[0]] for row in case.cells()], [row[1:] for row in case.cells()]
    for alternative, key in (
        ("positive", "p_positive_autocorr"), ("negative", "p_negative_autocorr"), ("two-sided", "two_sided"),
    ):
        p = evaluate("FIT_DURBIN_WATSON_P", response, predictors, alternative, case.intercept)
        assert p == pytest.approx(exact[key], abs=1e-10)
        if alternative == "positive":
            assert evaluate("FIT_DURBIN_WATSON_P", response, predictors, intercept=case.intercept) == p


def test_p_does_not_apply_beside_a_lagged_response():
    response = [3.0, 4.5, 4.0, 6.0, 5.5, 7.0, 6.5, 9.0, 8.0, 9.5]
    blocks = [[v] for v in response[1:]], [[v] for v in response[:-1]]
    assert evaluate("FIT_DURBIN_WATSON_P", *blocks) == "#N/A"
    assert "the row before" in why("FIT_DURBIN_WATSON_P", *blocks)
