"""The same figures by other routes: longer fits, textbook formulas, scipy and statsmodels where those are right."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
import scipy.stats
import statsmodels.api as sm
from hypothesis import given, settings
from hypothesis import strategies as st
from properties_designs import SEEDS, fitted, numeric, regular, with_category
from statsmodels.stats.diagnostic import acorr_breusch_godfrey, het_breuschpagan
from statsmodels.stats.outliers_influence import OLSInfluence, variance_inflation_factor
from statsmodels.stats.stattools import durbin_watson as statsmodels_durbin_watson

from sheetfuncs.core.collinearity import variance_inflation
from sheetfuncs.core.design import Category, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.form import reset
from sheetfuncs.core.independence import breusch_godfrey, durbin_watson
from sheetfuncs.core.influence import row_measures
from sheetfuncs.core.normality import jarque_bera, normal_scores, shapiro_wilk, shapiro_wilk_of
from sheetfuncs.core.variance import breusch_pagan

few = settings(max_examples=40)
both = pytest.mark.parametrize("intercept", [True, False])


@few
@given(data=regular())
def test_against_statsmodels_OLS_and_its_tests(data):
    y, x = data
    fit, other = fitted(y, x), sm.OLS(y, sm.add_constant(x)).fit()
    np.testing.assert_allclose(fit.coefficients, other.params, rtol=1e-8, atol=1e-10)
    np.testing.assert_allclose(fit.p_values, other.pvalues, rtol=1e-7, atol=1e-14)
    np.testing.assert_allclose(np.transpose(fit.interval(0.9)), other.conf_int(alpha=0.1), rtol=1e-8, atol=1e-10)
    assert fit.aic == pytest.approx(other.aic + 2, rel=1e-10)  # sigma counts as a parameter here
    assert fit.bic == pytest.approx(other.bic + np.log(fit.n), rel=1e-10)
    assert durbin_watson(fit).statistic == pytest.approx(statsmodels_durbin_watson(other.resid), rel=1e-9)
    for studentize in (True, False):
        ours, theirs = breusch_pagan(fit, studentize=studentize), het_breuschpagan(
            other.resid, other.model.exog, robust=studentize
        )
        np.testing.assert_allclose((ours.statistic, ours.p), theirs[:2], rtol=1e-7)
    for lags in (1, 3):
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", FutureWarning)  # announces another shape of the result
            theirs = acorr_breusch_godfrey(other, nlags=lags)
        chi, f = breusch_godfrey(fit, lags), breusch_godfrey(fit, lags, distribution="F")
        np.testing.assert_allclose((chi.statistic, chi.p, f.statistic, f.p), theirs, rtol=1e-7)
    rows, theirs = row_measures(fit), OLSInfluence(other)
    np.testing.assert_allclose(rows.externally_studentized, theirs.resid_studentized_external, rtol=1e-7, atol=1e-10)
    np.testing.assert_allclose(rows.cooks_distance, theirs.cooks_distance[0], rtol=1e-7, atol=1e-12)
    np.testing.assert_allclose(rows.dffits, theirs.dffits[0], rtol=1e-7, atol=1e-10)


@both
@few
@given(data=regular())
def test_reset_is_the_F_of_a_longer_fit(intercept, data):
    y, x = data
    fit = fitted(y, x, intercept=intercept)
    for of, base in (("fitted", fit.fitted[:, None]), ("predictors", x)):
        if fit.df <= 2 * base.shape[1]:
            continue
        longer = fitted(y, np.column_stack([x, base**2, base**3]), intercept=intercept)
        df = fit.df - longer.df
        ours = reset(fit, of=of)
        assert ours.df == (df, longer.df)
        assert ours.statistic == pytest.approx((fit.rss - longer.rss) / df / (longer.rss / longer.df), rel=1e-5)
        assert ours.p == pytest.approx(scipy.stats.f.sf(ours.statistic, *ours.df), rel=1e-9)


@both
@few
@given(data=regular(fewest=16), lags=st.integers(1, 4))
def test_breusch_godfrey_is_the_F_of_a_longer_fit(intercept, data, lags):
    """Also without an intercept, where the auxiliary regression has none either, and with the first rows omitted."""
    y, x = data
    fit = fitted(y, x, intercept=intercept)
    e = fit.residuals
    lagged = np.column_stack([np.concatenate([np.zeros(lag), e[:-lag]]) for lag in range(1, lags + 1)])
    for before_first, first in (("zeros", 0), ("omitted", lags)):
        longer = fitted(e[first:], np.column_stack([x, lagged])[first:], intercept=intercept)
        chi = breusch_godfrey(fit, lags, before_first=before_first)
        f = breusch_godfrey(fit, lags, before_first=before_first, distribution="F")
        total = float(e[first:] @ e[first:])
        assert chi.statistic == pytest.approx((fit.n - first) * (1 - longer.rss / total), rel=1e-7, abs=1e-9)
        assert chi.p == pytest.approx(scipy.stats.chi2.sf(chi.statistic, lags), rel=1e-9)
        # lmtest's F too counts all that design and lags explain of the residuals that are kept.
        assert f.df == (lags, longer.df)
        assert f.statistic == pytest.approx((total - longer.rss) / lags / (longer.rss / longer.df), rel=1e-7, abs=1e-9)


@few
@given(data=regular(), centred=st.booleans())
def test_variance_inflation_by_auxiliary_regressions(data, centred):
    _, x = data
    fit = fitted(np.arange(float(len(x))) ** 2, x, intercept=centred)
    ours = [i.vif for i in variance_inflation(fit.basis, fit.design.groups)]
    if x.shape[1] == 1:
        assert ours == [1.0]
        return
    for j, factor in enumerate(ours):
        auxiliary = fitted(x[:, j], np.delete(x, j, axis=1), intercept=centred)
        assert factor == pytest.approx(1 / (1 - auxiliary.r_squared), rel=1e-9)
        if centred:  # without a constant statsmodels measures another thing than R's car and we do
            assert factor == pytest.approx(variance_inflation_factor(sm.add_constant(x), j + 1), rel=1e-8)


@few
@given(data=with_category())
def test_generalized_variance_inflation_by_determinants(data):
    """Fox and Monette 1992: det(R11) det(R22) / det(R), R the correlations of the columns."""
    y, x, codes = data
    design = build_design(y, [*numeric(x), Category("site", ("a", "b", "c"), codes)])
    fit = fit_design(design)
    r = np.corrcoef(design.columns, rowvar=False)
    expected = np.linalg.det(r[1:, 1:]) / np.linalg.det(r)
    for inflation in variance_inflation(fit.basis, design.groups):  # with two predictors both have the same
        assert inflation.vif == pytest.approx(expected, rel=1e-9)


@settings(max_examples=60)
@given(seed=SEEDS, n=st.integers(3, 300) | st.sampled_from([3, 4, 5, 6, 11, 12, 5000]), sort=st.integers(0, 3))
def test_normality_against_scipy(seed, n, sort):
    random = np.random.default_rng(seed)
    values = [random.normal, random.exponential, lambda size: random.standard_t(3, size), random.random][sort](size=n)
    statistic, p = scipy.stats.shapiro(values)
    ours = shapiro_wilk_of(values)
    # scipy keeps the normal quantiles of the published Fortran, which are good to single precision.
    assert ours[0] == pytest.approx(statistic, abs=2e-7)
    assert ours[1] == pytest.approx(p, rel=1e-4, abs=1e-12)
    far = shapiro_wilk_of(values * -1e9 + 1e12)
    assert far[0] == pytest.approx(ours[0], abs=1e-6)


@few
@given(data=regular())
def test_normality_of_residuals_against_scipy(data):
    fit = fitted(*data)
    statistic, p = scipy.stats.jarque_bera(fit.residuals)
    ours = jarque_bera(fit)
    assert (ours.statistic, ours.p) == pytest.approx((statistic, p), rel=1e-9)
    assert shapiro_wilk(fit).statistic == pytest.approx(scipy.stats.shapiro(fit.residuals)[0], abs=2e-7)


@given(values=st.lists(st.integers(-20, 20), min_size=1, max_size=40).map(lambda v: np.array(v, float)))
def test_normal_scores_are_Blom_s(values):
    ranks = scipy.stats.rankdata(values)
    expected = scipy.stats.norm.ppf((ranks - 3 / 8) / (len(values) + 1 / 4))
    np.testing.assert_allclose(normal_scores(values), expected, rtol=1e-12, atol=1e-14)
