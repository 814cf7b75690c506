"""One column of a block together with how a sentence speaks of it, and the header rows that name it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from sheetfuncs.cells.address import cell_name, column_letters
from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.serial_dates import text_of_serial
from sheetfuncs.cells.stored_text import on_one_line, reads_as_number


@dataclass(frozen=True, eq=False)
class Source:
    """One column of a block. role: "response", "predictor 2" or "order". label: "column C (Weight)"."""

    block: Block
    index: int
    role: str
    name: str
    label: str

    @property
    def kinds(self) -> np.ndarray:
        return self.block.kinds[:, self.index]

    @property
    def numbers(self) -> np.ndarray:
        return self.block.numbers[:, self.index]

    @property
    def texts(self) -> np.ndarray:
        return self.block.texts[self.index]

    @property
    def letters(self) -> str:
        return column_letters(self.block.worksheet_column(self.index))

    def cell(self, position: int) -> str:
        """How a sentence names one cell (0-based position): "Jobs!C17", or "row 17 of predictor 2"."""
        row = self.block.first_row + position
        if self.block.sheet is None:
            return f"row {row} of {self.label}"
        return cell_name(row, self.block.worksheet_column(self.index), self.block.sheet)


def make_sources(
    roles: Sequence[tuple[Block, int, str]], header: int | None, names: Sequence[str] | None
) -> list[Source]:
    """One source a column, named by the header row (0-based position), else by letter or role.

    Equal names get the column's letters (or its role) behind them. `names` replaces every name.
    """
    sources = []
    for place, (block, index, role) in enumerate(roles):
        found = header_text(block, header, index) if header is not None else None
        name, label = _name_and_label(block, index, role, names[place] if names is not None else found)
        sources.append(Source(block, index, role, name, label))
    return _with_unique_names(sources)


def _name_and_label(block: Block, index: int, role: str, name: str | None) -> tuple[str, str]:
    if block.sheet is None:
        return name or role, f"{role} ({name})" if name and name != role else role
    letters = column_letters(block.worksheet_column(index))
    return name or letters, f"column {letters} ({name})" if name and name != letters else f"column {letters}"


def _with_unique_names(sources: list[Source]) -> list[Source]:
    taken = [source.name for source in sources if source.role != "order"]  # which may repeat a predictor
    if len(set(taken)) == len(taken):
        return sources
    return [
        replace(source, name=f"{source.name} ({source.role if source.block.sheet is None else source.letters})")
        if source.role != "order" and taken.count(source.name) > 1
        else source
        for source in sources
    ]


def header_text(block: Block, position: int, index: int) -> str | None:
    """A header cell's text on one line; numbers and dates as text; None for a blank or an error."""
    kind = block.kinds[position, index]
    if kind == Kind.TEXT:
        return on_one_line(block.text(position, index) or "") or None
    number = float(block.numbers[position, index])
    if kind == Kind.BOOLEAN:
        return "TRUE" if number else "FALSE"
    if kind == Kind.DATE:
        return text_of_serial(number, block.date1904)
    return f"{number:.15g}" if kind == Kind.NUMBER else None


def is_text_above_numbers(block: Block, start: int, index: int) -> bool:
    """Whether the cell at `start` is text and the next one below that is neither blank nor an error is no text.

    Text above nothing at all counts too: a header without data.
    """
    if block.kinds[start, index] != Kind.TEXT:
        return False
    below = block.kinds[start + 1 :, index]
    for length in (8, len(below)):  # nearly always among the first few
        filled = below[:length][(below[:length] != Kind.BLANK) & (below[:length] != Kind.ERROR)]
        if len(filled):
            return bool(filled[0] != Kind.TEXT)
    return True


def response_says_header(response: Block, others: Sequence[Block], start: int) -> bool:
    """Whether row `start` is a header row, by the response: text above numbers.

    Text that itself reads as a number, beside numbers everywhere else, is a number stored as text and no header.
    """
    if not is_text_above_numbers(response, start, 0):
        return False
    beside = [kind for block in others for kind in block.kinds[start].tolist()]
    numbers_beside = bool(beside) and all(kind == Kind.NUMBER for kind in beside)
    return not (numbers_beside and reads_as_number(response.text(start, 0) or ""))


def predictors_say_header(block: Block, start: int) -> bool:
    """Whether row `start` is a header row where there is no response to ask.

    It is if some column has text above numbers (text that reads as a number counts only among nothing but text), or
    if every column is text throughout and none of the first texts occurs again below.
    """
    first = block.kinds[start].tolist()
    only_text = all(kind in (Kind.TEXT, Kind.BLANK) for kind in first)
    above = [index for index in range(block.column_count) if is_text_above_numbers(block, start, index)]
    if above:
        return only_text or any(not reads_as_number(block.text(start, index) or "") for index in above)
    if not all(kind == Kind.TEXT for kind in first):
        return False
    rest = [block.texts[index] for index in range(block.column_count)]
    return all(texts[start] not in texts[start + 1 :].tolist() for texts in rest)
