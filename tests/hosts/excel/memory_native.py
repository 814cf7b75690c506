"""What an engine's `api` gives in the program in memory, under the names of pywin32 and of appscript; and addresses."""

from __future__ import annotations

import re
from types import SimpleNamespace

import memory_model as model

_CORNER = re.compile(r"\$?([A-Z]{0,3})\$?([0-9]{0,7})", re.IGNORECASE)


class Missing:
    """A property that fails when it is asked for."""


class Native(SimpleNamespace):
    """An object as pywin32 or appscript would give it."""

    def __getattribute__(self, name):
        value = super().__getattribute__(name)
        if isinstance(value, Missing):
            raise model.ExcelError(f"{name} is not to be had here")
        return value


class Get:
    def __init__(self, value):
        self.value = value

    def get(self):
        return self.value


class NativeName:
    def __init__(self, name: model.Name):
        object.__setattr__(self, "name", name)

    def __setattr__(self, key, value):
        assert key == "Visible"
        self.name.visible = value

    @property
    def visible(self):
        return SimpleNamespace(set=lambda value: setattr(self.name, "visible", value))


def areas_of(text: str) -> list[tuple[int, int, int, int]]:
    return [_area(part) for part in text.split(",")]


def _area(text: str) -> tuple[int, int, int, int]:
    corners = [_CORNER.fullmatch(part) for part in text.split(":")]
    if not all(corners) or not text:
        raise model.ExcelError(f"no range {text}")
    letters, rows = [c[1].upper() for c in corners], [c[2] for c in corners]
    columns = [_column(letter) if letter else default for letter, default in
               zip((letters[0], letters[-1]), (1, model.MAX_COLUMNS), strict=True)]
    lines = [int(row) if row else default for row, default in
             zip((rows[0], rows[-1]), (1, model.MAX_ROWS), strict=True)]
    return lines[0], columns[0], lines[1], columns[1]


def _column(letters: str) -> int:
    number = 0
    for letter in letters:
        number = 26 * number + ord(letter) - 64
    return number
