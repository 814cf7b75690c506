"""Prais-Winsten, Cochrane-Orcutt and maximum likelihood: R 4.2.2 (the iteration of make_reference.R, nlme::gls), the
definitions, several fixed points, properties and edges."""

from __future__ import annotations

import numpy as np
import pytest
from form_cases import (
    MEANINGFUL,
    SEEDS,
    assert_fit_or_reason,
    awkward_fits,
    fit_case,
    fit_of,
    r_fits,
    raw,
    regression,
    same_terms,
)
from hypothesis import given, settings
from reference_cases import ROUNDING_NOISE
from scipy.stats import multivariate_normal
from statsmodels.api import GLS

from sheetfuncs.core import autoregression as module
from sheetfuncs.core.autoregression import ar1_maximum_likelihood, cochrane_orcutt, prais_winsten

METHODS = {"prais_winsten": prais_winsten, "cochrane_orcutt": cochrane_orcutt}
LOOSER = {"syn_nearcol_a": 1e-8, "longley": 1e-8}


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("name", MEANINGFUL)
def test_iterations_against_R(name, method):
    fit = fit_case(name)
    results = r_fits(name, method)
    assert len(results) == 2
    for r in results:
        result = METHODS[method](fit, iterate=r["args"]["iterate"])
        tolerance = LOOSER.get(name, 1e-9)
        assert result.converged
        assert result.details["rho"] == pytest.approx(r["rho"], rel=tolerance)
        assert same_terms(name, result.terms, result.coefficients, r["coefficients"], tolerance) >= 1
        same_terms(name, result.terms, result.standard_errors, r["std_errors"], tolerance)
        assert result.sigma == pytest.approx(r["sigma"], rel=tolerance)
        assert result.df == r["df_resid"]
        assert result.details["dw_transformed"] == pytest.approx(r["dw_transformed"], rel=tolerance)
        if name not in LOOSER:  # there, R goes on among its own roundings
            assert abs(result.details["iterations"] - r["iterations"]) <= 1


@pytest.mark.parametrize("name", MEANINGFUL)
def test_maximum_likelihood_against_R_nlme_gls(name):
    """gls stops where the likelihood is flat: its phi is good to about 1e-6, the log-likelihood to twice the digits;
    ours is not below it."""
    for r in r_fits(name, "ar1_ml"):
        result = ar1_maximum_likelihood(fit_case(name))
        assert result.details["phi"] == pytest.approx(r["phi"], abs=3e-6)
        assert result.details["loglik"] == pytest.approx(r["loglik"], rel=1e-9)
        assert result.details["loglik"] >= r["loglik"] - 1e-9
        assert same_terms(name, result.terms, result.coefficients, r["coefficients"], 1e-3) >= 1


@pytest.mark.parametrize("method", [prais_winsten, ar1_maximum_likelihood])
@pytest.mark.parametrize("intercept", [True, False])
def test_coefficients_against_statsmodels_GLS_with_that_correlation(method, intercept):
    y, x = regression(3, 30)
    fit = fit_of(y, x, intercept=intercept)
    result = method(fit)
    rho = result.details.get("rho", result.details.get("phi"))
    between = np.abs(np.subtract.outer(np.arange(30), np.arange(30)))
    other = GLS(y, raw(fit.design), sigma=rho**between / (1 - rho**2)).fit()
    np.testing.assert_allclose(result.coefficients, other.params, rtol=1e-8)
    np.testing.assert_allclose(result.standard_errors, other.bse, rtol=1e-8)
    assert result.sigma == pytest.approx(np.sqrt(other.scale), rel=1e-9)
    np.testing.assert_allclose(result.transformed_residuals[1:], result.residuals[1:] - rho * result.residuals[:-1],
                               rtol=0, atol=1e-9)


@settings(max_examples=25, deadline=None)
@given(SEEDS)
def test_the_likelihood_is_that_of_the_normal_distribution_and_nowhere_higher(seed):
    y, x = regression(seed, 18, 2)
    fit = fit_of(y, x)
    result = ar1_maximum_likelihood(fit)
    between = np.abs(np.subtract.outer(np.arange(18), np.arange(18)))

    def likelihood(rho):
        shape = rho**between / (1 - rho**2)
        z = raw(fit.design)
        weights = np.linalg.inv(shape)
        left = y - z @ np.linalg.solve(z.T @ weights @ z, z.T @ weights @ y)
        return multivariate_normal.logpdf(left, cov=shape * (left @ weights @ left) / 18)

    assert result.details["loglik"] == pytest.approx(likelihood(result.details["phi"]), rel=1e-9)
    assert result.details["loglik"] >= max(map(likelihood, np.linspace(-0.98, 0.98, 99))) - 1e-9


@settings(max_examples=30, deadline=None)
@given(SEEDS)
def test_a_fixed_point_gives_itself(seed):
    y, x = regression(seed, 25, 2)
    fit = fit_of(y, x)
    for method in METHODS.values():
        result = method(fit)
        if not result.applies or not result.converged:
            continue
        e = result.residuals
        rho = result.details["rho"]
        assert e[1:] @ e[:-1] / (e[:-1] @ e[:-1]) == pytest.approx(rho, rel=1e-8, abs=1e-10)
        first, *_ = result.details["fixed_points"]
        assert first["rho"] == rho
        assert first["sigma"] == pytest.approx(result.sigma, rel=1e-8)


def test_several_fixed_points_are_reported():
    """cars in row order: Cochrane-Orcutt stands still at 0.16 and at 0.98 (computed here; each is checked by its
    definition)."""
    fit = fit_case("cars")
    result = cochrane_orcutt(fit)
    points = result.details["fixed_points"]
    assert [round(point["rho"], 3) for point in points] == [0.162, 0.978]
    assert "From other starts the iteration ends at a correlation of 0.978 instead of 0.162" in result.note
    z, y, rho = raw(fit.design), fit.design.response, points[1]["rho"]
    b = np.linalg.lstsq(z[1:] - rho * z[:-1], y[1:] - rho * y[:-1], rcond=None)[0]
    e = y - z @ b
    assert e[1:] @ e[:-1] / (e[:-1] @ e[:-1]) == pytest.approx(rho, rel=1e-6)
    left = e[1:] - rho * e[:-1]
    assert points[1]["sigma"] == pytest.approx(np.sqrt(left @ left / (49 - 2)), rel=1e-6)
    assert prais_winsten(fit).note == ""


def test_several_maxima_are_reported():
    maxima = ar1_maximum_likelihood(fit_case("cars")).details["maxima"]
    assert [round(one["phi"], 3) for one in maxima] == [0.160, 0.989]
    assert maxima[0]["loglik"] > maxima[1]["loglik"]


def test_the_two_methods_may_end_far_apart():
    """stackloss: rho of 0.18 and 0.74 (both R's, see the reference)."""
    fit = fit_case("stackloss")
    assert round(prais_winsten(fit).details["rho"], 2) == 0.18
    assert round(cochrane_orcutt(fit).details["rho"], 2) == 0.74


@settings(max_examples=30, deadline=None)
@given(SEEDS)
def test_units_zeros_and_time_order_do_not_matter(seed):
    y, x = regression(seed, 25, 2)
    shuffled = np.random.default_rng(seed).permutation(25)
    for method in (*METHODS.values(), ar1_maximum_likelihood):
        result = method(fit_of(y, x))
        if not result.applies:
            continue
        scaled = method(fit_of(-2e5 * y, x * [1e-6, 7e4] + np.array([1.0, 1e3])))
        mixed = method(fit_of(y[shuffled], x[shuffled], order=shuffled.astype(float)))
        for other in (scaled, mixed):
            key = "rho" if "rho" in result.details else "phi"
            assert other.details[key] == pytest.approx(result.details[key], rel=1e-6, abs=1e-7)
        np.testing.assert_allclose(scaled.coefficients[1:] * [1e-6, 7e4] / -2e5, result.coefficients[1:], rtol=1e-5)
        np.testing.assert_allclose(mixed.residuals, result.residuals[shuffled], rtol=0, atol=1e-5 * result.sigma)
        np.testing.assert_allclose(mixed.transformed_residuals, result.transformed_residuals, atol=1e-5 * result.sigma)


def test_many_rows_are_taken_in_pieces(monkeypatch):
    y, x = regression(2, 500)
    fit = fit_of(y, x)
    whole = prais_winsten(fit).details["rho"]
    monkeypatch.setattr(module, "CHUNK", 7)
    assert prais_winsten(fit).details["rho"] == pytest.approx(whole, rel=1e-12)


def test_an_offset_costs_no_digit():
    y, x = regression(4, 40, 2)
    u = np.round(x, 3)
    near, far = (prais_winsten(fit_of(y, shifted)) for shifted in ((u + 1e9) - 1e9, u + 1e9))
    np.testing.assert_allclose(far.coefficients[1:], near.coefficients[1:], rtol=1e-9)


def test_errors_that_repeat_are_refused():
    """Residuals that double from row to row: rho comes to more than 1."""
    y = 2.0 ** np.arange(12.0)
    fit = fit_of(y, np.empty((12, 0)), intercept=True)
    result = cochrane_orcutt(fit, iterate=False)
    assert not result.applies
    assert "is not below 1" in result.reason


def test_a_response_of_the_row_before_is_said():
    y = np.random.default_rng(3).normal(size=40).cumsum()
    result = prais_winsten(fit_of(y[1:], y[:-1, None]))
    assert "x1 is the response of the row before; with that the estimates are off." in result.note


def test_too_few_rows_once_the_first_is_left_out():
    y, x = regression(1, 5)
    assert fit_of(y, x).df == 1
    assert cochrane_orcutt(fit_of(y, x)).reason == (
        "5 rows are too few for 4 coefficients once the first row is left out."
    )


@pytest.mark.parametrize("method", [*METHODS.values(), ar1_maximum_likelihood])
@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_nothing_is_fitted_to_rounding_noise(name, method):
    fit = fit_case(name)
    assert method(fit).reason == fit.nothing_left()


@settings(max_examples=200, deadline=None)
@given(awkward_fits())
def test_awkward_rows_give_a_fit_or_a_reason(fit):
    if fit is None:
        return
    for method in (*METHODS.values(), ar1_maximum_likelihood):
        assert_fit_or_reason(method(fit))
