"""The Durbin-Watson statistic as a ratio of quadratic forms in normal errors: its exact p-value, and its bounds.

P(DW < d) = P(u'M(A - dI)M u < 0) for normal u, M the residual projector and A the second-difference matrix, which is
diagonal in the DCT-II basis (Durbin and Watson 1950, Biometrika 37:409-428, section 5). `inversion` does the rest.
"""

from __future__ import annotations

from math import sqrt

import numpy as np
from scipy.fft import dct
from scipy.special import ndtri

from sheetfuncs.core.basis import Basis
from sheetfuncs.core.determinant_form import DeterminantForm, frequencies, frequency
from sheetfuncs.core.inversion import BORDER, UNDERFLOW, EigenvalueForm, Tails, saddlepoint, tails_at_zero
from sheetfuncs.core.threads import few_threads

# Up to here all eigenvalues are cheaper than one small determinant for every node of the integral.
EIGENVALUES_UP_TO = 50
# With fewer rows for each coefficient too: every determinant is costly, and with few degrees of freedom loses digits.
ROWS_PER_COEFFICIENT = 8
# Up to here all eigenvalues are computed where the saddlepoint may lie beyond the frequencies of A.
EIGENVALUES_IN_NEED_UP_TO = 3000
# Up to this share of the way to an end, a rough saddlepoint will do.
INNER = 0.5
# Eigenvalues between 0 and 4 are computed to about this.
NOISE = 1e-13


def durbin_watson_tails(basis: Basis, d: float, order: np.ndarray | None = None) -> Tails:
    """Both tails of the Durbin-Watson statistic at d for this basis; order (n,) sorts its rows in time.

    Exact for normal, independent errors and predictors that hold no lagged response. With d outside the possible
    range one tail is 0 and the other 1.
    """
    n = basis.n
    q = basis.q if order is None else basis.q[order]
    with few_threads(basis.q.size):
        if n <= EIGENVALUES_UP_TO or n < ROWS_PER_COEFFICIENT * basis.rank:
            return _from_eigenvalues(q, basis.intercept, d)
        return _from_determinants(q, basis.intercept, d)


def durbin_watson_bounds(
    n: int, predictors: int, significance: float, *, intercept: bool = True
) -> tuple[float, float]:
    """dL and dU: whatever the predictors are, the critical value lies between them (Durbin and Watson 1950, 1951).

    n: rows; predictors: their number, the constant not counted; significance: one-sided, against positive correlation.
    The bounding ratios keep the n - p smallest, or largest, eigenvalues of A that the constant leaves.
    """
    possible = frequencies(n)[int(intercept):]
    kept = possible.shape[0] - predictors
    return _quantile(possible[:kept], significance), _quantile(possible[predictors:], significance)


def _quantile(possible: np.ndarray, probability: float) -> float:
    """The d with P(sum (f - d) z^2 < 0) = probability, f the possible ratios."""
    low, high = float(possible[0]), float(possible[-1])
    if possible.shape[0] == 1:
        return low
    size, mean = possible.shape[0], float(possible.mean())
    slope = 1.0 / sqrt(2.0 * float(np.square(possible - mean).sum()) / size / (size + 2))
    # The normal deviate of P is nearly a straight line in d, of this slope at first (the ratio has these moments), so
    # that the secant method needs few steps. What leaves the bracket is halved.
    target = float(ndtri(probability))
    d, before, deviate_before = mean + target / slope, np.nan, np.nan
    for _ in range(100):
        if not low < d < high:
            d = 0.5 * (low + high)
        deviate = float(ndtri(tails_at_zero(EigenvalueForm(possible - d)).lower)) - target
        if abs(deviate) <= 1e-11 or high - low <= 1e-15 * high:
            break
        low, high = (d, high) if deviate < 0.0 else (low, d)
        if np.isfinite(deviate - deviate_before) and deviate != deviate_before:
            slope = (deviate - deviate_before) / (d - before)
        before, deviate_before = d, deviate
        d -= deviate / slope
    return d


def _from_eigenvalues(q: np.ndarray, intercept: bool, d: float) -> Tails:
    """From all eigenvalues of (I - SS')D(I - SS'), S the spectrum of q and D diagonal, frequencies less d."""
    n = q.shape[0]
    shifted, spectrum = frequencies(n) - d, dct(q, type=2, axis=0, norm="ortho")
    if intercept:  # the constant is the basis vector of frequency 0
        shifted, spectrum = shifted[1:], spectrum[1:]
    product = shifted[:, None] * spectrum
    product -= 0.5 * spectrum @ (spectrum.T @ product)
    update = spectrum @ product.T
    matrix = -update - update.T
    matrix.flat[:: matrix.shape[0] + 1] += shifted
    eigenvalues = np.linalg.eigvalsh(matrix)
    if eigenvalues[0] >= -NOISE:
        return Tails(0.0, 1.0)
    if eigenvalues[-1] <= NOISE:
        return Tails(1.0, 0.0)
    return tails_at_zero(EigenvalueForm(eigenvalues))


def _from_determinants(q: np.ndarray, intercept: bool, d: float) -> Tails:
    n = q.shape[0]
    if d <= frequency(n, int(intercept)) + NOISE:
        return Tails(0.0, 1.0)
    if d >= frequency(n, n - 1) - NOISE:
        return Tails(1.0, 0.0)
    form = DeterminantForm(q, intercept, d)
    # By far the most correlated of long series need no more than a bound.
    if n * (d - 2.0) ** 2 > 2e3 and form.bound(0.999 * (form.lowest if d < 2.0 else form.highest)) < UNDERFLOW:
        return Tails(0.0, 1.0) if d < 2.0 else Tails(1.0, 0.0)
    saddle = saddlepoint(form, form.roughly_at)
    if saddle.share > INNER:
        saddle = saddlepoint(form)
    if saddle.share > BORDER and n <= EIGENVALUES_IN_NEED_UP_TO:
        return _from_eigenvalues(q, intercept, d)
    return tails_at_zero(form, saddle)
