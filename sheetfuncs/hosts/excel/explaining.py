"""Why a cell with one of our functions shows what it shows."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

from sheetfuncs.cells.address import cell_name, is_address, parse_area
from sheetfuncs.cells.block import ERROR_TEXTS, Block
from sheetfuncs.errors import AddressError, ArgumentError, SheetfuncsError
from sheetfuncs.functions.evaluate import find_function
from sheetfuncs.functions.explain_call import gives, rows_behind, stopped
from sheetfuncs.functions.formula import ParsedCall, RangeText, parse_formula
from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.hosts.excel.functions import unexpected_failure
from sheetfuncs.hosts.excel.native import ask, on_mac
from sheetfuncs.hosts.excel.ranges import read_block, within_used

if TYPE_CHECKING:
    import xlwings as xw

_OURS = re.compile(rf"\b(?:{'|'.join(map(re.escape, sorted(REGISTRY, key=len, reverse=True)))})\s*\(", re.IGNORECASE)
_IN_QUOTES = re.compile(r'"(?:[^"]|"")*"|\'(?:[^\']|\'\')*\'')


def explain_cell(cell: xw.Range) -> str:
    """One or more sentences on the value of a cell that calls one of our functions.

    Raises AddressError for a cell that does not, ArgumentError for a formula that cannot be read.
    """
    where = cell_name(cell.row, cell.column, cell.sheet.name)
    calls = calls_in(_formula_of(cell))
    if not calls:
        raise AddressError(
            f"{where} holds no function of sheetfuncs: select one cell with a FIT_ formula, and press the button again."
        )
    texts = [_explain(call, cell) for call in calls]
    return f"{where}: " + "\n\n".join(dict.fromkeys(texts))


def calls_in(formula: str) -> list[str]:
    """Every call of one of our functions in a formula, from its name to its closing bracket."""
    bare = _IN_QUOTES.sub(lambda quoted: " " * len(quoted[0]), formula)
    found, place = [], 0
    while match := _OURS.search(bare, place):
        place = _closing(bare, match.end())
        found.append(formula[match.start() : place])
    return found


def _closing(bare: str, place: int) -> int:
    """The place behind the bracket that closes what was opened before `place`."""
    depth = 1
    for bracket in re.finditer("[()]", bare[place:]):
        depth += 1 if bracket[0] == "(" else -1
        if depth == 0:
            return place + bracket.end()
    return len(bare)


def _formula_of(cell: xw.Range) -> str:
    """The formula behind a cell, also where it is filled from a formula above or beside it."""
    formula = str(cell.formula or "")
    parent = None if on_mac() or formula.startswith("=") else ask(cell, "SpillParent", "")
    return str(parent.Formula) if parent is not None else formula


def _explain(text: str, cell: xw.Range) -> str:
    call = parse_formula(text)
    function = find_function(call.name)
    if len(call.arguments) > len(function.arguments):
        raise ArgumentError(
            f"{function.name} takes at most {len(function.arguments)} arguments and {len(call.arguments)} were given: "
            f"{function.signature}."
        )
    given = _given(call, cell)
    refused = stopped(call.name, given)
    if refused:
        return refused
    if read_block(cell).value(0, 0) not in ERROR_TEXTS or rows_behind(call.name, given):
        return gives(call.name, given)
    kept = unexpected_failure(call.name)
    return f"{call.name} gives a value now: have the sheet calculated again." + (f" Before: {kept}" if kept else "")


def _given(call: ParsedCall, cell: xw.Range) -> list[object]:
    blocks: dict[str, Block] = {}
    given: list[object] = []
    for argument in call.arguments:
        if isinstance(argument, RangeText):
            if argument.text not in blocks:
                blocks[argument.text] = read_block(_range_called(argument.text, cell))
            given.append(blocks[argument.text])
        else:
            given.append(argument)
    return given


def _range_called(text: str, cell: xw.Range) -> xw.Range:
    """The range that a formula's text means, seen from the cell that holds it."""
    from sheetfuncs.hosts.excel.sheets import sheet_called

    area = parse_area(text) if is_address(text.rstrip("#")) and not text.endswith("#") else None
    sheet = cell.sheet if area is None or area.sheet is None else sheet_called(cell.sheet.book, area.sheet)
    try:
        return within_used(sheet.range(text if area is None else str(area.without_sheet())))
    except SheetfuncsError:
        raise
    except Exception:
        raise AddressError(
            f"Excel does not find {text!r} here: give a range of this workbook, such as Jobs!C4:F64."
        ) from None
