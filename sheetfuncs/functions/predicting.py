"""Predictions for rows of new predictor values, cell by cell."""

from __future__ import annotations

import numpy as np

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.observations import CategoryColumn, Column
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
    if at.column_count != len(predictors) or at.row_count == 0:
        raise BlockShapeError(
            f"The range to predict at has {at.row_count} rows and {at.column_count} columns: it needs a column for "
            f"each of {', '.join(p.name for p in predictors)}, in this order."
        )
    places = _places(at, [p.name for p in predictors])
    header = places is not None
    ordered = at.columns(places) if places is not None else at
    body = ordered.rows(1, at.row_count) if header else ordered
    values, errors = _design_rows(body, predictors)
    cells: list[list[Cell]] = [list(COLUMNS)] if header else []
    found = predict(regression.fit, values, level)
    limits = (found.value, found.average_low, found.average_high, found.new_low, found.new_high)
    for row, error in enumerate(errors):
        cells.append([error] * len(COLUMNS) if error else [number(column[row]) for column in limits])
    return cells


def _places(at: Block, names: list[str]) -> list[int] | None:
    """Where each predictor stands in `at`, whose first row repeats their headers; None where it does not."""
    first = [at.text(0, column) if at.kinds[0, column] == Kind.TEXT else None for column in range(at.column_count)]
    if None in first or sorted(map(str, first)) != sorted(names):
        return None
    return list(range(len(names))) if first == names else [first.index(name) for name in names]


def _design_rows(body: Block, predictors: tuple[Column | CategoryColumn, ...]) -> tuple[np.ndarray, list[str | None]]:
    """Values of the design's columns, (m, k), and the error of each row that has no prediction."""
    pieces: list[np.ndarray] = []
    errors: list[str | None] = [None] * body.row_count
    for column, predictor in enumerate(predictors):
        categorical = isinstance(predictor, CategoryColumn)
        levels = predictor.levels if isinstance(predictor, CategoryColumn) else ()
        for row in range(body.row_count):
            errors[row] = errors[row] or _error(body, row, column, levels, categorical)
        if categorical:
            texts = [body.text(row, column) for row in range(body.row_count)]
            pieces += [np.array([float(text == level) for text in texts]) for level in levels[1:]]
        else:
            numbers = body.numbers[:, column]
            pieces.append(np.where(np.isfinite(numbers), numbers, 0.0))
    return np.column_stack(pieces) if pieces else np.empty((body.row_count, 0)), errors


def _error(body: Block, row: int, column: int, levels: tuple[str, ...], categorical: bool) -> str | None:
    kind, text = body.kinds[row, column], body.text(row, column)
    if kind == Kind.BLANK:
        return "#N/A"
    if kind == Kind.ERROR:
        return text
    if categorical:
        return None if text in levels else "#VALUE!"
    return "#VALUE!" if kind == Kind.TEXT else None
