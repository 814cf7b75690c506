"""Hidden names of the sheet: the settings by which it is recognised, and the places of the decision record."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from typing import Any

SETTINGS = "_sheetfuncs_settings_"
DECISION = "_sheetfuncs_decision_"
# A text constant in a formula holds at most 255 characters; doubled quotes are counted too, to be safe everywhere.
_CHUNK = 240
_CONSTANT = re.compile(r'^="((?:[^"]|"")*)"$')


def settings_to_names(settings: Mapping[str, Any]) -> dict[str, str]:
    """Settings as defined names _sheetfuncs_settings_1, _2, ... each a formula that is a text constant.

    The texts, joined in the order of their numbers, are JSON in plain ASCII.
    """
    text = json.dumps(settings, ensure_ascii=True, separators=(",", ":"), sort_keys=True, allow_nan=False)
    text = text.replace("!", "\\u0021")  # an exclamation mark makes some readers take the text for a reference
    names, chunk = {}, ""
    for character in text:
        piece = character.replace('"', '""')
        if len(chunk) + len(piece) > _CHUNK:
            names[f"{SETTINGS}{len(names) + 1}"] = f'="{chunk}"'
            chunk = ""
        chunk += piece
    names[f"{SETTINGS}{len(names) + 1}"] = f'="{chunk}"'
    return names


def names_to_settings(names: Mapping[str, str]) -> dict[str, Any] | None:
    """The settings in a sheet's defined names (with or without the leading "="); None where there are none.

    Raises ValueError where the names are there and do not hold settings.
    """
    parts = []
    while (formula := names.get(f"{SETTINGS}{len(parts) + 1}")) is not None:
        found = _CONSTANT.match("=" + formula.removeprefix("="))
        if not found:
            raise ValueError(f"The name {SETTINGS}{len(parts) + 1} does not hold a text.")
        parts.append(found.group(1).replace('""', '"'))
    if not parts:
        return None
    settings = json.loads("".join(parts))
    if not isinstance(settings, dict):
        raise ValueError("The settings of the sheet are not a list of names and values.")
    return settings
