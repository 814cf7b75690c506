"""A sheet's name inside formulas: found and exchanged, without touching text in quotes."""

from __future__ import annotations

import re

_TOKEN = re.compile(
    r""""(?:[^"]|"")*"            # a text constant
      | '(?:[^']|'')+'(?=!)       # a quoted sheet name
      | (?<![\w.'\]!\#])[^\W\d][\w.]*(?=!)   # a plain one; not the REF of an error value
    """,
    re.VERBOSE,
)


def quoted(name: str) -> str:
    """The name as formulas write it, always in apostrophes."""
    return "'" + name.replace("'", "''") + "'"


def rename_sheet(formula: str, old: str, new: str) -> str:
    """The formula with references to one sheet turned to another; text constants stay as they are."""
    wanted = {old.casefold(), quoted(old).casefold()}
    return _TOKEN.sub(lambda match: quoted(new) if match.group().casefold() in wanted else match.group(), formula)
