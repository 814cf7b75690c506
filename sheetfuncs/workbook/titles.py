"""Sheet names: what is allowed, and a valid one made from a wanted one.

Limits of the file format's main application: 31 UTF-16 units, none of \\ / ? * [ ] :, no apostrophe at either end,
not blank, unique without regard to case, and not "History", which its change tracking reserves.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

from sheetfuncs.errors import SheetNameError

MAX_UNITS = 31
_FORBIDDEN = re.compile(r"[\\/?*\[\]:\x00-\x1f]")


def sheet_title(wanted: str, *, taken: Iterable[str] = ()) -> str:
    """A valid sheet name as near to the wanted one as the limits allow, different from those taken.

    Forbidden characters become "-", a long name is cut, and a taken one gets " (2)", " (3)", ... at its end.
    """
    used = {name.casefold() for name in taken} | {"history"}
    base = _FORBIDDEN.sub("-", wanted).strip().strip("'").strip() or "Sheet"
    title, number = _cut(base, MAX_UNITS), 1
    while title.casefold() in used:
        number += 1
        ending = f" ({number})"
        title = _cut(base, MAX_UNITS - len(ending)) + ending
    return title


def check_title(name: str) -> None:
    """Raises SheetNameError, with the reason, for a name that a sheet cannot have."""
    if not name.strip():
        raise SheetNameError("A sheet name cannot be blank. Give one of 1 to 31 characters.")
    if _units(name) > MAX_UNITS:
        raise SheetNameError(f"The sheet name {name!r} has {_units(name)} characters; at most {MAX_UNITS} are allowed.")
    found = _FORBIDDEN.search(name)
    if found:
        raise SheetNameError(f"The sheet name {name!r} holds {found.group()!r}; \\ / ? * [ ] : are not allowed in one.")
    if name[0] == "'" or name[-1] == "'":
        raise SheetNameError(f"The sheet name {name!r} begins or ends with an apostrophe; leave it out.")
    if name.casefold() == "history":
        raise SheetNameError("The sheet name 'History' is reserved by the spreadsheet program; choose another.")


def _units(text: str) -> int:
    return len(text.encode("utf-16-le", "surrogatepass")) // 2


def _cut(text: str, units: int) -> str:
    while _units(text) > units:
        text = text[:-1]
    return text.rstrip().rstrip("'").rstrip() or "Sheet"
