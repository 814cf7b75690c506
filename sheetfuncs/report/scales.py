"""Axes with round ends and steps."""

from __future__ import annotations

import math
from collections.abc import Iterable

import numpy as np

from sheetfuncs.report.elements import Axis
from sheetfuncs.report.formats import digits_format

# Below this, a step would have no digits of its own.
_SMALLEST = 1e-290


def nice_axis(title: str, values: Iterable[float], *, zero: bool = False, steps: int = 6) -> Axis:
    """An axis whose ends and steps are round numbers just outside the values; zero: it also shows zero."""
    finite = np.array([v for v in values if math.isfinite(v)])
    if not finite.size:
        return Axis(title)
    low, high = float(finite.min()), float(finite.max())
    if zero:
        low, high = min(low, 0.0), max(high, 0.0)
    span = high - low or abs(high) or 1.0
    if span < _SMALLEST:
        return Axis(title)
    step = _round_step(span / steps)
    first, last = math.floor(low / step + 1e-9) * step, math.ceil(high / step - 1e-9) * step
    if first == last:
        first, last = first - step, last + step
    largest = max(abs(first), abs(last))
    if largest > 1e6 * span:
        return Axis(title)  # round ends would fall together: the host knows no better either, but shows all digits
    return Axis(title, _tick_format(step, largest), first, last, step)


def _round_step(raw: float) -> float:
    power = 10.0 ** math.floor(math.log10(raw))
    return next(m * power for m in (1.0, 2.0, 2.5, 5.0, 10.0) if raw <= m * power * (1 + 1e-9))


def _tick_format(step: float, largest: float) -> str:
    if largest >= 1e7 or step < 1e-4:
        return digits_format(1e-9, 2)
    count = max(-math.floor(math.log10(step) + 1e-9), 0)
    if abs(step * 10**count - round(step * 10**count)) > 1e-6:
        count += 1  # steps of 2.5
    return "#,##0" + ("." + "0" * count if count else "")
