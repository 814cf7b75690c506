"""Formulas with our functions that Calc loaded as text it does not know, set again so that they calculate.

They come from .xlsx files that other programs saved: plain names, names with the prefixes of programs that did not
know them, calls into an add-in. Such a cell shows its stored value until something recalculates it, then #NAME?.
What is set again means the same as before; so the document counts as unchanged and there is nothing to undo.
"""

from __future__ import annotations

from contextlib import contextmanager, suppress

from com.sun.star.uno import Exception as UnoException
from sheetfuncs_bridge import messages
from sheetfuncs_bridge.documents import frame_of, known_names, local_path
from sheetfuncs_bridge.external_links import linked_files
from sheetfuncs_bridge.spellings import Spellings, calls, leads_to_our_addin

FORMULA = 16  # com.sun.star.sheet.CellFlags
SIGN = "FIT_"
_UNKNOWN_CALL = r"[a-z][A-Za-z0-9_.]*\("  # Calc writes the functions that it knows in capitals
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


class _Formulas:
    """The formulas of a document that are to be set again, each as a Change."""

    def __init__(self, model):
        self._model = model
        self._spellings = Spellings(known_names())
        self._links = None
        sheets = model.getSheets()
        self._sheets = [sheets.getByIndex(place) for place in range(sheets.getCount())]

    def cells(self):
        """Of cells; an array formula once, for all its cells."""
        for sheet in self._sheets:
            for cells in _ranges_with(sheet, SIGN):
                seen = set()
                for row, texts in enumerate(cells.getFormulaArray()):
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
        """Whether some cell calls what Calc does not know; a text that looks like such a call counts too."""
        return any(True for sheet in self._sheets for _ in _ranges_with(sheet, _UNKNOWN_CALL, pattern=True))

    def _changes(self, owner, *properties):
        for name in properties:
            plain = self._plain(getattr(owner, name))
            if plain is not None:
                yield _Change(owner, name, plain)

    def _plain(self, text: str):
        """The formula with plain names, or None where it stays: all is understood, or something else is not."""
        if SIGN not in text.upper():
            return None
        plain = self._spellings.plain(text, self._is_ours)
        if plain == text or any(call.link is not None or call.name != call.name.upper() for call in calls(plain)):
            return None
        return plain

    def _is_ours(self, link: int) -> bool:
        if self._links is None:
            path = local_path(self._model)
            self._links = [] if path is None else linked_files(path)
        return link > len(self._links) or all(map(leads_to_our_addin, self._links[link - 1]))


class _Change:
    """A property of a cell, range, rule or name, and the formula that it is to hold."""

    def __init__(self, owner, name: str, formula: str):
        self.owner, self.name, self.formula = owner, name, formula


def _done(change: _Change) -> bool:
    """Set the formula; whether that worked. Array formulas on protected sheets are refused, without a word."""
    try:
        setattr(change.owner, change.name, change.formula)
    except UnoException:
        return False
    return change.name != "ArrayFormula" or SIGN.lower() not in change.owner.getArrayFormula()


def _ranges_with(sheet, wanted: str, *, pattern: bool = False):
    """The ranges of formula cells whose formulas hold a text, or something of a pattern."""
    cells = sheet.queryContentCells(FORMULA)
    if not cells.getCount():
        return
    search = sheet.createSearchDescriptor()
    search.SearchString = wanted
    search.SearchType = 0  # in formulas
    search.SearchRegularExpression = search.SearchCaseSensitive = pattern
    found = cells.findAll(search)
    for place in range(found.getCount() if found is not None else 0):
        yield found.getByIndex(place)


@contextmanager
def _unnoticed(model):
    """Changes that leave no trace: nothing to undo, no question whether to save, one repaint at the end."""
    modified = model.isModified()
    undo = model.getUndoManager()
    undo.lock()
    model.addActionLock()
    model.lockControllers()
    try:
        yield
    finally:
        model.unlockControllers()
        model.removeActionLock()
        undo.unlock()
        if not modified:
            with suppress(UnoException):  # a document that is read only
                model.setModified(False)
