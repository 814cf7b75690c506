"""A rectangle of cells as columns of numbers and kinds: what every host hands over."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from enum import IntEnum

import numpy as np

ERROR_TEXTS = frozenset({
    "#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A", "#GETTING_DATA",
    "#SPILL!", "#CALC!", "#FIELD!", "#BLOCKED!", "#CONNECT!", "#UNKNOWN!", "#BUSY!", "#EXTERNAL!", "#PYTHON!",
})


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
    """

    numbers: np.ndarray
    kinds: np.ndarray
    texts: Mapping[int, np.ndarray] = field(default_factory=dict)
    sheet: str | None = None
    first_row: int = 1
    first_column: int = 1
    hidden: np.ndarray | None = None

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

    def columns(self, indices: Sequence[int]) -> Block:
        """The block made of these columns (0-based). `first_column` stays true only for adjacent ones."""
        indices = list(indices)
        return Block(
            self.numbers[:, indices], self.kinds[:, indices],
            {new: self.texts[old] for new, old in enumerate(indices) if old in self.texts},
            self.sheet, self.first_row, self.first_column + (indices[0] if indices else 0), self.hidden,
        )

    @classmethod
    def from_rows(cls, rows: Sequence[Sequence[object]], **place: object) -> Block:
        """Build a block from a list of rows, a cell being None, float, int, bool, str or an error text."""
        height = len(rows)
        width = max((len(row) for row in rows), default=0)
        numbers = np.full((height, width), np.nan)
        kinds = np.zeros((height, width), np.uint8)
        texts: dict[int, np.ndarray] = {}
        for r, row in enumerate(rows):
            for c, value in enumerate(row):
                if value is None or value == "":
                    continue
                if isinstance(value, bool | np.bool_):
                    kinds[r, c], numbers[r, c] = Kind.BOOLEAN, float(value)
                elif isinstance(value, str):
                    kinds[r, c] = Kind.ERROR if value in ERROR_TEXTS else Kind.TEXT
                    texts.setdefault(c, np.full(height, None, object))[r] = value
                else:
                    number = float(value)  # type: ignore[arg-type]
                    if np.isfinite(number):
                        kinds[r, c], numbers[r, c] = Kind.NUMBER, number
                    else:  # no spreadsheet cell holds NaN or infinity: treat it as the error it would show
                        kinds[r, c] = Kind.ERROR
                        texts.setdefault(c, np.full(height, None, object))[r] = "#NUM!"
        return cls(numbers, kinds, texts, **place)  # type: ignore[arg-type]
