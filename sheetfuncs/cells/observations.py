"""From blocks of cells to the arrays of a regression, with a ledger of every row."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.columns import (
    CategoryColumn,
    Column,
    DateRules,
    boolean_remark,
    check_dates,
    is_category,
    read_category,
    require_numbers,
    suggestion,
)
from sheetfuncs.cells.ledger import ExcludedRow, Ledger, excluded_rows
from sheetfuncs.cells.source import Source, make_sources, predictors_say_header, response_says_header
from sheetfuncs.cells.stored_text import shown
from sheetfuncs.errors import ArgumentError, BlockShapeError, TooFewRowsError

__all__ = [
    "CategoryColumn",
    "Column",
    "ExcludedRow",
    "Ledger",
    "Observations",
    "PredictorColumns",
    "read_observations",
    "read_predictors",
]

_KINDS = len(Kind)


@dataclass(frozen=True, eq=False)
class PredictorColumns:
    """Predictors read without a response; fields as in Observations."""

    predictors: tuple[Column | CategoryColumn, ...]
    ledger: Ledger
    remarks: tuple[str, ...]
    has_header: bool
    block_rows: int
    positions: np.ndarray


@dataclass(frozen=True, eq=False)
class Observations:
    """The used rows of a regression, n of them, in the rows' order.

    remarks: one sentence each, on what the reader did that the analyst should know.
    block_rows: height of the response block. positions: int64 (n,), 0-based places of the used rows in it.
    header_position: the 0-based place of the header row, None without one.
    """

    response: Column
    predictors: tuple[Column | CategoryColumn, ...]
    order: Column | None
    ledger: Ledger
    remarks: tuple[str, ...]
    has_header: bool
    block_rows: int
    positions: np.ndarray
    header_position: int | None = None

    @property
    def used_mask(self) -> np.ndarray:
        """bool (block_rows,): which rows of the response block are used."""
        mask = np.zeros(self.block_rows, bool)
        mask[self.positions] = True
        return mask


def read_observations(
    response: Block,
    predictors: Block,
    order: Block | None = None,
    *,
    names: Sequence[str] | None = None,
    dates: Literal["plain", "check"] = "plain",
    date_predictors: Collection[str] = (),
    base_levels: Mapping[str, str] | None = None,
) -> Observations:
    """Read a response (one column), its predictors (k columns) and perhaps an order (one column), equally high.

    Rows with a blank or an error in any of these columns are left out; blank rows above the first and below the last
    filled cell are no rows at all. Where the response has text above numbers, that row is the header of every block.
    names: of the response, the predictors and the order, in place of headers. dates: "plain" takes them as numbers;
    "check" refuses them as predictors unless `date_predictors` names the column. base_levels: {column: level}.

    Raises BlockShapeError, CellKindError, CollinearPredictorsError (a category with one level), TooFewRowsError (no
    row left) and ArgumentError (an option that names what is not there).
    """
    others = (predictors,) if order is None else (predictors, order)
    _require_shapes(response, predictors, order)
    start, end = _filled_rows((response, *others))
    header = start if start < end and response_says_header(response, others, start) else None
    roles = [(response, 0, "response"), *_predictor_roles(predictors)]
    if order is not None:
        roles.append((order, 0, "order"))
    sources = make_sources(roles, header, names)
    rules = _date_rules(sources, dates, date_predictors)
    reading = _Reading(sources, start if header is None else header + 1, end, rules, base_levels or {})
    columns = reading.columns()
    read_order = columns[-1] if order is not None else None
    remarks = [*reading.remarks, *_tie_remarks(read_order)]
    assert isinstance(columns[0], Column)
    assert not isinstance(read_order, CategoryColumn)
    return Observations(
        columns[0],
        tuple(columns[1 : 1 + predictors.column_count]),
        read_order,
        reading.ledger(header),
        tuple(remarks),
        header is not None,
        response.row_count,
        reading.positions,
        header,
    )


def read_predictors(predictors: Block) -> PredictorColumns:
    """Read predictors where there is no response. The first row is a header where a column has text above numbers."""
    if predictors.column_count == 0 or predictors.row_count == 0:
        raise BlockShapeError("There are no predictor cells; give at least one column of numbers.")
    start, end = _filled_rows((predictors,))
    header = start if start < end and predictors_say_header(predictors, start) else None
    sources = make_sources(_predictor_roles(predictors), header, None)
    reading = _Reading(sources, start if header is None else header + 1, end, DateRules(), {})
    columns = tuple(reading.columns())
    return PredictorColumns(
        columns,
        reading.ledger(header),
        tuple(reading.remarks),
        header is not None,
        predictors.row_count,
        reading.positions,
    )


class _Reading:
    """One pass over the columns: kinds are checked on all data rows, values are taken from the used ones."""

    def __init__(self, sources: list[Source], start: int, end: int, rules: DateRules, base_levels: Mapping[str, str]):
        self.sources, self.start, self.end, self.rules, self.base_levels = sources, start, end, rules, base_levels
        self.remarks: list[str] = []
        self.counts = [_count_kinds(source.kinds[start:end]) for source in sources]
        self.categories = [is_category(source, counts) for source, counts in zip(sources, self.counts, strict=True)]
        for source, counts, category in zip(sources, self.counts, self.categories, strict=True):
            if not category:
                require_numbers(source, start, end, counts)
                remark = check_dates(source, start, end, counts, rules)
                self.remarks += [text for text in (remark, boolean_remark(source, counts)) if text]
        used = self._used()
        self.positions = np.arange(start, end) if used is None else start + np.flatnonzero(used)
        bad = () if used is None else start + np.flatnonzero(~used)
        self.excluded = excluded_rows(sources, np.asarray(bad, np.int64))
        self._require_rows()

    def _used(self) -> np.ndarray | None:
        """Which data rows are good in every column; None for all of them."""
        used = None
        for source, counts in zip(self.sources, self.counts, strict=True):
            if counts[Kind.BLANK] or counts[Kind.ERROR]:
                kinds = source.kinds[self.start : self.end]
                good = (kinds != Kind.BLANK) & (kinds != Kind.ERROR)
                used = good if used is None else used & good
        return used

    def _require_rows(self) -> None:
        if len(self.positions):
            return
        if not self.excluded:
            raise TooFewRowsError(
                f"There are no rows of data in {self._where()}; give a range with a number in every used column."
            )
        reasons = Ledger(self.positions, self.excluded, 0, None).reasons
        told = "; ".join(f"{count:,} × {reason}" for reason, count in reasons[:3])
        raise TooFewRowsError(
            f"No row is left in {self._where()}: every row has a blank or an error in a used column ({told}"
            f"{'; ...' if len(reasons) > 3 else ''}); fill these cells, or leave such a column out."
        )

    def _where(self) -> str:
        sheet = self.sources[0].block.sheet
        labels = ", ".join(source.label for source in self.sources[:4]) + (", ..." if len(self.sources) > 4 else "")
        return labels if sheet is None else f"sheet {sheet} ({labels})"

    def columns(self) -> list[Column | CategoryColumn]:
        whole = len(self.positions) == self.end - self.start
        columns: list[Column | CategoryColumn] = []
        for source, category in zip(self.sources, self.categories, strict=True):
            if category:
                column, remarks = read_category(source, self.positions, self._base_of(source))
                columns.append(column)
                self.remarks += remarks
            else:
                numbers = source.numbers
                values = numbers[self.start : self.end] if whole else numbers[self.positions]
                columns.append(Column(source.name, np.ascontiguousarray(values)))
        self._refuse_unknown_bases()
        return columns

    def _base_of(self, source: Source) -> str | None:
        return next((level for name, level in self.base_levels.items() if _is_called(source, name)), None)

    def _refuse_unknown_bases(self) -> None:
        categories = [source for source, category in zip(self.sources, self.categories, strict=True) if category]
        for name in self.base_levels:
            if not any(_is_called(source, name) for source in categories):
                there = [source.name for source in categories]
                raise ArgumentError(
                    f"A base level is given for {shown(name)}, which is no text column among the predictors"
                    f"{suggestion(name, there)}; "
                    + (f"text columns are {', '.join(there)}." if there else "none of the predictors is text.")
                )

    def ledger(self, header: int | None) -> Ledger:
        first = self.sources[0].block.first_row
        hidden = next((source.block.hidden for source in self.sources if source.block.hidden is not None), None)
        count = 0 if hidden is None else int(np.count_nonzero(hidden[self.positions]))
        return Ledger(first + self.positions, self.excluded, count, None if header is None else first + header)


def _is_called(source: Source, name: str) -> bool:
    wanted = " ".join(name.split()).casefold()
    return wanted == source.name.casefold() or (source.block.sheet is not None and wanted == source.letters.casefold())


def _count_kinds(kinds: np.ndarray) -> list[int]:
    if (kinds == Kind.NUMBER).all():  # the usual case, many times faster than counting
        counts = [0] * _KINDS
        counts[Kind.NUMBER] = len(kinds)
        return counts
    return np.bincount(kinds, minlength=_KINDS).tolist()


def _predictor_roles(predictors: Block) -> list[tuple[Block, int, str]]:
    return [(predictors, index, f"predictor {index + 1}") for index in range(predictors.column_count)]


def _filled_rows(blocks: Sequence[Block]) -> tuple[int, int]:
    """The first row with a filled cell, and one behind the last (0-based); equal where there is none."""
    height = blocks[0].row_count
    if height and any((block.kinds[[0, -1]] != Kind.BLANK).any(axis=1).all() for block in blocks):
        return 0, height  # the usual case
    filled = np.zeros(height, bool)
    for block in blocks:
        for index in range(block.column_count):
            filled |= block.kinds[:, index] != Kind.BLANK
    rows = np.flatnonzero(filled)
    return (int(rows[0]), int(rows[-1]) + 1) if len(rows) else (0, 0)


def _date_rules(sources: list[Source], dates: str, date_predictors: Collection[str]) -> DateRules:
    predictors = [source for source in sources if source.role.startswith("predictor")]
    allowed = set()
    for name in date_predictors:
        found = [source.name for source in predictors if _is_called(source, name)]
        if not found:
            there = [source.name for source in predictors]
            raise ArgumentError(
                f"No predictor is called {shown(name)}{suggestion(name, there)}; the predictors are {', '.join(there)}."
            )
        allowed.update(found)
    return DateRules(dates == "check", frozenset(allowed))


def _tie_remarks(order: Column | CategoryColumn | None) -> list[str]:
    if not isinstance(order, Column) or len(order.values) < 2:
        return []
    ordered = np.sort(order.values)
    same = ordered[1:] == ordered[:-1]
    tied = int(np.count_nonzero(np.append(same, False) | np.append(False, same)))
    if not tied:
        return []
    return [
        f"{tied:,} rows share their value of the order {order.name} with another row; these keep the sheet's order."
    ]


def _require_shapes(response: Block, predictors: Block, order: Block | None) -> None:
    for block, role in ((response, "response"), (order, "order")):
        if block is not None and block.column_count != 1:
            hint = "; it lies on its side: turn it with TRANSPOSE" if block.row_count == 1 < block.column_count else ""
            raise BlockShapeError(
                f"The {role} has {block.column_count} columns where one is allowed{hint}; give one column."
            )
    if predictors.column_count == 0:
        raise BlockShapeError("There is no predictor column; give at least one column beside the response.")
    for block, role in ((predictors, "predictors have"), (order, "order has")):
        if block is not None and block.row_count != response.row_count:
            raise BlockShapeError(
                f"The response has {response.row_count:,} rows and the {role} {block.row_count:,}; give ranges of "
                "equal height."
            )
