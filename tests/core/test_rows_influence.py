"""DFBETAS, COVRATIO and predicted R squared: R 4.2.2 dfbetas, covratio and sum((e/(1-h))^2), refits without each row,
statsmodels, and edges."""

from __future__ import annotations

import numpy as np
import pytest
from form_cases import (
    MEANINGFUL,
    OTHER_COEFFICIENT,
    SEEDS,
    awkward_fits,
    fit_case,
    fit_of,
    r_numbers,
    r_results,
    regression,
)
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_cases import ROUNDING_NOISE, as_number, load_case
from statsmodels.api import OLS
from statsmodels.stats.outliers_influence import OLSInfluence

from sheetfuncs.core.influence import press, row_measures
from sheetfuncs.core.shifts import coefficient_shifts, dfbetas

BY_ROW = [name for name in MEANINGFUL if r_results(name, "influence")]
LOOSER = {"syn_nearcol_a": 1e-8}


@pytest.mark.parametrize("name", BY_ROW)
def test_against_R_dfbetas_and_covratio(name):
    """syn_lev1_a: the row of leverage 1 is undefined; R prints rounding noise for its dfbetas."""
    case, fit = load_case(name), fit_case(name)
    (r,) = r_results(name, "influence")
    measures = row_measures(fit)
    ours = dict(zip(fit.design.terms, dfbetas(fit, measures).T, strict=True))
    defined = ~fit.fits_itself
    assert np.isnan(measures.covratio[~defined]).all()
    tolerance = LOOSER.get(name, 1e-9)
    np.testing.assert_allclose(measures.covratio[defined], r_numbers(r["covratio"])[defined], rtol=tolerance)
    compared = 0
    for term, values in r["dfbetas"].items():
        if case.term(term) in OTHER_COEFFICIENT.get(name, ()):
            continue
        expected = r_numbers(values)
        largest = np.abs(expected[defined]).max()
        assert np.isnan(ours[case.term(term)][~defined]).all()
        np.testing.assert_allclose(
            ours[case.term(term)][defined], expected[defined], rtol=tolerance, atol=tolerance * largest
        )
        compared += 1
    assert compared == fit.p - sum(term in fit.design.terms for term in OTHER_COEFFICIENT.get(name, ()))


@pytest.mark.parametrize("name", MEANINGFUL)
def test_predicted_r_squared_against_R(name):
    (r,) = r_results(name, "press")
    result = press(fit_case(name))
    if name == "syn_lev1_a":
        assert not result.applies
        return
    tolerance = LOOSER.get(name, 1e-9)
    unit = 1e9 if name == "syn_tiny_a" else 1.0  # of the response as it is re-expressed
    assert result.statistic * unit**2 == pytest.approx(as_number(r["press"]), rel=tolerance)
    assert result.details["predicted_r_squared"] == pytest.approx(as_number(r["predicted_r_squared"]), rel=tolerance)


@settings(max_examples=40, deadline=None)
@given(SEEDS, st.integers(8, 25), st.integers(1, 4), st.booleans())
def test_against_refits_without_each_row(seed, n, k, intercept):
    y, x = regression(seed, n, k)
    fit = fit_of(y, x, intercept=intercept)
    measures = row_measures(fit)
    changes = dfbetas(fit, measures)
    for i in range(n):
        keep = np.arange(n) != i
        other = fit_of(y[keep], x[keep], intercept=intercept)
        covariance = np.linalg.slogdet(other.sigma**2 * other.unscaled_covariance)[1]
        whole = np.linalg.slogdet(fit.sigma**2 * fit.unscaled_covariance)[1]
        assert measures.sigma_without[i] == pytest.approx(other.sigma, rel=1e-8)
        assert np.log(measures.covratio[i]) == pytest.approx(covariance - whole, rel=1e-6, abs=1e-8)
        expected = (fit.coefficients - other.coefficients) / (
            other.sigma * np.sqrt(np.diag(fit.unscaled_covariance))
        )
        np.testing.assert_allclose(changes[i], expected, rtol=1e-6, atol=1e-8)


@pytest.mark.parametrize("seed", range(3))
def test_against_statsmodels(seed):
    y, x = regression(seed, 40)
    fit = fit_of(y, x)
    measures = row_measures(fit)
    theirs = OLSInfluence(OLS(y, np.column_stack([np.ones(40), x])).fit())
    np.testing.assert_allclose(measures.covratio, theirs.cov_ratio, rtol=1e-9)
    np.testing.assert_allclose(dfbetas(fit, measures), theirs.dfbetas, rtol=1e-8, atol=1e-12)


def test_the_sign_is_that_of_leaving_the_row_in():
    """A last row high above the others pulls the slope up: positive, while leaving it out lowers the slope."""
    x = np.arange(10.0)
    y = x + 0.1 * (-1.0) ** np.arange(10)
    y[-1] += 3.0
    fit = fit_of(y, x[:, None])
    assert dfbetas(fit, row_measures(fit))[-1, 1] > 2
    assert coefficient_shifts(fit)[-1, 1] < -1


@settings(max_examples=40, deadline=None)
@given(SEEDS)
def test_units_do_not_matter(seed):
    y, x = regression(seed, 20)
    fit, other = fit_of(y, x), fit_of(-3e5 * y, x * [1e-6, 20.0, 7e4])
    before, after = row_measures(fit), row_measures(other)
    np.testing.assert_allclose(after.covratio, before.covratio, rtol=1e-8)
    one, two = dfbetas(fit, before), dfbetas(other, after)
    np.testing.assert_allclose(np.abs(two), np.abs(one), rtol=1e-7, atol=1e-9)


def test_a_row_without_which_the_others_fit_perfectly():
    x = np.arange(8.0)
    y = 2 * x + 1
    y[3] = 20.0
    fit = fit_of(y, x[:, None])
    measures = row_measures(fit)
    assert measures.covratio[3] == 0.0
    changes = dfbetas(fit, measures)
    assert np.isnan(changes[3]).all()
    assert np.isfinite(np.delete(changes, 3, axis=0)).all()


def test_many_coefficients_do_not_overflow():
    y, x = regression(2, 420, 200)
    measures = row_measures(fit_of(y, x))
    assert np.isfinite(measures.covratio).all()
    assert (measures.covratio > 0).all()


@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_rounding_noise_has_no_influence(name):
    fit = fit_case(name)
    measures = row_measures(fit)
    assert np.isnan(measures.covratio).all()
    assert np.isnan(dfbetas(fit, measures)).all()
    assert press(fit).reason == fit.nothing_left()


def test_one_degree_of_freedom_leaves_none_without_a_row():
    y, x = regression(3, 5)
    fit = fit_of(y, x)
    measures = row_measures(fit)
    assert fit.df == 1
    assert np.isnan(measures.covratio).all()
    assert np.isnan(dfbetas(fit, measures)).all()


@settings(max_examples=300, deadline=None)
@given(awkward_fits())
def test_awkward_rows_are_never_infinite(fit):
    if fit is None:
        return
    measures = row_measures(fit)
    assert not np.isinf(measures.covratio).any()
    assert not np.isinf(dfbetas(fit, measures)).any()
