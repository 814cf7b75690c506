"""Places to predict at: "Weight=12, Site=north" -> a row of the design's columns -> value and intervals."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from sheetfuncs.cells.observations import CategoryColumn, Column
from sheetfuncs.checking import Check
from sheetfuncs.core.prediction import predict
from sheetfuncs.errors import ArgumentError


def predictions_at(check: Check, places: Sequence[Mapping[str, str]], level: float) -> tuple[dict[str, Any], ...]:
    """One dict a place: at, value, average_low, average_high, new_low, new_high (None without error bars), outside."""
    if not places:
        return ()
    columns = np.array([_row(check, place) for place in places])
    found = predict(check.fit, columns, level)
    names = ("value", "average_low", "average_high", "new_low", "new_high")
    return tuple(
        {
            "at": dict(place), "level": level, "outside": bool(found.outside[i]),
            **{name: _finite(getattr(found, name)[i]) for name in names},
        }
        for i, place in enumerate(places)
    )


def _row(check: Check, place: Mapping[str, str]) -> list[float]:
    predictors = check.observations.predictors
    names = [p.name for p in predictors]
    unknown = [name for name in place if name not in names]
    missing = [name for name in names if name not in place]
    if unknown or missing:
        what = f"does not name {', '.join(missing)}" if missing else f"names {', '.join(unknown)}, which is not there"
        raise ArgumentError(f"--at {what}: give a value for each of {', '.join(names)}.")
    row: list[float] = []
    for predictor in predictors:
        row += _values(predictor, place[predictor.name])
    return row


def _values(predictor: Column | CategoryColumn, text: str) -> list[float]:
    if isinstance(predictor, CategoryColumn):
        if text not in predictor.levels:
            raise ArgumentError(
                f'--at {predictor.name}="{text}": there is no such level; the data have {", ".join(predictor.levels)}.'
            )
        return [float(text == level) for level in predictor.levels[1:]]
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise ArgumentError(f'--at {predictor.name}="{text}" is not a number; write it like 12.5.')
    return [value]


def _finite(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None
