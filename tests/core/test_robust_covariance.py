"""Robust covariances against R (sandwich), 50-digit arithmetic, statsmodels, and their definitions."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_cases import as_number, load_case
from reference_checks import FITTED, NOISE, fit_of, fitted, made_fit, r_results, same_p

from sheetfuncs.core.covariance import (
    HETEROSCEDASTIC_KINDS,
    KINDS,
    covariance,
    heteroscedasticity_consistent,
    newey_west,
    newey_west_automatic,
    rule_of_thumb_lag,
)
from sheetfuncs.errors import ArgumentError

# R's own results lose digits where columns are nearly dependent; 50-digit results stand in for them below.
ILL_CONDITIONED = {"longley": 1e-7}
# On the re-expressed problem another constant, or other units: t and p agree, errors only of these terms.
SAME_TERMS = {"syn_nearcol_a": ("x3",), "syn_offset_a": ("x1", "x2"), "syn_tiny_a": ()}


def compare(name, ours, expected):
    case = load_case(name)
    label = (name, expected["args"])
    rel = ILL_CONDITIONED.get(name, 1e-9)
    terms = {case.term(term): term for term in expected["std_errors"]}
    for j, ours_term in enumerate(fitted(name).design.terms):
        if name in SAME_TERMS and name != "syn_tiny_a" and ours_term not in SAME_TERMS[name]:
            continue
        term = terms[ours_term]
        if name not in SAME_TERMS or ours_term in SAME_TERMS[name]:
            error = as_number(expected["std_errors"][term])
            assert ours.standard_errors[j] == pytest.approx(error, rel=rel), label
        assert ours.t[j] == pytest.approx(as_number(expected["t"][term]), rel=rel), label
        p = as_number(expected["p"][term])
        if rel > 1e-9:
            assert math.log(ours.p[j]) == pytest.approx(math.log(p), rel=rel), label
        else:
            same_p(ours.p[j], p, label)


@pytest.mark.parametrize("name", FITTED)
def test_HC_against_R_sandwich(name):
    for expected in r_results(name, "hc_se"):
        kind = {"const": "ordinary"}.get(expected["args"]["type"], expected["args"]["type"])
        ours = covariance(fitted(name), kind)
        assert ours.args == expected["args"]
        if "NaN" in expected["std_errors"].values():
            assert not ours.applies
            assert ours.reason.startswith("Row 1 has leverage 1")
            continue
        compare(name, ours, expected)


@pytest.mark.parametrize("name", FITTED)
def test_Newey_West_against_R_sandwich(name):
    results = r_results(name, "newey_west")
    assert len(results) >= 6
    for expected in results:
        args = expected["args"]
        ours = newey_west(fitted(name), args["lag"], small_sample=args["small_sample_n_over_n_minus_p"])
        assert ours.args == args
        compare(name, ours, expected)
        if args["rule_of_thumb"] and not args["small_sample_n_over_n_minus_p"]:
            by_rule = newey_west(fitted(name))
            np.testing.assert_array_equal(by_rule.matrix, ours.matrix)
            assert f"lag {args['lag']} = floor(4 (n/100)^(2/9))" in by_rule.note


@pytest.mark.parametrize("name", [n for n in FITTED if n not in ("syn_nearcol_a", "syn_offset_a", "syn_tiny_a")])
def test_automatic_Newey_West_against_R_sandwich(name):
    """Not on the re-expressed cases: the lag depends on the predictors' units and levels."""
    [expected] = r_results(name, "newey_west_auto")
    ours = newey_west_automatic(fitted(name))
    assert ours.args == expected["args"]
    assert ours.details["bandwidth"] == pytest.approx(as_number(expected["bandwidth"]), rel=1e-9)
    assert ours.details["lag"] == expected["lag"]
    compare(name, ours, expected)


@pytest.mark.parametrize("name", [n for n in FITTED if "hc_std_errors" in load_case(n).exact])
def test_HC_against_mpmath_at_50_digits(name):
    """Ill-conditioned cases too: the errors come from the orthogonal basis, not from inverted cross products."""
    case, fit = load_case(name), fitted(name)
    compared = 0
    for kind, errors in case.exact["hc_std_errors"].items():
        ours = heteroscedasticity_consistent(fit, kind)
        if not ours.applies:
            assert fit.fits_itself.any()
            assert kind in ("HC2", "HC3", "HC4")
            continue
        exact = {case.term(term): float(value) for term, value in errors.items()}
        np.testing.assert_allclose(ours.standard_errors, [exact[t] for t in fit.design.terms], rtol=1e-10)
        compared += 1
    assert compared >= 1


@pytest.mark.parametrize("name", NOISE)
def test_nothing_is_said_about_rounding_noise(name):
    fit = fitted(name)
    for result in (*(covariance(fit, kind) for kind in KINDS), newey_west_automatic(fit)):
        assert not result.applies
        assert result.reason == fit.nothing_left()
        assert result.cell_error == "#NUM!"


@pytest.mark.parametrize("intercept", [True, False])
def test_against_statsmodels(intercept):
    """statsmodels OLS: HC0 to HC3, and HAC with and without its correction, t distribution."""
    import statsmodels.api as sm

    fit = made_fit(150, 3, intercept=intercept, shift=0.5)
    x = np.column_stack([np.ones(150), fit.design.columns]) if intercept else fit.design.columns
    model = sm.OLS(fit.design.response, x).fit()
    theirs = {kind: model.get_robustcov_results(kind, use_t=True) for kind in ("HC0", "HC1", "HC2", "HC3")}
    ours = {kind: covariance(fit, kind, level=0.9) for kind in theirs}
    for small in (False, True):
        theirs[small] = model.get_robustcov_results("HAC", maxlags=5, use_correction=small, use_t=True)
        ours[small] = newey_west(fit, 5, small_sample=small, level=0.9)
    for kind, robust in theirs.items():
        np.testing.assert_allclose(ours[kind].matrix, robust.cov_params(), rtol=1e-9, atol=1e-15)
        np.testing.assert_allclose(ours[kind].p, robust.pvalues, rtol=1e-7)
        limits = np.column_stack([ours[kind].low, ours[kind].high])
        np.testing.assert_allclose(limits, robust.conf_int(alpha=0.1), rtol=1e-8)


@pytest.mark.parametrize("lag", [0, 1, 3, 17, 39])
@pytest.mark.parametrize("ordered", [True, False])
def test_Newey_West_against_its_definition(lag, ordered):
    """Newey and West 1987, equation 5: a loop over lags."""
    time = np.random.default_rng(4).permutation(40).astype(float) if ordered else None
    fit = made_fit(40, 2, order=time)
    x = np.column_stack([np.ones(40), fit.design.columns])
    scores = fit.design.in_order(x * fit.residuals[:, None])
    middle = scores.T @ scores
    for step in range(1, lag + 1):
        product = scores[step:].T @ scores[:-step]
        middle += (1 - step / (lag + 1)) * (product + product.T)
    inverse = np.linalg.inv(x.T @ x)
    np.testing.assert_allclose(newey_west(fit, lag).matrix, inverse @ middle @ inverse, rtol=1e-10, atol=1e-16)


@settings(max_examples=40, deadline=None)
@given(
    st.integers(0, 500), st.integers(10, 70), st.sampled_from([1e-110, 1e-9, 1e6, 1e110]), st.sampled_from([1e-9, 1e7]),
    st.sampled_from([0.0, 1e4]), st.sampled_from(KINDS),
)
def test_t_and_p_of_slopes_do_not_depend_on_units_offsets_or_places(seed, n, unit, of_x, offset, kind):
    plain = made_fit(n, 3, seed=seed)
    rng = np.random.default_rng(seed)
    places = rng.permutation(3)
    rows = np.arange(n) if kind == "Newey-West" else rng.permutation(n)
    other = fit_of((plain.design.response * unit)[rows], (plain.design.columns[:, places] * of_x + offset * of_x)[rows])
    ours, expected = covariance(other, kind), covariance(plain, kind)
    np.testing.assert_allclose(ours.t[1:], expected.t[1:][places], rtol=1e-6, atol=1e-9)
    np.testing.assert_allclose(ours.p[1:], expected.p[1:][places], rtol=1e-5)


def test_the_matrix_is_symmetric_and_never_indefinite():
    for lag in (0, 4, 58):
        matrix = newey_west(made_fit(60, 4), lag).matrix
        np.testing.assert_array_equal(matrix, matrix.T)
        assert np.linalg.eigvalsh(matrix).min() > -1e-15


def test_no_error_for_a_coefficient_that_one_row_determines():
    """Without an intercept the 0/1 column of a single row takes that row's residual whatever it is."""
    rng = np.random.default_rng(2)
    x = np.column_stack([rng.normal(size=20), np.eye(20)[7]])
    x[7, 0] = 0.0
    fit = fit_of(x[:, 0] + rng.normal(size=20), x, intercept=False)
    for kind in ("HC0", "HC1", "Newey-West"):
        ours = covariance(fit, kind)
        assert np.isfinite(ours.p).tolist() == [True, False]
        assert "only rows of leverage 1" in ours.note
    for kind in ("HC2", "HC3", "HC4"):
        assert "Row 8 has leverage 1" in covariance(fit, kind).reason
    two = fit_of(np.r_[x[:, 0], 1.0, 2.0], np.column_stack([np.r_[rng.normal(size=20), 0, 0], np.eye(22)[:, 20:]]))
    assert "2 rows, the first of them 21, have leverage 1" in covariance(two, "HC3").reason


def test_other_refusals():
    fit = made_fit(12, 2)
    assert "12 rows are too few for 12 lags" in newey_west(fit, 12).reason
    for wrong in (-1, 1.5):
        with pytest.raises(ArgumentError):
            newey_west(fit, wrong)
    for call in (covariance, heteroscedasticity_consistent):
        with pytest.raises(ArgumentError):
            call(fit, "HC5")
    assert heteroscedasticity_consistent(fit).kind == "HC3"
    assert set(HETEROSCEDASTIC_KINDS) < set(KINDS)


def test_rule_of_thumb():
    assert [rule_of_thumb_lag(n) for n in (2, 25, 100, 1_000, 1_000_000)] == [1, 2, 4, 6, 30]
