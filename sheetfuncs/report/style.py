"""Colours and cell looks. Colours: Okabe and Ito 2008, safe for colour-blind readers and distinct in grey."""

from __future__ import annotations

from dataclasses import dataclass, replace

INK = "#1F2933"
QUIET = "#5F6B7A"
HAIRLINE = "#D5DAE0"
POINTS = "#0072B2"
SMOOTH = "#D55E00"
BAND = "#CFE3F1"
INPUT = "#F4F8FB"
# A face that every host has under this name or with the same widths, so that measured line breaks hold.
FONT = "Arial"


@dataclass(frozen=True)
class Style:
    """How a cell looks. size in points; borders are colours or None; indent in steps of the host."""

    size: float = 9.0
    bold: bool = False
    italic: bool = False
    colour: str = INK
    fill: str | None = None
    align: str = "left"
    upright: str = "top"
    wrap: bool = False
    number_format: str = "General"
    above: str | None = None
    below: str | None = None
    box: str | None = None
    indent: int = 0
    underlined: bool = False
    editable: bool = False

    def but(self, **changes: object) -> Style:
        """The same with some changes."""
        return replace(self, **changes)  # type: ignore[arg-type]


TEXT = Style()
WRAPPED = TEXT.but(wrap=True)
STRONG = TEXT.but(bold=True)
QUIET_TEXT = TEXT.but(colour=QUIET)
QUIET_WRAPPED = QUIET_TEXT.but(wrap=True)
# Beside another left-aligned column, so that the two do not touch.
BESIDE = WRAPPED.but(indent=1)
QUIET_BESIDE = QUIET_WRAPPED.but(indent=1)
TITLE = TEXT.but(size=16.0, bold=True, upright="vcenter")
LEAD = TEXT.but(size=10.5, upright="vcenter")
HEADING = TEXT.but(size=11.0, bold=True, upright="bottom")
COLUMN_HEAD = QUIET_WRAPPED.but(below=QUIET, upright="bottom")
COLUMN_HEAD_RIGHT = COLUMN_HEAD.but(align="right")
LINK = TEXT.but(colour=POINTS, underlined=True)
NUMBER = TEXT.but(align="right")
QUIET_NUMBER = QUIET_TEXT.but(align="right")
ENTRY = WRAPPED.but(fill=INPUT, box=HAIRLINE, editable=True, upright="vcenter")
