"""One worksheet formula of ours as text: its function, its arguments, and its value on a workbook."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass

from sheetfuncs.cells.address import shown
from sheetfuncs.cells.block import ERROR_TEXTS, Block
from sheetfuncs.errors import ArgumentError
from sheetfuncs.functions.arguments import allowed
from sheetfuncs.functions.declaration import CellResult, WorksheetFunction
from sheetfuncs.functions.evaluate import evaluate, find_function
from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.functions.spellings import Spellings

LONGEST_FORMULA = 8_192  # what a cell can hold


@dataclass(frozen=True)
class RangeText:
    """A range as the formula writes it: "Jobs!C4:F64", "'Job list'!B:B", "Jobs[Cost]", or a defined name."""

    text: str


Value = float | bool | str
FormulaArgument = RangeText | Value | tuple[tuple[Value, ...], ...] | None


@dataclass(frozen=True)
class ParsedCall:
    """A formula's function (upper case, its plain name where it is ours) and arguments; an omitted one is None.

    A text is the text itself, an error value its text; an array constant is a tuple of rows.
    """

    name: str
    arguments: tuple[FormulaArgument, ...]


def evaluate_formula(text: str, read_range: Callable[[str], Block]) -> CellResult:
    """The value of a formula; read_range turns a range's text into its Block, once for each different text.

    Refused data give an error text, as in a cell. Raises a SheetfuncsError for a formula that cannot be read, a
    function that is not ours, arguments too many or missing, and for what read_range refuses.
    """
    call = parse_formula(text)
    function = find_function(call.name)
    _refuse_wrong_count(function, call.arguments)
    blocks: dict[str, Block] = {}
    arguments: list[object] = []
    for argument in call.arguments:
        if isinstance(argument, RangeText):
            if argument.text not in blocks:
                blocks[argument.text] = read_range(argument.text)
            arguments.append(blocks[argument.text])
        else:
            arguments.append(argument)
    return evaluate(call.name, *arguments)


def parse_formula(text: str) -> ParsedCall:
    """Parse one call such as "=FIT_VIF(Jobs!C4:F64; 2)".

    Arguments stand between commas, or between semicolons, where 0,95 is a number too. Raises ArgumentError for
    everything else: calculations, functions inside functions, quotes or brackets that do not close.
    """
    formula = text.strip()
    if len(formula) > LONGEST_FORMULA:
        raise ArgumentError(f"The formula has {len(formula)} characters; a cell holds at most {LONGEST_FORMULA}.")
    if formula.startswith("{") and formula.endswith("}"):  # as an array formula is shown
        formula = formula[1:-1].strip()
    match = _CALL.match(formula)
    if match is None:
        raise ArgumentError(
            f"{shown(text)} is not a call of one function; write it like =FIT_VIF(Jobs!C4:F64), in single quotes on a "
            "command line."
        )
    pieces, separator = _split_arguments(formula[match.end():], text)
    if len(pieces) == 1 and not pieces[0]:
        pieces = []
    arguments = tuple(_argument(piece, separator, text) for piece in pieces)
    return ParsedCall(_SPELLINGS.plain_name(match["name"]) or match["name"].upper(), arguments)


_CALL = re.compile(
    r"""=?\s*@?\s*(?:(?:\[\d+\]|'[^']*\.xlam?'|[\w.-]+\.xlam?)!)?(?:_xl\w+\.)*(?P<name>[A-Za-z_][\w.]*)\s*\(""",
    re.IGNORECASE,
)
_SPELLINGS = Spellings(REGISTRY)
# What may stand in a formula, longest first; brackets of table references may nest and escape with an apostrophe.
_TOKEN = re.compile(
    r"""(?P<text>"(?:[^"]|"")*")
    | (?P<quoted>'(?:[^']|'')*')
    | (?P<table>\[(?:'.|[^\[\]']|\[(?:'.|[^\[\]'])*\])*\])
    | (?P<array>\{[^{}"]*(?:"(?:[^"]|"")*"[^{}"]*)*\})
    | (?P<open>\() | (?P<close>\)) | (?P<separator>[,;])
    | (?P<other>[^"'\[\]{}(),;]+)""",
    re.VERBOSE,
)


def _split_arguments(rest: str, formula: str) -> tuple[list[str], str]:
    """The texts between the call's separators, up to its closing bracket; and which separator it uses."""
    tokens: list[tuple[str, str]] = []
    place, depth = 0, 1
    while depth:
        match = _TOKEN.match(rest, place)
        if match is None:
            raise _unpaired(rest[place:place + 1], formula)
        kind, place = str(match.lastgroup), match.end()
        depth += (kind == "open") - (kind == "close")
        if depth:
            tokens.append((kind if depth == 1 else "inner", match[0]))
    if rest[place:].strip():
        raise _calculation(rest[place:].strip(), formula)
    separators = {token for kind, token in tokens if kind == "separator"}
    separator = ";" if ";" in separators else ","
    pieces = [""]
    for kind, token in tokens:
        if kind == "separator" and token == separator:
            pieces.append("")
        else:
            pieces[-1] += token
    return [piece.strip() for piece in pieces], separator


_NUMBER = re.compile(r"([+-]*)\s*((?:\d+[.,]?\d*|[.,]\d+)(?:[Ee][+-]?\d+)?)\s*(%?)")
_NESTED = re.compile(r"^[@+\-\s]*([A-Za-z_][\w.]*)\s*\(")
_QUOTED_PARTS = re.compile(r"'(?:[^']|'')*'|\[(?:'.|[^\[\]']|\[(?:'.|[^\[\]'])*\])*\]")
_OPERATORS = re.compile(r"[-+*/^&=<>()\"{}%]|\s[^\s:!]")


def _argument(piece: str, separator: str, formula: str) -> FormulaArgument:
    if not piece:
        return None
    value = _value(piece, separator)
    if value is not None:
        return value
    if piece.startswith("{"):
        return _array(piece, formula)
    nested = _NESTED.match(piece)
    if nested:
        raise ArgumentError(
            f"{shown(formula)} calls {nested[1]} inside another function: put that into a cell of its own and point "
            "to the cell."
        )
    bare = _QUOTED_PARTS.sub("x", piece)
    operator = _OPERATORS.search(bare)
    if operator or separator in bare or "," in bare:
        raise _calculation(piece, formula)
    return RangeText(piece)


def _value(piece: str, separator: str) -> Value | None:
    """A text, number, TRUE, FALSE or error value; None for anything else."""
    if len(piece) >= 2 and re.fullmatch(r'"(?:[^"]|"")*"', piece):
        return piece[1:-1].replace('""', '"')
    if piece.upper() in ERROR_TEXTS:
        return piece.upper()
    logical = re.fullmatch(r"(TRUE|FALSE)\s*(?:\(\s*\))?", piece, re.IGNORECASE)
    if logical:
        return logical[1].upper() == "TRUE"
    match = _NUMBER.fullmatch(piece)
    if match is None or ("," in match[2] and separator == ","):
        return None
    number = float(match[2].replace(",", "."))
    number *= -1.0 if match[1].count("-") % 2 else 1.0
    return number / 100.0 if match[3] else number


def _array(piece: str, formula: str) -> tuple[tuple[Value, ...], ...]:
    """An array constant: columns between commas (or backslashes, where commas are decimal), rows between semicolons."""
    inside = re.findall(r'"(?:[^"]|"")*"|[^"]', piece[1:-1])
    column_separator = "\\" if "\\" in inside else ","
    rows: list[list[str]] = [[""]]
    for token in inside:
        if token == ";":
            rows.append([""])
        elif token == column_separator:
            rows[-1].append("")
        else:
            rows[-1][-1] += token
    decimal = ";" if column_separator == "\\" else ","
    values = [[_value(item.strip(), decimal) for item in row] for row in rows]
    if any(value is None for row in values for value in row):
        raise ArgumentError(
            f"{shown(formula)} holds an array whose items are not all numbers, texts, TRUE or FALSE; write it like "
            "{1,2;3,4}."
        )
    return tuple(tuple(value for value in row if value is not None) for row in values)


def _refuse_wrong_count(function: WorksheetFunction, arguments: tuple[FormulaArgument, ...]) -> None:
    if len(arguments) > len(function.arguments):
        raise ArgumentError(
            f"{function.name} takes at most {len(function.arguments)} arguments and {len(arguments)} were given: "
            f"{function.signature}."
        )
    for argument, given in zip(function.arguments, (*arguments, *[None] * len(function.arguments)), strict=False):
        if given is None and not argument.optional:
            raise ArgumentError(f"{function.name} needs {allowed(argument)} as {argument.name}: {function.signature}.")


def _unpaired(found: str, formula: str) -> ArgumentError:
    where = f" at {found}" if found else " at its end"
    return ArgumentError(f"{shown(formula)} has quotes or brackets that do not pair{where}: each needs its partner.")


def _calculation(found: str, formula: str) -> ArgumentError:
    return ArgumentError(
        f"{shown(formula)} holds {shown(found)}, which is neither a range nor one value: one function on plain "
        "ranges is evaluated; put a calculation into a cell and point to it."
    )
