"""Normality: do the residuals look like draws from a normal curve?"""

from __future__ import annotations

from math import exp, log, sqrt

import numpy as np
from scipy.special import ndtr, ndtri

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import ROUNDINGS
from sheetfuncs.core.fit import Fit, once_per_fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.tails import chi_square_tail

NORMAL = "the errors are normal"
RESIDUALS_NOTE = "Residuals are not independent draws, so p is approximate."
EQUAL = "All residuals are equal, so that they have no shape."
SHAPIRO_FEWEST, SHAPIRO_MOST = 3, 5000

# Royston 1995, Algorithm AS R94, Applied Statistics 44:547-551: polynomial coefficients, lowest power first.
_C1 = (0.0, 0.221157, -0.147981, -2.07119, 4.434685, -2.706056)
_C2 = (0.0, 0.042981, -0.293762, -1.752461, 5.682633, -3.582633)
_C3 = (0.544, -0.39978, 0.025054, -6.714e-4)
_C4 = (1.3822, -0.77857, 0.062767, -0.0020322)
_C5 = (-1.5861, -0.31082, -0.083751, 0.0038915)
_C6 = (-0.4803, -0.082676, 0.0030302)
_G = (-2.273, 0.459)


def shapiro_wilk(fit: Fit) -> Result:
    """Shapiro-Wilk W of the residuals (Shapiro and Wilk 1965; Royston 1995, Algorithm AS R94), 3 to 5,000 rows."""
    refusal = refused(fit, "shapiro_wilk", {}, "Royston 1995", NORMAL)
    if refusal:
        return refusal
    if not SHAPIRO_FEWEST <= fit.n <= SHAPIRO_MOST:
        return DoesNotApply(
            method="shapiro_wilk", args={}, variant="Royston 1995", null=NORMAL,
            reason=f"Its p-value is established for {SHAPIRO_FEWEST} to {SHAPIRO_MOST:,} rows; there are {fit.n:,}.",
        )
    if all_equal(fit):
        return DoesNotApply(
            method="shapiro_wilk", args={}, variant="Royston 1995", null=NORMAL, reason=EQUAL, cell_error="#NUM!"
        )
    w, p = shapiro_wilk_of(fit.sorted_residuals)
    return Statistic(
        method="shapiro_wilk", args={}, variant="Royston 1995", statistic=w, p=p, null=NORMAL, note=RESIDUALS_NOTE
    )


def shapiro_wilk_of(values: np.ndarray) -> tuple[float, float]:
    """W and p of 3 to 5,000 values that are not all equal, by Algorithm AS R94 (with exact normal quantiles)."""
    x = np.sort(values)
    n = x.shape[0]
    x = (x - x[n // 2]) / (x[-1] - x[0])
    weights = _shapiro_weights(n)
    left = x - np.add.reduce(x) / n
    along, total = float(weights @ left), float(left @ left)
    size = sqrt(float(weights @ weights) * total)
    missing = (size - along) * (size + along) / size**2  # 1 - W without cancellation
    return 1.0 - missing, _shapiro_p(max(missing, 1e-19), n)


def _shapiro_weights(n: int) -> np.ndarray:
    if n == 3:
        return np.array([-np.sqrt(0.5), 0.0, np.sqrt(0.5)])
    half = n // 2
    m = ndtri((np.arange(1, half + 1) - 0.375) / (n + 0.25))
    length, lowest = 2.0 * float(m @ m), float(m[0])
    step = 1.0 / sqrt(n)
    first = _polynomial(_C1, step) - lowest / sqrt(length)
    weights = np.zeros(n)
    if n > 5:
        next_lowest = float(m[1])
        second = _polynomial(_C2, step) - next_lowest / sqrt(length)
        scale = (length - 2 * lowest**2 - 2 * next_lowest**2) / (1 - 2 * first**2 - 2 * second**2)
        weights[:half] = m / sqrt(scale)
        weights[:2] = -first, -second
    else:
        weights[:half] = m / sqrt((length - 2 * lowest**2) / (1 - 2 * first**2))
        weights[0] = -first
    weights[n - half :] = -weights[half - 1 :: -1]
    return weights


def _shapiro_p(missing: float, n: int) -> float:
    if n == 3:  # exact
        return float(max(0.0, 6.0 / np.pi * (np.arcsin(np.sqrt(1.0 - missing)) - np.arcsin(np.sqrt(0.75)))))
    y = log(missing)
    if n <= 11:
        limit = _polynomial(_G, float(n))
        if y >= limit:
            return 0.0
        y = -log(limit - y)
        mean, spread = _polynomial(_C3, float(n)), exp(_polynomial(_C4, float(n)))
    else:
        size = log(n)
        mean, spread = _polynomial(_C5, size), exp(_polynomial(_C6, size))
    return float(ndtr((mean - y) / spread))


def _polynomial(coefficients: tuple[float, ...], x: float) -> float:
    value = 0.0
    for coefficient in reversed(coefficients):
        value = value * x + coefficient
    return value


def jarque_bera(fit: Fit) -> Result:
    """Jarque-Bera test from skewness and kurtosis of the residuals, moments with divisor n (Jarque and Bera 1980,
    Economics Letters 6:255-259); asymptotic chi-square with 2 degrees of freedom, slow to hold for few rows."""
    variant = "asymptotic chi-square"
    refusal = refused(fit, "jarque_bera", {}, variant, NORMAL)
    if refusal:
        return refusal
    if all_equal(fit):
        return DoesNotApply(
            method="jarque_bera", args={}, variant=variant, null=NORMAL, reason=EQUAL, cell_error="#NUM!"
        )
    skewness, kurtosis, statistic = residual_shape(fit)
    return Statistic(
        method="jarque_bera", args={}, variant=variant, statistic=statistic, df=2, p=chi_square_tail(2, statistic),
        null=NORMAL, note="The chi-square distribution is approached slowly; with few rows read p as rough.",
        details={"skewness": skewness, "kurtosis": kurtosis},
    )


def all_equal(fit: Fit) -> bool:
    """Whether the residuals differ by rounding only: possible without an intercept."""
    lowest_first = fit.sorted_residuals
    return float(lowest_first[-1] - lowest_first[0]) <= ROUNDINGS * fit.noise


@once_per_fit
def residual_shape(fit: Fit) -> tuple[float, float, float]:
    """Skewness and kurtosis of the residuals, as `shape`, and Jarque and Bera's statistic of them."""
    skewness, kurtosis = shape(fit.residuals)
    return skewness, kurtosis, fit.n / 6.0 * (skewness**2 + (kurtosis - 3.0) ** 2 / 4.0)


def shape(values: np.ndarray) -> tuple[float, float]:
    """Skewness and kurtosis (3 is normal) of values that are not all equal, moments about the mean with divisor n."""
    n = values.shape[0]
    left = values - np.add.reduce(values) / n
    left /= max(float(left.max()), -float(left.min()))
    square = left * left
    second = float(np.add.reduce(square)) / n
    return float(square @ left) / n / second**1.5, float(square @ square) / n / second**2


def normal_scores(values: np.ndarray) -> np.ndarray:
    """Where each value's rank would lie on a standard normal curve, (n,): the quantile of (rank - 3/8)/(n + 1/4)
    (Blom 1958, Statistical Estimates and Transformed Beta-Variables). Equal values share their mean rank."""
    _, place, count = np.unique(values, return_inverse=True, return_counts=True)
    last = np.cumsum(count)
    return scores_of_ranks((last - (count - 1) / 2.0)[place], values.shape[0])


def scores_of_ranks(rank: np.ndarray, n: int) -> np.ndarray:
    """Normal scores of ranks from 1 among n values (Blom 1958)."""
    return ndtri((rank - 0.375) / (n + 0.25))
