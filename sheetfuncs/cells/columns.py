"""What a column of cells may hold in each role, and the sentence for what it may not."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from sheetfuncs.cells.block import Kind
from sheetfuncs.cells.source import Source
from sheetfuncs.cells.stored_text import reads_as_number, shown
from sheetfuncs.errors import ArgumentError, CellKindError, CollinearPredictorsError

MOST_LEVELS = 12


@dataclass(frozen=True, eq=False)
class Column:
    """One numeric column of the used rows: float64 (n,)."""

    name: str
    values: np.ndarray


@dataclass(frozen=True, eq=False)
class CategoryColumn:
    """One text column of the used rows. levels in order of appearance, the base first; codes: int64 (n,)."""

    name: str
    levels: tuple[str, ...]
    codes: np.ndarray


@dataclass(frozen=True)
class DateRules:
    """Whether dates are plain numbers, or refused as predictors unless named here."""

    refuse: bool = False
    allowed: frozenset[str] = frozenset()


def is_category(source: Source, counts: Sequence[int]) -> bool:
    """Whether every filled cell of a predictor is text (errors aside). counts: cells of each Kind."""
    return source.role.startswith("predictor") and counts[Kind.TEXT] > 0 and not _numeric(counts)


def _numeric(counts: Sequence[int]) -> int:
    return counts[Kind.NUMBER] + counts[Kind.BOOLEAN] + counts[Kind.DATE]


def require_numbers(source: Source, start: int, end: int, counts: Sequence[int]) -> None:
    """Refuse text in a numeric column, naming its first cell. start, end: the data rows."""
    if not counts[Kind.TEXT]:
        return
    position = start + int(np.argmax(source.kinds[start:end] == Kind.TEXT))
    text = source.texts[position]
    more = counts[Kind.TEXT] - 1
    cells = "1 more cell of the column holds" if more == 1 else f"{more:,} more cells of the column hold"
    others = f", and {cells} text too" if more else ""
    where = f"{source.cell(position)}"
    if source.block.sheet is not None:
        where += f", in {source.label},"
    if not text.strip():
        raise CellKindError(
            f"{where} holds nothing but spaces, which count as text{others}; clear the cell to leave the row out."
        )
    if reads_as_number(text):
        raise CellKindError(
            f"{where} holds {shown(text)}, a number stored as text{others}; turn it into a real number (in the "
            "spreadsheet: Data, Text to Columns, Finish) and try again."
        )
    numbers = _numeric(counts)
    among = f"among {numbers:,} number{'s' if numbers > 1 else ''}" if numbers else "where numbers are needed"
    raise CellKindError(
        f"{where} holds the text {shown(text)} {among}{others}; put a number there, or clear the cell to leave the "
        "row out."
    )


def check_dates(source: Source, start: int, end: int, counts: Sequence[int], rules: DateRules) -> str | None:
    """Refuse dates that nobody asked for; returns a remark where they count as days."""
    dates = counts[Kind.DATE]
    if not dates or not rules.refuse or source.role == "order":
        return None
    position = start + int(np.argmax(source.kinds[start:end] == Kind.DATE))
    asked = source.name in rules.allowed
    if not asked and counts[Kind.NUMBER]:
        raise CellKindError(
            f"{source.cell(position)}{'' if source.block.sheet is None else f', in {source.label},'} is a date or time "
            f"among {counts[Kind.NUMBER]:,} plain numbers; a value such as 3-4 may have been taken for a date: enter "
            "it again, or format the column as numbers."
        )
    if not asked and source.role != "response":
        raise CellKindError(
            f"{source.label} holds dates or times (first in {source.cell(position)}), which are no predictor unless "
            f"asked for: leave it out of the range, or name it as the time order (--order {source.name}) or, if days "
            f"themselves are meant, as a predictor (--date-predictor {source.name})."
        )
    return f"{source.label} holds dates or times; they count in days."


def boolean_remark(source: Source, counts: Sequence[int]) -> str | None:
    """A remark where TRUE and FALSE count as 1 and 0."""
    if not counts[Kind.BOOLEAN]:
        return None
    return f"{source.label} holds TRUE and FALSE; they count as 1 and 0."


def read_category(source: Source, positions: np.ndarray, base: str | None) -> tuple[CategoryColumn, list[str]]:
    """The levels and codes of a text column at the used positions, and remarks on levels that look alike."""
    texts = source.texts[positions].tolist()
    _refuse_stored_numbers(source, positions, texts)
    place: dict[str, int] = {}
    codes = np.fromiter((place.setdefault(text, len(place)) for text in texts), np.int64, len(texts))
    levels = list(place)
    _refuse_levels(source, levels, len(texts))
    if base is not None and base != levels[0]:
        if base not in place:
            raise ArgumentError(
                f"{source.label} has no level {shown(base)}{suggestion(base, levels)}; its levels are "
                f"{', '.join(map(shown, levels))}."
            )
        order = [place[base], *(code for code in range(len(levels)) if code != place[base])]
        new_code = np.empty(len(levels), np.int64)
        new_code[order] = np.arange(len(levels))
        codes, levels = new_code[codes], [levels[code] for code in order]
    return CategoryColumn(source.name, tuple(levels), codes), _alike_remarks(source, levels)


def _refuse_stored_numbers(source: Source, positions: np.ndarray, texts: list[str]) -> None:
    bad = {text for text in set(texts) if reads_as_number(text)}
    if not bad:
        return
    first = next(place for place, text in enumerate(texts) if text in bad)
    count = sum(text in bad for text in texts)
    cells = "one such cell" if count == 1 else f"{count:,} such cells"
    raise CellKindError(
        f"{source.cell(int(positions[first]))} holds {shown(texts[first])}, a number stored as text ({cells} in "
        f"{source.label}); turn the column into real numbers (in the spreadsheet: Data, Text to Columns, Finish), or, "
        "if it is a category, into words such as “line 3”."
    )


def _refuse_levels(source: Source, levels: list[str], rows: int) -> None:
    if len(levels) == 1 < rows:
        raise CollinearPredictorsError(
            f"{source.label} holds the text {shown(levels[0])} in every used row, so it explains nothing; leave it out "
            "of the predictors.",
            (source.name,),
        )
    if len(levels) == rows:
        raise CellKindError(
            f"{source.label} holds a different text in every used row ({shown(levels[0])}, ...), like a list of names; "
            "such a column cannot explain anything: leave it out of the range, or name the others (--predictors A,B)."
        )
    if len(levels) > MOST_LEVELS:
        raise CellKindError(
            f"{source.label} is text with {len(levels):,} different values ({', '.join(map(shown, levels[:3]))}, ...); "
            f"a category may have at most {MOST_LEVELS}: group them, leave the column out of the range, or name the "
            "others (--predictors A,B)."
        )


def _alike_remarks(source: Source, levels: Iterable[str]) -> list[str]:
    groups: dict[str, list[str]] = {}
    for level in levels:
        groups.setdefault(" ".join(level.split()).casefold(), []).append(level)
    remarks = [
        f"{source.label}: the levels {' and '.join(map(shown, alike))} differ only in spaces or capitals, and count as "
        "different."
        for alike in groups.values()
        if len(alike) > 1
    ]
    if "" in groups:
        remarks.append(f"{source.label} has a level that is nothing but spaces.")
    return remarks


def suggestion(wanted: str, there: Iterable[str]) -> str:
    """ " (did you mean ...?)" where something close is there, else nothing."""
    names: Mapping[str, str] = {name.casefold(): name for name in there}
    close = difflib.get_close_matches(wanted.casefold(), list(names), 1, 0.65)
    return f" (did you mean {shown(names[close[0]])}?)" if close else ""
