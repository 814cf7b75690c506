"""Coefficients and their error bars against exact results (mpmath, 50 digits), R 4.2.2 lm, and NIST StRD."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest
from reference_cases import FOLDER, NAMES, ROUNDING_NOISE, as_number, load_case

from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.influence import row_measures
from sheetfuncs.errors import CollinearPredictorsError

# Cases whose conditioning would cost plain doubles their digits (see the case's "hard") are refined, and come out
# better than the ordinary ones.
TIGHTER = {"syn_nearcol_a": 1e-15, "longley": 1e-15}
EXACT = [name for name in NAMES if load_case(name).exact and name != "syn_constcol_a"]


def fit_case(name, predictors=None):
    return fit_design(load_case(name).design(predictors))


@pytest.mark.parametrize("name", EXACT)
def test_coefficients_against_mpmath(name):
    case, fit = load_case(name), fit_case(name)
    ours = dict(zip(fit.design.terms, fit.coefficients, strict=True))
    for term, value in case.exact["coefficients"].items():
        scale = np.abs(case.numbers(case.response)).max() if abs(float(value)) < 1e-30 else 0.0
        assert ours[case.term(term)] == pytest.approx(float(value), rel=TIGHTER.get(name, 3e-14), abs=1e-13 * scale)


@pytest.mark.parametrize("name", [n for n in EXACT if n not in ROUNDING_NOISE])
def test_error_bars_residuals_and_rows_against_mpmath(name):
    exact, fit = load_case(name).exact, fit_case(name)
    tolerance = TIGHTER.get(name, 3e-14)
    np.testing.assert_allclose(
        fit.standard_errors, [float(v) for v in exact["std_errors"].values()], rtol=tolerance
    )
    assert fit.rss == pytest.approx(float(exact["rss"]), rel=tolerance)
    assert fit.r_squared == pytest.approx(float(exact["r_squared"]), rel=1e-12)
    if "residuals" not in exact:
        return
    rows = row_measures(fit)
    np.testing.assert_allclose(fit.residuals, np.array(exact["residuals"], float), atol=10 * tolerance * fit.sigma)
    ours = {
        "leverage": rows.leverage, "rstandard": rows.internally_studentized,
        "rstudent": rows.externally_studentized, "cooks_distance": rows.cooks_distance, "dffits": rows.dffits,
    }
    for key, values in ours.items():
        expected = np.array([np.nan if str(v).startswith("undefined") else float(v) for v in exact[key]])
        np.testing.assert_allclose(values, expected, rtol=100 * tolerance, atol=1e-11, err_msg=key)
    if str(exact["press"]).startswith("undefined"):
        assert np.isnan(rows.press)
    else:
        assert rows.press == pytest.approx(float(exact["press"]), rel=10 * tolerance)


@pytest.mark.parametrize("name", [n for n in NAMES if not load_case(n).facts.get("r_results_warning")])
def test_summary_figures_against_R_lm(name):
    """R: s <- summary(m <- lm(formula)); coef(s), confint(m), s$sigma, s$r.squared, s$fstatistic, AIC(m), BIC(m)"""
    case, fit = load_case(name), fit_case(name)
    r = next(result for result in case.results if result["method"] == "ols")
    low, high = fit.interval()
    for key, values in (("t", fit.t), ("ci95_low", low), ("ci95_high", high)):
        np.testing.assert_allclose(values, list(r[key].values()), rtol=1e-9, atol=1e-12, err_msg=key)
    np.testing.assert_allclose(fit.p_values, list(r["p_values"].values()), rtol=1e-7)
    assert (fit.n, fit.p, fit.df) == (r["n"], r["p"], r["df_resid"])
    statistic, df, p = fit.f_test
    assert list(df) == r["f_statistic"]["df"]
    assert p == pytest.approx(r["f_statistic"]["p"], rel=1e-7)
    figures = {
        "sigma": fit.sigma, "tss": fit.tss, "adj_r_squared": fit.adjusted_r_squared, "loglik": fit.log_likelihood,
        "aic": fit.aic, "bic": fit.bic,
    }
    for key, value in {**figures, "f": statistic}.items():
        expected = r["f_statistic"]["statistic"] if key == "f" else r[key]
        assert value == pytest.approx(expected, rel=1e-9), key


def test_a_constant_column_beside_an_intercept_is_refused_by_name():
    with pytest.raises(CollinearPredictorsError, match="x2") as refusal:
        fit_case("syn_constcol_a")
    assert refusal.value.predictors == ("x2",)
    exact = load_case("syn_constcol_a").exact
    fit = fit_case("syn_constcol_a", ("x1",))
    np.testing.assert_allclose(fit.coefficients, np.array(list(exact["coefficients"].values()), float), rtol=1e-13)


@pytest.mark.parametrize(("name", "perfect", "df"), [("syn_perfect_a", True, 9), ("syn_saturated_a", False, 0)])
def test_rounding_noise_is_not_reported_as_error_bars(name, perfect, df):
    fit = fit_case(name)
    assert (fit.perfect, fit.df, fit.has_error_bars) == (perfect, df, False)
    assert not fit.residuals.any()
    assert np.isnan(fit.p_values).all()
    assert fit.nothing_left()


# Digits (-log10 of the largest relative error). The exact solution of the data as doubles itself agrees with the
# certified values to 7.6 digits on Filip, whose powers are rounded, 13.2 on Wampler2, 13.5 on Pontius, and 14 or more
# on the others.
NIST_DIGITS = {
    "Norris": 14, "Pontius": 13.4, "NoInt1": 14, "NoInt2": 14, "Filip": 7.5, "Longley": 14, "Wampler1": 14,
    "Wampler2": 13, "Wampler3": 14, "Wampler4": 14, "Wampler5": 14,
}
# Standard errors: 13.9 on Norris, 13.8 on Pontius.
NIST_ERROR_DIGITS = {**NIST_DIGITS, "Norris": 13.8}


def nist_set(name):
    facts = json.loads((FOLDER / "nist" / "certified.json").read_text())["linear_regression"][name]
    with open(FOLDER / "nist" / f"{name}.csv", newline="") as file:
        header, *rows = csv.reader(file)
    values = np.array(rows, float)
    if facts["model"].startswith("polynomial"):
        degree = int(facts["model"].split()[2].rstrip(","))
        predictors = [Numeric(f"x^{power}", values[:, 1] ** power) for power in range(1, degree + 1)]
    else:
        predictors = [Numeric(name, values[:, j]) for j, name in enumerate(header) if j]
    return facts, fit_design(build_design(values[:, 0], predictors, intercept=facts["intercept"]))


@pytest.mark.parametrize("name", NIST_DIGITS)
def test_against_NIST_certified_values(name):
    facts, fit = nist_set(name)
    digits = NIST_DIGITS[name]
    certified = np.array([as_number(v) for v in facts["coefficients"].values()])
    assert digits_right(fit.coefficients, certified) >= digits
    errors = np.array([as_number(v) for v in facts["std_errors"].values()])
    if errors.any():
        assert digits_right(fit.standard_errors, errors) >= NIST_ERROR_DIGITS[name]
        assert digits_right(fit.sigma, as_number(facts["residual_sd"])) >= NIST_ERROR_DIGITS[name]
    else:  # certified to be a perfect fit
        assert fit.perfect
        assert np.abs(fit.standard_errors).max() <= 1e-13 * fit.design.response.std()
        assert np.abs(fit.residuals).max() <= 1e-13 * fit.design.response.std()
    assert digits_right(fit.r_squared, as_number(facts["r_squared"])) >= min(digits, 13.5)


def digits_right(ours, certified):
    with np.errstate(divide="ignore"):
        return float(np.min(-np.log10(np.maximum(np.abs(ours / np.asarray(certified) - 1.0), 1e-16))))


def test_fit_against_published_figures():
    """Stack loss: Brownlee 1965, p. 454 (from memory); Gesell: Mickey, Dunn and Clark 1967 (from memory)."""
    fit = fit_case("stackloss")
    np.testing.assert_allclose(fit.coefficients, [-39.9196744, 0.7156402, 1.2952861, -0.1521225], atol=5e-7)
    assert fit.sigma == pytest.approx(3.24336392, abs=5e-8)
    fit = fit_case("gesell")
    rows = row_measures(fit)
    np.testing.assert_allclose(fit.coefficients, [109.8738406, -1.1269889], atol=5e-8)
    assert rows.externally_studentized[18] == pytest.approx(3.60697972, abs=5e-9)
    assert rows.leverage[17] == pytest.approx(0.65160998, abs=5e-9)
    assert rows.cooks_distance[17] == pytest.approx(0.67811203, abs=5e-8)
