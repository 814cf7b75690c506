"""Predictions for rows of new predictor values, cell by cell."""

from __future__ import annotations

import numpy as np

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.observations import CategoryColumn, Column
from sheetfuncs.cells.source import header_text
from sheetfuncs.core.prediction import predict
from sheetfuncs.errors import BlockShapeError
from sheetfuncs.functions.answers import number
from sheetfuncs.functions.declaration import Cell
from sheetfuncs.functions.regressions import Regression

COLUMNS = ("value", "average low", "average high", "new low", "new high")


def predict_at(regression: Regression, at: Block, level: float) -> list[list[Cell]]:
    """One row of COLUMNS for each row of `at`; a header row gives the columns' names.

    A row with a blank gives #N/A, one with an error that error, one with a wrong kind of cell or an unknown level
    #VALUE!. Raises BlockShapeError where `at` has other columns than the predictors.
    """
    predictors = regression.observations.predictors
    names = [predictor.name for predictor in predictors]
    if at.column_count != len(names) or at.row_count == 0:
        raise BlockShapeError(
            f"The range to predict at has {at.row_count} rows and {at.column_count} columns: it needs a column for "
            f"each of {', '.join(names)}, in this order."
        )
    header, places = _header(at, names)
    values, errors = _design_rows(at.columns(places), predictors)
    found = predict(regression.fit, values, level)
    limits = (found.value, found.average_low, found.average_high, found.new_low, found.new_high)
    cells: list[list[Cell]] = [
        [error] * len(COLUMNS) if error else [number(column[row]) for column in limits]
        for row, error in enumerate(errors)
    ]
    if header is not None:
        cells[header] = list(COLUMNS)
    return cells


def _header(at: Block, names: list[str]) -> tuple[int | None, list[int]]:
    """The row of `at` that repeats the predictors' headers (its first filled one, or none), and each one's column."""
    filled = np.flatnonzero((at.kinds != Kind.BLANK).any(axis=1))
    first = [header_text(at, filled[0], column) or "" for column in range(at.column_count)] if filled.size else []
    if sorted(first) != sorted(names):
        return None, list(range(len(names)))
    return int(filled[0]), [first.index(name) for name in names]


def _design_rows(body: Block, predictors: tuple[Column | CategoryColumn, ...]) -> tuple[np.ndarray, list[str | None]]:
    """Values of the design's columns, (m, k), and the error of each row that has no prediction."""
    pieces: list[np.ndarray] = []
    errors: list[str | None] = [None] * body.row_count
    for column, predictor in enumerate(predictors):
        kinds = body.kinds[:, column]
        if isinstance(predictor, CategoryColumn):
            codes = _codes(body, column, predictor.levels)
            pieces.append((codes[:, None] == np.arange(1, len(predictor.levels))).astype(np.float64))
            good = codes >= 0
        else:
            pieces.append(np.nan_to_num(body.numbers[:, column])[:, None])
            good = np.isfinite(body.numbers[:, column])
        for row in np.flatnonzero(~good).tolist():
            errors[row] = errors[row] or _error(kinds[row], body.text(row, column))
    return np.hstack(pieces), errors


def _codes(body: Block, column: int, levels: tuple[str, ...]) -> np.ndarray:
    """The place of each cell's text among the levels, -1 where it is none of them."""
    place = {level: code for code, level in enumerate(levels)}
    return np.array([place.get(body.text(row, column) or "", -1) for row in range(body.row_count)])


def _error(kind: int, text: str | None) -> str | None:
    """What a cell that gives no value makes of its row."""
    return "#N/A" if kind == Kind.BLANK else text if kind == Kind.ERROR else "#VALUE!"
