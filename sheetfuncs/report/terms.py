"""How a coefficient is called on the sheet."""

from __future__ import annotations

from sheetfuncs.checking import Check


def term_label(check: Check, place: int) -> str:
    """The name of the coefficient at this place from 0: "Intercept", or that of its column."""
    return "Intercept" if check.design.intercept and place == 0 else check.design.terms[place]
