"""What the tests found about each assumption, in sentences and plain units. Evidence only: no verdict is passed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from sheetfuncs.core.collinearity import Inflation
from sheetfuncs.core.condition import Condition, NearDependency
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.normality import all_equal, shape
from sheetfuncs.core.results import DoesNotApply, Result
from sheetfuncs.core.smooth import autocorrelations, local_line, spread_by_groups
from sheetfuncs.judgement.rows import FlaggedRow
from sheetfuncs.judgement.words import counted, listed, number, pvalue, signed, times

CLEAR, SOME = 0.01, 0.05
# An interval twice as wide as it would be with unrelated predictors is worth saying aloud; no published limit.
WIDER_LIMIT = 2.0
# Ratios that would print as "1.0 times" are said in words.
ALIKE_BELOW = 1.05
_MOST_NAMES, _LONG_NAME = 4, 24


@dataclass(frozen=True)
class Evidence:
    """One line of the first screen.

    assumption: "mean", "normality", "constant variance", "independence", "form", "collinearity" or "rows".
    question: as the analyst would ask it. strength: "clear", "some", "none", "fact" (no test) or "not tested".
    finding: what was found, with its p. test: which test and variant it rests on. size: how large, in plain units.
    bears_on: what would suffer if the assumption does not hold.
    """

    assumption: str
    question: str
    strength: str
    finding: str
    test: str
    size: str
    bears_on: str
    p: float | None = None

    @property
    def against(self) -> bool:
        return self.strength in ("clear", "some")

    @property
    def without_p(self) -> str:
        """The finding without its p, for where p stands elsewhere or not at all."""
        return self.finding if self.p is None else self.finding.replace(f", {pvalue(self.p)}", "")

    @property
    def with_test(self) -> str:
        """The finding with the test and variant that its p comes from."""
        if self.p is None:
            return self.finding
        return self.finding.replace(f", {pvalue(self.p)}", f", {pvalue(self.p)} ({self.test})")


def all_evidence(
    fit: Fit, statistics: Sequence[Result], inflation: Sequence[Inflation], flagged: Sequence[FlaggedRow],
    condition: Condition | DoesNotApply,
) -> tuple[Evidence, ...]:
    """One Evidence for each assumption, in the sheet's order. condition: of the slopes' columns."""
    return (
        _mean(fit, _find(statistics, "residual_mean")),
        _form(fit, _find(statistics, "reset", power=[2, 3])),
        _variance(fit, _find(statistics, "breusch_pagan", studentize=True)),
        _independence(fit, statistics),
        _normality(fit, statistics),
        _collinearity(fit, inflation, condition),
        _rows(fit, flagged),
    )


def _find(statistics: Sequence[Result], method: str, **args: object) -> Result:
    for result in statistics:
        if result.method == method and all(result.args.get(k) == v for k, v in args.items()):
            return result
    raise KeyError(method)


def _tested(assumption: str, against: str, result: Result) -> tuple[str, str]:
    """Strength and finding of a test."""
    if not result.applies or result.p is None:
        return "not tested", result.reason or "No test in this version."
    if result.p < CLEAR:
        return "clear", f"Clear evidence against {against}, {pvalue(result.p)}."
    if result.p < SOME:
        return "some", f"Some evidence against {against}, {pvalue(result.p)}."
    return "none", f"No evidence found against {against}, {pvalue(result.p)}; that is not proof."


def _mean(fit: Fit, result: Result) -> Evidence:
    bears_on = "With an intercept this carries no information; without one, fitted values can be biased."
    question = "Do the errors average zero?"
    if not result.applies:
        return Evidence("mean", question, "not tested", result.reason or "", "Residual mean", "", bears_on)
    if fit.design.intercept:
        return Evidence(
            "mean", question, "fact", "Zero by construction: the intercept takes up any mean.",
            "Residual mean, relative to the residuals' scale", "", bears_on,
        )
    share = abs(result.statistic or 0.0) / fit.sigma
    return Evidence(
        "mean", question, "fact", "Not fixed by the fit, since there is no intercept: read its size.",
        "Residual mean, no intercept", f"mean {number(result.statistic or 0.0)}, {number(share, 2)} of the residual "
        "standard deviation", bears_on,
    )


def _form(fit: Fit, result: Result) -> Evidence:
    strength, finding = _tested("form", "a straight-line form", result)
    places, smooth = local_line(fit.fitted, fit.residuals)
    size = ""
    if places.size and fit.has_error_bars:
        worst = int(np.argmax(np.abs(smooth)))
        size = (
            f"a smooth line through the residuals strays at most {number(abs(smooth[worst]), 2)} from zero, "
            f"{number(abs(smooth[worst]) / fit.sigma, 2)} of the residual standard deviation"
        )
    return Evidence(
        "form", "Does a straight line describe it?", strength, finding, _named("RESET", result), size,
        "A missed bend biases coefficients and every prediction, most of all outside the data.", result.p,
    )


def _variance(fit: Fit, result: Result) -> Evidence:
    strength, finding = _tested("constant variance", "constant variance", result)
    size = ""
    if fit.has_error_bars and fit.n >= 10:
        groups = 5 if fit.n >= 25 else 2
        _, spread, _ = spread_by_groups(fit.fitted, fit.residuals, groups)
        part = "fifth" if groups == 5 else "half"
        if spread[0] > 0 and spread[-1] > 0:
            ratio = spread[-1] / spread[0]
            apart = max(ratio, 1 / ratio)
            size = (
                f"typical error {number(spread[-1], 2)} in the {part} of largest fitted values, {number(spread[0], 2)} "
                "in the smallest: " + (f"{times(apart)} apart" if apart >= ALIKE_BELOW else "equally wide")
            )
    return Evidence(
        "constant variance", "Are the errors equally wide everywhere?", strength, finding,
        _named("Breusch-Pagan", result), size,
        "Error bars of coefficients and intervals for new values are too narrow in one place, too wide in another.",
        result.p,
    )


def _independence(fit: Fit, statistics: Sequence[Result]) -> Evidence:
    result, name = _find(statistics, "durbin_watson_test", alternative="two.sided"), "Durbin-Watson"
    if not result.applies:
        result, name = _find(statistics, "breusch_godfrey", order=1, type="Chisq", fill="0"), "Breusch-Godfrey"
    strength, finding = _tested("independence", "independent errors", result)
    size = ""
    durbin_watson = _find(statistics, "durbin_watson")
    if durbin_watson.applies and durbin_watson.statistic is not None and fit.n > 2:
        r1 = autocorrelations(fit.design.in_order(fit.residuals), 1)[0]
        size = f"neighbouring errors correlate {signed(r1)}; Durbin-Watson {durbin_watson.statistic:.2f} (2 is none)"
    order = "the given order" if fit.design.order is not None else "the rows' order"
    return Evidence(
        "independence", "Is each error free of the one before?", strength, finding,
        f"{_named(name, result)}, in {order}", size,
        "Positive correlation makes error bars too narrow: there is less information than rows.", result.p,
    )


def _normality(fit: Fit, statistics: Sequence[Result]) -> Evidence:
    result = _find(statistics, "shapiro_wilk")
    name = "Shapiro-Wilk"
    if not result.applies and _find(statistics, "anderson_darling").applies:
        result, name = _find(statistics, "anderson_darling"), "Anderson-Darling"
    strength, finding = _tested("normality", "normal errors", result)
    size = ""
    if fit.has_error_bars and not all_equal(fit):
        skew, kurtosis = shape(fit.residuals)
        size = (
            f"skewness {signed(skew)} (0 is symmetric), kurtosis {kurtosis:.2f} (3 is normal); "
            f"largest residual {number(float(np.abs(fit.residuals).max()) / fit.sigma, 2)} standard deviations"
        )
    return Evidence(
        "normality", "Do the errors follow a normal curve?", strength, finding, _named(name, result), size,
        "Intervals around one new value rest on it; coefficients do only with few rows.", result.p,
    )


def _collinearity(fit: Fit, inflation: Sequence[Inflation], condition: Condition | DoesNotApply) -> Evidence:
    question = "Can the predictors be told apart?"
    bears_on = "Wide intervals for the predictors concerned; predictions inside the data are not harmed."
    test = "Variance inflation factors" + (", generalized" if fit.design.has_categories else "")
    if len(inflation) < 2:
        return Evidence("collinearity", question, "fact", "One predictor: nothing to confuse it with.", test, "",
                        bears_on)
    worst = max(inflation, key=lambda i: i.vif_per_df)
    size = f"VIF {number(worst.vif)}" + (f" for {worst.df} columns" if worst.df > 1 else "")
    if isinstance(condition, Condition) and condition.near_dependencies:
        size += f"; {moving_together(condition.near_dependencies[0])}"
    wider = worst.vif_per_df
    finding = (
        f"{worst.predictor}'s interval is {times(wider)} as wide as it would be if the predictors were unrelated."
        if wider >= WIDER_LIMIT else
        f"No interval is widened much: at most {times(wider)} as wide, for {worst.predictor}."
        if wider >= ALIKE_BELOW else "The predictors are nearly unrelated: no interval is widened."
    )
    return Evidence("collinearity", question, "fact", finding, test, size, bears_on)


def moving_together(group: NearDependency) -> str:
    """"Weight and Volume move together (condition index 45)"; of many columns the first few."""
    names = [name if len(name) <= _LONG_NAME else f"{name[:_LONG_NAME - 1]}…" for name in group.terms]
    return f"{_some(names)} move together (condition index {number(group.index)})"


def _some(things: Sequence[object]) -> str:
    """All of a few, or the first of many and how many more."""
    shown = [str(thing) for thing in (things if len(things) <= _MOST_NAMES + 1 else things[:_MOST_NAMES])]
    more = len(things) - len(shown)
    return listed([*shown, f"{more} more"] if more else shown)


def _rows(fit: Fit, flagged: Sequence[FlaggedRow]) -> Evidence:
    question = "Does the answer hang on single rows?"
    bears_on = "A single wrong or foreign row can carry the result."
    test = "Leave-one-out changes, Bonferroni outlier test, leverage"
    if not fit.has_error_bars:
        return Evidence("rows", question, "not tested", fit.nothing_left(), test, "", bears_on)
    if not flagged:
        return Evidence("rows", question, "fact", "No row stands out.", test, "", bears_on)
    finding = f"{counted(len(flagged), 'row deserves', 'rows deserve')} a look: {_some([f.row for f in flagged])}."
    first = flagged[0]
    size = f"row {first.row}: {first.reason[:1].lower()}{first.reason[1:].partition(';')[0]}"
    return Evidence("rows", question, "fact", finding, test, size, bears_on)


def _named(test: str, result: Result) -> str:
    return f"{test}, {result.variant}" if result.variant else test
