"""The cross-check for a reviewer without Python: the used rows on this sheet, and native formulas over them.

The stored values of the formulas do not come from the fit they are to check: they are computed here again, from the
copy, by another decomposition (numpy's least squares by singular values).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from sheetfuncs.checking import Check
from sheetfuncs.report import style as looks
from sheetfuncs.report.elements import Area, Column
from sheetfuncs.report.formats import data_format, digits_format
from sheetfuncs.report.layout import COUNT, FIRST, Head, Page

# LINEST takes at most 64 predictor columns in common hosts (from memory); copies beyond these sizes make a workbook
# slow to open and recalculate, which would cost the analyst more than a cross-check is worth.
MOST_PREDICTORS = 60
MOST_ROWS = 20_000
MOST_CELLS = 400_000
# Relative agreement asked for. For a coefficient near zero the measure is its standard error, for the residual mean
# the residual standard deviation: relative to themselves both would be compared with rounding noise.
AGREEMENT = 1e-9
_LABEL = 5
_OURS, _NATIVE, _DIFFERENCE, _VERDICT = (FIRST + _LABEL + place for place in range(4))


@dataclass(frozen=True)
class Line:
    """One compared figure. native: the value that the formula gives; scale: what a difference is measured by."""

    label: str
    ours: float
    native: float
    formula: str
    scale: float
    number_format: str


@dataclass(frozen=True)
class Copy:
    """Where the copy of the used rows stands, in time order."""

    response: Area
    predictors: Area
    residuals: Area


def why_no_copy(check: Check) -> str:
    """Why no copy of the rows stands on the sheet; empty where it does."""
    n, k = check.design.columns.shape
    if k == 0:
        return "There is no predictor, so there is nothing for LINEST to fit."
    if k > MOST_PREDICTORS:
        return f"{k} predictor columns are more than LINEST takes in common spreadsheets ({MOST_PREDICTORS})."
    if n > MOST_ROWS or n * (k + 4) > MOST_CELLS:
        return (
            f"{n:,} rows are too many to copy onto this sheet: at most {MOST_ROWS:,} rows and {MOST_CELLS:,} cells. To "
            "cross-check, use LINEST on the data's own sheet, or check a part of the rows."
        )
    return ""


def reserve_cross_check(page: Page, check: Check) -> int:
    """Heading and room for the comparison; returns its first row."""
    note = (
        "For a reviewer without Python. The formulas use the spreadsheet's own functions on a copy of the used rows, "
        "which stands at the end of this sheet. They recalculate; the figures beside them are what this sheet reports. "
        "Where predictors lie far from zero, or nearly determine each other, a spreadsheet's own functions lose digits."
    )
    reason = why_no_copy(check)
    page.section("cross-check", "Cross-check in native formulas", "" if reason else note)
    if reason:
        page.put(FIRST, reason, looks.WRAPPED, span=COUNT)
        page.next()
        return 0
    start = page.row
    page.next(2 + len(_lines(check, None)))
    return start


def write_cross_check(page: Page, check: Check, start: int, copy: Copy) -> None:
    """The comparison, on the rows kept free for it, with formulas over the copy."""
    with page.at(start):
        page.table_head([
            Head(FIRST, _LABEL, "Figure"), Head(_OURS, 1, "Reported here", right=True),
            Head(_NATIVE, 1, "Native formula", right=True), Head(_DIFFERENCE, 1, "Difference", right=True),
            Head(_VERDICT, 2, "To nine digits"),
        ])
        for line in _lines(check, copy):
            _write_line(page, line)


def _write_line(page: Page, line: Line) -> None:
    row = page.row
    ours, native = Area(row, _OURS, row, _OURS).plain, Area(row, _NATIVE, row, _NATIVE).plain
    difference = Area(row, _DIFFERENCE, row, _DIFFERENCE).plain
    page.put(FIRST, line.label, looks.WRAPPED, span=_LABEL)
    _value(page, _OURS, line.ours, line.number_format)
    _value(page, _NATIVE, line.native, line.number_format, line.formula, array="LINEST" in line.formula)
    _value(page, _DIFFERENCE, line.native - line.ours, "0.0E+00", f"{native}-{ours}")
    limit = AGREEMENT * line.scale
    agrees = abs(line.native - line.ours) <= limit
    page.put(
        _VERDICT, "agrees" if agrees else "differs", looks.TEXT.but(indent=1),
        formula=f'IF(ISNUMBER({difference}),IF(ABS({difference})<={limit!r},"agrees","differs"),"no value")',
    )
    page.next()


def _value(
    page: Page, column: int, value: float, number_format: str, formula: str | None = None, array: bool = False
) -> None:
    page.put(column, float(value), looks.NUMBER.but(number_format=number_format), formula=formula, array=array)


def _lines(check: Check, copy: Copy | None) -> list[Line]:
    fit, design = check.fit, check.design
    place = copy or Copy(*[Area(1, 1, 2, 1)] * 3)
    y, x = design.in_order(design.response), design.in_order(design.columns)
    estimates, residual_sum = _least_squares(y, x, design.intercept)
    call = f"LINEST({place.response.address},{place.predictors.address},{str(design.intercept).upper()},TRUE)"
    k = x.shape[1]
    lines = []
    for j, term in enumerate(design.terms):
        # LINEST lists the last predictor first, and the intercept last of all.
        column = k + 1 if design.intercept and j == 0 else k - j + int(design.intercept)
        ours, error = float(fit.coefficients[j]), float(fit.standard_errors[j])
        scale = max(abs(ours), error if np.isfinite(error) else 0.0) or 1.0
        lines.append(Line(
            f"Coefficient of {term}" if not (design.intercept and j == 0) else "Intercept", ours, float(estimates[j]),
            f"INDEX({call},1,{column})", scale,
            digits_format(ours, 8),
        ))
    if not fit.has_error_bars:
        return lines
    return [*lines, *_whole_fit(check, place, call, y, residual_sum), *_residuals(check, place)]


def _whole_fit(check: Check, place: Copy, call: str, y: np.ndarray, residual_sum: float) -> list[Line]:
    fit = check.fit
    about = y - y.mean() if check.design.intercept else y
    r_squared = 1.0 - residual_sum / float(about @ about)
    sigma = float(np.sqrt(residual_sum / fit.df))
    return [
        Line("R²", fit.r_squared, r_squared, f"INDEX({call},3,1)", 1.0, "0.0000000"),
        Line("Residual standard deviation", fit.sigma, sigma, f"INDEX({call},3,2)", fit.sigma,
             digits_format(fit.sigma, 8)),
    ]


def _residuals(check: Check, place: Copy) -> list[Line]:
    e = check.design.in_order(check.fit.residuals)
    area = place.residuals
    earlier = Area(area.first_row, area.first_column, area.last_row - 1, area.last_column).address
    later = Area(area.first_row + 1, area.first_column, area.last_row, area.last_column).address
    lines = [
        Line("Mean of the residuals", float(e.mean()), float(sum(e.tolist()) / len(e)), f"AVERAGE({area.address})",
             check.fit.sigma, "0.00E+00" if abs(e.mean()) < 1e-4 else digits_format(float(e.mean()), 8)),
    ]
    ours = check.statistic("durbin_watson")
    if ours.statistic is not None:
        steps = np.diff(e)
        lines.append(Line(
            "Durbin-Watson", ours.statistic, float(steps @ steps) / float(e @ e),
            f"SUMXMY2({later},{earlier})/SUMSQ({area.address})", ours.statistic or 1.0, "0.0000000",
        ))
    return lines


def _least_squares(y: np.ndarray, x: np.ndarray, intercept: bool) -> tuple[np.ndarray, float]:
    """Coefficients, the constant first, and the residuals' sum of squares, by singular values of scaled columns."""
    centre = x.mean(axis=0) if intercept else np.zeros(x.shape[1])
    columns, mean = x - centre, y.mean() if intercept else 0.0
    scale = np.linalg.norm(columns, axis=0)
    slopes = np.linalg.lstsq(columns / scale, y - mean, rcond=None)[0] / scale
    left = y - mean - columns @ slopes
    estimates = np.concatenate([[mean - centre @ slopes], slopes]) if intercept else slopes
    return estimates, float(left @ left)


def write_copy(page: Page, check: Check) -> Copy:
    """The used rows: worksheet row, response, predictor columns, fitted, residual; in time order."""
    design, fit = check.design, check.fit
    order = "in the order given by " + str(check.settings.order) if check.settings.order else "in the rows' own order"
    page.section(
        "copy", "Copy of the used rows",
        f"As they were when checked, {order}; categories stand as 0 and 1 against their base. Not printed.",
    )
    names = ["Row", design.response_name, *design.column_names, "Fitted", "Residual"]
    columns = [design.rows, design.response, *design.columns.T, fit.fitted, fit.residuals]
    made = [
        _write_column(page, FIRST + j, name, design.in_order(np.asarray(values)))
        for j, (name, values) in enumerate(zip(names, columns, strict=True))
    ]
    page.next(1 + design.n)
    areas = [column.area for column in made]
    first, last = areas[2], areas[-3]
    return Copy(areas[1], Area(first.first_row, first.first_column, last.last_row, last.first_column), areas[-1])


def _write_column(page: Page, column: int, name: str, values: Sequence[float] | np.ndarray) -> Column:
    numbers = [float(v) for v in values]
    page.put(column, name, looks.COLUMN_HEAD_RIGHT)
    made = Column(page.row + 1, column, tuple(numbers), looks.QUIET_NUMBER.but(number_format=data_format(numbers)))
    page.columns.append(made)
    return made
