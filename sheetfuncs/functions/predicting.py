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
    with np.errstate(over="ignore", invalid="ignore"):  # a place far beyond the data may overflow: its cell says #NUM!
        found = predict(regression.fit, values, level)
    limits = (found.value, found.average_low, found.average_high, found.new_low, found.new_high)
    for row, error in enumerate(errors):
        cells.append([error] * len(COLUMNS) if error else [number(column[row]) for column in limits])
    return cells


def _places(at: Block, names: list[str]) -> list[int] | None:
    """Where each predictor stands in `at`, whose first row repeats their headers; None where it does not."""
    first = [header_text(at, 0, column) or "" for column in range(at.column_count)]
    return [first.index(name) for name in names] if sorted(first) == sorted(names) else None


def _design_rows(body: Block, predictors: tuple[Column | CategoryColumn, ...]) -> tuple[np.ndarray, list[str | None]]:
    """Values of the design's columns, (m, k), and the error of each row that has no prediction."""
    pieces: list[np.ndarray] = []
    errors = np.full(body.row_count, None, object)
    for column, predictor in enumerate(predictors):
        if isinstance(predictor, CategoryColumn):
            codes = _codes(body, column, predictor.levels)
            pieces.append((codes[:, None] == np.arange(1, len(predictor.levels))).astype(np.float64))
            wrong = (codes < 0) & (body.kinds[:, column] != Kind.BLANK)
        else:
            pieces.append(np.nan_to_num(body.numbers[:, column])[:, None])
            wrong = body.kinds[:, column] == Kind.TEXT
        _mark(errors, body, column, wrong)
    return np.hstack(pieces), errors.tolist()


def _codes(body: Block, column: int, levels: tuple[str, ...]) -> np.ndarray:
    """The place of each cell's text among the levels, -1 where it is none of them."""
    place = {level: code for code, level in enumerate(levels)}
    texts = body.texts.get(column)
    return np.array([place.get(text, -1) for text in ([None] * body.row_count if texts is None else texts.tolist())])


def _mark(errors: np.ndarray, body: Block, column: int, wrong: np.ndarray) -> None:
    """Write this column's errors into the rows that have none yet."""
    kinds = body.kinds[:, column]
    free = np.equal(errors, None).astype(bool)
    errors[free & (kinds == Kind.BLANK)] = "#N/A"
    errors[free & wrong] = "#VALUE!"
    failed = free & (kinds == Kind.ERROR)
    if failed.any():
        errors[failed] = body.texts[column][failed]
