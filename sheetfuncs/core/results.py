"""The shapes of results: a statistic, a table, and "does not apply" with its reason."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

Degrees = float | tuple[float, float] | None


@dataclass(frozen=True, kw_only=True)
class Statistic:
    """One test or figure.

    method, args: which one, in words that a program can match ("breusch_pagan", {"studentize": True, ...}).
    variant:      the same for a reader ("studentized, on all predictors").
    statistic, df, p: the figures; df a number or a (numerator, denominator) pair; p None where there is no test.
    null:         what p is evidence against, in words.
    note:         a remark that belongs beside the figures.
    details:      further figures of this method by name.
    """

    method: str
    args: Mapping[str, Any]
    variant: str
    statistic: float
    df: Degrees = None
    p: float | None = None
    null: str = ""
    note: str = ""
    details: Mapping[str, Any] = field(default_factory=dict)

    applies = True
    reason: None = None


@dataclass(frozen=True, kw_only=True)
class DoesNotApply:
    """A test that has no meaning for this fit, and why."""

    method: str
    args: Mapping[str, Any]
    variant: str
    reason: str
    null: str = ""
    cell_error: str = "#N/A"

    applies = False
    statistic: None = None
    df: None = None
    p: None = None
    note: str = ""
    details: Mapping[str, Any] = field(default_factory=dict)


Result = Statistic | DoesNotApply
