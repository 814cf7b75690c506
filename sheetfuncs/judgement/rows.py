"""Rows that deserve a look, each with a sentence that says why. None is ever removed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import fdtri, stdtr

from sheetfuncs.core.fit import Fit
from sheetfuncs.core.influence import RowMeasures
from sheetfuncs.core.shifts import coefficient_shifts
from sheetfuncs.judgement.words import number

MOST = 12
# A row that moves a coefficient by its whole standard error changes the answer as much as sampling does.
SHIFT_LIMIT = 1.0
# Huber 1981, Robust Statistics, p. 162 (from memory): leverages above 0.5 should be avoided if possible.
LEVERAGE_LIMIT = 0.5
OUTLIER_LEVEL = 0.05


@dataclass(frozen=True)
class FlaggedRow:
    """A row to look at. row: worksheet row; index: its place among the used rows; weight: how urgent, for sorting."""

    row: int
    index: int
    reason: str
    weight: float


def rows_to_look_at(fit: Fit, measures: RowMeasures) -> tuple[FlaggedRow, ...]:
    """At most MOST rows, most urgent first."""
    if not fit.has_error_bars:
        return ()
    shifts = coefficient_shifts(fit)
    outlier_p = _outlier_p(fit, measures.externally_studentized)
    cook_limit = float(fdtri(fit.p, fit.df, 0.5))
    largest = np.nanmax(np.abs(np.nan_to_num(shifts)), axis=1)
    with np.errstate(invalid="ignore"):
        candidates = (
            (outlier_p < OUTLIER_LEVEL) | (largest >= SHIFT_LIMIT) | (measures.leverage > LEVERAGE_LIMIT)
            | (measures.cooks_distance >= cook_limit) | measures.spoils_perfect_fit
        )
    flagged = [_flag(fit, measures, shifts, outlier_p, cook_limit, int(i)) for i in np.flatnonzero(candidates)]
    flagged.sort(key=lambda f: (-f.weight, f.row))
    return tuple(flagged[:MOST])


def _outlier_p(fit: Fit, studentized: np.ndarray) -> np.ndarray:
    """Two-sided p of each externally studentized residual, times the number of rows (Bonferroni); NaN counts as 1."""
    if fit.df < 2:
        return np.ones(fit.n)
    tested = np.isfinite(studentized)
    p = np.ones(fit.n)
    p[tested] = 2.0 * stdtr(fit.df - 1, -np.abs(studentized[tested])) * tested.sum()
    return np.minimum(p, 1.0)


def _flag(
    fit: Fit, measures: RowMeasures, shifts: np.ndarray, outlier_p: np.ndarray, cook_limit: float, i: int
) -> FlaggedRow:
    row = int(fit.design.rows[i])
    if fit.fits_itself[i]:
        return FlaggedRow(
            row, i, "It alone determines its own fitted value (leverage 1), so its error cannot be seen and a mistake "
            "in it would pass unnoticed.", 1e6,
        )
    if measures.spoils_perfect_fit[i]:
        return FlaggedRow(
            row, i, "Without it the fit is perfect: every other row lies on the line, and this one alone "
            f"{number(abs(measures.leave_one_out[i]), 3)} off it.", 1e5,
        )
    parts: list[str] = []
    weight = 0.0
    if outlier_p[i] < OUTLIER_LEVEL:
        off = measures.externally_studentized[i]
        parts.append(
            f"it lies {number(abs(off), 2)} of its standard errors {'above' if off > 0 else 'below'} what the other "
            f"rows predict ({_chance(outlier_p[i])})"
        )
        weight += abs(off) / 3
    j = int(np.argmax(np.abs(shifts[i])))
    if abs(shifts[i, j]) >= SHIFT_LIMIT:
        before = fit.coefficients[j]
        after = before + shifts[i, j] * fit.standard_errors[j]
        parts.append(
            f"without it {_term(fit, j)} would be {number(after)} instead of {number(before)}, "
            f"a move of {number(abs(shifts[i, j]), 2)} of its standard errors"
        )
        weight += abs(shifts[i, j])
    if measures.cooks_distance[i] >= cook_limit:
        parts.append(
            "without it all coefficients together move beyond the edge of their 50 % confidence region "
            f"(Cook's distance {number(measures.cooks_distance[i], 2)})"
        )
        weight += 1.0
    if measures.leverage[i] > LEVERAGE_LIMIT:
        parts.append(
            "its predictors lie far from those of the other rows: it determines "
            f"{measures.leverage[i]:.0%} of its own fitted value".replace("%", " %")
        )
        weight += measures.leverage[i]
    sentence = "; ".join(parts)
    return FlaggedRow(row, i, sentence[:1].upper() + sentence[1:] + ".", weight)


def _chance(p: float) -> str:
    if p < 1e-6:
        return "by chance less than once in a million such data sets"
    return f"by chance in about one of {round(1 / p, -int(np.floor(np.log10(1 / p))) + 1):,.0f} such data sets"


def _term(fit: Fit, j: int) -> str:
    name = fit.design.terms[j]
    return "the intercept" if fit.design.intercept and j == 0 else f"the coefficient of {name}"
