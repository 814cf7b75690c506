"""Belsley's condition indices: how many near-dependencies the columns have, and which columns each one holds."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.basis import Basis, listed
from sheetfuncs.core.design import INTERCEPT
from sheetfuncs.errors import NoVariationError

# Belsley, Kuh and Welsch 1980, Regression Diagnostics, sections 3.2 and 3.3: from 30 on "moderate to strong", and two
# or more coefficients with more than half of their variance there.
STRONG = 30.0
HALF = 0.5
# Shares of the near-dependencies that two columns must have in common to belong to one group.
_LINKED = 0.3


@dataclass(frozen=True)
class NearDependency:
    """Columns that move together: condition index, and the terms with each one's share of variance that comes of it."""

    index: float
    terms: tuple[str, ...]
    proportions: tuple[float, ...]

    @property
    def sentence(self) -> str:
        return f"{listed(self.terms)} move together (condition index {self.index:.3g})"


@dataclass(frozen=True, eq=False)
class Condition:
    """Condition indices and variance-decomposition proportions.

    terms: (m,) names of the columns. indices: (m,) from 1 up; the last is the condition number of the columns scaled to
    unit length. proportions: (m, m), row i the shares of each coefficient's variance that come of index i; columns sum
    to 1. centred: whether the columns are about their means and the constant is left out.
    near_dependencies: none where nothing is wrong.
    """

    terms: tuple[str, ...]
    indices: np.ndarray
    proportions: np.ndarray
    centred: bool
    near_dependencies: tuple[NearDependency, ...]

    @property
    def number(self) -> float:
        return float(self.indices[-1])


def condition_indices(basis: Basis, column_names: Sequence[str], *, centred: bool = False) -> Condition:
    """Singular values of the columns scaled to unit length (Belsley, Kuh and Welsch 1980, chapter 3).

    centred False: the constant is one of the columns, as in the book, so that a predictor with little variation beside
    its level counts as near to the constant. True: the columns about their means (Stewart 1987, Stat. Sci. 2:68-84),
    which speaks of the slopes alone; refused without an intercept, or without predictors. Units never matter: every
    column is scaled to unit length. One-sided Jacobi rotations (Demmel and others 1999, Lin. Alg. Appl. 299:21-80) give
    small singular values their relative digits.
    """
    if centred and (not basis.intercept or basis.q.shape[1] == 0):
        raise NoVariationError("The centred form needs an intercept and at least one predictor.")
    without = centred or not basis.intercept
    columns, inverse = (basis.scaled_coordinates, basis.r_inverse) if without else _with_constant(basis)
    terms = (*column_names,) if without else (INTERCEPT, *column_names)
    length = np.linalg.norm(columns, axis=0)
    columns = columns / length
    if columns.shape[1] == 1:
        return Condition(terms, np.ones(1), np.ones((1, 1)), centred, ())
    singular, left, right, work, _, info = lapack.dgejsv(np.asfortranarray(columns), joba=0, jobu=0, jobv=0, jobr=0)
    if info != 0 or not (singular > 0).all():
        raise NoVariationError("The predictors' condition could not be computed: look for extreme values among them.")
    singular = singular * (work[0] / work[1])
    # v over its singular value, by the inverse: small elements of v have no digits of their own.
    shares = ((inverse * length[:, None]) @ left).T ** 2
    proportions = shares / shares.sum(axis=0)
    indices = singular[0] / singular
    return Condition(terms, indices, proportions, centred, _near_dependencies(terms, indices, proportions, right))


def _with_constant(basis: Basis) -> tuple[np.ndarray, np.ndarray]:
    """(p, p) coordinates of constant and columns, each over the length of its part about the mean; their inverse."""
    k = basis.q.shape[1]
    columns, inverse = np.eye(k + 1), np.eye(k + 1)
    level = np.sqrt(basis.n) * basis.centre / basis.scale
    columns[0, 1:], columns[1:, 1:] = level, basis.scaled_coordinates
    inverse[0, 1:], inverse[1:, 1:] = -level @ basis.r_inverse, basis.r_inverse
    return columns, inverse


def _near_dependencies(
    terms: Sequence[str], indices: np.ndarray, proportions: np.ndarray, right: np.ndarray
) -> tuple[NearDependency, ...]:
    """Groups of columns. Near-dependencies of about equal strength share their columns' variance between them in any
    mixture, so that shares are summed over them (section 3.3), and groups told apart by the space that they span."""
    strong = indices >= STRONG
    if not strong.any():
        return ()
    held = proportions[strong].sum(axis=0)
    members = np.flatnonzero(held > HALF)
    directions = right[:, strong]
    found = []
    for group in _linked(members, directions[members]):
        if group.shape[0] < 2:
            continue
        within = (directions[group] ** 2).sum(axis=0)
        its_own = within > HALF if (within > HALF).any() else within == within.max()
        found.append(NearDependency(
            float(indices[strong][its_own].max()), tuple(terms[i] for i in group), tuple(float(held[i]) for i in group)
        ))
    return tuple(sorted(found, key=lambda one: -one.index))


def _linked(members: np.ndarray, directions: np.ndarray) -> list[np.ndarray]:
    """Members in groups, each reached from another one of its group by a link."""
    with np.errstate(invalid="ignore", divide="ignore"):
        unit = np.nan_to_num(directions / np.linalg.norm(directions, axis=1, keepdims=True))
    # m columns that all follow one base lie at 1/(m - 1) to each other, columns of other groups at almost 0.
    link = np.abs(unit @ unit.T) > min(_LINKED, 0.5 / max(members.shape[0], 1))
    groups = []
    waiting = np.ones(members.shape[0], dtype=bool)
    while waiting.any():
        reached = np.zeros_like(waiting)
        reached[np.flatnonzero(waiting)[0]] = True
        while True:
            wider = reached | link[reached].any(axis=0)
            if (wider == reached).all():
                break
            reached = wider
        groups.append(members[reached])
        waiting &= ~reached
    return groups
