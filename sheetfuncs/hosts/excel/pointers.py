"""Formulas and names elsewhere in the workbook that point at one of our sheets, kept while the sheet is replaced.

Excel turns whatever points at a deleted sheet into #REF!. The new sheet has the title of the old one, so that the same
formula, entered again, points at the new one.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, cast

from sheetfuncs.cells.address import cell_name, quote_sheet
from sheetfuncs.hosts.excel.native import ask
from sheetfuncs.hosts.excel.values import two_dimensional
from sheetfuncs.report.elements import quoted

if TYPE_CHECKING:
    import xlwings as xw


@dataclass(frozen=True)
class Pointer:
    """A cell with a formula. property: how xlwings calls the formula, "formula2" where it fills cells beside it."""

    cell: xw.Range
    property: str
    formula: str


@dataclass
class Pointers:
    """names: with what they refer to. arrays: where array formulas of the older kind stand, which are reported only."""

    cells: list[Pointer] = field(default_factory=list)
    names: list[tuple[xw.Name, str]] = field(default_factory=list)
    arrays: list[str] = field(default_factory=list)

    def put_back(self) -> tuple[str, ...]:
        """Enter the formulas again; returns where that was not possible."""
        lost = list(self.arrays)
        for pointer in self.cells:
            try:
                setattr(pointer.cell, pointer.property, pointer.formula)
            except Exception:  # on a protected sheet, say
                lost.append(_where(pointer.cell))
        for name, formula in self.names:
            try:
                name.refers_to = formula
            except Exception:
                lost.append(name.name)
        return tuple(lost)


def pointers_to(target: xw.Sheet, *, besides: xw.Sheet) -> Pointers:
    """What points at a sheet from other sheets and from names of the workbook; besides: the sheet that follows it."""
    wanted = tuple({f"{text}!".casefold() for text in (quoted(target.name), quote_sheet(target.name))})
    found = Pointers()
    for sheet in target.book.sheets:
        if sheet.name not in (target.name, besides.name):
            for cell, formula in _formulas(sheet):
                if any(text in formula.casefold() for text in wanted):
                    _add(found, cell, formula)
    for name in target.book.names:
        formula = name.refers_to or ""
        if "!" not in name.name and any(text in formula.casefold() for text in wanted):
            found.names.append((name, formula))
    return found


def _add(found: Pointers, cell: xw.Range, formula: str) -> None:
    if ask(cell, "HasSpill", "has_spill"):
        found.cells.append(Pointer(cell, "formula2", str(cell.formula2)))
    elif cell.has_array:
        found.arrays.append(_where(cell))
    else:
        found.cells.append(Pointer(cell, "formula", formula))


def _formulas(sheet: xw.Sheet) -> Iterator[tuple[xw.Range, str]]:
    """Every cell of the sheet that holds a formula."""
    used = sheet.used_range
    try:
        areas = cast("list[xw.Range]", used.get_special_cells("formulas"))
    except Exception:  # a protected sheet does not tell them apart
        areas = [used]
    for area in areas:
        for i, row in enumerate(two_dimensional(area.formula)):
            for j, text in enumerate(row):
                if isinstance(text, str) and text.startswith("="):
                    yield area[i, j], text


def _where(cell: xw.Range) -> str:
    return cell_name(cell.row, cell.column, cell.sheet.name)
