"""The ledger: which worksheet rows a fit rests on, which were left out and why, which are hidden."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from sheetfuncs.cells.block import Kind
from sheetfuncs.cells.source import Source

_MOST_NAMED = 3


@dataclass(frozen=True, slots=True)
class ExcludedRow:
    """A worksheet row that was left out, and why."""

    row: int
    reason: str


@dataclass(frozen=True, eq=False)
class Ledger:
    """used: worksheet rows (int64, ascending). hidden: how many of them are hidden. header_row: or None."""

    used: np.ndarray
    excluded: tuple[ExcludedRow, ...]
    hidden: int
    header_row: int | None

    @property
    def excluded_between(self) -> int:
        """How many rows were left out between the first and the last used one."""
        if not len(self.used):
            return 0
        first, last = int(self.used[0]), int(self.used[-1])
        return sum(first < row.row < last for row in self.excluded)

    @property
    def gaps(self) -> int:
        """At how many places rows were left out between used ones, so that rows apart became neighbours."""
        return int(np.count_nonzero(np.diff(self.used) > 1))

    @property
    def reasons(self) -> list[tuple[str, int]]:
        """Each reason with the number of rows, most frequent first."""
        return Counter(row.reason for row in self.excluded).most_common()


def excluded_rows(sources: Sequence[Source], positions: np.ndarray) -> tuple[ExcludedRow, ...]:
    """The rows at these positions, each of which has a blank or an error in at least one of the columns.

    positions: int64, 0-based in the blocks.
    """
    if not len(positions):
        return ()
    marks = [_marks(source, positions) for source in sources]
    reasons: dict[tuple[str, ...], str] = {}
    first_row = sources[0].block.first_row
    rows = []
    for position, row_marks in zip(positions.tolist(), zip(*marks, strict=True), strict=True):
        reason = reasons.get(row_marks)
        if reason is None:
            reason = reasons[row_marks] = _reason(sources, row_marks)
        rows.append(ExcludedRow(first_row + position, reason))
    return tuple(rows)


def _marks(source: Source, positions: np.ndarray) -> list[str]:
    """One word a row: "" for a good cell, "blank", or the error value."""
    kinds = source.kinds[positions]
    marks = np.full(len(positions), "", object)
    marks[kinds == Kind.BLANK] = "blank"
    errors = kinds == Kind.ERROR
    if errors.any():
        marks[errors] = source.texts[positions[errors]]
    return marks.tolist()


def _reason(sources: Sequence[Source], marks: tuple[str, ...]) -> str:
    if all(mark == "blank" for mark in marks):
        return "blank row"
    groups: dict[str, list[str]] = {}
    for source, mark in zip(sources, marks, strict=True):
        if mark:
            groups.setdefault(mark, []).append(source.label)
    return "; ".join(f"{mark} in {_joined(labels)}" for mark, labels in groups.items())


def _joined(labels: list[str]) -> str:
    if len(labels) > _MOST_NAMED:
        return f"{', '.join(labels[:_MOST_NAMED])} and {len(labels) - _MOST_NAMED} more"
    return " and ".join([", ".join(labels[:-1]), labels[-1]] if len(labels) > 1 else labels)
