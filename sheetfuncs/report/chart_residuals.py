"""Charts of residuals: against fitted values (form and mean), their spread (variance), their shape (normality)."""

from __future__ import annotations

import numpy as np

from sheetfuncs.checking import Check
from sheetfuncs.core.smooth import local_line, spread_by_groups
from sheetfuncs.judgement.words import number
from sheetfuncs.report.elements import Axis
from sheetfuncs.report.normal_scores import normal_scores, pointwise_limits
from sheetfuncs.report.scales import nice_axis
from sheetfuncs.report.sketch import Line, Sketch, numbers, texts
from sheetfuncs.report.text import shortened
from sheetfuncs.report.thinning import MOST_IN_LINE, STRETCHES, points_look, shown_rows, thinning_note

_FEWEST = 5
_FIFTHS_FROM, _HALVES_FROM = 25, 10


def response_name(check: Check) -> str:
    """The response's name, short enough for a title."""
    return shortened(check.settings.response, 28)


def form_chart(check: Check) -> Sketch | None:
    """Residuals against fitted values, with a smooth line through all of them."""
    fit = check.fit
    if not fit.has_error_bars or fit.n < _FEWEST:
        return None
    name = response_name(check)
    rows = shown_rows(check)
    x, y = fit.fitted[rows], fit.residuals[rows]
    # Rows to look at stand in a series of their own alone: some hosts would draw the plain point over their mark.
    plain = ~np.isin(rows, [flag.index for flag in check.flagged])
    figures = [numbers("Fitted value", x[plain]), numbers("Residuals", y[plain])]
    lines = [Line(0, 1, points_look(rows.size))]
    if check.flagged:
        index = np.array([flag.index for flag in check.flagged])
        figures += [numbers("Fitted value", fit.fitted[index]), numbers("Rows to look at", fit.residuals[index])]
        lines.append(Line(2, 3, "flagged"))
    places, smooth = local_line(fit.fitted, fit.residuals)
    if places.size:
        figures += [numbers("Fitted value", places), numbers("Smooth line", smooth)]
        lines.append(Line(len(figures) - 2, len(figures) - 1, "smooth"))
    return Sketch(
        "scatter", f"Do the errors of {name} bend along the fitted values?",
        "A smooth line that stays near zero speaks for a straight-line form; a bow speaks for a bend that the fit "
        "misses." + thinning_note(check),
        tuple(figures), tuple(lines), nice_axis(f"Fitted {name}", x), nice_axis(f"Residual of {name}", y),
    )


def variance_chart(check: Check) -> Sketch | None:
    """Root mean square residual in groups of equal size by fitted value, beside that of all rows."""
    fit = check.fit
    if not fit.has_error_bars or fit.n < _HALVES_FROM:
        return None
    count, part = (5, "fifth") if fit.n >= _FIFTHS_FROM else (2, "half")
    rank = np.sort(fit.fitted)
    groups = np.array_split(rank, count)
    _, spread, sizes = spread_by_groups(fit.fitted, fit.residuals, count)
    labels = [f"{number(group[0])} to {number(group[-1])}" for group in groups]
    overall = float(np.sqrt(np.mean(fit.residuals**2)))
    name = response_name(check)
    plural = "fifths" if count == 5 else "halves"
    rows = f"{sizes.min():,}" if sizes.min() == sizes.max() else f"{sizes.min():,} or {sizes.max():,}"
    return Sketch(
        "columns", f"Are the errors of {name} equally wide throughout?",
        f"The rows in {plural} by fitted value, {rows} rows each. A column's height is the root mean square residual "
        f"of its {part}; equal heights speak for constant variance.",
        (texts(f"Fitted {name}", labels), numbers("Typical error", spread),
         numbers("Typical error of all rows", np.full(count, overall))),
        (Line(0, 1, "columns"), Line(0, 2, "limit")),
        Axis(f"Fitted {name}, from smallest to largest {part}", text=True),
        nice_axis(f"Typical error of {name}", [*spread, overall], zero=True),
    )


def normality_chart(check: Check) -> Sketch | None:
    """Standardized residuals against normal scores, with the line of a normal curve and pointwise limits."""
    fit = check.fit
    if not fit.has_error_bars or fit.n < _FEWEST:
        return None
    standardized = check.by_row.internally_studentized
    values = np.sort(standardized[np.isfinite(standardized)])
    if values.size < _FEWEST:
        return None
    note = ""
    if values.size > MOST_IN_LINE:
        keep = np.unique(np.linspace(0, values.size - 1, STRETCHES).round().astype(int))
        # The tails are what the chart is for: the outermost hundred at both ends are all kept.
        keep = np.union1d(keep, np.r_[:100, values.size - 100:values.size])
        note = f" Shown: {keep.size:,} of {values.size:,} rows, evenly by rank, and the outermost hundred at both ends."
    else:
        keep = np.arange(values.size)
    scores = normal_scores(values.size, keep)
    line = np.linspace(scores[0], scores[-1], 41)
    low, high = pointwise_limits(line, values.size)
    name = response_name(check)
    return Sketch(
        "scatter", f"Do the errors of {name} follow a normal curve?",
        "Points along the line speak for a normal curve. Dashed: pointwise 95 % limits, normal score ± 1.96 times the "
        "standard error of an order statistic; with many points some leave them by chance." + note,
        (numbers("Normal score", scores), numbers("Residuals", values[keep]),
         numbers("Normal score", line), numbers("Normal curve", line),
         numbers("Pointwise limits", low), numbers("Upper limit", high)),
        (Line(0, 1, points_look(keep.size)), Line(2, 3, "line"), Line(2, 4, "limit"), Line(2, 5, "limit")),
        nice_axis("Normal score", line), nice_axis("Residual, in standard deviations", [*values, *low, *high]),
    )
