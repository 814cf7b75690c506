"""Charts of single rows (how far each moves a coefficient) and of collinearity (how much wider each interval is)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from sheetfuncs.checking import Check
from sheetfuncs.core.shifts import coefficient_shifts
from sheetfuncs.judgement.words import counted, listed
from sheetfuncs.report.elements import Axis
from sheetfuncs.report.scales import nice_axis
from sheetfuncs.report.separation import moving_together
from sheetfuncs.report.sketch import Line, Sketch, counts, numbers, texts
from sheetfuncs.report.text import shortened
from sheetfuncs.report.thinning import points_look, shown_rows, thinning_note

_FEWEST = 5
_MOST_COLUMNS = 250
_MOST_LABELS = 6
MOST_BARS = 8


def watched_term(check: Check) -> int:
    """The coefficient that the chart of rows follows: the first predictor's first, as the analyst put it first."""
    return int(check.design.intercept and check.design.columns.shape[1] > 0)


def rows_chart(check: Check) -> Sketch | None:
    """How far the watched coefficient moves when each row is left out, in its standard errors."""
    fit = check.fit
    if not fit.has_error_bars or fit.n < _FEWEST:
        return None
    j = watched_term(check)
    shifts = coefficient_shifts(fit)[:, j]
    rows = shown_rows(check)
    rows = rows[np.isfinite(shifts[rows])]
    if not rows.size:
        return None
    flagged = {flag.index for flag in check.flagged}
    plain = np.array([i for i in rows if i not in flagged], dtype=int)
    marked = np.array([i for i in rows if i in flagged], dtype=int)
    term = shortened(check.design.terms[j], 32)
    alone = fit.n - int(np.isfinite(shifts).sum())
    note = f" {counted(alone, 'row')} that alone determines its fitted value is not shown." if alone == 1 else (
        f" {alone} rows that alone determine their fitted values are not shown." if alone else "")
    axis = nice_axis("Move, in standard errors", shifts[rows], zero=True)
    common = (
        f"How far does each row move the coefficient of {term}?",
        f"The change of the coefficient of {term}, the first predictor, when a row is left out. One standard error is "
        "as much as chance alone moves it." + note + thinning_note(check),
    )
    numbers_of = check.design.rows
    farthest = set(marked[np.argsort(-np.abs(shifts[marked]), kind="stable")[:_MOST_LABELS]])

    def labels(of: np.ndarray) -> tuple[str, ...]:
        return tuple(str(numbers_of[i]) if i in farthest else "" for i in of)

    if rows.size <= _MOST_COLUMNS:
        return Sketch(
            "columns", *common,
            (texts("Worksheet row", [str(row) for row in numbers_of[rows]]),
             numbers("Rows", [np.nan if i in flagged else shifts[i] for i in rows]),
             numbers("Rows to look at", [shifts[i] if i in flagged else np.nan for i in rows])),
            (Line(0, 1, "columns"), *((Line(0, 2, "flagged columns", labels(rows)),) if marked.size else ())),
            Axis("Worksheet row", text=True), axis,
        )
    return Sketch(
        "scatter", *common,
        (counts("Worksheet row", numbers_of[plain]), numbers("Rows", shifts[plain]),
         counts("Worksheet row", numbers_of[marked]), numbers("Rows to look at", shifts[marked])),
        (Line(0, 1, points_look(plain.size)), *((Line(2, 3, "flagged", labels(marked)),) if marked.size else ())),
        nice_axis("Worksheet row", numbers_of[rows]), axis,
    )


def separation_chart(check: Check) -> Sketch | None:
    """How much wider each predictor's interval is than it would be if the predictors were unrelated."""
    if len(check.inflation) < 2:
        return None
    widest = sorted(check.inflation, key=lambda i: -i.vif_per_df)[:MOST_BARS]
    more = len(check.inflation) - len(widest)
    left_out = f" Shown: the {MOST_BARS} widest of {len(check.inflation)} predictors." if more else ""
    widest.reverse()  # bars are drawn from the bottom up
    values = [i.vif_per_df for i in widest]
    partners = moving_together(check)
    return Sketch(
        "bars", "How much wider is each interval than with unrelated predictors?",
        "1 means not at all; beside a predictor stand those it moves with. The square root of the variance inflation "
        "factor; for a category of several levels, per degree of freedom." + left_out,
        (texts("Predictor", [_with_partners(i.predictor, partners) for i in widest]), numbers("Times as wide", values)),
        (Line(0, 1, "columns"),),
        Axis("", text=True, every_label=True), nice_axis("Times as wide", values, zero=True),
    )


def _with_partners(name: str, partners: Mapping[str, Sequence[str]]) -> str:
    """"Weight, with Volume": the predictor and those that it moves with."""
    named = [shortened(partner, 20) for partner in partners.get(name, [])[:2]]
    return shortened(name, 28) + (f", with {listed(named)}" if named else "")
