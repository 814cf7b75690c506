"""How files and programs spell our functions inside formulas, and the plain name behind each spelling.

    FIT_VIF(                                  plain: what is typed, and what we write
    _xlfn.FIT_VIF(  _xludf.  _xll.            a program that did not know the function when it saved (MS-XLSX 2.2.2)
    [1]!FIT_VIF(                              a function of an add-in; 1 counts the workbook's external links
    #REF!1!FIT_VIF(                           the same after Calc, without our extension, saved it as .ods
    ORG.SHEETFUNCS.CALC.FUNCTIONS.FITVIF(     LibreOffice Calc

Only the standard library, and nothing newer than Python 3.8: the extension for Calc carries a copy of this file.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator

CALC_PREFIX = "org.sheetfuncs.calc.functions."
"""What stands before a function's name in files of Calc, in lower case."""

_IDENTIFIER = r"(?:[^\W\d]|\\)[\w.\\?]*"
_TOKEN = re.compile(
    rf"""
      "[^"]*"                                                               # a text; a quote in it is written twice
    | '[^']*' (?: !{_IDENTIFIER} )?                                         # a quoted sheet, and what it qualifies
    | \[(?P<link>\d{{1,5}})\]! (?P<linked>{_IDENTIFIER}) (?=[\s\0]*\()      # a call into another file
    | \#REF!(?:\d{{0,5}}!|\s)? (?P<lost>{_IDENTIFIER}) (?=[\s\0]*\()         # the same, its link lost
    | \[ (?: '. | [^\[\]'] | \[ (?: '. | [^\[\]'] )* \] )* \]               # columns of a table, or another file
      (?: {_IDENTIFIER} )? (?: !{_IDENTIFIER} )?
    | (?P<call>{_IDENTIFIER}) (?=[\s\0]*\()
    | {_IDENTIFIER} (?: !{_IDENTIFIER} )?                                   # a reference or a name
    """,
    re.VERBOSE | re.DOTALL,
)
_FILE_PREFIX = re.compile(r"(?:_xl[a-z]+\.)+", re.IGNORECASE)
_MAY_HOLD_FUNCTIONS = (".xlam", ".xla", ".xlsm", ".xlsb", ".xls", ".xltm", ".xlt", ".xll")


class Call:
    """One call in a formula. start, end: where its name stands, with prefixes; link: the external link's number."""

    def __init__(self, start: int, end: int, name: str, link: int | None):
        self.start, self.end, self.name, self.link = start, end, name, link


class Spellings:
    """Every spelling of the functions with these plain names."""

    def __init__(self, names: Iterable[str]):
        self._plain: dict[str, str] = {}
        for name in names:
            self._plain[name.lower()] = name
            self._plain[CALC_PREFIX + name.replace("_", "").lower()] = name

    def plain_name(self, spelled: str) -> str | None:
        """The plain name of a function spelled with any prefixes but a link, or None for what is not ours."""
        prefix = _FILE_PREFIX.match(spelled)
        return self._plain.get(spelled[prefix.end() if prefix else 0:].lower())

    def changes(self, formula: str, link_is_ours: Callable[[int], bool]) -> list[tuple[int, int, str]]:
        """(start, end, plain name) of each call of ours that is not spelled plainly.

        link_is_ours(number) says whether that external link leads to our add-in. Texts, sheet names and columns of
        tables are passed over; NUL in the formula stands for nothing.
        """
        found = []
        for call in calls(formula):
            plain = self.plain_name(call.name)
            ours = call.link is None or (call.link > 0 and link_is_ours(call.link))  # 0 is the workbook itself
            if plain is not None and ours and formula[call.start:call.end] != plain:
                found.append((call.start, call.end, plain))
        return found

    def plain(self, formula: str, link_is_ours: Callable[[int], bool] = lambda number: True) -> str:
        """The formula with all calls of ours spelled plainly; see `changes`."""
        for start, end, name in reversed(self.changes(formula, link_is_ours)):
            formula = formula[:start] + name + formula[end:]
        return formula


def calls(formula: str) -> Iterator[Call]:
    """Every call of a function by its name, in order."""
    for match in _TOKEN.finditer(formula):
        name = match["call"] or match["linked"] or match["lost"]
        if name:
            yield Call(match.start(), match.end(), name, int(match["link"]) if match["link"] else None)


def leads_to_our_addin(target: str) -> bool:
    """Whether calls through a link to this file are ours: to our add-in, or to a file that cannot hold functions."""
    name = re.split(r"[\\/]", target)[-1].lower()
    return name.startswith("sheetfuncs") or not name.endswith(_MAY_HOLD_FUNCTIONS)
