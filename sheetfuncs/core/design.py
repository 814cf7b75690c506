"""The design: response, predictors as columns of a matrix, their names, and which columns belong together."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from sheetfuncs.errors import ArgumentError, BlockShapeError, NoVariationError, TooFewRowsError

INTERCEPT = "intercept"


@dataclass(frozen=True, eq=False)
class Numeric:
    """A predictor of numbers: values (n,)."""

    name: str
    values: np.ndarray


@dataclass(frozen=True, eq=False)
class Category:
    """A predictor of text: codes (n,) into levels; levels[0] is the base and gets no column."""

    name: str
    levels: tuple[str, ...]
    codes: np.ndarray


@dataclass(frozen=True)
class Group:
    """The columns [start, stop) of the predictor matrix that one predictor takes."""

    name: str
    start: int
    stop: int

    @property
    def width(self) -> int:
        return self.stop - self.start


@dataclass(frozen=True, eq=False)
class Design:
    """One regression's data.

    response: (n,). columns: (n, k), the predictors without a constant; categories as 0/1 columns against their base.
    column_names: k names ("Weight", "Site: north"). groups: one per predictor. intercept: whether a constant is fitted.
    order: None for the rows' own order, else a permutation (n,) that sorts the rows in time.
    rows: (n,) the worksheet row of each observation (1-based positions for bare arrays).
    """

    response: np.ndarray
    columns: np.ndarray
    response_name: str
    column_names: tuple[str, ...]
    groups: tuple[Group, ...]
    intercept: bool
    order: np.ndarray | None
    rows: np.ndarray
    base_levels: tuple[tuple[str, str], ...] = ()

    @cached_property
    def n(self) -> int:
        return self.response.shape[0]

    @cached_property
    def p(self) -> int:
        """Number of coefficients, the constant counted."""
        return self.columns.shape[1] + int(self.intercept)

    @property
    def terms(self) -> tuple[str, ...]:
        """Names of the coefficients, the constant first."""
        return (INTERCEPT, *self.column_names) if self.intercept else self.column_names

    @cached_property
    def has_categories(self) -> bool:
        return any(g.width > 1 for g in self.groups) or bool(self.base_levels)

    def in_order(self, values: np.ndarray) -> np.ndarray:
        """These per-row values in time order."""
        return values if self.order is None else values[self.order]


def build_design(
    response: np.ndarray,
    predictors: Sequence[Numeric | Category],
    *,
    response_name: str = "response",
    intercept: bool = True,
    order: np.ndarray | None = None,
    rows: np.ndarray | None = None,
) -> Design:
    """Lay out response (n,) and predictors as one Design.

    order: (n,) values to sort by (ties keep the rows' order), or None.
    Refused: arrays of unequal length, values that are not finite, no rows, no coefficient at all, not more rows than
    coefficients minus one (n < p). n == p is allowed: coefficients exist, error bars do not.
    """
    y = np.ascontiguousarray(response, dtype=np.float64)
    n = y.shape[0]
    pieces: list[np.ndarray] = []
    names: list[str] = []
    groups: list[Group] = []
    bases: list[tuple[str, str]] = []
    for predictor in predictors:
        start = len(names)
        if isinstance(predictor, Category):
            bases.append((predictor.name, predictor.levels[0]))
            names += [f"{predictor.name}: {level}" for level in predictor.levels[1:]]
            codes = np.asarray(predictor.codes)
            piece = (codes[:, None] == np.arange(1, len(predictor.levels))).astype(np.float64)
        else:
            names.append(predictor.name)
            piece = np.asarray(predictor.values, dtype=np.float64)[:, None]
        if piece.shape[0] != n:
            raise BlockShapeError(
                f"{predictor.name} has {piece.shape[0]} values and {response_name} has {n}: both need the same rows."
            )
        pieces.append(piece)
        groups.append(Group(predictor.name, start, len(names)))
    x = np.empty((n, len(names)), order="F")  # column by column, as everything reads it
    for piece, group in zip(pieces, groups, strict=True):
        x[:, group.start:group.stop] = piece
    p = x.shape[1] + int(intercept)
    if p == 0:
        raise ArgumentError("There is nothing to fit: give at least one predictor, or an intercept.")
    if n < p:
        raise TooFewRowsError(
            f"{n} usable row{'s' if n != 1 else ''} for {p} coefficients: "
            f"at least {p + 1} rows are needed. Add rows or use fewer predictors."
        )
    if not np.isfinite(y).all() or not np.isfinite(x).all():
        raise NoVariationError("A value is not a finite number: every used cell needs one.")
    permutation = None if order is None else np.argsort(np.asarray(order), kind="stable")
    if permutation is not None and np.array_equal(permutation, np.arange(n)):
        permutation = None
    return Design(
        y, x, response_name, tuple(names), tuple(groups), bool(intercept), permutation,
        np.arange(1, n + 1) if rows is None else np.asarray(rows), tuple(bases),
    )
