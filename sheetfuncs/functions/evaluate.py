"""Evaluate a worksheet function by its worksheet name: what every host goes through."""

from __future__ import annotations

import difflib

import numpy as np

from sheetfuncs.errors import ArgumentError, SheetfuncsError, UnknownFunctionError
from sheetfuncs.functions.arguments import Argument, is_error, read_option
from sheetfuncs.functions.declaration import Call, CellResult, WorksheetFunction
from sheetfuncs.functions.registry import REGISTRY


def evaluate(name: str, /, *args: object, **options: object) -> CellResult:
    """The function's value: a number, a text, a list of rows, or the text of an error value.

    args, options: by place or by the registry's argument names. A range is a list of rows (a cell is None, a number, a
    text, a bool, or an error text), one bare cell, or a Block; an omitted argument is None. Data that are refused give
    an error text: #VALUE! cells or options of a wrong kind, #NUM! numbers that do not allow it, #N/A a method that does
    not apply, #NAME? an unknown function. Raises TypeError for an unknown option or too many arguments.

        >>> round(evaluate("FIT_DURBIN_WATSON", [[1.0], [2.5], [2.0], [4.5]], [[1.0], [2.0], [3.0], [4.0]]), 12)
        3.166666666667
    """
    try:
        return compute(name, *args, **options)
    except SheetfuncsError as refusal:
        return refusal.cell_error


def why(name: str, /, *args: object, **options: object) -> str:
    """The sentence behind an error value of this call, or "ok"."""
    try:
        compute(name, *args, **options)
    except SheetfuncsError as refusal:
        return str(refusal)
    return "ok"


def compute(name: str, /, *args: object, **options: object) -> CellResult:
    """As `evaluate`, but a refusal is raised as a SheetfuncsError."""
    function = find_function(name)
    call = _call(function, _bound(function, args, options))
    # What overflows or is undefined ends as an error value; a warning would only fill a host's log.
    with np.errstate(all="ignore"):
        return function.compute(call)


def find_function(name: object) -> WorksheetFunction:
    """The function of this name, in any case. Raises UnknownFunctionError with the nearest names."""
    known = REGISTRY.get(name.strip().upper()) if isinstance(name, str) else None
    if known is not None:
        return known
    near = difflib.get_close_matches(str(name).upper(), REGISTRY, n=3, cutoff=0.5)
    hint = f"did you mean {' or '.join(near)}?" if near else "`sheetfuncs functions` lists them."
    raise UnknownFunctionError(f"There is no function {str(name)[:60]} here; {hint}")


def _bound(function: WorksheetFunction, args: tuple[object, ...], options: dict[str, object]) -> dict[str, object]:
    """What was given for each argument, None for those omitted."""
    names = [argument.name for argument in function.arguments]
    if len(args) > len(names):
        raise TypeError(f"{function.name} takes at most {len(names)} arguments, {len(args)} were given")
    given: dict[str, object] = dict.fromkeys(names)
    given.update(zip(names, args, strict=False))
    for name, value in options.items():
        if name not in given:
            raise TypeError(f"{function.name} has no argument {name!r}; it has {', '.join(names)}")
        if name in names[: len(args)]:
            raise TypeError(f"{function.name} got the argument {name!r} twice")
        given[name] = value
    return given


def _call(function: WorksheetFunction, given: dict[str, object]) -> Call:
    ranges: dict[str, object] = {}
    options = {}
    for argument in function.arguments:
        value = given[argument.name]
        if argument.kind != "range":
            options[argument.name] = read_option(argument, value)
            if options[argument.name] is None and not argument.optional:
                raise _missing(argument, function)
            continue
        if is_error(value):
            refusal = ArgumentError(f"The range {argument.name} is the error {value}: give a range that exists.")
            refusal.cell_error = str(value)
            raise refusal
        if value is None and not argument.optional:
            raise _missing(argument, function)
        ranges[argument.name] = value
    return Call(ranges, options)


def _missing(argument: Argument, function: WorksheetFunction) -> ArgumentError:
    return ArgumentError(f"The argument {argument.name} is missing: {function.signature}.")
