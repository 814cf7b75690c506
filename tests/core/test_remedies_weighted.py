"""Weighted and feasible weighted fits, smearing: R 4.2.2 lm(weights = w), Duan 1983, statsmodels WLS, properties."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest
from form_cases import (
    MEANINGFUL,
    SEEDS,
    assert_fit_or_reason,
    awkward_fits,
    design_of,
    design_with,
    fit_case,
    fit_of,
    r_fits,
    regression,
    same_terms,
)
from hypothesis import given, settings
from reference_cases import NAMES, ROUNDING_NOISE, load_case
from statsmodels.api import WLS

from sheetfuncs.core.design import Category, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.smearing import smearing
from sheetfuncs.core.weighted import feasible_weighted_fit, log_variance_weights, weighted_fit
from sheetfuncs.errors import ArgumentError

LOOSER = {"syn_nearcol_a": 1e-8}


def weights_of(name, r, design):
    """The weights that the reference names; None where they come from a column that is re-expressed for R."""
    if r["args"]["weights"].startswith("w_i"):
        return 1.0 + np.arange(design.n) % 4
    column = r["args"]["weights"][len("1/"):-len("^2")]
    return None if name == "syn_offset_a" else 1.0 / design.columns[:, design.column_names.index(column)] ** 2


@pytest.mark.parametrize("name", MEANINGFUL)
def test_weighted_fit_against_R_lm_weights(name):
    design = design_of(name)
    compared = 0
    for r in r_fits(name, "wls"):
        weights = weights_of(name, r, design)
        if weights is None:
            continue
        compared += compare(name, weighted_fit(design, weights), r)
        np.testing.assert_allclose(weights[:5], r["weights_first5"], rtol=1e-12)
    assert compared >= 1


@pytest.mark.parametrize("name", MEANINGFUL)
def test_feasible_weighted_fit_against_R_lm_weights(name):
    """syn_lev1_a: the residual of the row of leverage 1 is zero; R takes the logarithm of its rounding noise."""
    result = feasible_weighted_fit(fit_case(name))
    if name == "syn_lev1_a":
        assert result.reason.startswith("The residual of row 1 is zero, so that the logarithm")
        return
    (r,) = r_fits(name, "fgls_log_e2")
    assert result.args == r["args"]
    assert compare(name, result, r) == 1
    np.testing.assert_allclose(result.details["weights"][:5], r["weights_first5"], rtol=1e-7)


def compare(name, result, r):
    tolerance = LOOSER.get(name, 1e-9)
    assert result.method == r["method"]
    assert same_terms(name, result.terms, result.coefficients, r["coefficients"], tolerance) >= 1
    same_terms(name, result.terms, result.standard_errors, r["std_errors"], tolerance)
    assert result.sigma == pytest.approx(r["sigma"], rel=tolerance)
    assert result.r_squared == pytest.approx(r["r_squared"], rel=tolerance)
    return 1


@pytest.mark.parametrize("intercept", [True, False])
def test_weighted_fit_against_statsmodels(intercept):
    y, x = regression(3, 50)
    weights = np.random.default_rng(3).uniform(0.1, 10, size=50)
    result = weighted_fit(design_with(y, x, intercept=intercept), weights)
    other = WLS(y, np.column_stack([np.ones(50), x]) if intercept else x, weights).fit()
    np.testing.assert_allclose(result.coefficients, other.params, rtol=1e-9)
    np.testing.assert_allclose(result.standard_errors, other.bse, rtol=1e-9)
    np.testing.assert_allclose(result.p_values, other.pvalues, rtol=1e-7)
    np.testing.assert_allclose(np.transpose(result.interval(0.9)), other.conf_int(0.1), rtol=1e-8)
    np.testing.assert_allclose(result.covariance, other.cov_params(), rtol=1e-8, atol=1e-12)
    np.testing.assert_allclose(result.residuals, other.resid, rtol=0, atol=1e-9)
    np.testing.assert_allclose(result.transformed_residuals, other.wresid, rtol=0, atol=1e-9)
    assert result.r_squared == pytest.approx(other.rsquared, rel=1e-9)
    np.testing.assert_allclose(result.fitted + result.residuals, y, rtol=1e-12)


@settings(max_examples=40, deadline=None)
@given(SEEDS)
def test_whole_number_weights_are_repeated_rows_but_for_the_degrees_of_freedom(seed):
    y, x = regression(seed, 20)
    counts = np.random.default_rng(seed).integers(1, 5, size=20)
    result = weighted_fit(design_with(y, x), counts)
    repeated = fit_of(np.repeat(y, counts), np.repeat(x, counts, axis=0))
    np.testing.assert_allclose(result.coefficients, repeated.coefficients, rtol=1e-8, atol=1e-10)
    assert result.sigma**2 * result.df == pytest.approx(repeated.rss, rel=1e-9)
    assert result.r_squared == pytest.approx(repeated.r_squared, rel=1e-8)


@settings(max_examples=40, deadline=None)
@given(SEEDS)
def test_equal_weights_are_least_squares_and_their_size_only_scales_sigma(seed):
    y, x = regression(seed, 20)
    fit = fit_of(y, x)
    for weight in (1.0, 1e-30, 1e30):
        result = weighted_fit(fit.design, np.full(20, weight))
        np.testing.assert_allclose(result.coefficients, fit.coefficients, rtol=1e-10)
        np.testing.assert_allclose(result.standard_errors, fit.standard_errors, rtol=1e-10)
        assert result.sigma == pytest.approx(fit.sigma * np.sqrt(weight), rel=1e-10)
        assert result.r_squared == pytest.approx(fit.r_squared, rel=1e-10)


def test_an_offset_costs_no_digit_with_weights():
    y, x = regression(5, 30, 2)
    u = np.round(x, 3)
    weights = np.random.default_rng(5).uniform(1, 2, size=30)
    near, far = weighted_fit(design_with(y, (u + 1e9) - 1e9), weights), weighted_fit(design_with(y, u + 1e9), weights)
    np.testing.assert_allclose(far.coefficients[1:], near.coefficients[1:], rtol=1e-11)
    np.testing.assert_allclose(far.standard_errors[1:], near.standard_errors[1:], rtol=1e-11)
    np.testing.assert_allclose(far.residuals, near.residuals, rtol=0, atol=1e-6)


@pytest.mark.parametrize("bad", [0.0, -1.0, math.nan, math.inf])
def test_weights_that_are_no_weights(bad):
    design = design_with(*regression(1, 10))
    weights = np.ones(10)
    weights[6] = bad
    with pytest.raises(ArgumentError, match="The weight of row 7 is"):
        weighted_fit(design, weights)
    with pytest.raises(ArgumentError, match="9 weights for 10 rows"):
        weighted_fit(design, np.ones(9))


def test_weights_that_leave_nothing_of_a_category():
    codes = np.array([0] * 9 + [1])
    y, _ = regression(1, 10)
    weights = np.ones(10)
    weights[9] = 1e-40
    result = weighted_fit(build_design(y, [Category("site", ("a", "b"), codes)]), weights)
    assert not result.applies
    assert "site: b" in result.reason


@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_nothing_is_weighted_on_rounding_noise(name):
    fit = fit_case(name)
    assert not weighted_fit(fit.design, 1.0 + np.arange(fit.n)).applies
    assert feasible_weighted_fit(fit).reason == fit.nothing_left()
    assert log_variance_weights(fit).reason == fit.nothing_left()


def test_the_result_as_plain_values():
    y, x = regression(2, 15)
    plain = json.loads(json.dumps(feasible_weighted_fit(fit_of(y, x)).to_dict(), allow_nan=False))
    assert [term["term"] for term in plain["terms"]] == ["intercept", "x1", "x2", "x3"]
    assert plain["df"] == 11
    assert "weights" not in plain


@pytest.mark.parametrize("name", [name for name in NAMES if r_fits(name, "smearing")])
def test_smearing_against_Duan_1983_in_R(name):
    (r,) = r_fits(name, "smearing")
    fit = fit_case(name)
    result = smearing(fit)
    if fit.df == 0:
        assert result.reason == fit.nothing_left()
        return
    tolerance = 1e-9
    assert result.factor == pytest.approx(r["smearing_factor"], rel=tolerance)
    assert result.normal_theory_factor == pytest.approx(r["normal_theory_factor"], rel=tolerance)
    np.testing.assert_allclose(result.medians[:5], r["naive_first5"], rtol=tolerance)
    np.testing.assert_allclose(result.averages[:5], r["retransformed_first5"], rtol=tolerance)
    assert result.averages.mean() == pytest.approx(r["retransformed_mean"], rel=tolerance)
    if name not in ("syn_nearcol_a", "syn_perfect_a"):
        coefficients = {k: v for k, v in r["log_model_coefficients"].items() if v != "NA"}
        same_terms(name, result.log_fit.design.terms, result.log_fit.coefficients, coefficients, tolerance)
    json.dumps(result.to_dict(), allow_nan=False)


def test_every_case_without_smearing_has_a_response_that_is_not_positive():
    for name in NAMES:
        if not r_fits(name, "smearing"):
            assert load_case(name).numbers(load_case(name).response).min() <= 0
            assert smearing(fit_case(name)).reason.startswith("Logarithms need a positive response: row ")


def test_a_perfect_logarithm_smears_nothing():
    x = np.arange(10.0)
    result = smearing(fit_design(design_with(np.exp(0.5 + 0.2 * x), x[:, None])))
    assert (result.factor, result.normal_theory_factor) == (1.0, 1.0)


@settings(max_examples=200, deadline=None)
@given(awkward_fits())
def test_awkward_rows_give_a_fit_or_a_reason(fit):
    if fit is None:
        return
    for result in (weighted_fit(fit.design, 1.0 + np.arange(fit.n)), feasible_weighted_fit(fit)):
        assert_fit_or_reason(result)
    smeared = smearing(fit)
    assert smeared.reason.endswith(".") if not smeared.applies else smeared.factor > 0
