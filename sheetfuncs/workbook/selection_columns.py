"""Which columns of a selected range are the response, the predictors and the order."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass, replace

import numpy as np

from sheetfuncs.cells.address import Area, column_letters, format_area
from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.columns import suggestion
from sheetfuncs.cells.source import header_text, predictors_say_header
from sheetfuncs.cells.stored_text import shown
from sheetfuncs.errors import ArgumentError, BlockShapeError
from sheetfuncs.workbook.read import Book
from sheetfuncs.workbook.read_gather import SheetCells
from sheetfuncs.workbook.regions import below_titles

_EARLIEST_DATE = 366.0  # below it a date format shows a time of day or a duration, which is no time order


@dataclass(frozen=True)
class Selection:
    """The area that was meant, and one sentence for each thing that was decided on the way."""

    area: Area
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True, eq=False)
class SelectedColumns:
    """One column of response, the predictors, perhaps one column of order, all of one height, and their area."""

    response: Block
    predictors: Block
    order: Block | None
    remarks: tuple[str, ...]
    area: Area


def read_selection(
    book: Book,
    where: Area | Selection,
    *,
    response: str | None = None,
    predictors: Sequence[str] | None = None,
    order: str | None = None,
    date_predictors: Collection[str] = (),
) -> SelectedColumns:
    """The response, the predictors and perhaps the order of a range, with a remark for each thing that was decided.

    Columns are named by header or by letter. Without names the response is the first column and the predictors are
    all others; columns without values are skipped; a single column of dates that nobody named becomes the order.
    Raises ArgumentError for a name that is not there or used twice, BlockShapeError where no predictor is left.
    """
    area = where if isinstance(where, Area) else where.area
    earlier = () if isinstance(where, Area) else where.remarks
    cells = book.read_cells(area)
    block, titles = (cells.block, []) if area.last_row is not None else below_titles(cells.block)
    chosen = _Columns(block)
    chosen.choose(response, predictors, order, date_predictors)
    remarks = [*earlier, *titles, *chosen.remarks, *_formula_remarks(book, cells, chosen.used, chosen)]
    return chosen.selected(tuple(remarks), area)


def select_columns(
    block: Block,
    *,
    response: str | None = None,
    predictors: Sequence[str] | None = None,
    order: str | None = None,
    date_predictors: Collection[str] = (),
) -> SelectedColumns:
    """The same for a block of cells that a running program hands over. Arguments and errors as of `read_selection`."""
    chosen = _Columns(block)
    chosen.choose(response, predictors, order, date_predictors)
    last_row, last_column = block.first_row + block.row_count - 1, block.worksheet_column(block.column_count - 1)
    area = Area(block.sheet, block.first_row, block.first_column, last_row, last_column)
    return chosen.selected(tuple(chosen.remarks), area)


class _Columns:
    """The columns of a block by header and letter, and the parts they take."""

    def __init__(self, block: Block):
        self.block = block
        self.remarks: list[str] = []
        self.response = 0
        self.predictors: list[int] = []
        self.order: int | None = None
        filled = np.logical_or.reduce(block.kinds != Kind.BLANK, axis=1) if block.column_count else np.zeros(0, bool)
        rows = np.flatnonzero(filled)
        if not len(rows):
            raise BlockShapeError(f"{self._where()} is empty; give the range that holds the data.")
        start = int(rows[0])
        self.has_header = predictors_say_header(block, start)
        self.first_data_row = start + self.has_header
        self.headers = [
            header_text(block, start, index) if self.has_header or block.kinds[start, index] == Kind.TEXT else None
            for index in range(block.column_count)
        ]

    def choose(
        self,
        response: str | None,
        predictors: Sequence[str] | None,
        order: str | None,
        date_predictors: Collection[str],
    ) -> None:
        named_response = None if response is None else self._place(response, "response")
        named_predictors = None if predictors is None else [self._place(name, "predictor") for name in predictors]
        named_dates = [self._place(name, "date predictor") for name in date_predictors]
        self.order = None if order is None else self._place(order, "order")
        named = {named_response, self.order, *(named_predictors or ()), *named_dates}
        self._refuse_doubles(named_response, named_predictors)
        free = self._without_empty([index for index in range(self.block.column_count) if index not in named])
        if self.order is None:
            self._choose_order(free)
        free = [index for index in free if index != self.order]
        if named_response is None:
            candidates = [index for index in free if index not in named_dates]
            if not candidates:
                raise BlockShapeError(f"No column is left for the response in {self._where()}; give a wider range.")
            named_response = candidates[0]
            if named_response != 0:
                self.remarks.append(f"{_capital(self.label(named_response))} is the response, the first column left.")
        self.response = named_response
        others = sorted({*free, *named_dates} - {self.response})
        self.predictors = others if named_predictors is None else named_predictors
        if not self.predictors:
            raise BlockShapeError(
                f"{self._where()} leaves no predictor beside the response, {self.label(self.response)}; give a range "
                "that holds the predictors too."
            )

    @property
    def used(self) -> list[int]:
        return [self.response, *self.predictors, *([] if self.order is None else [self.order])]

    def selected(self, remarks: tuple[str, ...], area: Area) -> SelectedColumns:
        block = self.block
        order = None if self.order is None else block.columns([self.order])
        return SelectedColumns(
            block.columns([self.response]), block.columns(self.predictors), order, remarks,
            replace(area, sheet=block.sheet),
        )

    def _place(self, name: str, what: str) -> int:
        wanted = " ".join(name.split())
        for fold in (str, str.casefold):
            places = [i for i, header in enumerate(self.headers) if header is not None and fold(header) == fold(wanted)]
            if len(places) > 1:
                letters = " and ".join(self.letters(place) for place in places)
                raise ArgumentError(f"{shown(name)} heads the columns {letters}; name the {what} by its letter.")
            if places:
                return places[0]
        for place in range(self.block.column_count):
            if self.letters(place) == wanted.upper():
                return place
        there = [header or self.letters(place) for place, header in enumerate(self.headers)]
        raise ArgumentError(
            f"The {what} {shown(name)} is no column of {self._where()}{suggestion(wanted, there)}; its columns are "
            f"{', '.join(there[:20])}{', ...' if len(there) > 20 else ''} (headers, or their letters)."
        )

    def _refuse_doubles(self, response: int | None, predictors: list[int] | None) -> None:
        for index in predictors or ():
            if index == response:
                raise ArgumentError(f"{_capital(self.label(index))} is named as response and as predictor; choose one.")
            if (predictors or []).count(index) > 1:
                raise ArgumentError(f"{_capital(self.label(index))} is named twice among the predictors; name it once.")

    def _without_empty(self, indices: list[int]) -> list[int]:
        """The columns that hold anything below the header; says which do not."""
        filled = [bool((self.block.kinds[self.first_data_row :, index] != Kind.BLANK).any()) for index in indices]
        empty = [index for index, full in zip(indices, filled, strict=True) if not full]
        if len(empty) == 1:
            self.remarks.append(f"{_capital(self.label(empty[0]))} has no values and was skipped.")
        elif empty:
            self.remarks.append(f"Columns {', '.join(self._spans(empty))} have no values and were skipped.")
        return [index for index, full in zip(indices, filled, strict=True) if full]

    def _spans(self, indices: list[int]) -> list[str]:
        spans: list[list[int]] = []
        for index in indices:
            if spans and spans[-1][-1] == index - 1:
                spans[-1].append(index)
            else:
                spans.append([index])
        return [
            self.letters(span[0]) if len(span) == 1 else f"{self.letters(span[0])} to {self.letters(span[-1])}"
            for span in spans
        ]

    def _choose_order(self, free: list[int]) -> None:
        """A single column of dates that nobody named says the time order."""
        dates = [index for index in free if self._holds_dates(index)]
        if len(dates) == 1:
            self.order = dates[0]
            self.remarks.append(
                f"{_capital(self.label(dates[0]))} holds dates and was taken as the time order of the rows; to use "
                "it as a predictor, say so under Settings on the sheet, or with --date-predictor."
            )

    def _holds_dates(self, index: int) -> bool:
        kinds = self.block.kinds[self.first_data_row :, index]
        dates = kinds == Kind.DATE
        if not dates.any() or not (dates | (kinds == Kind.BLANK) | (kinds == Kind.ERROR)).all():
            return False
        return bool(np.min(self.block.numbers[self.first_data_row :, index][dates]) >= _EARLIEST_DATE)

    def letters(self, index: int) -> str:
        return column_letters(self.block.worksheet_column(index))

    def label(self, index: int) -> str:
        header = self.headers[index] if self.has_header else None
        return f"column {self.letters(index)} ({header})" if header else f"column {self.letters(index)}"

    def _where(self) -> str:
        block = self.block
        last_row, last_column = block.first_row + block.row_count - 1, block.first_column + block.column_count - 1
        return format_area(
            Area(
                block.sheet,
                block.first_row,
                block.first_column,
                max(last_row, block.first_row),
                max(last_column, block.first_column),
            )
        )


def _formula_remarks(book: Book, cells: SheetCells, used: list[int], columns: _Columns) -> list[str]:
    """Formulas without stored values, and formulas whose stored values all are the zeros of a place holder."""
    remarks = []
    for index in dict.fromkeys(used):
        unstored, formulas = int(cells.unstored[index]), int(cells.formulas[index])
        if unstored:
            what = "1 formula cell" if unstored == 1 else f"{unstored:,} formula cells"
            verb = "holds" if unstored == 1 else "hold"
            remarks.append(
                f"{what} of {columns.label(index)} {verb} no stored value and count{'s' if unstored == 1 else ''} as "
                "blank: open and save the workbook in a spreadsheet program first."
            )
        elif book.calculates_on_load and formulas > 1 and not _any_other_than_zero(columns, index):
            remarks.append(
                f"The formulas of {columns.label(index)} all store 0 and may never have been calculated: open and save "
                "the workbook in a spreadsheet program first."
            )
    return remarks


def _any_other_than_zero(columns: _Columns, index: int) -> bool:
    block, rows = columns.block, slice(columns.first_data_row, None)
    return bool(((block.numbers[rows, index] != 0.0) & (block.kinds[rows, index] != Kind.BLANK)).any())


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]
