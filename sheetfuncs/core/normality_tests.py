"""Further tests of normality: by the distance between distributions, and by skewness and kurtosis."""

from __future__ import annotations

from math import asinh, cbrt, copysign, exp, log, sqrt

import numpy as np
from scipy.special import log_ndtr, ndtr

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.fit import Fit, once_per_fit
from sheetfuncs.core.normality import EQUAL, NORMAL, RESIDUALS_NOTE, all_equal, residual_shape
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.simulated_tables import BELOW, LOWEST_P, SimulatedTable, simulated_table
from sheetfuncs.core.tails import chi_square_tail

ANDERSON_DARLING_FEWEST = DAGOSTINO_FEWEST = 8
ANDERSON_DARLING_LOWEST = 3.7e-24
KURTOSIS_FEWEST = 20
SMALL_SAMPLE = {"distribution": "small-sample table"}

# D'Agostino and Stephens 1986, Goodness-of-Fit Techniques, table 4.9: up to this A, log p (from the upper end) or
# log(1 - p) (the first two) is this polynomial of A, lowest power first.
_TAILS = (
    (0.2, (-13.436, 101.14, -223.73)), (0.34, (-8.318, 42.796, -59.938)), (0.6, (0.9177, -4.279, -1.38)),
    (10.0, (1.2937, -5.709, 0.0186)),
)


def anderson_darling(fit: Fit) -> Result:
    """Anderson-Darling A squared of the residuals, their mean and standard deviation (divisor n - 1) estimated; 8 rows
    or more.

    Null: the errors are normal. A^2 = -n - mean of (2i - 1)(log F(z_i) + log(1 - F(z_(n+1-i)))), z the sorted
    standardized residuals, F the normal distribution (Anderson and Darling 1954, JASA 49:765-769). p from
    A = A^2 (1 + 0.75/n + 2.25/n^2) by D'Agostino and Stephens 1986, Goodness-of-Fit Techniques, table 4.9; their
    formula ends at A = 10, beyond which p is that of the end, 3.7e-24.
    """
    variant = "mean and spread estimated, p by D'Agostino and Stephens 1986"
    refusal = _refused(fit, "anderson_darling", variant, ANDERSON_DARLING_FEWEST, "its p-value is established")
    if refusal:
        return refusal
    statistic = _anderson_darling_of(_standardized(fit))
    corrected = statistic * (1.0 + 0.75 / fit.n + 2.25 / fit.n**2)
    beyond = f" p is {ANDERSON_DARLING_LOWEST:.2g} or less, where its formula ends." if corrected >= 10.0 else ""
    return Statistic(
        method="anderson_darling", args={}, variant=variant, statistic=statistic, p=_anderson_darling_p(corrected),
        null=NORMAL, note=RESIDUALS_NOTE + beyond, details={"corrected": corrected},
    )


def _anderson_darling_of(z: np.ndarray) -> float:
    """A squared of sorted standardized values."""
    n = z.shape[0]
    away = -np.abs(z)
    tail = ndtr(away)
    smallest = min(float(tail[0]), float(tail[-1]))
    outer = np.log(tail) if smallest > 1e-300 else log_ndtr(away)
    inner = np.log1p(-tail)
    middle = int(z.searchsorted(0.0))
    both = np.empty((2, n))  # logarithms of F(z_i), and of 1 - F(z_i)
    both[0, :middle], both[0, middle:] = outer[:middle], inner[middle:]
    both[1, :middle], both[1, middle:] = inner[:middle], outer[middle:]
    weight = np.arange(1.0, 2.0 * n, 2.0)
    return -n - float(np.sum(weight * (both[0] + both[1, ::-1]))) / n  # not by a product: it adds up less exactly


def _anderson_darling_p(a: float) -> float:
    for end, (constant, slope, bend) in _TAILS:
        if a < end:
            value = exp(constant + slope * a + bend * a**2)
            return 1.0 - value if end < 0.5 else value
    return ANDERSON_DARLING_LOWEST


def lilliefors(fit: Fit) -> Result:
    """Lilliefors test: Kolmogorov and Smirnov's distance D between the residuals and the normal distribution with
    their mean and standard deviation (divisor n - 1); 5 rows or more.

    Null: the errors are normal. Statistic: the largest distance between the two distribution functions (Lilliefors
    1967, JASA 62:399-402). p from simulated quantiles of D (sqrt(n) - 0.01 + 0.85/sqrt(n)) down to 1e-4
    (`simulated_tables`). details: simulation_error, the standard error of p.
    """
    variant = "mean and spread estimated, p from a simulated table"
    table = simulated_table("lilliefors")
    refusal = _refused(fit, "lilliefors", variant, table.fewest, "its table holds")
    if refusal:
        return refusal
    d = _distance(_standardized(fit))
    root = sqrt(fit.n)
    p, error, note = _from_table(fit, table, d * (root - 0.01 + 0.85 / root))
    return Statistic(
        method="lilliefors", args={}, variant=variant, statistic=d, p=p, null=NORMAL, note=note,
        details={"simulation_error": error},
    )


def _distance(z: np.ndarray) -> float:
    """Largest distance between the steps of sorted standardized values and the normal distribution."""
    n = z.shape[0]
    above = np.arange(1.0, n + 1.0) / n - ndtr(z)  # the step's upper end; its lower end is 1/n less
    return max(float(above.max()), 1.0 / n - float(above.min()))


def jarque_bera_small_sample(fit: Fit) -> Result:
    """Jarque-Bera test (Jarque and Bera 1980) with p from simulated quantiles for this number of rows, down to 1e-4
    (`simulated_tables`), 5 rows or more; statistic as in `jarque_bera`. details: skewness, kurtosis (3 is normal), and
    simulation_error, the standard error of p."""
    variant = "simulated table for this number of rows"
    table = simulated_table("jarque_bera")
    refusal = _refused(fit, "jarque_bera", variant, table.fewest, "its table holds", SMALL_SAMPLE)
    if refusal:
        return refusal
    skewness, kurtosis, statistic = residual_shape(fit)
    p, error, note = _from_table(fit, table, statistic)
    return Statistic(
        method="jarque_bera", args=SMALL_SAMPLE, variant=variant, statistic=statistic, p=p, null=NORMAL, note=note,
        details={"skewness": skewness, "kurtosis": kurtosis, "simulation_error": error},
    )


def dagostino_k2(fit: Fit) -> Result:
    """D'Agostino and Pearson's K squared from skewness and kurtosis of the residuals, 8 rows or more.

    Null: the errors are normal. Statistic: z_skewness^2 + z_kurtosis^2, chi-square with 2 degrees of freedom
    (D'Agostino and Pearson 1973, Biometrika 60:613-622); z_skewness by D'Agostino 1970, Biometrika 57:679-681,
    z_kurtosis by Anscombe and Glynn 1983, Biometrika 70:227-234, rough below 20 rows. Moments with divisor n. details:
    skewness, kurtosis (3 is normal), z_skewness, z_kurtosis.
    """
    variant = "skewness and kurtosis together"
    refusal = _refused(fit, "dagostino_k2", variant, DAGOSTINO_FEWEST, "its transformation of the kurtosis is valid")
    if refusal:
        return refusal
    skewness, kurtosis, _ = residual_shape(fit)
    along, across = _z_skewness(skewness, fit.n), _z_kurtosis(kurtosis, fit.n)
    statistic = along**2 + across**2
    few = f" Below {KURTOSIS_FEWEST} rows its kurtosis part is unreliable." if fit.n < KURTOSIS_FEWEST else ""
    return Statistic(
        method="dagostino_k2", args={}, variant=variant, statistic=statistic, df=2, p=chi_square_tail(2, statistic),
        null=NORMAL, note=RESIDUALS_NOTE + few,
        details={"skewness": skewness, "kurtosis": kurtosis, "z_skewness": along, "z_kurtosis": across},
    )


def _z_skewness(skewness: float, n: int) -> float:
    """D'Agostino 1970: Johnson's unbounded curve for the skewness of n normal draws."""
    y = skewness * sqrt((n + 1) * (n + 3) / (6 * (n - 2)))
    fourth = 3 * (n**2 + 27 * n - 70) * (n + 1) * (n + 3) / ((n - 2) * (n + 5) * (n + 7) * (n + 9))
    w2 = sqrt(2 * (fourth - 1)) - 1
    return asinh(y / sqrt(2 / (w2 - 1))) / sqrt(log(w2) / 2)


def _z_kurtosis(kurtosis: float, n: int) -> float:
    """Anscombe and Glynn 1983: cube root of a linear function of a chi-square's inverse, made standard normal.

    For kurtosis of about 5/3 and less the linear function is zero or below and the root changes sides; the sign here is
    the kurtosis' own, so that a flat distribution never shows as a peaked one. The square is the published one.
    """
    mean = 3 * (n - 1) / (n + 1)
    spread = sqrt(24 * n * (n - 2) * (n - 3) / ((n + 1) ** 2 * (n + 3) * (n + 5)))
    x = (kurtosis - mean) / spread
    skew = 6 * (n**2 - 5 * n + 2) / ((n + 7) * (n + 9)) * sqrt(6 * (n + 3) * (n + 5) / (n * (n - 2) * (n - 3)))
    a = 6 + 8 / skew * (2 / skew + sqrt(1 + 4 / skew**2))
    below = 1 + x * sqrt(2 / (a - 4))
    if abs(below) < 1e-12:
        below = copysign(1e-12, below)
    z = (1 - 2 / (9 * a) - cbrt((1 - 2 / a) / below)) / sqrt(2 / (9 * a))
    return z if below > 0 else -z


def _refused(
    fit: Fit, method: str, variant: str, fewest: int, purpose: str, args: dict[str, str] | None = None
) -> DoesNotApply | None:
    """The refusal of a fit without anything to test, with fewer rows than the method holds for, or equal residuals."""
    args = args or {}
    refusal = refused(fit, method, args, variant, NORMAL)
    if refusal:
        return refusal
    if fit.n >= fewest and not all_equal(fit):
        return None
    few = f"{purpose[0].upper()}{purpose[1:]} for {fewest} rows and more; there are {fit.n}."
    return DoesNotApply(
        method=method, args=args, variant=variant, null=NORMAL, reason=few if fit.n < fewest else EQUAL,
        cell_error="#NUM!",
    )


@once_per_fit
def _standardized(fit: Fit) -> np.ndarray:
    """(n,): sorted residuals less their mean, over their standard deviation with divisor n - 1."""
    e = fit.sorted_residuals
    left = e - np.add.reduce(e) / fit.n
    left /= max(float(left[-1]), -float(left[0]))
    left /= sqrt(float(left @ left) / (fit.n - 1))
    return left


def _from_table(fit: Fit, table: SimulatedTable, value: float) -> tuple[float, float, str]:
    """p, its simulation error, and the note that belongs to it."""
    p, error = table.p(value, fit.n)
    return p, error, RESIDUALS_NOTE + (f" p {BELOW}, where the table ends." if p <= LOWEST_P else "")
