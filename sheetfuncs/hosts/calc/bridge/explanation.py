"""Why a cell holds what it holds: each of our functions in its formula, asked for its reason with the same arguments.

The formula is read as tokens, so that quotes, names and signs of separation are LibreOffice's own business.
"""

from __future__ import annotations

import json

from com.sun.star.uno import Exception as UnoException
from sheetfuncs_bridge.calls import gather, pack_afresh
from sheetfuncs_bridge.chosen import Refusal, column_letters
from sheetfuncs_bridge.client import CELLS, EXTENSION

SERVICE = "org.sheetfuncs.calc.functions."
ONE_CELL = "Select the one cell whose value you ask about: a cell with a formula such as =FIT_DURBIN_WATSON(...)."
REFUSED_BY_LIBREOFFICE = (
    "Err:504 is LibreOffice's own: it did not hand the arguments over. The column of the order must hold no error "
    "value; and data must be ranges of cells, not lists in braces or ranges joined by ~. With the arguments as they "
    "stand in the cells:"
)
_PARAMETER_ERROR = 504
_SPECIAL = 0  # com.sun.star.sheet.FormulaMapGroup, and the places of what follows in FormulaMapGroupSpecialOffset
_PUSH, _NAME, _MISSING, _SPACES = 0, 4, 6, 8
_COLUMN_RELATIVE, _ROW_RELATIVE, _SHEET_RELATIVE, _DELETED = 1, 4, 16, 2 | 8 | 32  # com.sun.star.sheet.ReferenceFlags


def explain(document, controller) -> str:
    """The sentences on the selected cell. Raises Refusal where it holds no function of ours."""
    selection = controller.getSelection()
    if not hasattr(selection, "getRangeAddress"):
        raise Refusal(ONE_CELL)
    cell = selection.getCellByPosition(0, 0)
    address = cell.getCellAddress()
    where = f"{column_letters(address.Column)}{address.Row + 1}"
    formula = _Formula(document, cell)
    calls = formula.calls()
    if not calls:
        raise Refusal(_without_calls(where, cell))
    texts = []
    for name, arguments in calls:
        texts.append(_reason(formula, name, arguments))
    if cell.getError() == _PARAMETER_ERROR:
        texts.insert(0, REFUSED_BY_LIBREOFFICE)
    return f"{where}: " + "\n\n".join(dict.fromkeys(texts))


def _without_calls(where: str, cell) -> str:
    if "FIT_" in cell.getFormula().upper():
        return (
            f"LibreOffice does not know a function in {where}: see in the function wizard how it is written, and type "
            "the formula again."
        )
    return f"{where} holds no function of sheetfuncs. {ONE_CELL}"


def _reason(formula, name: str, arguments) -> str:
    try:
        given = [formula.value_of(tokens) for tokens in arguments]
    except Refusal as refusal:
        return f"{name}: {refusal}"
    head, blocks = gather(name, given, pack_afresh)
    return CELLS.request("explain", head, blocks).head.get("sentence", f"{name}: no answer came.")


class _Formula:
    """The formula of a cell as tokens. With an array formula, seen from the first cell of its range."""

    def __init__(self, document, cell):
        self._document = document
        self._tokens, self._cell = cell.getTokens(), cell
        if cell.getArrayFormula():
            cursor = cell.getSpreadsheet().createCursorByRange(cell)
            cursor.collapseToCurrentArray()
            self._tokens, self._cell = cursor.getArrayTokens(), cursor.getCellByPosition(0, 0)
        self._address = self._cell.getCellAddress()
        mapper = document.createInstance("com.sun.star.sheet.FormulaOpCodeMapper")
        words = ("(", ")", ";", "TRUE", "FALSE")
        codes = [one.OpCode for one in mapper.getMappings(words, 1)]  # in English, whatever the language here
        self._open, self._close, self._separator, self._true, self._false = codes
        special = [one.Token.OpCode for one in mapper.getAvailableMappings(1, _SPECIAL)]
        self._push, self._name = special[_PUSH], special[_NAME]
        self._ignored = {special[_MISSING], special[_SPACES]}
        self._names = _functions()

    def calls(self) -> list:
        """(name, arguments) of each of our functions; an argument is a list of tokens."""
        found = []
        for place, token in enumerate(self._tokens):
            name = self._names.get(token.Data.lower()) if isinstance(token.Data, str) else None
            if name is not None and token.OpCode != self._push:
                found.append((name, self._arguments(place + 1)))
        return found

    def _arguments(self, place: int) -> list:
        arguments: list = [[]]
        depth = 0
        for token in self._tokens[place:]:
            depth += (token.OpCode == self._open) - (token.OpCode == self._close)
            if depth == 0:
                break
            if (token.OpCode == self._open and depth == 1) or token.OpCode in self._ignored:
                continue
            if token.OpCode == self._separator and depth == 1:
                arguments.append([])
            else:
                arguments[-1].append(token)
        return [] if arguments == [[]] else arguments

    def value_of(self, tokens: list):
        """What an argument is: a range, a number, a text, True, False, or None where it was left out."""
        if not tokens:
            return None
        first = tokens[0]
        if first.OpCode in (self._true, self._false):
            return first.OpCode == self._true
        if len(tokens) == 1 and first.OpCode == self._name:
            return self._named(first.Data)
        if len(tokens) == 1 and first.OpCode == self._push:
            return self._pushed(first.Data)
        number = _signed_number(self._text(tokens))
        if number is not None:
            return number
        raise Refusal(
            f"the argument {self._text(tokens)} is itself computed; put it into cells of its own, give those cells, "
            "and ask again."
        )

    def _text(self, tokens: list) -> str:
        parser = self._document.createInstance("com.sun.star.sheet.FormulaParser")
        parser.setPropertyValue("CompileEnglish", True)
        return parser.printFormula(tuple(tokens), self._address)

    def _pushed(self, data):
        if isinstance(data, (float, str)):
            return data
        if hasattr(data, "Reference1"):
            return self._range(data.Reference1, data.Reference2)
        if hasattr(data, "RelativeColumn"):
            return self._range(data, data)
        raise Refusal("an argument lies in another document; bring the data into this one and ask again.")

    def _range(self, first, last):
        if (first.Flags | last.Flags) & _DELETED:
            raise Refusal("an argument refers to cells that were deleted; select its range again.")
        sheets = self._document.getSheets()
        column, row, sheet = self._place(first)
        last_column, last_row, _ = self._place(last)
        return sheets.getByIndex(sheet).getCellRangeByPosition(column, row, last_column, last_row)

    def _place(self, reference):
        own = self._address
        return (
            own.Column + reference.RelativeColumn if reference.Flags & _COLUMN_RELATIVE else reference.Column,
            own.Row + reference.RelativeRow if reference.Flags & _ROW_RELATIVE else reference.Row,
            own.Sheet + reference.RelativeSheet if reference.Flags & _SHEET_RELATIVE else reference.Sheet,
        )

    def _named(self, token):
        holder = self._document if token.Sheet < 0 else self._document.getSheets().getByIndex(token.Sheet)
        names = holder.getPropertyValue("NamedRanges")
        for place in range(names.getCount()):
            named = names.getByIndex(place)
            if named.getPropertyValue("TokenIndex") == token.Index:
                cells = _referred(named)
                if cells is not None:
                    return cells
        raise Refusal("a name among its arguments stands for no range of cells; give the range and ask again.")


def _signed_number(text: str):
    """The number that a text like -5% writes, or None."""
    digits = text.rstrip("%").lstrip("+-")
    try:
        number = float(digits) / 100 ** text.count("%")
    except ValueError:
        return None
    return -number if text.count("-") % 2 else number


def _referred(named):
    try:
        return named.getReferredCells()
    except UnoException:
        return None


def _functions() -> dict:
    """The worksheet name of each function by the name that formulas carry inside."""
    functions = json.loads((EXTENSION / "functions.json").read_text("utf-8"))
    return {(SERVICE + one["method"]).lower(): one["name"] for one in functions}
