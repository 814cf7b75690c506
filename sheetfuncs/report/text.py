"""How much room a text takes, so that wrapped lines get the row height that they need."""

from __future__ import annotations

import unicodedata

# Advance widths of the printing ASCII characters in thousandths of the type size: the published metrics of Helvetica
# (from memory), which Arial and its metric twins share.
_WIDTHS = (
    278, 278, 355, 556, 556, 889, 667, 191, 333, 333, 389, 584, 278, 333, 278, 278, 556, 556, 556, 556, 556, 556, 556,
    556, 556, 556, 278, 278, 584, 584, 584, 556, 1015, 667, 667, 722, 722, 667, 611, 778, 722, 278, 500, 667, 556, 833,
    722, 778, 667, 778, 722, 667, 611, 722, 667, 944, 667, 667, 611, 278, 278, 278, 469, 556, 333, 556, 556, 500, 556,
    556, 278, 556, 556, 222, 222, 500, 222, 833, 556, 556, 556, 556, 333, 500, 278, 556, 500, 722, 500, 500, 500, 334,
    260, 334, 584,
)
# Screens round small letters to whole pixels; a little too wide is harmless, too narrow would clip a line.
_SLACK = 1.05


def text_width(text: str, size: float, bold: bool = False) -> float:
    """Width in pixels at 96 dots per inch."""
    units = sum(_advance(c) for c in text)
    return units / 1000 * size * 96 / 72 * _SLACK * (1.08 if bold else 1.0)


def _advance(character: str) -> int:
    place = ord(character) - 32
    if 0 <= place < len(_WIDTHS):
        return _WIDTHS[place]
    if character.isupper():
        return 722
    if unicodedata.east_asian_width(character) in "WF":
        return 1000
    if unicodedata.combining(character):
        return 0
    return 556


def line_count(text: str, width: float, size: float, bold: bool = False) -> int:
    """How many lines a text takes in so many pixels; words longer than a line are broken."""
    return sum(_lines_of(line, width, size, bold) for line in text.split("\n"))


def _lines_of(line: str, width: float, size: float, bold: bool) -> int:
    lines, used = 1, 0.0
    space = text_width(" ", size, bold)
    for word in line.split(" "):
        length = text_width(word, size, bold)
        if used and used + space + length > width:
            lines, used = lines + 1, 0.0
        elif used:
            used += space
        while length > width:
            lines, length = lines + 1, length - width
        used += length
    return lines


def shortened(text: str, length: int) -> str:
    """At most so many characters, cut with an ellipsis; line breaks become spaces."""
    text = " ".join(text.split())
    return text if len(text) <= length else text[: length - 1].rstrip() + "…"
