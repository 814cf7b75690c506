"""Where programs differ, each choice of ours beside the figure that the other convention gives on the same data.

tests/reference/CONVENTIONS.md lists the differences, with the figures of R 4.2.2 and statsmodels 0.15.0. Every test
here fails if we slip into the other convention.
"""

from __future__ import annotations

import numpy as np
import pytest
from reference_cases import load_case
from scipy.special import chdtrc, fdtrc, stdtr

from sheetfuncs.core.collinearity import variance_inflation
from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.form import reset
from sheetfuncs.core.independence import breusch_godfrey, durbin_watson
from sheetfuncs.core.influence import outlier_test, row_measures
from sheetfuncs.core.mean import residual_mean
from sheetfuncs.core.normality import jarque_bera
from sheetfuncs.core.variance import breusch_pagan


@pytest.fixture(scope="module")
def fits():
    names = ("longley", "publicschools", "prestige", "stackloss", "gesell", "syn_noint_a", "hartnagel")
    return {name: fit_design(load_case(name).design()) for name in names}


def test_reset_on_Longley_takes_centred_powers(fits):
    """Raw powers with a pseudo-inverse give 6.95."""
    assert reset(fits["longley"]).statistic == pytest.approx(2.2727103129, rel=1e-9)


def test_reset_counts_the_rank_that_powers_add(fits):
    """Income^2 already stands among the predictors: R counts it among the degrees of freedom all the same."""
    case = load_case("publicschools")
    for powers, r_powers in (((2, 3), [2, 3]), ((2,), 2)):
        r = next(
            result for result in case.results
            if result["method"] == "reset" and result["args"] == {"power": r_powers, "type": "regressor"}
        )
        ours = reset(fits["publicschools"], powers, of="predictors")
        (numerator, denominator), (r_numerator, r_denominator) = ours.df, r["df"]
        assert (numerator, denominator) == (r_numerator - 1, r_denominator + 1)
        explained = r["statistic"] * r_numerator / r_denominator  # both explain the same
        assert ours.statistic == pytest.approx(explained * denominator / numerator, rel=1e-9)
        assert ours.p == pytest.approx(fdtrc(numerator, denominator, ours.statistic), rel=1e-12)


def test_breusch_godfrey_without_intercept_has_no_constant_either(fits):
    """With a constant in the auxiliary regression (statsmodels) the statistic is .8347 on this case."""
    assert breusch_godfrey(fits["syn_noint_a"]).statistic == pytest.approx(0.8221, abs=5e-5)


def test_breusch_godfrey_F_counts_coefficients_and_lags(fits):
    fit = fits["hartnagel"]
    result = breusch_godfrey(fit, 2, distribution="F")
    assert result.df == (2, fit.n - fit.p - 2)
    swapped = fdtrc(*result.df[::-1], result.statistic)
    assert abs(swapped - result.p) > 100 * 1e-7 * result.p


def test_breusch_godfrey_pads_with_zeros_unless_asked(fits):
    zeros = breusch_godfrey(fits["hartnagel"])
    assert zeros.args["fill"] == "0"
    assert zeros.statistic != pytest.approx(
        breusch_godfrey(fits["hartnagel"], before_first="omitted").statistic, rel=1e-4
    )


def test_breusch_pagan_is_studentized_on_all_predictors_unless_asked(fits):
    fit = fits["publicschools"]
    results = {r["args"]["studentize"]: r for r in load_case("publicschools").results
               if r["method"] == "breusch_pagan" and r["args"]["z"] == "all regressors"}
    assert results[True]["statistic"] != pytest.approx(results[False]["statistic"], rel=0.1)
    assert breusch_pagan(fit).statistic == pytest.approx(results[True]["statistic"], rel=1e-9)
    on_fitted = next(r for r in load_case("publicschools").results if r["method"] == "ncv_test_fitted")
    assert breusch_pagan(fit, studentize=False).statistic != pytest.approx(on_fitted["statistic"], rel=1e-3)


def test_breusch_pagan_without_intercept_has_no_constant_and_one_df_less(fits):
    r = next(result for result in load_case("syn_noint_a").results if result["method"] == "breusch_pagan")
    ours = breusch_pagan(fits["syn_noint_a"], studentize=r["args"]["studentize"])
    assert (ours.statistic, ours.df) == (pytest.approx(r["statistic"], rel=1e-9), 1)
    assert "without a constant" in ours.note


def test_jarque_bera_takes_moments_with_divisor_n(fits):
    """Divisor n - 1 changes the figure by more than one per cent here."""
    fit = fits["gesell"]
    e = fit.residuals - fit.residuals.mean()
    spread = np.std(e, ddof=1)
    other = fit.n / 6 * (np.mean(e**3) ** 2 / spread**6 + (np.mean(e**4) / spread**4 - 3) ** 2 / 4)
    assert jarque_bera(fit).statistic != pytest.approx(other, rel=0.01)


def test_variance_inflation_without_intercept_is_about_zero(fits):
    """R's car: 3.258; about the means it would be 1.0033."""
    fit = fits["syn_noint_a"]
    ours = [i.vif for i in variance_inflation(fit.basis, fit.design.groups)]
    assert ours == pytest.approx([3.258, 3.258], abs=5e-4)


def test_categories_have_one_generalized_factor(fits):
    """A factor for each 0/1 column depends on which level is the base."""
    fit = fits["prestige"]
    ours = {i.predictor: i for i in variance_inflation(fit.basis, fit.design.groups)}
    assert (ours["type"].df, set(ours)) == (2, {"income", "education", "type"})


def test_information_criteria_count_sigma(fits):
    """Without sigma among the parameters AIC is 2 and BIC log n less."""
    fit = fits["stackloss"]
    r = next(result for result in load_case("stackloss").results if result["method"] == "ols")
    assert (fit.aic, fit.bic) == (pytest.approx(r["aic"], rel=1e-12), pytest.approx(r["bic"], rel=1e-12))
    assert fit.aic + 2 * fit.log_likelihood == pytest.approx(2 * (fit.p + 1), rel=1e-12)


def test_r_squared_without_intercept_is_about_zero(fits):
    fit = fits["syn_noint_a"]
    y = fit.design.response
    assert fit.tss == pytest.approx(float(y @ y), rel=1e-14)
    assert fit.r_squared > 1 - fit.rss / float(np.sum((y - y.mean()) ** 2)) + 0.01


def test_outlier_test_has_one_degree_of_freedom_less_and_multiplies_p(fits):
    """Gesell: row 19 (Mickey, Dunn and Clark 1967, from memory)."""
    fit = fits["gesell"]
    result = outlier_test(fit)
    assert (result.details["row_of_used"], result.df) == (19, fit.n - fit.p - 1)
    assert result.statistic == pytest.approx(3.60697972, abs=5e-9)
    single = 2 * stdtr(result.df, -result.statistic)
    assert result.details["unadjusted_p"] == pytest.approx(single, rel=1e-12)
    assert result.p == result.details["bonferroni_p"] == pytest.approx(21 * single, rel=1e-12)
    assert row_measures(fit).internally_studentized[18] < 3


@pytest.mark.parametrize(("name", "published"), [("longley", 2.5594877), ("hartnagel", 0.6168635551),
                                                 ("stackloss", 1.48513103)])
def test_durbin_watson_against_published_figures(fits, name, published):
    """Longley: tests/reference/published; Hartnagel: Fox 2016, ch. 16, and stack loss: both from memory there."""
    result = durbin_watson(fits[name])
    assert result.statistic == pytest.approx(published, abs=6e-8)
    assert "below 2" in result.note
    assert result.note.index("below 2") < result.note.index("positive") < result.note.index("above 2")


def test_durbin_watson_is_not_two_minus_twice_the_autocorrelation(fits):
    """The gap is (e_1^2 + e_n^2) / rss, .35 on stack loss."""
    fit = fits["stackloss"]
    e = fit.residuals
    approximation = 2 * (1 - e[1:] @ e[:-1] / fit.rss)
    gap = (e[0] ** 2 + e[-1] ** 2) / fit.rss
    assert durbin_watson(fit).statistic == pytest.approx(approximation - gap, rel=1e-12)
    assert gap > 0.3


def test_residual_mean_is_judged_relative_to_the_residuals():
    """Data at 1e-9 and at 1e9: an absolute limit would call the one zero and the other not."""
    random = np.random.default_rng(3)
    x, noise = random.normal(size=40), random.normal(size=40)
    for unit in (1e-9, 1.0, 1e9):
        fit = fit_design(build_design((1 + x + noise) * unit, [Numeric("x", x)]))
        assert abs(residual_mean(fit).details["mean_over_sd"]) < 1e-15
        assert "no information" in residual_mean(fit).note


def test_tails_are_not_one_minus_a_cdf():
    """Strong evidence keeps its digits: p far below 1e-16, against mpmath at 50 digits."""
    mpmath = pytest.importorskip("mpmath")
    with mpmath.workdps(50):
        chi = mpmath.gammainc(mpmath.mpf(3) / 2, mpmath.mpf(300), regularized=True)
        x = mpmath.mpf(40) / (40 + mpmath.mpf(2) * 500)
        f = mpmath.betainc(20, 1, 0, x, regularized=True)
        t = mpmath.betainc(15, mpmath.mpf(1) / 2, 0, mpmath.mpf(30) / (30 + 40**2), regularized=True) / 2
    assert chdtrc(3, 600.0) == pytest.approx(float(chi), rel=1e-10)
    assert fdtrc(2, 40, 500.0) == pytest.approx(float(f), rel=1e-10)
    assert stdtr(30, -40.0) == pytest.approx(float(t), rel=1e-10)
    x = np.linspace(0, 1, 200)
    fit = fit_design(build_design(np.exp(3 * x) + 1e-3 * np.sin(99 * x), [Numeric("x", x)]))
    for result in (reset(fit), breusch_godfrey(fit), breusch_godfrey(fit, distribution="F")):
        assert 0 < result.p < 1e-30


def test_body_fat_variance_inflation_against_a_textbook():
    """Kutner, Nachtsheim, Neter and Li, Applied Linear Statistical Models, table 7.1 (data typed from memory):
    708.84, 564.34 and 104.61 (from memory)."""
    from reference_cases import FOLDER

    rows = np.genfromtxt(FOLDER / "published" / "bodyfat.csv", delimiter=",", names=True)
    predictors = [Numeric(name, rows[name]) for name in ("triceps", "thigh", "midarm")]
    fit = fit_design(build_design(rows["bodyfat"], predictors))
    ours = [i.vif for i in variance_inflation(fit.basis, fit.design.groups)]
    np.testing.assert_allclose(ours, [708.842914, 564.343386, 104.606005], rtol=1e-8)
    np.testing.assert_allclose(ours, [708.84, 564.34, 104.61], atol=0.005)
