"""Lists of the worksheet functions, generated from the registry."""

from __future__ import annotations

import textwrap

from sheetfuncs.functions.arguments import Argument
from sheetfuncs.functions.declaration import WorksheetFunction
from sheetfuncs.functions.evaluate import find_function
from sheetfuncs.functions.registry import REGISTRY

WIDTH = 100


def functions_markdown() -> str:
    """The README's list: a table a group, each function with its arguments and what it gives."""
    lines: list[str] = []
    for group in dict.fromkeys(function.group for function in REGISTRY.values()):
        lines += [f"**{group}**", "", "| function | what it gives |", "|---|---|"]
        lines += [
            f"| `{function.signature}` | {function.summary.replace('|', chr(92) + '|')} |"
            for function in REGISTRY.values() if function.group == group
        ]
        lines.append("")
    return "\n".join(lines).rstrip() + "\n"


def functions_text(name: str | None = None) -> str:
    """All functions for a terminal, or everything about the one called `name`.

    Raises UnknownFunctionError for a name that is not there.
    """
    if name is not None:
        return _one(find_function(name))
    lines: list[str] = []
    for group in dict.fromkeys(function.group for function in REGISTRY.values()):
        lines.append(group)
        for function in REGISTRY.values():
            if function.group == group:
                lines += _wrapped(function.signature, "  ", "      ")
    return "\n".join([*lines, "", "sheetfuncs functions NAME explains one of them."])


def _one(function: WorksheetFunction) -> str:
    lines = [*_wrapped(function.signature, "", "    "), "", *_wrapped(function.summary), ""]
    lines += _wrapped(f"Gives {function.shape}{_columns(function)}.")
    lines.append("")
    for argument in function.arguments:
        lines += _wrapped(f"{argument.name}{_brackets(argument)}: {argument.help}", "  ", "      ")
    return "\n".join(lines)


def _columns(function: WorksheetFunction) -> str:
    names = [*function.columns, *([f"{function.term_columns} of each term"] if function.term_columns else [])]
    return f": {', '.join(names)}" if names else ""


def _brackets(argument: Argument) -> str:
    return " (may be omitted)" if argument.optional else ""


def _wrapped(text: str, first: str = "", rest: str = "") -> list[str]:
    return textwrap.wrap(text, WIDTH, initial_indent=first, subsequent_indent=rest, break_long_words=False,
                         break_on_hyphens=False)
