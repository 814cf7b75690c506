"""Charts of independence: residuals in time order, and how much each resembles those before it."""

from __future__ import annotations

import numpy as np

from sheetfuncs.checking import Check
from sheetfuncs.core.smooth import autocorrelations
from sheetfuncs.report.chart_residuals import response_name
from sheetfuncs.report.elements import Axis
from sheetfuncs.report.scales import nice_axis
from sheetfuncs.report.sketch import Line, Sketch, counts, numbers, texts
from sheetfuncs.report.text import shortened
from sheetfuncs.report.thinning import MOST_IN_LINE, STRETCHES, stretch_means

_FEWEST = 8
_MOST_LAGS = 12
_STEPS = (0.02, 0.05, 0.1, 0.25)
_MOST_MARKED = 250


def order_chart(check: Check) -> Sketch | None:
    """Residuals in time order; with very many rows means of neighbouring ones."""
    fit = check.fit
    if not fit.has_error_bars or fit.n < _FEWEST:
        return None
    residuals = check.design.in_order(fit.residuals)
    given = check.settings.order
    note = ""
    in_stretches = fit.n > MOST_IN_LINE
    if in_stretches:
        places, values = stretch_means(residuals)
        y_name = "Mean residual"
        note = f" Each of the {STRETCHES:,} points is the mean of about {fit.n // STRETCHES:,} neighbouring rows."
    else:
        places = np.arange(1, fit.n + 1) if check.design.order is not None else check.design.rows
        values, y_name = residuals, "Residual"
    rows_shown = check.design.order is None and not in_stretches
    x_title = "Worksheet row" if rows_shown else f"Place in the order by {shortened(given, 32)}" if given else "Place"
    name = response_name(check)
    return Sketch(
        "scatter", f"Do the errors of {name} wander from one row to the next?",
        "Long stretches on one side of zero speak for errors that follow one another; a steady zigzag for errors that "
        "alternate." + note,
        (counts(x_title, places), numbers(y_name, values)),
        (Line(0, 1, "joined points" if values.size <= _MOST_MARKED else "course"),),
        nice_axis(x_title, places), nice_axis(f"{y_name} of {name}", values, zero=True),
    )


def autocorrelation_chart(check: Check) -> Sketch | None:
    """Autocorrelations of the residuals with limits of +-1.96/sqrt(n)."""
    fit = check.fit
    lags = min(_MOST_LAGS, fit.n // 4)
    if not fit.has_error_bars or fit.n < _FEWEST:
        return None
    values = autocorrelations(check.design.in_order(fit.residuals), lags)
    limit = 1.96 / np.sqrt(fit.n)
    step = next((step for step in _STEPS if max(np.abs(values).max(), limit) <= 2 * step), 0.5)
    return Sketch(
        "columns", "How much does an error resemble the one some rows before it?",
        "Columns within the dashed limits, ±1.96/√n, are what unrelated errors give; the limits hold for each column "
        "alone, and about one in twenty leaves them by chance.",
        (texts("Rows apart", [str(lag) for lag in range(1, lags + 1)]), numbers("Correlation", values),
         numbers("Limits, ±1.96/√n", np.full(lags, limit)), numbers("Lower limit", np.full(lags, -limit))),
        (Line(0, 1, "columns"), Line(0, 2, "limit"), Line(0, 3, "limit")),
        Axis("Rows apart", text=True), Axis("Correlation", "0.00", -2 * step, 2 * step, step),
    )
