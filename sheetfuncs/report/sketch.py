"""A chart before it has a place: its figures as columns, and which of them each series shows."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from sheetfuncs.report.elements import Axis


@dataclass(frozen=True)
class Figures:
    """One column of figures. kind: "number", "count" or "text"."""

    name: str
    values: tuple[float | int | str, ...]
    kind: str = "number"


@dataclass(frozen=True)
class Line:
    """One series: columns x and y by their place in the sketch. Its name is the name of column y.
    labels: what stands beside each point, "" for nothing; empty for no labels at all."""

    x: int
    y: int
    look: str
    labels: tuple[str, ...] = ()


@dataclass(frozen=True)
class Sketch:
    """A chart. question: its title. caption: how to read it, and what it leaves out."""

    kind: str
    question: str
    caption: str
    figures: tuple[Figures, ...]
    lines: tuple[Line, ...]
    x: Axis
    y: Axis


def numbers(name: str, values: Iterable[float] | np.ndarray) -> Figures:
    """A column of numbers; those that are not finite leave a gap."""
    return Figures(name, tuple(float(v) for v in values))


def counts(name: str, values: Iterable[float] | np.ndarray) -> Figures:
    """A column of whole numbers: rows, lags, places."""
    return Figures(name, tuple(int(v) for v in values), "count")


def texts(name: str, values: Iterable[str]) -> Figures:
    """A column of labels."""
    return Figures(name, tuple(values), "text")
