"""Every function on every reference case, as cells: exact results (mpmath) where there are some, else R's.

Sources stand beside each number in tests/reference; tolerances are those of its README: 1e-9 for statistics, 1e-7 for
p-values.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any, NamedTuple

import pytest

from sheetfuncs.functions.evaluate import evaluate
from tests.reference.reference_cases import NAMES, ROUNDING_NOISE, Case, as_number, load_case

REFUSED = ("syn_constcol_a",)
ORDINARY = [name for name in NAMES if name not in (*REFUSED, *ROUNDING_NOISE)]
ONE_ROW_ALONE = "syn_lev1_a"


# Rows minus coefficients is 2 there: two lags or two powers explain all that is left, whatever the data.
SATURATED = [("syn_smalln_a", "breusch_godfrey"), ("syn_smalln_a", "reset")]


# Lilliefors is not among them: R's p is that of a formula, ours a simulated one (tests/core/test_normality_lilliefors).
NORMALITY = {
    "shapiro_wilk": "shapiro-wilk", "jarque_bera": "jarque-bera", "anderson_darling": "anderson-darling",
    "dagostino_k2": "dagostino-pearson",
}


class Expected(NamedTuple):
    function: str
    options: dict[str, object]
    values: Any
    tolerance: float


def ranges(case: Case) -> tuple[list[list[object]], list[list[object]]]:
    """Response and predictors as cells, with a header row."""
    return [row[:1] for row in case.cells()], [row[1:] for row in case.cells()]


def found(case: Case, expected: Expected) -> Any:
    response, predictors = ranges(case)
    blocks = [predictors] if expected.function == "FIT_VIF" else [response, predictors]
    return evaluate(expected.function, *blocks, intercept=case.intercept, **expected.options)


def r_results(case: Case) -> list[dict[str, Any]]:
    """R's results; where R lost digits or dropped a column, those of the same problem exactly re-expressed."""
    return case.facts.get("results_alt", case.results) if "r_results_warning" in case.facts else case.results


def expectations(case: Case) -> Iterator[Expected]:
    """One number a test, from the exact results first."""
    exact = case.exact.get("tests", {})
    for result in r_results(case):
        method, args = result["method"], result["args"]
        if result.get("error") or result.get("unreliable"):
            continue
        if (case.name, method) in SATURATED and args.get("order") != 1:
            continue
        if method == "durbin_watson" and not args:
            yield Expected("FIT_DURBIN_WATSON", {}, case.exact.get("durbin_watson", result["statistic"]), 1e-9)
        elif method == "breusch_godfrey" and (args["type"], args["fill"]) == ("Chisq", "0") and "order_by" not in args:
            p = exact.get(f"breusch_godfrey_{args['order']}", result)["p"]
            yield Expected("FIT_BREUSCH_GODFREY_P", {"lags": args["order"]}, p, 1e-7)
        elif method == "breusch_pagan" and args["z"] == "all regressors":
            variant, key = ("studentized", "bp_studentized") if args["studentize"] else ("original", "bp_original")
            yield Expected("FIT_BREUSCH_PAGAN_P", {"variant": variant}, exact.get(key, result)["p"], 1e-7)
        elif method == "reset" and (args["power"], args["type"]) == ([2, 3], "fitted"):
            yield Expected("FIT_RESET_P", {}, exact.get("reset_fitted_2_3", result)["p"], 1e-7)
        elif method in NORMALITY:
            # Both programs compute Shapiro-Wilk in single steps of AS R94 and agree to about 1e-7.
            yield Expected("FIT_NORMALITY_P", {"test": NORMALITY[method]}, result["p"], 2e-7)
        elif method == "outlier_test":
            yield Expected("FIT_OUTLIER_P", {}, min(1.0, as_number(result["bonferroni_p"])), 1e-7)
        elif method == "press" and case.name != ONE_ROW_ALONE:
            yield Expected("FIT_PRESS", {}, case.exact.get("press", result["press"]), 1e-9)


TESTS = [(name, expected) for name in ORDINARY for expected in expectations(load_case(name))]


def hard(case: Case) -> float:
    """How much looser a case may be: R's own double results are good to about 1e-8 only in the last of these."""
    return 1e3 if case.name == "syn_nearcol_a" else 1.0


def test_every_number_function_is_compared():
    compared = {expected.function for _, expected in TESTS}
    assert compared == {
        "FIT_DURBIN_WATSON", "FIT_BREUSCH_GODFREY_P", "FIT_BREUSCH_PAGAN_P", "FIT_RESET_P", "FIT_NORMALITY_P",
        "FIT_OUTLIER_P", "FIT_PRESS",
    }
    assert len(TESTS) > 150


@pytest.mark.parametrize(
    ("name", "expected"), TESTS,
    ids=[f"{name}-{one.function}-{'-'.join(map(str, one.options.values()))}" for name, one in TESTS],
)
def test_number_against_reference(name, expected):
    case = load_case(name)
    assert found(case, expected) == pytest.approx(as_number(expected.values), rel=expected.tolerance * hard(case))


@pytest.mark.parametrize("name", ORDINARY)
def test_residual_mean_against_reference(name):
    case = load_case(name)
    mean = found(case, Expected("FIT_RESIDUAL_MEAN", {}, None, 0))
    if case.intercept:
        residuals = [row[0] for row in found(case, Expected("FIT_RESIDUALS", {}, None, 0)) if type(row[0]) is float]
        assert abs(mean) < 1e-15 * max(map(abs, residuals))
    else:
        assert mean == pytest.approx(as_number(case.exact["residual_mean"]), rel=1e-9)


COLUMNS = [
    ("FIT_RESIDUALS", {}, "residuals"),
    ("FIT_RESIDUALS", {"kind": "internally studentized"}, "rstandard"),
    ("FIT_RESIDUALS", {"kind": "externally studentized"}, "rstudent"),
    ("FIT_LEVERAGE", {}, "leverage"),
    ("FIT_COOKS_DISTANCE", {}, "cooks_distance"),
    ("FIT_DFFITS", {}, "dffits"),
]


def per_row(case: Case, key: str) -> list[float]:
    if key in case.exact:
        return [math.nan if "undefined" in str(value) else as_number(value) for value in case.exact[key]]
    return [as_number(value) for r in r_results(case) if isinstance(r.get(key), list) for value in r[key]]


@pytest.mark.parametrize(("function", "options", "key"), COLUMNS, ids=[column[2] for column in COLUMNS])
@pytest.mark.parametrize("name", [name for name in ORDINARY if name != "syn_big_a"])  # too long to be stored by row
def test_column_against_reference(name, function, options, key):
    case = load_case(name)
    cells = [row[0] for row in found(case, Expected(function, options, None, 0))]
    assert len(cells) == len(case.rows) + 1
    assert [i for i, cell in enumerate(cells[1:], 1) if cell == "#N/A"] == case.facts["rows_dropped_1based"]
    values = [cells[1 + i] for i in case.used]
    expected = per_row(case, key)
    assert len(values) == len(expected) > 0
    size = max(abs(value) for value in expected if value == value)
    for value, one in zip(values, expected, strict=True):
        if value == "#NUM!":
            assert case.name == ONE_ROW_ALONE
        else:
            assert value == pytest.approx(one, rel=1e-9 * hard(case), abs=1e-9 * hard(case) * size)
    assert values.count("#NUM!") == (case.name == ONE_ROW_ALONE and key not in ("residuals", "leverage"))


@pytest.mark.parametrize("name", ORDINARY)
def test_coefficients_against_reference(name):
    case = load_case(name)
    response, predictors = ranges(case)
    for column, level in case.base_levels.items():  # the reference's base comes first, so that it is ours
        place = predictors[0].index(column)
        order = sorted(range(1, len(response)), key=lambda i, p=place, base=level: predictors[i][p] != base)
        response, predictors = ([block[i] for i in (0, *order)] for block in (response, predictors))
    rows = {row[0]: row[1:] for row in evaluate("FIT_COEFFICIENTS", response, predictors, intercept=case.intercept)}
    ols = case.results[0]
    figures = [ols["coefficients"], ols["std_errors"], ols["t"], ols["p_values"], ols["ci95_low"], ols["ci95_high"]]
    if case.exact:
        figures[:2] = case.exact["coefficients"], case.exact["std_errors"]
        figures = figures[:2] if case.facts.get("r_results_warning") else figures
    for term in figures[0]:
        for value, figure in zip(rows[case.term(term)], figures, strict=False):
            assert value == pytest.approx(as_number(figure[term]), rel=1e-8 * hard(case), abs=1e-300)
    assert len(rows) == len(figures[0])


@pytest.mark.parametrize("name", ORDINARY)
def test_vif_against_reference(name):
    case = load_case(name)
    _, predictors = ranges(case)
    kept = [predictors[0], *(predictors[1 + i] for i in case.used)]
    values = [row[0] for row in evaluate("FIT_VIF", kept, intercept=case.intercept)]
    reference = next((r.get("GVIF", r.get("VIF")) for r in r_results(case) if r["method"] == "vif"), None)
    exact = case.exact.get("vif_by_column", {})
    if len(case.predictors) == 1:
        assert values == [pytest.approx(1.0, rel=1e-14)]
    for predictor, value in zip(case.predictors, values, strict=True):
        one = exact.get(predictor) if not case.facts["categorical"] else None
        one = one if one is not None else (reference or {}).get(predictor)
        if one is not None:
            assert value == pytest.approx(as_number(one), rel=1e-9 * hard(case))
            assert evaluate("FIT_VIF", kept, predictor, case.intercept) == value
        else:
            assert len(case.predictors) == 1


SCALARS = [
    "FIT_RESIDUAL_MEAN", "FIT_DURBIN_WATSON", "FIT_BREUSCH_GODFREY_P", "FIT_BREUSCH_PAGAN_P", "FIT_NORMALITY_P",
    "FIT_RESET_P", "FIT_OUTLIER_P", "FIT_PRESS",
]


@pytest.mark.parametrize("name", ROUNDING_NOISE)
@pytest.mark.parametrize("function", SCALARS)
def test_rounding_noise_is_not_tested(name, function):
    assert found(load_case(name), Expected(function, {}, None, 0)) == "#NUM!"


@pytest.mark.parametrize("name", REFUSED)
@pytest.mark.parametrize("function", [*SCALARS, "FIT_COEFFICIENTS", "FIT_LEVERAGE", "FIT_VIF"])
def test_a_constant_column_is_refused(name, function):
    assert found(load_case(name), Expected(function, {}, None, 0)) == "#NUM!"


def test_one_row_alone_leaves_no_press():
    assert found(load_case(ONE_ROW_ALONE), Expected("FIT_PRESS", {}, None, 0)) == "#NUM!"


def test_shapiro_wilk_ends_at_5000_rows():
    case = load_case("syn_big_a")
    assert len(case.rows) > 5_000
    assert found(case, Expected("FIT_NORMALITY_P", {}, None, 0)) == "#N/A"
    assert isinstance(found(case, Expected("FIT_NORMALITY_P", {"test": "jarque-bera"}, None, 0)), float)


def test_durbin_watson_in_the_order_of_another_column():
    case = load_case("syn_ties_a")
    results = [r for r in case.results if r["method"] == "durbin_watson_test" and r["args"].get("order_by") == "t"]
    order = [["t"], *([float(row[case.header.index("t")])] for row in case.rows)]
    for result in results:
        value = evaluate("FIT_DURBIN_WATSON", *ranges(case), order=order)
        assert value == pytest.approx(as_number(result["statistic"]), rel=1e-9)
    assert results


@pytest.mark.parametrize("expected", [
    Expected("FIT_BREUSCH_GODFREY_P", {"lags": 2}, None, 0), Expected("FIT_BREUSCH_GODFREY_P", {"lags": 4}, None, 0),
    Expected("FIT_RESET_P", {}, None, 0),
])
def test_too_few_rows_are_refused(expected):
    assert found(load_case("syn_smalln_a"), expected) == "#NUM!"
