"""Hidden names of the sheet: the settings by which it is recognised, and the places of its cells to be filled in."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

SETTINGS = "_sheetfuncs_settings_"
DECISION = "_sheetfuncs_decision_"
ENTRY = "_sheetfuncs_entry_"
# A text constant in a formula holds at most 255 characters; doubled quotes are counted too, to be safe everywhere.
_CHUNK = 240


def settings_to_names(settings: Mapping[str, Any]) -> dict[str, str]:
    """Settings as defined names _sheetfuncs_settings_1, _2, ... each a formula that is a text constant.

    The texts, joined in the order of their numbers, are JSON in plain ASCII.
    """
    text = json.dumps(settings, ensure_ascii=True, separators=(",", ":"), sort_keys=True, allow_nan=False)
    text = text.replace("!", "\\u0021")  # an exclamation mark makes some readers take the text for a reference
    names: dict[str, str] = {}
    chunk = ""
    for character in text:
        piece = character.replace('"', '""')
        if len(chunk) + len(piece) > _CHUNK:
            names[f"{SETTINGS}{len(names) + 1}"] = f'="{chunk}"'
            chunk = ""
        chunk += piece
    names[f"{SETTINGS}{len(names) + 1}"] = f'="{chunk}"'
    return names
