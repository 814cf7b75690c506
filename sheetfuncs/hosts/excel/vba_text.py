"""Pieces of VBA source: texts and lists as expressions that any system's editor reads alike.

The limits are Microsoft's, from memory: a line of at most 1,023 characters, at most 24 continuations of one statement,
a compiled procedure below 64 KB, help texts and each argument's description at most 255 characters.
"""

from __future__ import annotations

from collections.abc import Iterable

LONGEST_LINE = 1_023
MOST_CONTINUATIONS = 24
LONGEST_HELP = 255


def literal(text: str) -> str:
    """A text as an expression in plain letters only: `"n " & ChrW(8805) & " 2"`.

    The editor reads a source by the code page of the system that it runs on, so other letters would change there.
    """
    parts, plain = [], ""
    for letter in text:
        if " " <= letter <= "~":
            plain += '""' if letter == '"' else letter
        else:
            parts += [f'"{plain}"', f"ChrW({ord(letter)})"] if plain else [f"ChrW({ord(letter)})"]
            plain = ""
    return " & ".join([*parts, f'"{plain}"'] if plain or not parts else parts)


def in_lines(opening: str, pieces: Iterable[str], closing: str) -> str:
    """One statement with each piece on a line of its own: `opening`, the pieces with commas between, `closing`."""
    return f"{opening} _\n        " + ", _\n        ".join(pieces) + closing
