"""Every test statistic against R 4.2.2 (the call stands in each result's "source") and exact mpmath results."""

from __future__ import annotations

import math

import numpy as np
import pytest
from reference_cases import NAMES, ROUNDING_NOISE, as_number, load_case
from reference_checks import same_p

from sheetfuncs.core.collinearity import variance_inflation
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.form import reset
from sheetfuncs.core.independence import breusch_godfrey, durbin_watson, durbin_watson_test
from sheetfuncs.core.influence import outlier_test
from sheetfuncs.core.mean import residual_mean
from sheetfuncs.core.normality import jarque_bera, shapiro_wilk
from sheetfuncs.core.quadratic_forms import durbin_watson_bounds
from sheetfuncs.core.variance import breusch_pagan, breusch_pagan_fitted

# "results" are R's on the original scale, where R drops a column or loses digits; these have exact results instead.
HARD = ("syn_constcol_a", "syn_nearcol_a", "syn_offset_a", "syn_tiny_a")
PLAIN = [name for name in NAMES if name not in (*ROUNDING_NOISE, *HARD)]
# Where R counts a power that the predictors already hold (Income^2 = Income2) among the degrees of freedom; ours is
# the rank. Likewise where the first row's category is empty once that row is dropped.
R_COUNTS_ALIASED_POWERS = ("publicschools",)


def all_tests(fit):
    return [
        durbin_watson(fit),
        *(
            breusch_godfrey(fit, lags, distribution=distribution, before_first=before_first)
            for lags in (1, 2, 4) for distribution in ("chi-square", "F") for before_first in ("zeros", "omitted")
        ),
        breusch_pagan(fit, studentize=True), breusch_pagan(fit, studentize=False), breusch_pagan_fitted(fit),
        shapiro_wilk(fit), jarque_bera(fit),
        *(reset(fit, powers, of=of) for powers in ((2, 3), (2,)) for of in ("fitted", "predictors")),
        outlier_test(fit),
    ]


def r_result(case, result):
    found = [
        r for r in case.results
        if r["method"] == result.method and "order_by" not in r["args"]
        and all(r["args"].get(key) == value for key, value in result.args.items())
    ]
    assert len(found) == 1, (result.method, result.args)
    return found[0]


@pytest.mark.parametrize("name", PLAIN)
def test_every_statistic_against_R(name):
    case = load_case(name)
    compared = 0
    for result in all_tests(fit_design(case.design())):
        r = r_result(case, result)
        label = f"{result.method} {dict(result.args)}"
        if not result.applies:
            assert "error" in r or not math.isfinite(as_number(r["statistic"])) or may_refuse(name, result), label
            continue
        if name in R_COUNTS_ALIASED_POWERS and result.args.get("type") == "regressor":
            assert result.df[0] == r["df"][0] - 1
            continue
        statistic = as_number(r.get("statistic", r.get("rstudent")))
        assert result.statistic == pytest.approx(statistic, rel=1e-9), label
        if "df" in r:
            assert np.atleast_1d(result.df).tolist() == np.atleast_1d(r["df"]).tolist(), label
        if "p" in r:
            same_p(result.details.get("unadjusted_p", result.p), as_number(r["p"]), label)
        compared += 1
    assert compared >= {"syn_smalln_a": 9, "syn_lev1_a": 16}.get(name, 19)


def may_refuse(name, result):
    """The one refusal of ours where R prints a figure: an auxiliary regression without degrees of freedom fits
    perfectly, so that chi-square is the number of rows, whatever the data."""
    args = result.args
    return (name, result.method, args.get("type")) == ("syn_smalln_a", "breusch_godfrey", "Chisq") and (
        (args["order"], args["fill"]) in {(1, "drop first rows"), (2, "0")}
    )


@pytest.mark.parametrize("name", [n for n in NAMES if "tests" in load_case(n).exact and n != "syn_constcol_a"])
def test_against_mpmath_at_50_digits(name):
    case = load_case(name)
    fit = fit_design(case.design())
    looser = 1e-6 if name == "syn_nearcol_a" else 1e-9
    tests = case.exact["tests"]
    if "bp_studentized" in tests:
        for key, studentize in (("bp_studentized", True), ("bp_original", False)):
            result = breusch_pagan(fit, studentize=studentize)
            assert result.statistic == pytest.approx(float(tests[key]["statistic"]), rel=looser)
            assert result.p == pytest.approx(float(tests[key]["p"]), rel=1e3 * looser)
    for key, powers in (("reset_fitted_2_3", (2, 3)), ("reset_fitted_2", (2,))):
        if key in tests:
            result = reset(fit, powers)
            assert result.statistic == pytest.approx(float(tests[key]["statistic"]), rel=looser)
            assert list(result.df) == tests[key]["df"]
    for lags in (1, 2, 4):
        exact = tests.get(f"breusch_godfrey_{lags}")
        if exact and "chi2" in exact:
            chi, f = breusch_godfrey(fit, lags), breusch_godfrey(fit, lags, distribution="F")
            if not chi.applies:
                assert fit.df <= lags
                continue
            assert chi.statistic == pytest.approx(float(exact["chi2"]), rel=looser)
            assert f.statistic == pytest.approx(float(exact["F"]), rel=looser)
            assert chi.p == pytest.approx(float(exact["p"]), rel=1e3 * looser)


@pytest.mark.parametrize("name", [n for n in NAMES if "dw_exact" in load_case(n).facts and n != "syn_constcol_a"])
def test_exact_durbin_watson_p_against_Imhof_and_mpmath(name):
    case = load_case(name)
    fit = fit_design(case.design())
    exact = case.facts["dw_exact"]
    # The reference's own statistic is off by 2e-12 on the near-collinear case, as the digits beside it show.
    tolerance = 1e-12 if name != "syn_nearcol_a" else 1e-11
    keys = {
        "positive": "p_positive_autocorr", "negative": "p_negative_autocorr", "two-sided": "two_sided",
    }
    for alternative, key in keys.items():
        result = durbin_watson_test(fit, alternative)
        assert result.statistic == pytest.approx(exact["statistic"], rel=1e-9)
        assert result.p == pytest.approx(exact[key], abs=tolerance)
    if "dw_exact_mpmath" in case.facts:
        p = float(case.facts["dw_exact_mpmath"]["p_positive_autocorr"])
        assert durbin_watson_test(fit).p == pytest.approx(p, rel=1e-12)


# All of the published bounds: test_quadratic_forms.py.
@pytest.mark.parametrize("name", [n for n in NAMES if "dw_bounds" in load_case(n).facts])
def test_durbin_watson_bounds_against_computed_ones(name):
    bounds = load_case(name).facts["dw_bounds"]
    for alpha in (0.01, 0.05):
        ours = durbin_watson_bounds(bounds["n"], bounds["k_excl_intercept"], alpha, intercept=bounds["intercept"])
        printed = bounds[f"alpha_{alpha}"]
        np.testing.assert_allclose(ours, (printed["dL"], printed["dU"]), atol=1e-8)


@pytest.mark.parametrize("name", [n for n in PLAIN if n != "syn_big_a"])
def test_variance_inflation_against_R_car_vif(name):
    case = load_case(name)
    fit = fit_design(case.design())
    r = next(result for result in case.results if result["method"] == "vif")
    printed = r.get("GVIF") or r.get("VIF") or {}
    ours = {i.predictor: i for i in variance_inflation(fit.basis, fit.design.groups)}
    if len(ours) == 1:
        assert next(iter(ours.values())).vif == 1.0
        return
    assert set(printed) == set(ours)
    for predictor, value in printed.items():
        assert ours[predictor].vif == pytest.approx(value, rel=1e-9)
        if "GVIF_1_over_2Df" in r:
            assert ours[predictor].vif_per_df == pytest.approx(r["GVIF_1_over_2Df"][predictor], rel=1e-9)


@pytest.mark.parametrize("name", ["syn_nearcol_a", "longley", "syn_offset_a", "syn_tiny_a"])
def test_variance_inflation_against_mpmath(name):
    fit = fit_design(load_case(name).design())
    exact = load_case(name).exact["vif_by_column"]
    for inflation in variance_inflation(fit.basis, fit.design.groups):
        assert inflation.vif == pytest.approx(float(exact[inflation.predictor]), rel=1e-9)


def test_variance_inflation_against_Belsley_Kuh_and_Welsch():
    """Longley: Belsley, Kuh and Welsch 1980 and later handbooks print these factors."""
    fit = fit_design(load_case("longley").design())
    ours = [i.vif for i in variance_inflation(fit.basis, fit.design.groups)]
    np.testing.assert_allclose(ours, [135.53244, 1788.51348, 33.61889, 3.58893, 399.15102, 758.9806], rtol=1e-6)


@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_nothing_is_tested_on_rounding_noise(name):
    fit = fit_design(load_case(name).design())
    for result in (*all_tests(fit), residual_mean(fit), durbin_watson_test(fit)):
        assert not result.applies
        assert result.reason == fit.nothing_left()
        assert result.cell_error == "#NUM!"


@pytest.mark.parametrize("name", [n for n in PLAIN if load_case(n).intercept])
def test_residual_mean_is_zero_relative_to_the_residuals(name):
    result = residual_mean(fit_design(load_case(name).design()))
    assert abs(result.details["mean_over_sd"]) < 1e-15


def test_residual_mean_without_intercept_against_mpmath():
    case = load_case("syn_noint_a")
    result = residual_mean(fit_design(case.design()))
    assert result.statistic == pytest.approx(float(case.exact["residual_mean"]), rel=1e-9)
    r = next(result for result in case.results if result["method"] == "residual_mean")
    assert result.details["mean_over_sd"] == pytest.approx(r["mean_over_sd"], rel=1e-9)


def test_direction_of_durbin_watson():
    """A statistic below 2 is positive correlation: the p against positive correlation is then the small one."""
    fit = fit_design(load_case("syn_ar1_a").design())
    assert durbin_watson(fit).statistic < 2
    assert durbin_watson_test(fit, "positive").p < 0.05 < durbin_watson_test(fit, "negative").p
