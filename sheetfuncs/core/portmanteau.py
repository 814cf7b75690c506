"""Autocorrelations of the residuals, and tests of the first few of them together. Rows stand in time order."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.fft import irfft, next_fast_len, rfft
from scipy.special import ndtri

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import EPS, ROUNDINGS
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.independence import NO_CORRELATION
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.tails import chi_square_tail
from sheetfuncs.errors import ArgumentError, NoVariationError

# One transform costs as much as this many sums of products.
_SUMS_UP_TO = 24
_ALIKE = "All residuals are alike, so that they show no variation that could be correlated."
_NOTE = "Residuals are not independent even where the errors are; no degrees of freedom are taken off for that."


@dataclass(frozen=True, eq=False)
class Autocorrelations:
    """Autocorrelations of the residuals.

    lags: (m,) 1 .. m. r: (m,). band: half-width within which 95 % lie where errors are independent, 1.96/sqrt(n).
    bartlett_band: (m,) the same where the errors are correlated up to the lag before and not beyond,
    1.96 sqrt((1 + 2 (r_1^2 + ... + r_{k-1}^2)) / n) (Bartlett 1946, J. R. Stat. Soc. Suppl. 8:27-41).
    """

    lags: np.ndarray
    r: np.ndarray
    band: float
    bartlett_band: np.ndarray


def default_lags(n: int) -> int:
    """A fifth of the rows, at most 10 (Hyndman and Athanasopoulos, Forecasting, section 5.4, for data not seasonal)."""
    return max(1, min(10, n // 5))


def ljung_box(fit: Fit, lags: int) -> Result:
    """Ljung-Box test (1978, Biometrika 65:297-303, equation 1.3): n (n + 2) sum of r_k^2 / (n - k), chi-square(lags).

    Null: the errors are not correlated with any of the `lags` before. The residuals' mean is taken off, which matters
    only without an intercept. Nothing is taken off the degrees of freedom for the coefficients.
    """
    return _portmanteau(fit, "ljung_box", (lags,))[0]


def box_pierce(fit: Fit, lags: int) -> Result:
    """Box-Pierce test (1970, JASA 65:1509-1526): n times the sum of r_k^2, chi-square(lags); as `ljung_box`, which is
    nearer to its distribution with few rows."""
    return _portmanteau(fit, "box_pierce", (lags,))[0]


def portmanteau_tests(fit: Fit, lags: Sequence[int]) -> tuple[Result, ...]:
    """`ljung_box`, then `box_pierce`, each at all these numbers of lags, from one set of autocorrelations."""
    whole = tuple(_whole(count) for count in lags)
    possible = max((count for count in whole if count < fit.n), default=0)
    r = _autocorrelations(fit, possible) if possible and fit.has_error_bars else None
    return (*_portmanteau(fit, "ljung_box", whole, r), *_portmanteau(fit, "box_pierce", whole, r))


def autocorrelation_table(fit: Fit, lags: int) -> Autocorrelations:
    """Autocorrelations r_1 .. r_lags of the residuals with two bands.

    r_k: sum of e_t e_{t-k} over the sum of e_t^2, the residuals' mean taken off.
    Raises ArgumentError for lags that are no whole number from 1, NoVariationError where there are not more rows than
    lags, or the residuals say nothing.
    """
    lags = _whole(lags)
    fit.require_variation()
    if lags >= fit.n:
        raise NoVariationError(_too_few(fit.n, lags))
    r = _autocorrelations(fit, lags)
    if r is None:
        raise NoVariationError(_ALIKE)
    half = float(ndtri(0.975)) / np.sqrt(fit.n)
    before = np.concatenate([[0.0], np.cumsum(r[:-1] ** 2)])
    return Autocorrelations(np.arange(1, lags + 1), r, float(half), half * np.sqrt(1.0 + 2.0 * before))


def _portmanteau(fit: Fit, method: str, lags: Sequence[int], known: np.ndarray | None = None) -> tuple[Result, ...]:
    counts = [_whole(count) for count in lags]
    possible = max((count for count in counts if count < fit.n), default=0)
    r = known if known is not None else _autocorrelations(fit, possible) if possible and fit.has_error_bars else None
    sums = None if r is None else fit.n * np.add.accumulate(r**2 * _weights(fit.n, r.shape[0], method))
    return tuple(_portmanteau_test(fit, method, count, sums) for count in counts)


def _weights(n: int, lags: int, method: str) -> np.ndarray | float:
    return (n + 2.0) / (n - np.arange(1.0, lags + 1.0)) if method == "ljung_box" else 1.0


def _portmanteau_test(fit: Fit, method: str, lags: int, sums: np.ndarray | None) -> Result:
    """sums: the statistic up to each lag; None where the residuals are alike."""
    named: dict[str, Any] = {
        "method": method, "args": {"lag": lags, "fitdf": 0}, "variant": f"{lags} lag{'s' if lags > 1 else ''}",
        "null": NO_CORRELATION,
    }
    refusal = refused(fit, **named)
    if refusal:
        return refusal
    if lags >= fit.n:
        return DoesNotApply(**named, reason=_too_few(fit.n, lags), cell_error="#NUM!")
    if sums is None:
        return DoesNotApply(**named, reason=_ALIKE, cell_error="#NUM!")
    statistic = float(sums[lags - 1])
    return Statistic(**named, statistic=statistic, df=lags, p=chi_square_tail(lags, statistic), note=_NOTE)


def _autocorrelations(fit: Fit, lags: int) -> np.ndarray | None:
    """r_1 .. r_lags, (lags,); None where the residuals do not vary."""
    e = fit.design.in_order(fit.residuals)
    mean = float(np.add.reduce(e)) / fit.n
    if not fit.design.intercept:
        e = e - mean
    total = float(e @ e)
    if total <= fit.n * (ROUNDINGS * EPS * mean) ** 2 + (ROUNDINGS * fit.noise) ** 2:
        return None
    if lags <= _SUMS_UP_TO:
        return np.array([e[lag:] @ e[:-lag] for lag in range(1, lags + 1)]) / total
    length = next_fast_len(fit.n + lags, real=True)
    power = rfft(e / np.sqrt(total), length)
    return irfft(power.real**2 + power.imag**2, length)[1:lags + 1]


def _whole(lags: float) -> int:
    if not float(lags).is_integer() or lags < 1:
        raise ArgumentError(f"{lags} is not a number of lags: use a whole number from 1 up.")
    return int(lags)


def _too_few(n: int, lags: int) -> str:
    return f"{n} rows are too few for {lags} lags: a lag needs at least one pair of rows."
