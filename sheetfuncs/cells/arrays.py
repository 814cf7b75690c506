"""Arrays, Series, DataFrames and lists of columns as blocks of cells."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.errors import ArgumentError

_DAY_ZERO = np.datetime64("1899-12-30")


def named_columns(data: Any, names: list[str] | None) -> list[tuple[str, np.ndarray]]:
    """(name, column) pairs of an array, a Series, a DataFrame or a list of columns."""
    if hasattr(data, "iloc") and hasattr(data, "columns"):
        columns = [data.iloc[:, j].to_numpy() for j in range(data.shape[1])]
        names = names or [str(c) for c in data.columns]
    elif hasattr(data, "iloc"):
        columns = [data.to_numpy()]
        names = [str(data.name)] if data.name is not None else names
    else:
        array = np.asarray(data) if not isinstance(data, np.ndarray) else data
        if isinstance(data, list | tuple) and data and isinstance(data[0], list | tuple | np.ndarray):
            columns = [np.asarray(c) for c in data]
        elif array.ndim == 2:
            columns = list(array.T)
        else:
            columns = [np.atleast_1d(array)]
    names = names or [f"predictor {j + 1}" for j in range(len(columns))]
    if len(names) != len(columns):
        raise ArgumentError(f"{len(names)} names for {len(columns)} columns: give one name a column.")
    return list(zip(names, columns, strict=True))


def block_of_columns(columns: Sequence[np.ndarray]) -> Block:
    """Columns of numbers, dates, booleans or text as a block of cells; missing values are blanks."""
    height = len(columns[0])
    if any(np.ndim(c) != 1 or len(c) != height for c in columns):
        raise ArgumentError("Every column needs the same number of rows, in one dimension.")
    numbers = np.full((height, len(columns)), np.nan)
    kinds = np.zeros((height, len(columns)), np.uint8)
    texts: dict[int, np.ndarray] = {}
    for j, column in enumerate(columns):
        column = np.asarray(column)
        if column.dtype.kind in "fiu":
            values = column.astype(np.float64)
            finite = np.isfinite(values)
            numbers[finite, j] = values[finite]
            kinds[finite, j] = Kind.NUMBER
        elif column.dtype.kind == "M":
            present = ~np.isnat(column)
            days = (column - _DAY_ZERO) / np.timedelta64(1, "D")
            numbers[present, j] = days[present]
            kinds[present, j] = Kind.DATE
        else:
            cells = [None if v is None or v != v else v for v in column.tolist()]
            one = Block.from_rows([[v] for v in cells])
            numbers[:, j], kinds[:, j] = one.numbers[:, 0], one.kinds[:, 0]
            if 0 in one.texts:
                texts[j] = one.texts[0]
    return Block(numbers, kinds, texts)
