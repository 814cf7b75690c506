"""A rectangle of cells as columns of numbers and kinds: what every host hands over."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from enum import IntEnum
from itertools import chain
from typing import SupportsFloat, SupportsIndex

import numpy as np

from sheetfuncs.errors import CellKindError

ERROR_TEXTS = frozenset(
    {
        "#NULL!",
        "#DIV/0!",
        "#VALUE!",
        "#REF!",
        "#NAME?",
        "#NUM!",
        "#N/A",
        "#GETTING_DATA",
        "#SPILL!",
        "#CALC!",
        "#FIELD!",
        "#BLOCKED!",
        "#CONNECT!",
        "#UNKNOWN!",
        "#BUSY!",
        "#EXTERNAL!",
        "#PYTHON!",
    }
)


class Kind(IntEnum):
    """What a cell holds. A blank and a formula that gives "" are both BLANK; " " is TEXT."""

    BLANK = 0
    NUMBER = 1
    BOOLEAN = 2
    TEXT = 3
    ERROR = 4
    DATE = 5


@dataclass(frozen=True, eq=False)
class Block:
    """A rectangle of cells.

    numbers: float64 (rows, columns); the value of NUMBER, DATE (serial number) and BOOLEAN (0/1) cells, else NaN.
    kinds:   uint8 (rows, columns) of Kind.
    texts:   column index -> object array (rows,): the str of TEXT and ERROR cells, None elsewhere. Columns without
             such a cell have no entry.
    sheet, first_row, first_column: where the rectangle stands (1-based; sheet None for a bare block).
    hidden:  bool (rows,): rows hidden or filtered out in the host; None where the host does not say.
    worksheet_columns: the worksheet column of each column where they are not adjacent, else None.
    date1904: whether DATE serial numbers count from 1904.
    """

    numbers: np.ndarray
    kinds: np.ndarray
    texts: Mapping[int, np.ndarray] = field(default_factory=dict)
    sheet: str | None = None
    first_row: int = 1
    first_column: int = 1
    hidden: np.ndarray | None = None
    worksheet_columns: tuple[int, ...] | None = None
    date1904: bool = False

    @property
    def row_count(self) -> int:
        return self.kinds.shape[0]

    @property
    def column_count(self) -> int:
        return self.kinds.shape[1]

    def text(self, row: int, column: int) -> str | None:
        """The text of a TEXT or ERROR cell (0-based place in the block), else None."""
        texts = self.texts.get(column)
        return None if texts is None else texts[row]

    def value(self, row: int, column: int) -> float | bool | str | None:
        """What a cell holds, as hosts hand it over: None for a blank, a serial number for a date."""
        kind = self.kinds[row, column]
        if kind in (Kind.TEXT, Kind.ERROR):
            return self.text(row, column)
        number = float(self.numbers[row, column])
        return None if kind == Kind.BLANK else bool(number) if kind == Kind.BOOLEAN else number

    def worksheet_column(self, column: int) -> int:
        """The worksheet column (1-based) of a column of the block (0-based)."""
        return self.first_column + column if self.worksheet_columns is None else self.worksheet_columns[column]

    def columns(self, indices: Sequence[int]) -> Block:
        """The block made of these columns (0-based), in this order; `worksheet_column` stays true."""
        indices = list(indices)
        places = tuple(self.worksheet_column(index) for index in indices)
        first = places[0] if places else self.first_column
        adjacent = places == tuple(range(first, first + len(places)))
        return Block(
            self.numbers[:, indices],
            self.kinds[:, indices],
            {new: self.texts[old] for new, old in enumerate(indices) if old in self.texts},
            self.sheet,
            self.first_row,
            first,
            self.hidden,
            None if adjacent else places,
            self.date1904,
        )

    def rows(self, start: int, stop: int) -> Block:
        """The block made of the rows start to stop - 1 (0-based)."""
        return Block(
            self.numbers[start:stop],
            self.kinds[start:stop],
            {column: texts[start:stop] for column, texts in self.texts.items()},
            self.sheet,
            self.first_row + start,
            self.first_column,
            None if self.hidden is None else self.hidden[start:stop],
            self.worksheet_columns,
            self.date1904,
        )

    @classmethod
    def from_rows(cls, rows: Sequence[Sequence[object]], **place: object) -> Block:
        """Build a block from a list of rows, a cell being None, float, int, bool, str or an error text.

        Shorter rows end in blanks. A number that no spreadsheet cell can hold (NaN, infinity) becomes the error
        that the cell would show. Raises CellKindError for an object that is none of these.
        """
        height = len(rows)
        widths = set(map(len, rows))
        width = max(widths, default=0)
        if len(widths) > 1:
            rows = [[*row, *[None] * (width - len(row))] for row in rows]
        numbers = np.full((height, width), np.nan, order="F")
        kinds = np.full((height, width), Kind.NUMBER, np.uint8, order="F")
        texts: dict[int, np.ndarray] = {}
        header = 0 if not height or set(map(type, rows[0])) <= _PLAIN else 1
        body = _all_numbers(rows[header:], height - header, width)
        if body is not None:
            numbers[header:] = body
        columns = zip(*rows, strict=True) if body is None else zip(*rows[:header], strict=True)
        for index, cells in enumerate(columns):
            found = _fill_column(list(cells), numbers[: len(cells), index], kinds[: len(cells), index])
            if found is not None:
                texts[index] = np.append(found, np.full(height - len(cells), None, object))
        return cls(numbers, kinds, texts, **place)  # type: ignore[arg-type]


_PLAIN = {float, int}


def _all_numbers(rows: Sequence[Sequence[object]], height: int, width: int) -> np.ndarray | None:
    """The rows as one array where every cell is a finite number, else None."""
    if not height or not set(map(type, chain.from_iterable(rows))) <= _PLAIN:
        return None
    try:
        numbers = np.fromiter(chain.from_iterable(rows), float, height * width)
    except OverflowError:
        return None
    return numbers.reshape(height, width) if np.isfinite(numbers).all() else None


def _fill_column(cells: list[object], numbers: np.ndarray, kinds: np.ndarray) -> np.ndarray | None:
    """Fill one column's numbers and kinds (preset to NUMBER) in place; returns its texts, or None without any."""
    types = list(map(type, cells))
    if types.count(str) == len(cells):
        return _fill_texts(cells, kinds)
    odd = [row for row, kind in enumerate(types) if kind is not float]
    values = cells.copy() if odd else cells
    for row in odd:
        values[row] = None  # which becomes NaN
    numbers[:] = np.array(values, float)
    finite = np.isfinite(numbers)
    if not finite.all():
        odd = np.flatnonzero(~finite).tolist()
    texts = None
    for row in odd:
        kinds[row], numbers[row], text = _read_cell(cells[row])
        if text is not None:
            if texts is None:
                texts = np.full(len(cells), None, object)
            texts[row] = text
    return texts


def _fill_texts(cells: list[object], kinds: np.ndarray) -> np.ndarray | None:
    """Kinds of a column of strings only; returns its texts with None at the blanks."""
    kind_of = {text: Kind.ERROR if text in ERROR_TEXTS else Kind.TEXT for text in set(cells)}
    kind_of[""] = Kind.BLANK
    kinds[:] = np.fromiter(map(kind_of.__getitem__, cells), np.uint8, len(cells))
    texts = np.array(cells, object)
    texts[kinds == Kind.BLANK] = None
    return texts if kinds.any() else None


def _read_cell(value: object) -> tuple[Kind, float, str | None]:
    """Kind, number and text of one cell."""
    if value is None or (isinstance(value, str) and value == ""):
        return Kind.BLANK, np.nan, None
    if isinstance(value, str):
        return Kind.ERROR if value in ERROR_TEXTS else Kind.TEXT, np.nan, str(value)
    if isinstance(value, bool | np.bool_):
        return Kind.BOOLEAN, float(value), None
    try:
        if not isinstance(value, SupportsFloat | SupportsIndex):  # float would read bytes as text
            raise TypeError
        number = float(value)
    except OverflowError:
        number = np.inf
    except (TypeError, ValueError):
        raise CellKindError(
            f"A cell was handed over as {type(value).__name__}; a cell is empty, a number, a text, "
            "TRUE or FALSE, or an error value: convert it first (dates to serial numbers)."
        ) from None
    if np.isfinite(number):
        return Kind.NUMBER, number, None
    return Kind.ERROR, np.nan, "#NUM!"
