"""From results to cells: numbers, and error values where there is no number."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from sheetfuncs.cells.observations import Observations
from sheetfuncs.core.results import Result
from sheetfuncs.errors import NotApplicableError, NoVariationError
from sheetfuncs.functions.declaration import Cell

LEFT_OUT = "#N/A"
UNDEFINED = "#NUM!"


def number(value: float) -> Cell:
    """A number, or "#NUM!" where it is undefined."""
    value = float(value)
    return value if math.isfinite(value) else UNDEFINED


def statistic(result: Result) -> Cell:
    """The statistic itself. Raises NotApplicableError, with the reason, where the method does not apply."""
    return _figure(result, result.statistic)


def p_value(result: Result) -> Cell:
    """The p-value. Raises NotApplicableError, with the reason, where the method does not apply."""
    return _figure(result, result.p)


def _figure(result: Result, value: float | None) -> Cell:
    if not result.applies:
        refusal = NotApplicableError(result.reason)
        refusal.cell_error = result.cell_error  # type: ignore[union-attr]
        raise refusal
    if value is None or not math.isfinite(value):
        raise NoVariationError(f"The {result.method.replace('_', ' ')} figure is not a finite number for this fit.")
    return float(value)


def by_row(observations: Observations, values: np.ndarray, heading: str) -> list[list[Cell]]:
    """One cell for each row of the response block: heading, value, or the error of a row without one."""
    cells: list[Cell] = [LEFT_OUT] * observations.block_rows
    for position, value in zip(observations.positions.tolist(), values.tolist(), strict=True):
        cells[position] = value if math.isfinite(value) else UNDEFINED
    if observations.header_position is not None:
        cells[observations.header_position] = heading
    return [[cell] for cell in cells]


def side_by_side(observations: Observations, values: np.ndarray, headings: Sequence[str]) -> list[list[Cell]]:
    """`by_row` for several columns (n, m): a row of cells for each row of the response block."""
    cells: list[list[Cell]] = [[LEFT_OUT] * len(headings) for _ in range(observations.block_rows)]
    finite = np.isfinite(values).all(axis=1).tolist()
    for position, row, whole in zip(observations.positions.tolist(), values.tolist(), finite, strict=True):
        cells[position] = row if whole else [value if math.isfinite(value) else UNDEFINED for value in row]
    if observations.header_position is not None:
        cells[observations.header_position] = list(headings)
    return cells


def table(*columns: object) -> list[list[Cell]]:
    """Columns of equal length, of texts or numbers, as rows of cells."""
    plain = [[c if isinstance(c, str) else number(c) for c in column] for column in columns]  # type: ignore[attr-defined]
    return [list(row) for row in zip(*plain, strict=True)]
