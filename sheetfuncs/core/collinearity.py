"""Collinearity: how much wider is an interval because the predictors move together?"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from sheetfuncs.core.basis import Basis
from sheetfuncs.core.design import Group


@dataclass(frozen=True)
class Inflation:
    """vif: variance inflation factor of a predictor, generalized where it has df > 1 columns.

    vif_per_df: vif ** (1 / (2 df)), by how much the interval is wider; comparable between predictors.
    """

    predictor: str
    vif: float
    df: int
    vif_per_df: float


def variance_inflation(basis: Basis, groups: Sequence[Group]) -> tuple[Inflation, ...]:
    """Variance inflation factors, one a predictor; 1 is none.

    One column: the diagonal of the inverse correlation matrix (Marquardt 1970, Technometrics 12:591-612). Several: the
    generalized factor det(R_gg) det((R^-1)_gg) (Fox and Monette 1992, JASA 87:178-183). Without an intercept the
    columns are compared about zero, which measures something else than with one.
    """
    if len(groups) == 1:  # nothing else to move together with
        return (Inflation(groups[0].name, 1.0, groups[0].width, 1.0),)
    return tuple(_inflation(basis, group) for group in groups)


def _inflation(basis: Basis, group: Group) -> Inflation:
    columns = slice(group.start, group.stop)
    inverse_rows = basis.r_inverse[columns]
    if group.width == 0:
        return Inflation(group.name, 1.0, 0, 1.0)
    if group.width == 1:
        root = float(np.linalg.norm(inverse_rows[0]))
    else:
        root = _volume(basis.scaled_coordinates[:, columns]) * _volume(inverse_rows.T)
    root = max(root, 1.0)
    return Inflation(group.name, root**2, group.width, root ** (1.0 / group.width))


def _volume(columns: np.ndarray) -> float:
    """sqrt(det(columns' columns)), without the squares that would cost half of the digits."""
    return float(np.prod(np.abs(np.diag(np.linalg.qr(columns, mode="r")))))
