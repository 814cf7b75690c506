"""Box-Cox: which power of the response, on these predictors, is the most likely one?"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from math import exp, expm1, isfinite, log, log1p, sqrt

import numpy as np
from scipy.linalg import lapack
from scipy.special import chdtri

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import EPS, ROUNDINGS
from sheetfuncs.core.box_cox_series import PowerSeries, power_series
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.tails import chi_square_tail
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError

POWERS = np.linspace(-5.0, 5.0, 21)  # where the highest likelihood is looked for first
ZERO_AND_ONE = [10, 12]
THIN, SOME = 400, 250  # rows that the search starts from, without and with a power series
STANDARD_ERRORS, IN_BETWEEN = 3.0, 0.05
TINY = 1e-300
CHUNK = 16384  # rows at a time, which stay in the processor's cache
SMALL = 0.005
CARRIES = 0.2
NEAR_ZERO = -0.9
# (k + 1)/(k + 2)!: the series of (x e^x - e^x + 1)/x^2, as exact as doubles below SMALL; highest power first.
_SERIES = (5 / 720, 4 / 120, 3 / 24, 2 / 6, 1 / 2)
FEWEST_DF = 2
# A column of which this share of its square is left after the others is told apart well enough for a start.
ENOUGH = 1e-4


def box_cox(fit: Fit, *, level: float = 0.95, without_intercept: bool = False) -> Result:
    """The power lambda of the response with the highest likelihood, by exact maximum of the profile (Box and Cox 1964,
    JRSS B 26:211-252), with the interval of all powers that a likelihood ratio test at 1 - level does not reject.

    The profile is -n/2 log rss of ((y/g)^lambda - 1)/lambda on the predictors (log(y/g) for 0), g the geometric mean.
    Refused without an intercept, where the likeliest power depends on what the response is divided by;
    without_intercept=True computes it for the response divided by its geometric mean, and says so.

    details: lambda; ci95 (or as level says), None for an end that is not there; loglik_max; LR_lambda_0 and
    LR_lambda_1, the likelihood ratio tests of the logarithm and of no power: statistic, and p from chi-square with 1
    degree of freedom.
    """
    if not 0.5 <= level <= 0.9999:
        raise ArgumentError(f"The level {level:g} is not between 0.5 and 0.9999: 0.95 gives a 95 % interval.")
    variant = "maximum likelihood, interval from the likelihood ratio"

    def cannot(reason: str, cell_error: str = "#N/A") -> DoesNotApply:
        return DoesNotApply(method="box_cox", args={}, variant=variant, reason=reason, cell_error=cell_error)

    refusal = refused(fit, "box_cox", {}, variant, "")
    if refusal:
        return refusal
    y = fit.design.response
    lowest = int(np.argmin(y))
    if y[lowest] <= 0.0:
        return cannot(f"Powers need a positive response: row {int(fit.design.rows[lowest])} has {y[lowest]:g}.")
    if not fit.design.intercept and not without_intercept:
        return cannot(
            "Without an intercept the likeliest power changes with what the response is divided by, so that it says "
            "nothing about the data alone."
        )
    if fit.df < FEWEST_DF:
        return cannot(f"{fit.n} rows are too few to find a power beside {fit.p} coefficients.", "#NUM!")
    with few_threads(fit.basis.q.size):
        profile = _Profile(_log_ratio(y), fit.basis.q, fit.design.intercept)
        cut = float(chdtri(1, 1.0 - level))
        found = _by_series(profile, cut)
        best = found[0] if found else _likeliest(profile)
        if profile.fits_perfectly(best):
            return cannot(
                f"With the power {best.power:.6g} the fit is perfect, so that nothing can be tested on it.", "#NUM!"
            )
        ends = found[1] if found else _interval(profile, best, cut)
        tests = _ratio_tests(fit, profile, best, found[2] if found else None)
    note = "1 leaves the response as it is, 0 is its logarithm."
    if not fit.design.intercept:
        note += " Fitted without an intercept: for the response divided by its geometric mean, and only for that."
    return Statistic(
        method="box_cox", args={}, variant=variant, statistic=best.power, note=note,
        details={
            "lambda": best.power, f"ci{100 * level:g}": [end if np.isfinite(end) else None for end in ends],
            "loglik_max": -0.5 * fit.n * log(best.rss), **tests,
        },
    )


def _log_ratio(y: np.ndarray) -> np.ndarray:
    """log(y / geometric mean), every digit kept where the values lie close together."""
    centre = exp(float(np.add.reduce(np.log(y))) / y.shape[0])
    off = (y - centre) / centre
    u = np.log1p(np.maximum(off, NEAR_ZERO))
    far = off <= NEAR_ZERO
    if far.any():  # what is left of 1 has few digits there
        u[far] = np.log(y[far] / centre)
    return u - np.add.reduce(u) / u.shape[0]


@dataclass(frozen=True, eq=False)
class _Profile:
    """Residual sum of squares of z = (e^(power u) - 1)/power on the predictors, for several powers at once.

    u: (n,) log of the response over its geometric mean. q: (n, k) orthonormal basis of the predictors.
    """

    u: np.ndarray
    q: np.ndarray
    intercept: bool

    def at(self, powers: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """rss (m,) and half its derivative (m,) at powers (m,); infinite where the powers of the response overflow."""
        n = self.u.shape[0]
        with np.errstate(over="ignore", invalid="ignore"):
            if n <= CHUNK:
                z, slope = _power(self.u, powers)
                left = z - self.q @ (self.q.T @ z)
                if self.intercept:
                    left -= z.sum(axis=0) / n
                rss, half = np.einsum("ij,ij->j", left, left), np.einsum("ij,ij->j", left, slope)
            else:
                rss, half = self._in_chunks(powers)
        if not (np.isfinite(rss).all() and np.isfinite(half).all()):
            bad = ~(np.isfinite(rss) & np.isfinite(half))
            rss[bad], half[bad] = np.inf, np.copysign(np.inf, powers[bad])
        return rss, half

    def _in_chunks(self, powers: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        n, m = self.u.shape[0], powers.shape[0]
        z, slope = np.empty((n, m)), np.empty((n, m))
        along, mean, rss, half = np.zeros((self.q.shape[1], m)), np.zeros(m), np.zeros(m), np.zeros(m)
        chunks = [slice(start, start + CHUNK) for start in range(0, n, CHUNK)]
        for rows in chunks:
            z[rows], slope[rows] = _power(self.u[rows], powers)
            along += self.q[rows].T @ z[rows]
            if self.intercept:
                mean += z[rows].sum(axis=0) / n
        for rows in chunks:
            left = z[rows] - self.q[rows] @ along - mean
            rss += np.einsum("ij,ij->j", left, left)
            half += np.einsum("ij,ij->j", left, slope[rows])
        return rss, half

    def one(self, power: float) -> tuple[float, float]:
        """The same at one power."""
        rss, half = self.at(np.array([power]))
        return float(rss[0]), float(half[0])

    def rss(self, powers: np.ndarray) -> np.ndarray:
        """rss alone (m,), for rows that are few or powers that are; not finite where powers of the response are not."""
        zero = powers == 0.0
        with np.errstate(over="ignore", invalid="ignore"):
            z = np.expm1(self.u * powers[:, None])
            z /= (powers + zero)[:, None]
            z[zero] = self.u
            z -= (z @ self.q) @ self.q.T
            if self.intercept:
                z -= (np.add.reduce(z, axis=1) / self.u.shape[0])[:, None]
            return np.einsum("ij,ij->i", z, z)

    def fits_perfectly(self, best: _Least) -> bool:
        """Whether the least rss is rounding of the sum of squares of z itself."""
        ends = (float(self.u.max()), float(self.u.min()))
        largest = max(abs(expm1(best.power * u) / best.power if best.power else u) for u in ends)
        limit = (ROUNDINGS * EPS) ** 2
        if best.rss > limit * self.u.shape[0] * largest * largest:
            return False
        z, _ = _power(self.u, np.array([best.power]))
        return best.rss <= limit * float(np.sum(z * z))


@dataclass(frozen=True)
class _Least:
    """The power with the least rss; bend: half the second derivative of rss there.

    grid: rss at whole and half powers, where these were looked at on all rows.
    """

    power: float
    rss: float
    bend: float
    grid: np.ndarray | None = None


def _power(u: np.ndarray, powers: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """z = (e^(power u) - 1)/power, u for power 0, and its derivative in the power, (n, m) both."""
    x = u[:, None] * powers
    grown = np.expm1(x)
    zero = powers == 0.0
    divisor = powers
    if zero.any():
        divisor = np.where(zero, 1.0, powers)
    z = grown / divisor
    if divisor is not powers:
        z[:, zero] = u[:, None]
    grown += 1.0
    grown *= u[:, None]
    grown -= z
    grown /= divisor
    # Where powers and logarithms are not all small, a few small ones carry no weight in any sum over the rows.
    if divisor is powers and np.abs(powers).min() * max(u.max(), -u.min()) > CARRIES:
        return z, grown
    small = np.abs(x) < SMALL
    if small.any():
        near, value = x[small], np.zeros(())
        for coefficient in _SERIES:
            value = value * near + coefficient
        grown[small] = value * np.broadcast_to((u * u)[:, None], x.shape)[small]
    return z, grown


def _by_series(profile: _Profile, cut: float) -> tuple[_Least, tuple[float, float], PowerSeries] | None:
    """The likeliest power and the ends of its interval from a power series; None where it does not reach so far."""
    start = _start(profile)
    if start is None:
        return None
    (power, reach), n = start, profile.u.shape[0]
    for _ in range(2):
        series = power_series(profile.u, profile.q, profile.intercept, power, reach)
        lowest = series.lowest() if series else None
        if series is None or lowest is None or abs(lowest[0] - start[0]) > start[1]:
            return None
        power, height, bend = lowest
        distance = sqrt(2.0 * cut / (n * bend))
        low, high = (series.rises_to(power, cut / n, side * distance) for side in (-1.0, 1.0))
        if low is not None and high is not None:
            rss = exp(height)
            return _Least(power, rss, 0.5 * bend * rss), (low, high), series
        reach = 2.0 * distance
    return None


def _start(profile: _Profile) -> tuple[float, float] | None:
    """A power near the likeliest one, and how far around it to look: the power of all rows lies within a few standard
    errors of that of some of them, and so do the interval's ends."""
    n = profile.u.shape[0]
    if n <= 2 * SOME:
        return _start_of(profile)
    start = _start_of(_thinned(profile, SOME))
    if start is None or n <= 8 * SOME:
        return start
    more = _thinned(profile, n // 8)
    series = power_series(more.u, more.q, more.intercept, *start)
    lowest = series.lowest() if series else None
    return None if lowest is None else (lowest[0], STANDARD_ERRORS * sqrt(2.0 / (more.u.shape[0] * lowest[2])))


def _start_of(some: _Profile) -> tuple[float, float] | None:
    """The same by whole and half powers, between which a polynomial shows the place to a twentieth or so."""
    height = np.log(np.maximum(some.rss(POWERS), TINY))
    # Derivatives of the quartics through five neighbours.
    slope = (height[:-4] - height[4:] + 8.0 * (height[3:-1] - height[1:-3])) / (12.0 * (POWERS[1] - POWERS[0]))
    inner = POWERS[2:-2]
    place = int(height.argmin()) - 2
    if not (0 <= place < inner.shape[0] and isfinite(slope[place])):
        return None
    left = place - 1 if slope[place] >= 0.0 else place
    if left < 0 or left + 1 == inner.shape[0] or not slope[left] < 0.0 <= slope[left + 1]:
        return None
    bend = float(slope[left + 1] - slope[left]) / float(inner[1] - inner[0])
    deviation = sqrt(2.0 / (some.u.shape[0] * bend))
    return _between(inner, slope, left), STANDARD_ERRORS * deviation + IN_BETWEEN


def _thinned(profile: _Profile, rows: int) -> _Profile:
    some = slice(None, None, profile.u.shape[0] // rows)
    q = profile.q[some] - (profile.q[some].mean(axis=0) if profile.intercept else 0.0)
    return _Profile(profile.u[some], _orthonormal(q), profile.intercept)


def _orthonormal(q: np.ndarray) -> np.ndarray:
    """A basis (n, k) of the space of q, good enough to start a search from; by cross products where they can tell the
    columns apart, in a tenth of the time."""
    gram = q.T @ q
    root, info = lapack.dpotrf(gram, lower=1)
    if info == 0 and (root.diagonal() ** 2 > ENOUGH * gram.diagonal()).all():
        return lapack.dtrtrs(root, q.T, lower=1)[0].T
    return np.linalg.qr(q)[0]


def _likeliest(profile: _Profile) -> _Least:
    n = profile.u.shape[0]
    if n <= 4 * THIN:
        return _least(profile)
    some = _thinned(profile, THIN)
    thin = _least(some)
    if thin.bend > 0.0 and thin.rss > 0.0:
        # Five standard errors of the thinned rows to either side hold the root of all rows, or the search starts anew.
        reach = 5.0 * np.sqrt(thin.rss / (thin.bend * some.u.shape[0]))
        bend = thin.bend * n / some.u.shape[0]
        found = _root(profile, thin.power, bend, thin.power - reach, thin.power + reach)
        if abs(found.power - thin.power) < 0.99 * reach:
            return found
    return _least(profile)


def _least(profile: _Profile) -> _Least:
    powers = POWERS
    grid = None
    for _ in range(60):
        rss, half = profile.at(powers)
        grid = rss if grid is None else grid
        place = int(np.argmin(rss))
        left = place - 1 if half[place] >= 0.0 else place
        if left < 0 or left + 1 == powers.shape[0]:  # it lies further out
            edge = float(powers[0 if left < 0 else -1])
            powers = np.array([2.0 * edge, edge] if left < 0 else [edge, 2.0 * edge])
        elif half[left] < 0.0 <= half[left + 1]:
            break
        else:  # several bends in one step: look closer
            powers = np.linspace(powers[left], powers[left + 1], 9)
    else:
        return _Least(float(powers[place]), float(rss[place]), 0.0, grid)
    low, high = float(powers[left]), float(powers[left + 1])
    at_low, at_high = float(half[left]), float(half[left + 1])
    start = _between(powers, half, left)
    found = _root(profile, start, (at_high - at_low) / (high - low), low, high)
    return _Least(found.power, found.rss, found.bend, grid)


def _between(powers: np.ndarray, half: np.ndarray, left: int) -> float:
    """Roughly where half is zero between powers[left] and the next one."""
    around = slice(max(left - 1, 0), left + 3)
    low, high = float(powers[left]), float(powers[left + 1])
    at_low, at_high = float(half[left]), float(half[left + 1])
    start = _inverse(powers[around].tolist(), half[around].tolist())
    if not low < start < high:
        start = (low * at_high - high * at_low) / (at_high - at_low) if np.isfinite(at_high - at_low) else np.nan
    return start if low < start < high else 0.5 * (low + high)


def _inverse(x: list[float], y: list[float]) -> float:
    """Where y, at most four values, is zero: Neville's polynomial of x in y; NaN where y does not rise."""
    if any(b <= a for a, b in pairwise(y)):
        return float("nan")
    x = list(x)
    for width in range(1, len(x)):
        for i in range(len(x) - width):
            x[i] = (y[i + width] * x[i] - y[i] * x[i + 1]) / (y[i + width] - y[i])
    return x[0]


def _root(profile: _Profile, start: float, bend: float, low: float, high: float) -> _Least:
    """The power between low and high where rss turns from falling to rising: secant steps, the first with this bend,
    kept in the bracket, which is halved where they are of no use."""
    now, (rss, half) = start, profile.one(start)
    size = max(abs(low), abs(high))
    for turn in range(200):
        low, high = (now, high) if half < 0.0 else (low, now)
        following = now - half / bend if np.isfinite(half) and bend > 0.0 else np.nan
        if not low < following < high or turn % 8 == 7:
            following = 0.5 * (low + high)
        if half == 0.0 or high - low <= 1e-14 * size:
            break
        before, half_before = now, half
        now = float(following)
        rss, half = profile.one(now)
        if abs(now - before) <= 1e-9 * size:  # nearer, differences are rounding
            now -= half / bend if bend > 0.0 else 0.0
            break
        bend = (half - half_before) / (now - before)
    return _Least(now, rss, bend)


def _interval(profile: _Profile, best: _Least, cut: float) -> tuple[float, float]:
    """Both powers at which n log(rss / best) is cut; infinite where there is none.

    Newton steps on the root of that figure, which is nearly straight, kept between a power inside and one outside.
    """
    n = profile.u.shape[0]
    side = np.array([-1.0, 1.0])
    goal = np.sqrt(cut / n)
    inside, outside = np.zeros(2), np.full(2, np.inf)  # distances from the best power
    distance = np.full(2, goal * np.sqrt(best.rss / best.bend) if 0.0 < best.bend < np.inf else 1.0)
    for _ in range(100):
        rss, half = profile.at(best.power + side * distance)
        with np.errstate(invalid="ignore", divide="ignore"):
            height = np.sqrt(np.log1p(np.maximum(rss - best.rss, 0.0) / best.rss))
            following = distance + (goal - height) * height * rss / (side * half)
        below = height <= goal
        inside, outside = np.where(below, distance, inside), np.where(below, outside, distance)
        known = np.isfinite(outside)
        middle = np.where(known, 0.5 * (inside + np.where(known, outside, 0.0)), 2.0 * distance)
        stays = (following > inside) & (following < np.minimum(outside, 4.0 * distance))
        following = np.where(stays, following, middle)
        near = (np.abs(following - distance) <= 1e-7 * distance) | (height == goal)
        distance = np.where(height == goal, distance, following)
        if near.all():
            break
    low, high = np.where(near, best.power + side * distance, side * np.inf)
    return float(low), float(high)


def _at_zero_and_one(fit: Fit, profile: _Profile) -> list[float]:
    """rss at the powers 0 and 1; the second is the fit's own where an intercept takes up the 1 that is taken off."""
    u, q = profile.u, profile.q
    if not profile.intercept:
        return [float(one) for one in profile.rss(np.array([0.0, 1.0]))]
    left = u - q @ (q.T @ u)
    left -= np.add.reduce(left) / fit.n
    middle = int(np.abs(u).argmin())  # there no digit is lost on the way to what the response is divided by
    centre = float(fit.design.response[middle]) * exp(-float(u[middle]))
    return [float(left @ left), (fit.length / centre) ** 2]


def _ratio_tests(fit: Fit, profile: _Profile, best: _Least, series: PowerSeries | None) -> dict[str, dict[str, float]]:
    heights = [series.at(power)[0] if series else float("nan") for power in (0.0, 1.0)]
    if not all(map(isfinite, heights)):
        rss = best.grid[ZERO_AND_ONE].tolist() if best.grid is not None else _at_zero_and_one(fit, profile)
        rest = [log1p(max(0.0, one - best.rss) / best.rss) for one in rss]
    else:
        rest = [0.0, 0.0]
    tests = {}
    for name, height, other in zip(("LR_lambda_0", "LR_lambda_1"), heights, rest, strict=True):
        above = height - log(best.rss) if isfinite(height) else other
        statistic = profile.u.shape[0] * max(0.0, above)
        tests[name] = {"statistic": statistic, "p": chi_square_tail(1, statistic)}
    return tests
