"""Fits other than least squares on the rows as they are: one shape for all, and least squares on transformed rows."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from scipy.special import stdtr, stdtrit

from sheetfuncs.core.basis import DETERMINED, EPS, ROUNDINGS, Basis, centred, factorize
from sheetfuncs.core.design import Design
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import CollinearPredictorsError

# Rows (n,) or (n, m) to as many or fewer transformed rows; linear.
Transform = Callable[[np.ndarray], np.ndarray]


@dataclass(frozen=True, eq=False)
class RemedyFit:
    """A fit by another method than ordinary least squares.

    method, args, variant: as of a Statistic. coefficients, standard_errors: (p,), the constant first; covariance:
    (p, p). sigma: residual standard deviation on the transformed rows; df: of sigma. fitted, residuals: (n,) of the
    rows as they are. transformed_residuals: (m,) those that should be independent and equally wide, in time order where
    that matters. r_squared: share of the transformed variation, None where it has no meaning. converged: whether an
    iteration, if there is one, came to its end. details: further figures of the method by name.
    """

    method: str
    args: Mapping[str, Any]
    variant: str
    design: Design
    coefficients: np.ndarray
    covariance: np.ndarray
    sigma: float
    df: int
    fitted: np.ndarray
    residuals: np.ndarray
    transformed_residuals: np.ndarray
    r_squared: float | None = None
    converged: bool = True
    note: str = ""
    details: Mapping[str, Any] = field(default_factory=dict)

    applies = True
    reason: None = None

    @property
    def terms(self) -> tuple[str, ...]:
        return self.design.terms

    @property
    def standard_errors(self) -> np.ndarray:
        return np.sqrt(np.diag(self.covariance))

    @property
    def t(self) -> np.ndarray:
        """(p,): coefficients over their standard errors."""
        return self.coefficients / self.standard_errors

    @property
    def p_values(self) -> np.ndarray:
        """(p,): two-sided, t with df degrees of freedom; approximate, since weights or correlation are estimates."""
        return 2.0 * stdtr(self.df, -np.abs(self.t))

    def interval(self, level: float = 0.95) -> tuple[np.ndarray, np.ndarray]:
        """Limits of the coefficients, (p,) and (p,), by t with df degrees of freedom."""
        half = stdtrit(self.df, 0.5 + level / 2) * self.standard_errors
        return self.coefficients - half, self.coefficients + half

    def to_dict(self) -> dict[str, Any]:
        """Method, terms and figures as plain Python values; what there is one of a row stays out."""
        columns = (self.coefficients, self.standard_errors, self.t, self.p_values)
        figures = zip(self.terms, *(column.tolist() for column in columns), strict=True)
        return {
            "method": self.method, "args": dict(self.args), "variant": self.variant,
            "terms": [dict(zip(("term", "estimate", "error", "t", "p"), one, strict=True)) for one in figures],
            "sigma": self.sigma, "df": self.df, "r_squared": self.r_squared, "converged": self.converged,
            "note": self.note,
            **{key: value for key, value in self.details.items() if not isinstance(value, np.ndarray)},
        }


Remedied = RemedyFit | DoesNotApply


@dataclass(frozen=True, eq=False)
class Solution:
    """Least squares on transformed rows. root: (p, p), the inverse cross products are root root'; left: (m,) residuals
    there; fitted, residuals: (n,) of the rows as they are; noise: length of the roundings that left carries."""

    coefficients: np.ndarray
    root: np.ndarray
    left: np.ndarray
    fitted: np.ndarray
    residuals: np.ndarray
    noise: float

    @property
    def rss(self) -> float:
        return float(self.left @ self.left)

    @property
    def perfect(self) -> bool:
        """Whether what is left is rounding noise."""
        return bool(np.sqrt(self.rss) <= ROUNDINGS * self.noise)

    def covariance(self, sigma: float) -> np.ndarray:
        return sigma**2 * (self.root @ self.root.T)


def solve_transformed(design: Design, transform: Transform) -> Solution:
    """Least squares of the transformed response on the transformed predictors and constant.

    Predictors and response are centred before, and the transformed constant is taken off the transformed predictors
    before these are factorized, so that an offset costs no digit here either. Refused (CollinearPredictorsError): a
    transformation that leaves nothing of a predictor or of the constant, or not enough to tell them apart.
    """
    with few_threads(design.columns.size):
        if not design.intercept:
            basis = factorize(transform(design.columns), design.column_names, intercept=False)
            return _solution(design, transform(design.response), basis, design.columns, design.response)
        return _with_constant(design, transform)


def _solution(design: Design, y: np.ndarray, basis: Basis, x: np.ndarray, response: np.ndarray) -> Solution:
    coordinates, left = _coordinates(basis, y)
    root = basis.coefficient_root
    slopes = root @ coordinates
    fitted = x @ slopes
    noise = EPS * (float(np.linalg.norm(y)) + float(np.abs(slopes) @ basis.raw_norm))
    return Solution(slopes, root, left, fitted, response - fitted, noise)


def _coordinates(basis: Basis, y: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Coordinates of y in the basis, and what is left of it; in two steps, so that it is orthogonal."""
    first = basis.q.T @ y
    left = y - basis.q @ first
    second = basis.q.T @ left
    left -= basis.q @ second
    return first + second, left


def _with_constant(design: Design, transform: Transform) -> Solution:
    x, centre = centred(design.columns)
    response, mean = centred(design.response)
    constant = transform(np.ones(design.n))
    length = float(np.linalg.norm(constant))
    if length <= DETERMINED * np.sqrt(design.n):
        raise CollinearPredictorsError("Nothing is left of the intercept once the rows are transformed.", ())
    constant = constant / length
    moved, y = transform(x), transform(response)
    size = np.linalg.norm(moved, axis=0)
    along_x, along_y = constant @ moved, float(constant @ y)
    moved = moved - np.outer(constant, along_x)
    again = constant @ moved
    moved -= np.outer(constant, again)
    along_x += again
    y = y - along_y * constant
    for name, before, after in zip(design.column_names, size, np.linalg.norm(moved, axis=0), strict=True):
        if after <= DETERMINED * before or after == 0.0:
            raise CollinearPredictorsError(
                f"Once the rows are weighted or differenced, {name} cannot be told from the intercept.", (name,)
            )
    basis = factorize(moved, design.column_names, intercept=False)
    coordinates, left = _coordinates(basis, y)
    slope_root = basis.coefficient_root
    slopes = slope_root @ coordinates
    at_centre = (along_y - float(along_x @ slopes)) / length
    root = np.zeros((design.p, design.p))
    root[0, 0] = 1.0 / length
    root[0, 1:] = -(along_x / length + centre) @ slope_root
    root[1:, 1:] = slope_root
    about_mean = at_centre + x @ slopes
    noise = EPS * (float(np.linalg.norm(transform(np.abs(design.response)))) + float(np.abs(slopes) @ size))
    return Solution(
        np.concatenate([[at_centre + mean - float(centre @ slopes)], slopes]), root, left, about_mean + mean,
        response - about_mean, noise,
    )
