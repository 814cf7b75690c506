"""Distribution of ratios of quadratic forms in normal errors: the exact p-value of the Durbin-Watson statistic.

P(DW < d) = P(u'M(A - dI)M u < 0) for normal u, M the residual projector and A the second-difference matrix. Its
cumulant generating function K(s) = -1/2 log det(I - 2s M(A - dI)M) is inverted on the vertical line through the
saddlepoint (Helstrom 1996, IEEE Trans. Aerosp. Electron. Syst. 32:1465-1470; Daniels 1954, Ann. Math. Stat. 25:631),
where the integrand does not oscillate and tails keep their relative precision. No normal approximation at any n.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.fft import dct
from scipy.linalg import eigh

from sheetfuncs.core.basis import Basis
from sheetfuncs.core.threads import few_threads

# Up to here all eigenvalues are cheaper than one small determinant for every node of the integral.
EIGENVALUES_UP_TO = 160
RELATIVE = 1e-13
_MOST_NODES = 4096
_FARTHEST = 60.0

LogDeterminant = Callable[[np.ndarray], np.ndarray]


@dataclass(frozen=True)
class Tails:
    """P(statistic < d) and P(statistic > d), each right to its own leading digits."""

    lower: float
    upper: float


def durbin_watson_tails(basis: Basis, d: float, order: np.ndarray | None = None) -> Tails:
    """Both tails of the Durbin-Watson statistic at d for this basis; order (n,) sorts its rows in time.

    Exact for normal, independent errors and predictors that hold no lagged response. With d outside the possible
    range one tail is 0 and the other 1.
    """
    n = basis.n
    q = basis.q if order is None else basis.q[order]
    with few_threads(basis.q.size):
        if n > EIGENVALUES_UP_TO:
            return _from_determinants(q, basis.intercept, d)
        frequencies = 2.0 - 2.0 * np.cos(np.pi * np.arange(n) / n)
        # A is diagonal in the DCT-II basis (Durbin and Watson 1950, Biometrika 37:409-428, section 5).
        spectrum = dct(q, type=2, axis=0, norm="ortho")
        if basis.intercept:  # the constant is the basis vector of frequency 0
            frequencies, spectrum = frequencies[1:], spectrum[1:]
        return _from_eigenvalues(frequencies - d, spectrum)


def durbin_watson_bounds(
    n: int, predictors: int, significance: float, *, intercept: bool = True
) -> tuple[float, float]:
    """dL and dU: whatever the predictors are, the critical value lies between them (Durbin and Watson 1950, 1951).

    n: rows; predictors: their number, the constant not counted; significance: one-sided, against positive correlation.
    The bounding ratios keep the n - p smallest, or largest, eigenvalues of A that the constant leaves.
    """
    frequencies = 2.0 - 2.0 * np.cos(np.pi * np.arange(int(intercept), n) / n)
    kept = frequencies.shape[0] - predictors
    return _quantile(frequencies[:kept], significance), _quantile(frequencies[predictors:], significance)


def _quantile(frequencies: np.ndarray, probability: float) -> float:
    """The d with P(sum (f - d) z^2 < 0) = probability."""
    low, high = float(frequencies.min()), float(frequencies.max())

    def miss(d: float) -> float:
        return _of_eigenvalues(frequencies - d).lower / probability - 1.0

    # Regula falsi, Illinois form (Dowell and Jarratt 1971, BIT 11:168-174): scipy.optimize costs half a second to load.
    old, new, at_old, at_new = low, high, -1.0, 1.0 / probability - 1.0
    for _ in range(100):
        middle = new - at_new * (new - old) / (at_new - at_old)
        at_middle = miss(middle)
        if abs(at_middle) <= 1e-11 or abs(new - old) <= 1e-12:
            return float(middle)
        if at_middle * at_new < 0:
            old, at_old = new, at_new
        else:
            at_old *= 0.5
        new, at_new = middle, at_middle
    return float(new)


def _from_eigenvalues(shifted: np.ndarray, spectrum: np.ndarray) -> Tails:
    product = shifted[:, None] * spectrum
    middle = spectrum.T @ product
    matrix = np.diag(shifted) - spectrum @ product.T - product @ spectrum.T + spectrum @ middle @ spectrum.T
    return _of_eigenvalues(eigh(matrix, eigvals_only=True, check_finite=False))


def _of_eigenvalues(eigenvalues: np.ndarray) -> Tails:
    """Tails of sum eigenvalue z^2 at 0."""
    negative, positive = float(eigenvalues.min()), float(eigenvalues.max())
    noise = 1e-13 * max(-negative, positive)
    if negative >= -noise:
        return Tails(0.0, 1.0)
    if positive <= noise:
        return Tails(1.0, 0.0)

    def log_determinant(s: np.ndarray) -> np.ndarray:
        return np.log(1.0 - 2.0 * s[:, None] * eigenvalues).sum(axis=1)

    return _tails(log_determinant, 0.5 / negative, 0.5 / positive)


class _Moments:
    """Sums over the frequencies of cos(m theta) q q', for m = 0, 1, ...: lagged cross products of q, no transform.

    The DCT-II is the spectrum of the rows mirrored at both ends, so that these are cross products of each row with the
    rows m places away, the ends folded back.
    """

    def __init__(self, q: np.ndarray):
        self.q = q
        self.found = [q.T @ q]

    def upto(self, count: int) -> np.ndarray:
        """(count, k, k): the first moments."""
        while len(self.found) < count:
            self.found.append(self._moment(len(self.found)))
        return np.array(self.found[:count])

    def _moment(self, lag: int) -> np.ndarray:
        q = self.q
        apart = q[:-lag].T @ q[lag:]
        folded = q[:lag].T @ q[lag - 1::-1] if lag > 1 else np.outer(q[0], q[0])
        end = q[-lag:]
        folded = folded + end.T @ end[::-1]
        return (apart + apart.T + folded) / 2.0


def _from_determinants(q: np.ndarray, intercept: bool, d: float) -> Tails:
    """det(V'CV) = det(C) det(Q'C^-1 Q) for C = I - 2s(A - dI) and V orthogonal to Q: a k x k determinant a node.

    det(C) is a Chebyshev polynomial in closed form, and C^-1 its generating series
    1/(a + 4s cos) = (1 + 2 sum (-r)^m cos(m theta)) / sqrt(a^2 - 16 s^2), which converges like r^m.
    """
    n = q.shape[0]
    lowest_frequency, highest = (2.0 - 2.0 * np.cos(np.pi / n) if intercept else 0.0), 2.0 + 2.0 * np.cos(np.pi / n)
    if d <= lowest_frequency:
        return Tails(0.0, 1.0)
    if d >= highest:
        return Tails(1.0, 0.0)
    moments = _Moments(q)

    def log_determinant(s: np.ndarray) -> np.ndarray:
        s = s.astype(np.complex128)
        delta = s * (2.0 * d - 4.0)
        root = np.sqrt(1.0 + delta - 4.0 * s) * np.sqrt(1.0 + delta + 4.0 * s)
        beyond_one = (delta * (2.0 + delta) - 16.0 * s * s) / (root + 1.0)  # root - 1 without cancellation
        log_larger = np.log1p((delta + beyond_one) / 2.0)
        r = 2.0 * s * np.exp(-log_larger)
        logs = n * log_larger + np.log1p(-(r * r) ** n) - np.log(root)
        if not intercept:
            logs = logs + np.log(1.0 + 2.0 * s * d)
        return logs + _log_small_determinants(moments, r, root)

    # Inside the range of the frequencies of A itself, which every node of the integral stays in.
    return _tails(log_determinant, 0.5 / (lowest_frequency - d), 0.5 / (highest - d))


def _log_small_determinants(moments: _Moments, r: np.ndarray, root: np.ndarray) -> np.ndarray:
    """log det(Q'C^-1 Q) at every node, from the moments of Q."""
    if not moments.q.shape[1]:
        return np.zeros(r.shape, np.complex128)
    largest = float(np.abs(r).max())
    count = 2 + int(np.log(1e-17) / np.log(min(largest, 1.0 - 1e-9))) if largest > 1e-17 else 1
    count = max(1, min(count, moments.q.shape[0] - 1))
    weights = 2.0 * (-r[:, None]) ** np.arange(count)
    weights[:, 0] = 1.0
    small = np.tensordot(weights, moments.upto(count), axes=1) / root[:, None, None]
    sign, size = np.linalg.slogdet(small)
    return size + np.log(sign)


def _tails(log_determinant: LogDeterminant, lowest: float, highest: float) -> Tails:
    """Both tails from log det(I - 2sB), which exists for real s in (lowest, highest) around 0."""
    sides = [_saddlepoint(log_determinant, end) for end in (lowest, highest)]
    heights = [height for _, height, _ in sides]
    side = int(np.argmin(heights))
    place, _, width = sides[side]
    p = min(max(_integral(log_determinant, place, width), 0.0), 1.0)
    return Tails(p, 1.0 - p) if side == 0 else Tails(1.0 - p, p)


def _saddlepoint(log_determinant: LogDeterminant, end: float) -> tuple[float, float, float]:
    """Where K(s) - log|s| is least between 0 and end: place, value, and the integrand's width across it.

    Golden-section search; the place need not be exact, since any point between gives the same integral.
    """

    def height(share: float) -> float:
        s = np.array([share * end])
        return float(-0.5 * log_determinant(s).real[0] - np.log(abs(s[0])))

    golden = (np.sqrt(5.0) - 1.0) / 2.0
    low, high = 0.0, 1.0
    left, right = high - golden * (high - low), low + golden * (high - low)
    at_left, at_right = height(left), height(right)
    while high - low > 1e-3 * high:
        if at_left < at_right:
            high, right, at_right = right, left, at_left
            left = high - golden * (high - low)
            at_left = height(left)
        else:
            low, left, at_left = left, right, at_right
            right = low + golden * (high - low)
            at_right = height(right)
    share = (low + high) / 2.0
    step = min(share, 1.0 - share) / 4.0
    middle = height(share)
    curvature = (height(share + step) - 2.0 * middle + height(share - step)) / (step * end) ** 2
    return share * end, middle, 1.0 / np.sqrt(curvature)


def _integral(log_determinant: LogDeterminant, place: float, width: float) -> float:
    """|(1/pi) Re of the integral of exp(K(s))/s along place + it|: trapezoid in t = width sinh(x), nodes doubled."""

    def integrand(x: np.ndarray) -> np.ndarray:
        s = place + 1j * width * np.sinh(x)
        logs = log_determinant(s)
        # The square root's branch: the phase is 0 at x = 0 and continuous from there.
        phase = np.unwrap(np.concatenate([[0.0], logs.imag]))[1:]
        return np.exp(-0.5 * (logs.real + 1j * phase) - np.log(s)) * np.cosh(x)

    reach = _reach(log_determinant, place, width)
    count, before = 16, np.nan
    while count <= _MOST_NODES:
        x = np.linspace(0.0, reach, count + 1)
        values = integrand(x).real
        values[0] *= 0.5
        found = abs(float(values.sum()) * reach / count * width / np.pi)
        if abs(found - before) <= RELATIVE * found:
            return found
        count, before = 2 * count, found
    return found


def _reach(log_determinant: LogDeterminant, place: float, width: float) -> float:
    """The x from which on the integrand is too small to count. Found from below: far out everything costs more."""

    def size(x: float) -> float:
        s = np.array([place + 1j * width * np.sinh(x)])
        return float(-0.5 * log_determinant(s).real[0] - np.log(abs(s[0])) + x)

    x, start = 1.0, size(0.0)
    while x < _FARTHEST and size(x) > start - 40.0:
        x *= 1.15
    return x
