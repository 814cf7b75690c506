"""Least squares on a design: coefficients with error bars, residuals, and how much of the response is explained."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property, wraps
from math import sqrt
from typing import Any, Concatenate, ParamSpec, TypeVar

import numpy as np
from scipy.special import fdtrc, stdtr, stdtrit

from sheetfuncs.core.basis import (
    DETERMINED,
    EPS,
    ROUNDINGS,
    SMALLEST,
    Basis,
    back_substituted,
    centred,
    column_means,
    factorize,
)
from sheetfuncs.core.design import Design
from sheetfuncs.core.memory import keep_freed_memory
from sheetfuncs.core.refinement import ill_conditioned, loses_digits, refined_basis, refined_solution
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import NoVariationError

# Sums of squares below this leave room for those of differences and products.
LARGEST_SQUARES = 1e300
Of = TypeVar("Of")
Options = ParamSpec("Options")


@dataclass(frozen=True, eq=False)
class Fit:
    """A least-squares fit.

    coefficients: (p,), the constant first. residuals: (n,) in the rows' own order. rss: their sum of squares.
    perfect: the residuals are rounding noise and are stored as zeros. noise: the length (as of sqrt(rss)) of the
    roundings that response and coefficients carry into the residuals.
    """

    design: Design
    basis: Basis
    coefficients: np.ndarray
    residuals: np.ndarray
    rss: float
    perfect: bool
    noise: float

    @cached_property
    def n(self) -> int:
        return self.design.n

    @cached_property
    def p(self) -> int:
        return self.design.p

    @cached_property
    def df(self) -> int:
        return self.n - self.p

    @property
    def relative_noise(self) -> float:
        """The roundings in the residuals, relative to the residuals: 1 and more where they are nothing else."""
        return self.noise / sqrt(self.rss) if self.rss > 0 else 1.0

    @cached_property
    def has_error_bars(self) -> bool:
        """Whether the residuals say anything: some degrees of freedom, and more than rounding noise."""
        return self.df > 0 and not self.perfect

    @cached_property
    def fitted(self) -> np.ndarray:
        return self.design.response - self.residuals

    @cached_property
    def orthonormal(self) -> np.ndarray:
        """(p + 1, n), a line a column: the constant direction where there is an intercept, the basis, and the residuals
        scaled to length 1, from whose cross products over some of the rows many regressions follow."""
        first = int(self.design.intercept)
        lines = np.empty((self.p + 1, self.n))
        lines[:first] = 1.0 / sqrt(self.n)
        lines[first:-1] = self.basis.q.T
        np.divide(self.residuals, self.length or 1.0, out=lines[-1])
        return lines

    @cached_property
    def length(self) -> float:
        """Euclidean length of the residuals."""
        return sqrt(self.rss)

    @cached_property
    def told_apart_to(self) -> float:
        """A share of a column below which what the predictors leave of it may be rounding."""
        return max(DETERMINED, ROUNDINGS * EPS * self.basis.amplification)

    @cached_property
    def results(self) -> dict[Any, Any]:
        """What `once_per_fit` keeps."""
        return {}

    @cached_property
    def sorted_residuals(self) -> np.ndarray:
        """(n,): from the lowest to the highest, sorted once for every test that needs it."""
        return np.sort(self.residuals)

    @cached_property
    def sigma(self) -> float:
        """Residual standard deviation, sqrt(rss / (n - p)); NaN without degrees of freedom."""
        return float(np.sqrt(self.rss / self.df)) if self.df > 0 else float("nan")

    @property
    def leverage(self) -> np.ndarray:
        """Diagonal of the hat matrix, (n,)."""
        return self.basis.leverage

    @cached_property
    def fits_itself(self) -> np.ndarray:
        """(n,) bool: rows of leverage 1, which determine their own fitted value whatever the response is there."""
        return self.leverage >= 1.0 - 100.0 * self.p * EPS

    @cached_property
    def some_fit_themselves(self) -> bool:
        return bool(self.fits_itself.any())

    @cached_property
    def unscaled_covariance(self) -> np.ndarray:
        """(X'X)^-1, (p, p), the constant first: coefficients' covariance divided by sigma squared."""
        return self.basis.coefficient_root @ self.basis.coefficient_root.T

    @cached_property
    def standard_errors(self) -> np.ndarray:
        """(p,): sigma times the root of the diagonal of (X'X)^-1."""
        sigma = 0.0 if self.perfect and self.df > 0 else self.sigma
        return sigma * self.basis.root_lengths

    @cached_property
    def t(self) -> np.ndarray:
        """(p,): coefficients over their standard errors; NaN where the residuals say nothing."""
        if not self.has_error_bars:
            return np.full(self.p, np.nan)
        return self.coefficients / self.standard_errors

    @cached_property
    def p_values(self) -> np.ndarray:
        """(p,): two-sided, t with n - p degrees of freedom."""
        if not self.has_error_bars:
            return np.full(self.p, np.nan)
        return 2.0 * stdtr(self.df, -np.abs(self.t))

    def interval(self, level: float = 0.95) -> tuple[np.ndarray, np.ndarray]:
        """Confidence limits of the coefficients, (p,) and (p,)."""
        if not self.has_error_bars:
            nothing = np.full(self.p, np.nan)
            return nothing, nothing
        half = self.quantile(level) * self.standard_errors
        return self.coefficients - half, self.coefficients + half

    def quantile(self, level: float) -> float:
        """Of t with n - p degrees of freedom: this share lies between its negative and it."""
        if level not in self.quantiles:
            self.quantiles[level] = float(stdtrit(self.df, 0.5 + level / 2))
        return self.quantiles[level]

    @cached_property
    def quantiles(self) -> dict[float, float]:
        """Those asked for so far."""
        return {}

    @cached_property
    def fitted_about_mean(self) -> np.ndarray:
        """(n,): fitted values minus the response's mean, every digit kept where the response has a large offset;
        without an intercept the fitted values themselves."""
        y = self.design.response
        return (self.response_about_mean if self.design.intercept else y) - self.residuals

    @cached_property
    def response_about_mean(self) -> np.ndarray:
        """(n,): every digit kept where the response has a large offset."""
        return centred(self.design.response)[0]

    @cached_property
    def tss(self) -> float:
        """Total sum of squares: about the mean with an intercept, about zero without; 0 where it is rounding only."""
        y = self.design.response
        left = self.response_about_mean if self.design.intercept else y
        total = float(left @ left)
        return total if total > (ROUNDINGS * EPS) ** 2 * float(y @ y) else 0.0

    @cached_property
    def r_squared(self) -> float:
        """1 - rss/tss; NaN where the response does not vary."""
        return 1.0 - self.rss / self.tss if self.tss > 0 else float("nan")

    @cached_property
    def adjusted_r_squared(self) -> float:
        if self.df <= 0:
            return float("nan")
        base = self.n - int(self.design.intercept)
        return 1.0 - (1.0 - self.r_squared) * base / self.df

    @cached_property
    def f_test(self) -> tuple[float, tuple[int, int], float]:
        """F of all predictors together: statistic, (numerator, denominator) df, p."""
        k = self.design.columns.shape[1]
        if not self.has_error_bars or k == 0:
            return float("nan"), (k, self.df), float("nan")
        f = (self.tss - self.rss) / k / (self.rss / self.df)
        return f, (k, self.df), float(fdtrc(k, self.df, f))

    @cached_property
    def log_likelihood(self) -> float:
        """Gaussian, at the maximum: sigma squared = rss/n."""
        if not self.has_error_bars:
            return float("nan")
        return -0.5 * self.n * (np.log(2 * np.pi) + np.log(self.rss / self.n) + 1.0)

    @property
    def aic(self) -> float:
        """Akaike's criterion, sigma counted as a parameter (as R; statsmodels does not, and prints 2 less)."""
        return 2.0 * (self.p + 1) - 2.0 * self.log_likelihood

    @property
    def bic(self) -> float:
        """Schwarz's criterion, sigma counted as a parameter."""
        return float(np.log(self.n)) * (self.p + 1) - 2.0 * self.log_likelihood

    def require_variation(self) -> None:
        """Refuse where the residuals say nothing: no degrees of freedom, or a perfect fit."""
        reason = self.nothing_left()
        if reason:
            raise NoVariationError(reason)

    def nothing_left(self) -> str:
        """Why the residuals say nothing; empty where they do."""
        if self.has_error_bars:
            return ""
        if self.df == 0:
            return (
                f"{self.n} rows for {self.p} coefficients leave no degrees of freedom: the line passes through every "
                "row. Add rows or use fewer predictors."
            )
        if self.perfect and self.tss == 0.0:
            same = "the same value" if self.design.intercept else "a zero"
            return f"Every used row has {same} of {self.design.response_name}, so that there is nothing to explain."
        return "The fit is perfect: what is left is rounding noise, and nothing can be tested on it."


def once_per_fit(compute: Callable[Concatenate[Fit, Options], Of]) -> Callable[Concatenate[Fit, Options], Of]:
    """Keep what compute(fit, ...) gives with the fit, for all methods that ask for it."""

    @wraps(compute)
    def kept(fit: Fit, *options: Options.args, **named: Options.kwargs) -> Of:
        key = (compute, options, *named.items())
        if key not in fit.results:
            fit.results[key] = compute(fit, *options, **named)
        found: Of = fit.results[key]
        return found

    return kept


def fit_design(design: Design) -> Fit:
    """Fit a Design by least squares.

    Refused as `factorize` says, and where the response's squares overflow or underflow. With n == p, or with residuals
    within a few roundings of the data, the residuals are set to zero: what is computed there is noise.
    """
    keep_freed_memory()
    basis = factorize(design.columns, design.column_names, intercept=design.intercept)
    with few_threads(design.columns.size):
        if ill_conditioned(basis):
            basis = refined_basis(basis, design.columns)
        return _solve(design, basis)


def _solve(design: Design, basis: Basis) -> Fit:
    y = design.response
    with np.errstate(over="ignore", invalid="ignore"):
        left, mean = centred(y) if design.intercept else (y.copy(), 0.0)
        total, whole = float(left @ left), float(y @ y)
        if not max(total, whole) < LARGEST_SQUARES:
            raise NoVariationError(
                "The response is too large for its squares to be computed: express it in a larger unit."
            )
    if 0.0 < np.abs(y).max() < SMALLEST:
        raise NoVariationError(
            "The response is too small for its squares to be computed: express it in a smaller unit."
        )
    projected = basis.q.T @ left
    left -= basis.q @ projected
    correction = basis.q.T @ left  # a second projection keeps the residuals orthogonal to the last digit
    left -= basis.q @ correction
    if design.intercept:
        left -= column_means(left)
    slopes = coefficients = _slopes(basis, projected + correction)
    if design.intercept:
        coefficients = np.empty(slopes.shape[0] + 1)
        coefficients[0], coefficients[1:] = mean - basis.centre @ slopes, slopes

    noise = EPS * (sqrt(whole) + float(np.abs(slopes) @ basis.raw_norm))
    rss = float(left @ left)
    if design.n > design.p and loses_digits(basis, total, rss, noise, coefficients, float(mean)):
        coefficients, left = refined_solution(design, basis, coefficients, left)
        rss = float(left @ left)
    perfect = sqrt(rss) <= ROUNDINGS * noise
    if design.n == design.p or perfect:
        left[:] = rss = 0.0
    fit = Fit(design, basis, coefficients, left, rss, perfect and design.n > design.p, noise)
    left[fit.fits_itself] = 0.0
    return fit


def _slopes(basis: Basis, coordinates: np.ndarray) -> np.ndarray:
    k = coordinates.shape[0]
    scaled = np.empty(k)
    if k:
        scaled[basis.pivot] = back_substituted(basis.r, coordinates)
    return scaled / basis.scale
