"""Formulas with our functions that Calc loaded as text it does not know, set again so that they calculate.

They come from .xlsx files that other programs saved: plain names, names with the prefixes of programs that did not
know them, calls into an add-in. Such a cell shows its stored value until something recalculates it, then #NAME?.
25.2 understands plain names by itself, but shows what the other program stored, so they are set again there too.
What is set again means the same as before; so the document counts as unchanged and there is nothing to undo.
"""

from __future__ import annotations

import re
from contextlib import contextmanager, suppress

from com.sun.star.uno import Exception as UnoException
from sheetfuncs_bridge import messages
from sheetfuncs_bridge.documents import frame_of, known_names, local_path
from sheetfuncs_bridge.external_links import linked_files
from sheetfuncs_bridge.spellings import CALC_PREFIX, Spellings, calls, leads_to_our_addin

FORMULA = 16  # com.sun.star.sheet.CellFlags
_UNKNOWN_SIGN = "fit_"  # stands in each spelling but the one that Calc has for functions that it knows
_SIGN = re.compile(f"{_UNKNOWN_SIGN}|{re.escape(CALC_PREFIX)}", re.IGNORECASE)
_MAYBE_UNKNOWN = re.compile(r"[a-z][\w.]*\(|\]!")
OWN_FILTER = "calc"  # calc8, calc8_template: OpenDocument; all others begin otherwise
MOST_CELLS = 20_000  # read at once
_CONDITION = 0  # com.sun.star.sheet.ConditionEntryType


def set_again(model) -> int:
    """Set the formulas of a document again that name our functions and are not understood; returns how many."""
    formulas = _Formulas(model)
    found = [*formulas.cells(), *formulas.rules()]
    names = list(formulas.names())
    if not found and not names:
        return 0
    with _unnoticed(model):
        left = sum(not _done(change) for change in found)
        if names and not formulas.any_unknown():  # a change of names makes Calc read every formula again
            left += sum(not _done(change) for change in names)
    if left:
        messages.show_status(
            frame_of(model),
            f"{left} formulas with FIT_ functions are on protected sheets and keep their stored values: take the "
            "protection off, save, and open the workbook again.",
        )
    return len(found) + len(names) - left


def names_ours(model) -> bool:
    """Whether some cell's formula names a function of ours."""
    return any(True for sheet in _sheets_of(model) for _ in _formulas_with(_SIGN, sheet))


class _Formulas:
    """The formulas of a document that are to be set again, each as a Change."""

    def __init__(self, model):
        self._model = model
        self._spellings = Spellings(known_names())
        self._links = None
        self._sheets = _sheets_of(model)
        self._foreign = not str(_arguments(model).get("FilterName", "")).startswith(OWN_FILTER)

    def cells(self):
        """Of cells; an array formula once, for all its cells."""
        for sheet in self._sheets:
            seen = set()
            for cells, rows in _formulas_with(_SIGN, sheet):
                for row, texts in enumerate(rows):
                    for column, text in enumerate(texts):
                        plain = self._plain(text)
                        if plain is None:
                            continue
                        cell = cells.getCellByPosition(column, row)
                        if not text.startswith("{"):
                            yield _Change(cell, "Formula", plain)
                            continue
                        whole = sheet.createCursorByRange(cell)
                        whole.collapseToCurrentArray()
                        address = whole.getRangeAddress()
                        if (address.StartRow, address.StartColumn) not in seen:
                            seen.add((address.StartRow, address.StartColumn))
                            yield _Change(whole, "ArrayFormula", plain[1:-1])

    def rules(self):
        """Of conditional formats."""
        for sheet in self._sheets:
            for rule in sheet.ConditionalFormats.getConditionalFormats():
                for place in range(rule.getCount()):
                    entry = rule.getByIndex(place)
                    if entry.getType() == _CONDITION:
                        yield from self._changes(entry, "Formula1", "Formula2")

    def names(self):
        """Of defined names, of the document and of each sheet."""
        for owner in (self._model, *self._sheets):
            for name in owner.NamedRanges.getElementNames():
                yield from self._changes(owner.NamedRanges.getByName(name), "Content")

    def any_unknown(self) -> bool:
        """Whether some cell calls what Calc does not know."""
        return any(
            _has_unknown(text)
            for sheet in self._sheets for _, rows in _formulas_with(_MAYBE_UNKNOWN, sheet)
            for texts in rows for text in texts if _MAYBE_UNKNOWN.search(text)
        )

    def _changes(self, owner, *properties):
        for name in properties:
            plain = self._plain(getattr(owner, name))
            if plain is not None:
                yield _Change(owner, name, plain)

    def _plain(self, text: str):
        """The formula with plain names, or None where it stays: Calc itself saved the value of what it understands, or
        there is something else that it does not."""
        if not _SIGN.search(text) or not (self._foreign or _UNKNOWN_SIGN in text.lower()):
            return None
        plain = self._spellings.plain(text, self._is_ours)
        return None if plain == text or _has_unknown(plain) else plain

    def _is_ours(self, link: int) -> bool:
        if self._links is None:
            path = local_path(self._model)
            self._links = [] if path is None else linked_files(path)
        return link > len(self._links) or all(map(leads_to_our_addin, self._links[link - 1]))


class _Change:
    """A property of a cell, range, rule or name, and the formula that it is to hold."""

    def __init__(self, owner, name: str, formula: str):
        self.owner, self.name, self.formula = owner, name, formula


def _arguments(model) -> dict:
    return {one.Name: one.Value for one in model.getArgs()}


def _sheets_of(model) -> list:
    sheets = model.getSheets()
    return [sheets.getByIndex(place) for place in range(sheets.getCount())]


def _has_unknown(formula: str) -> bool:
    """Whether it calls what Calc does not know: such names it writes in small letters."""
    return any(call.link is not None or call.name != call.name.upper() for call in calls(formula))


def _done(change: _Change) -> bool:
    """Set the formula; whether that worked. Array formulas on protected sheets are refused, without a word."""
    try:
        setattr(change.owner, change.name, change.formula)
    except UnoException:
        return False
    return change.name != "ArrayFormula" or not _has_unknown(change.owner.getArrayFormula())


def _formulas_with(pattern, sheet):
    """(cells, rows of their formulas) for every block of formula cells that has something of a pattern in it.

    A search would be a little faster, but passes over rows that a filter hides.
    """
    found = sheet.queryContentCells(FORMULA)
    for place in range(found.getCount()):
        block = found.getByIndex(place)
        address = block.getRangeAddress()
        width, height = address.EndColumn - address.StartColumn + 1, address.EndRow - address.StartRow + 1
        step = max(1, MOST_CELLS // width)
        for top in range(0, height, step):
            piece = block.getCellRangeByPosition(0, top, width - 1, min(top + step, height) - 1)
            rows = piece.getFormulaArray()
            if pattern.search("\n".join(map("\n".join, rows))):
                yield piece, rows


@contextmanager
def _unnoticed(model):
    """Changes that leave no trace: nothing to undo, no question whether to save, one calculation at the end."""
    modified, calculates = model.isModified(), model.isAutomaticCalculationEnabled()
    undo = model.getUndoManager()
    undo.lock()
    model.enableAutomaticCalculation(False)  # one at a time, each formula would read its ranges anew
    model.addActionLock()
    model.lockControllers()
    try:
        yield
    finally:
        model.enableAutomaticCalculation(calculates)
        model.unlockControllers()
        model.removeActionLock()
        undo.unlock()
        if not modified:
            with suppress(UnoException):  # a document that is read only
                model.setModified(False)
