"""M-estimation: fits that rows far off pull less, by weights that fall with the residual."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import EPS, ROUNDINGS
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.remedy import Remedied, RemedyFit
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.core.threads import few_threads

# Tuned so that with normal errors the estimates are 95 % as certain as least squares.
HUBER, BISQUARE = 1.345, 4.685
# The median size of a normal error, in standard deviations, to four digits as is usual in these fits.
MEDIAN_SIZE = 0.6745
CONVERGED = 1e-10
FINEST = 1e-13
MOST_STEPS = 2000
STALLED = 100  # steps without a smaller one before, after which it goes round in circles


@dataclass(frozen=True)
class _Weighting:
    """Weights psi(u)/u of residuals over the scale, and the derivative of psi, in the same units."""

    weight: Callable[[np.ndarray], np.ndarray]
    derivative: Callable[[np.ndarray], np.ndarray]


def huber(fit: Fit, *, k: float = HUBER) -> Remedied:
    """Huber's M-estimate (Huber 1964, Annals of Mathematical Statistics 35:73-101): rows within k scales count in full,
    others as if they lay k scales off. See `_m_estimate` for scale and error bars."""

    def weight(u: np.ndarray) -> np.ndarray:
        return k / np.maximum(np.abs(u), k)

    def derivative(u: np.ndarray) -> np.ndarray:
        return (np.abs(u) <= k).astype(np.float64)

    return _m_estimate(fit, "m_huber", {"k": k}, f"Huber, k = {k:g}", _Weighting(weight, derivative))


def bisquare(fit: Fit, *, c: float = BISQUARE) -> Remedied:
    """The bisquare M-estimate (Beaton and Tukey 1974, Technometrics 16:147-185), from least squares: rows c scales off
    and further do not count. Where the iteration ends may depend on where it starts."""

    def inside(u: np.ndarray) -> np.ndarray:
        return 1.0 - np.minimum(np.abs(u / c), 1.0) ** 2

    def derivative(u: np.ndarray) -> np.ndarray:
        near = inside(u)
        return near * (near - 4.0 * (u / c) ** 2) * (np.abs(u) < c)

    return _m_estimate(
        fit, "m_bisquare", {"c": c}, f"bisquare, c = {c:g}", _Weighting(lambda u: inside(u) ** 2, derivative)
    )


def _m_estimate(fit: Fit, method: str, tuning: dict[str, float], variant: str, weighting: _Weighting) -> Remedied:
    """Weighted least squares over and over, from least squares, the scale each time the median size of the residuals
    over 0.6745, until the residuals stand still to 1e-10 (Holland and Welsch 1977, Communications in Statistics A6:
    813-827).

    Error bars: sqrt(sum psi^2 / (n - p)) / mean(psi') times K and the root of the diagonal of (X'X)^-1, K = 1 + p
    var(psi') / (n mean(psi')^2) (Huber 1981, Robust Statistics, equation 7.6.4, number from memory).
    details: scale, weights, iterations, delta: by how much, relative to their length, the residuals moved last.
    """
    args = {**tuning, "scale": "MAD about 0 / 0.6745, re-estimated each step", "start": "OLS"}
    refusal = refused(fit, method, args, variant, "")
    if refusal:
        return refusal

    def cannot(reason: str) -> DoesNotApply:
        return DoesNotApply(method=method, args=args, variant=variant, reason=reason, cell_error="#NUM!")

    with few_threads(fit.basis.q.size):
        z = _basis_with_constant(fit)
        residuals, moved = fit.residuals, np.zeros(fit.p)
        scale, weights, delta, best, steps, last = 0.0, np.ones(fit.n), np.inf, np.inf, 0, 0
        while steps < MOST_STEPS:
            steps += 1
            scale = float(np.median(np.abs(residuals))) / MEDIAN_SIZE
            if scale <= ROUNDINGS * fit.noise / np.sqrt(fit.n):
                return cannot("Half of the rows or more lie exactly on the fit, so that nothing measures the others.")
            weights = weighting.weight(residuals / scale)
            change = _weighted_step(z, weights, residuals)
            if change is None:
                return cannot("The rows that still count cannot tell the predictors apart.")
            moved = moved + change
            following = fit.residuals - z @ moved
            delta = float(np.linalg.norm(following - residuals) / np.linalg.norm(residuals))
            residuals = following
            # Beyond the goal it goes on as long as steps get smaller: rounding ends it, not the goal.
            if delta <= FINEST or (best <= CONVERGED and delta >= best) or steps - last > STALLED:
                break
            if delta < best:
                best, last = delta, steps
        u = residuals / scale
        psi, slope = residuals * weighting.weight(u), weighting.derivative(u)
        mean = float(slope.mean())
        if mean <= 0.0:
            return cannot("Too few rows count in full for error bars.")
        factor = 1.0 + fit.p * float(slope.var(ddof=1)) / (fit.n * mean**2)
        sigma = float(np.sqrt(psi @ psi / fit.df)) * factor / mean
        coefficients = fit.coefficients + fit.basis.coefficient_root @ moved
    return RemedyFit(
        method, args, variant, fit.design, coefficients, sigma**2 * fit.unscaled_covariance, sigma, fit.df,
        fit.design.response - residuals, residuals, residuals, converged=min(best, delta) <= CONVERGED,
        note="" if min(best, delta) <= CONVERGED else f"The iteration has not come to rest after {steps} steps.",
        details={"scale": scale, "weights": weights, "iterations": steps, "delta": delta},
    )


def _basis_with_constant(fit: Fit) -> np.ndarray:
    """(n, p) orthonormal, as `coefficient_root` takes its coordinates."""
    if not fit.design.intercept:
        return fit.basis.q
    return np.column_stack([np.full(fit.n, 1.0 / np.sqrt(fit.n)), fit.basis.q])


def _weighted_step(z: np.ndarray, weights: np.ndarray, residuals: np.ndarray) -> np.ndarray | None:
    """Coordinates (p,) by which weighted least squares moves from these residuals; None where it is not determined."""
    weighted = z * weights[:, None]
    gram = z.T @ weighted
    _, step, info = lapack.dposv(gram, weighted.T @ residuals)
    if info != 0 or np.linalg.eigvalsh(gram)[0] <= ROUNDINGS * EPS * z.shape[1]:
        return None
    return step
