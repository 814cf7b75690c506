"""The fit, a line a term: estimate, from, to, then the rest; and how well it describes the response."""

from __future__ import annotations

import math

import numpy as np

from sheetfuncs.checking import Check
from sheetfuncs.judgement.words import number
from sheetfuncs.report import style as looks
from sheetfuncs.report.formats import PVALUE, digits_format, estimate_format
from sheetfuncs.report.layout import COUNT, FIRST, Head, Page
from sheetfuncs.report.robust_errors import write_other_error_bars
from sheetfuncs.report.terms import term_label

_TERM = 5
_PERCENT = 100.0


def write_fit(page: Page, check: Check) -> None:
    """The section: a line a term, then the figures about the whole fit, then base levels."""
    level = f"{check.settings.level * _PERCENT:.4g} %"
    page.section(
        "fit", "The fit",
        f"From and to are the limits of a {level} interval that holds if the assumptions above do. Each coefficient "
        f"says by how much {check.settings.response} changes when its predictor grows by one and the others stay.",
    )
    _write_terms(page, check)
    if check.fit.has_error_bars:
        write_other_error_bars(page, check)
    top = page.row
    page.subheading("The fit as a whole")
    for label, value, value_format, note in _facts(check):
        page.put(FIRST, label, looks.TEXT, span=_TERM)
        page.number(FIRST + _TERM, value, value_format)
        page.put(FIRST + _TERM + 1, note, looks.QUIET_BESIDE, span=COUNT - _TERM - 1)
        page.next()
    page.kept.append((top, page.row - 1))
    for predictor, base in check.design.base_levels:
        page.put(FIRST, f"Base level of {predictor}", looks.WRAPPED, span=_TERM)
        page.put(FIRST + _TERM, f"{base}: the other levels are compared with it.", looks.WRAPPED,
                 span=COUNT - _TERM)
        page.next()


def _write_terms(page: Page, check: Check) -> None:
    fit = check.fit
    labels = ("Estimate", "From", "To", "Standard\nerror", "t", "df", "p")
    page.table_head([
        Head(FIRST, _TERM, "Term"),
        *(Head(FIRST + _TERM + i, 1, label, right=True) for i, label in enumerate(labels)),
    ])
    low, high = fit.interval(check.settings.level)
    for j in range(fit.p):
        error = float(fit.standard_errors[j])
        one_format = estimate_format(float(fit.coefficients[j]), error if fit.has_error_bars else np.nan)
        page.put(FIRST, term_label(check, j), looks.WRAPPED, span=_TERM)
        page.number(FIRST + _TERM, fit.coefficients[j], one_format, looks.NUMBER.but(bold=True))
        page.number(FIRST + _TERM + 1, low[j], one_format)
        page.number(FIRST + _TERM + 2, high[j], one_format)
        if fit.has_error_bars:
            page.number(FIRST + _TERM + 3, error, digits_format(error, 3))
            page.number(FIRST + _TERM + 4, fit.t[j], "0.00")
            page.number(FIRST + _TERM + 5, fit.df, "#,##0")
            page.number(FIRST + _TERM + 6, fit.p_values[j], PVALUE)
        page.next()
    if not fit.has_error_bars:
        page.put(FIRST, fit.nothing_left(), looks.WRAPPED, span=COUNT)
        page.next()


def _facts(check: Check) -> list[tuple[str, float, str, str]]:
    """Label, value, format and explanation of each figure about the whole fit."""
    fit = check.fit
    centred = (
        "Share of the response's variation about its mean." if check.design.intercept else
        "Share of the response's squares about zero, as there is no intercept: not comparable with a fit that has one."
    )
    facts = [
        ("Rows and coefficients", float(fit.n), "#,##0", f"{fit.p} coefficients, {fit.df:,} degrees of freedom left."),
        ("R²", fit.r_squared, "0.0000", centred),
    ]
    if not fit.has_error_bars:
        return facts
    f, (k, df), p = fit.f_test
    return [
        *facts,
        ("R², adjusted", fit.adjusted_r_squared, "0.0000", "For the number of coefficients."),
        ("R² on left-out rows", *_left_out(check)),
        ("Residual standard deviation", fit.sigma, digits_format(fit.sigma, 4),
         f"In the response's unit; the root of the residuals' squares over {fit.df:,}."),
        ("Residual mean", *_mean(check)),
        ("F", f, digits_format(f, 4),
         f"All predictors together, {k} and {df:,} degrees of freedom, {_p_text(p)}." if k else "No predictor."),
        ("AIC", fit.aic, digits_format(fit.aic, 5), "Akaike's criterion; the error variance counts as a parameter."),
        ("BIC", fit.bic, digits_format(fit.bic, 5), "Schwarz's criterion; the error variance counts as a parameter."),
    ]


def _left_out(check: Check) -> tuple[float, str, str]:
    press = check.statistic("press")
    if press.statistic is None:
        return math.nan, "0", press.reason or ""
    share = float(press.details["predicted_r_squared"])
    worse = "" if share >= 0 else " Negative: the response's mean predicts better." if check.design.intercept else (
        " Negative: zero predicts better.")
    return share, "0.0000", (
        "As R², each row predicted by the fit of all others. PRESS, the sum of their squared errors, is "
        f"{number(press.statistic, 4)}.{worse}"
    )


def _mean(check: Check) -> tuple[float, str, str]:
    mean = float(check.statistic("residual_mean").statistic or 0.0)
    return mean, digits_format(mean, 3), (
        "Zero but for rounding, whatever the data: the intercept takes up any mean." if check.design.intercept else
        f"{number(abs(mean) / check.fit.sigma, 2)} of the residual standard deviation; without an intercept the fit "
        "does not hold it at zero."
    )


def _p_text(p: float) -> str:
    return "p < 0.001" if p < 0.001 else f"p = {number(p, 2)}"
