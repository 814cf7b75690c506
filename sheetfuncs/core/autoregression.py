"""Fits for errors of which each keeps a share rho of the one before: Prais-Winsten, Cochrane-Orcutt, likelihood."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.independence import lagged_response
from sheetfuncs.core.remedy import Remedied, RemedyFit, solve_transformed
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import NumbersError

TOLERANCE = 1e-13
MOST_STEPS = 5000
STARTS = (-0.9, -0.5, 0.0, 0.5, 0.9)
SAME_POINT = 1e-6  # ends that differ by less are one
GRID = np.tanh(np.linspace(-6.0, 6.0, 97))  # where the highest likelihood is looked for first
CHUNK = 65536


def prais_winsten(fit: Fit, *, iterate: bool = True) -> Remedied:
    """Prais-Winsten (Prais and Winsten 1954, Cowles Commission discussion paper 383): least squares on differences
    y_t - rho y_{t-1}, the first row kept, times sqrt(1 - rho^2).

    rho: regression without constant of each residual on the one before, of the fit's residuals; with iterate of the
    residuals that the last rho gave, until it stands still. Rows in time order; those beside a gap count as neighbours.
    details: rho, iterations, dw_transformed, fixed_points: every rho at which the iteration stands still that starts
    from the residuals of least squares and from rho = -0.9, -0.5, 0, 0.5 and 0.9 lead to, with sigma there. The fit is
    at the one that least squares leads to.
    """
    return _iterated(fit, "prais_winsten", iterate, keep_first=True)


def cochrane_orcutt(fit: Fit, *, iterate: bool = True) -> Remedied:
    """Cochrane-Orcutt (Cochrane and Orcutt 1949, JASA 44:32-61): as `prais_winsten`, the first row left out."""
    return _iterated(fit, "cochrane_orcutt", iterate, keep_first=False)


def ar1_maximum_likelihood(fit: Fit) -> Remedied:
    """Maximum likelihood for normal errors of first-order autoregression, the first row included (Beach and MacKinnon
    1978, Econometrica 46:51-58).

    The likelihood is profiled: at each rho least squares as in Prais-Winsten, and the highest of -n/2 log(rss / n) +
    log(1 - rho^2) / 2 is taken. sigma is of the innovations, with divisor n - p. details: phi, loglik, maxima: every
    rho with a highest value nearby, with its log-likelihood.
    """
    args: dict[str, Any] = {}
    variant = "maximum likelihood"
    refusal = _refusal(fit, "ar1_ml", args, variant, fit.n)
    if refusal:
        return refusal
    with few_threads(fit.basis.q.size):
        products = _products(fit, keep_first=True)
        maxima = sorted(_maxima(products, fit.n), key=lambda one: -one[1])
        if not maxima:
            return _cannot("ar1_ml", args, variant, "The likelihood rises until each error repeats the one before.")
        phi = maxima[0][0]
        return _fit_at(fit, "ar1_ml", args, variant, phi, keep_first=True, converged=True, details=lambda solution: {
            "phi": phi, "loglik": _log_likelihood(solution.rss, phi, fit.n),
            "maxima": [{"phi": one, "loglik": value + _log_likelihood(fit.rss, 0.0, fit.n)} for one, value in maxima],
        })


@dataclass(frozen=True, eq=False)
class _Products:
    """Cross products (p + 1, p + 1) of the fit's basis and, last, its residuals scaled to length 1.

    whole - rho (lag + lag') + rho^2 twice are those of the transformed rows; lag is of each row with the one before,
    before of all rows that have one after them.
    """

    whole: np.ndarray
    lag: np.ndarray
    twice: np.ndarray
    before: np.ndarray

    def at(self, rho: float) -> np.ndarray:
        return self.whole - rho * (self.lag + self.lag.T) + rho**2 * self.twice

    def combination(self, rho: float) -> np.ndarray | None:
        """v (p + 1,) such that the rows times v are the untransformed residuals of the fit at this rho; None where the
        transformed predictors cannot be told apart."""
        gram = self.at(rho)
        _, weights, info = lapack.dposv(gram[:-1, :-1], gram[:-1, -1])
        return np.append(-weights, 1.0) if info == 0 else None

    def correlation(self, v: np.ndarray) -> float:
        """Regression without constant of each of these residuals on the one before."""
        below = float(v @ self.before @ v)
        return float(v @ self.lag @ v) / below if below > 0.0 else np.nan


def _products(fit: Fit, *, keep_first: bool) -> _Products:
    size = fit.p + 1
    whole, lag = np.zeros((size, size)), np.zeros((size, size))
    for rows in _rows(fit):
        whole += rows[1:].T @ rows[1:]
        lag += rows[1:].T @ rows[:-1]
    order = fit.design.order
    first, last = (_coordinates(fit, np.array([t if order is None else order[t]])) for t in (0, fit.n - 1))
    outer_first, outer_last = first.T @ first, last.T @ last
    before = whole + outer_first - outer_last
    if keep_first:
        return _Products(whole + outer_first, lag, whole - outer_last, before)
    return _Products(whole, lag, before, before)


def _rows(fit: Fit) -> Iterator[np.ndarray]:
    """Rows in time order, many at a time, each time with the row before them first."""
    for start in range(1, fit.n, CHUNK):
        place = np.arange(start - 1, min(start + CHUNK, fit.n))
        yield _coordinates(fit, place if fit.design.order is None else fit.design.order[place])


def _coordinates(fit: Fit, place: np.ndarray) -> np.ndarray:
    constant = int(fit.design.intercept)
    rows = np.empty((place.shape[0], fit.p + 1))
    rows[:, :constant] = 1.0 / np.sqrt(fit.n)
    rows[:, constant:-1] = fit.basis.q[place]
    rows[:, -1] = fit.residuals[place] / np.sqrt(fit.rss)
    return rows


def _iterated(fit: Fit, method: str, iterate: bool, *, keep_first: bool) -> Remedied:
    args = {"iterate": iterate}
    variant = f"{'iterated' if iterate else 'two steps'}, the first row {'kept' if keep_first else 'left out'}"
    refusal = _refusal(fit, method, args, variant, fit.n - (0 if keep_first else 1))
    if refusal:
        return refusal
    with few_threads(fit.basis.q.size):
        products = _products(fit, keep_first=keep_first)
        least_squares = np.zeros(fit.p + 1)
        least_squares[-1] = 1.0
        start = products.correlation(least_squares)
        rho, steps, converged = _stands_still(products, start) if iterate else (start, 1, True)
        if not abs(rho) < 1.0:
            return _cannot(
                method, args, variant,
                f"The correlation of neighbouring errors comes to {rho:.4g}, and is not below 1: look at differences "
                "of the columns, or at a trend that is missing.",
            )
        df = fit.df - int(not keep_first)
        points = _fixed_points(products, rho, fit.rss / df) if iterate and converged else []
        return _fit_at(
            fit, method, args, variant, rho, keep_first=keep_first, converged=converged,
            note=_note(rho, points, converged), details=lambda solution: {
                "rho": rho, "iterations": steps, "dw_transformed": _durbin_watson(solution.left),
                "fixed_points": points,
            },
        )


def _stands_still(products: _Products, rho: float) -> tuple[float, int, bool]:
    """Where the iteration from this rho ends, after how many estimates of rho, and whether it stands still there."""
    for step in range(2, MOST_STEPS + 1):
        v = products.combination(rho) if abs(rho) < 1.0 else None
        if v is None:
            return rho, step, False
        following = products.correlation(v)
        if abs(following - rho) < TOLERANCE:
            return following, step, True
        rho = following
    return rho, MOST_STEPS, False


def _fixed_points(products: _Products, rho: float, unit: float) -> list[dict[str, float]]:
    """Distinct ends of the iteration, that from least squares first, with sigma: unit is what a rss of 1 makes of its
    square."""
    ends = [rho]
    for start in STARTS:
        end, _, converged = _stands_still(products, start)
        if converged and abs(end) < 1.0 and all(abs(end - other) > SAME_POINT for other in ends):
            ends.append(end)
    found = []
    for end in ends:
        v = products.combination(end)
        if v is not None:
            found.append({"rho": end, "sigma": float(np.sqrt(max(0.0, v @ products.at(end) @ v) * unit))})
    return found


def _note(rho: float, points: list[dict[str, float]], converged: bool) -> str:
    if not converged:
        return f"The iteration does not come to rest within {MOST_STEPS} steps."
    if len(points) < 2:
        return ""
    others = ", ".join(f"{point['rho']:.3f}" for point in points[1:])
    return f"From other starts the iteration ends at a correlation of {others} instead of {rho:.3f}: compare the fits."


def _fit_at(
    fit: Fit, method: str, args: Mapping[str, Any], variant: str, rho: float, *, keep_first: bool, converged: bool,
    details: Any, note: str = "",
) -> Remedied:
    order = fit.design.order

    def transform(values: np.ndarray) -> np.ndarray:
        values = values if order is None else values[order]
        differences = values[1:] - rho * values[:-1]
        if not keep_first:
            return differences
        return np.concatenate([np.sqrt((1.0 - rho) * (1.0 + rho)) * values[:1], differences])

    try:
        solution = solve_transformed(fit.design, transform)
    except NumbersError as refusal:
        return _cannot(method, args, variant, str(refusal))
    if solution.perfect:
        return _cannot(method, args, variant, "The transformed rows fit perfectly: what is left is rounding noise.")
    df = solution.left.shape[0] - fit.p
    sigma = float(np.sqrt(solution.rss / df))
    lagged = lagged_response(fit)
    if lagged is not None:
        note = f"{note} {lagged} is the response of the row before; with that the estimates are off.".strip()
    return RemedyFit(
        method, args, variant, fit.design, solution.coefficients, solution.covariance(sigma), sigma, df,
        solution.fitted, solution.residuals, solution.left, converged=converged, note=note, details=details(solution),
    )


def _maxima(products: _Products, n: int) -> list[tuple[float, float]]:
    """Every rho with a highest likelihood nearby, and the log-likelihood less that of rho = 0 without constants."""
    slopes = [_slope(products, float(rho), n) for rho in GRID]
    found = []
    for i, (left, right) in enumerate(pairwise(slopes)):
        if left > 0.0 >= right:
            rho = _crossing(products, n, float(GRID[i]), left, float(GRID[i + 1]), right)
            v = products.combination(rho)
            if v is not None:
                rss = float(v @ products.at(rho) @ v)
                found.append((rho, -0.5 * n * float(np.log(rss)) + 0.5 * float(np.log1p(-(rho**2)))))
    return found


def _slope(products: _Products, rho: float, n: int) -> float:
    """Derivative of the profiled log-likelihood."""
    v = products.combination(rho)
    if v is None:
        return float("nan")
    rss = float(v @ products.at(rho) @ v)
    change = -2.0 * float(v @ products.lag @ v) + 2.0 * rho * float(v @ products.twice @ v)
    return -0.5 * n * change / rss - rho / ((1.0 - rho) * (1.0 + rho))


def _crossing(products: _Products, n: int, low: float, at_low: float, high: float, at_high: float) -> float:
    """Where the slope falls through zero between low and high: secant steps with the far end's height halved (the
    Illinois method; Dowell and Jarratt 1971, BIT 11:168-174)."""
    side = 0
    for _ in range(200):
        middle = (low * at_high - high * at_low) / (at_high - at_low)
        value = _slope(products, middle, n)
        if value > 0.0:
            done = abs(middle - low) <= 1e-14
            low, at_low = middle, value
            at_high, side = (at_high / 2.0, 1) if side == 1 else (at_high, 1)
        else:
            done = abs(high - middle) <= 1e-14 or value == 0.0
            high, at_high = middle, value
            at_low, side = (at_low / 2.0, -1) if side == -1 else (at_low, -1)
        if done or high - low <= 1e-14:
            return middle
    return middle


def _log_likelihood(rss: float, rho: float, n: int) -> float:
    return -0.5 * n * (float(np.log(2.0 * np.pi * rss / n)) + 1.0) + 0.5 * float(np.log1p(-(rho**2)))


def _durbin_watson(left: np.ndarray) -> float:
    steps = np.diff(left)
    return float(steps @ steps) / float(left @ left)


def _refusal(fit: Fit, method: str, args: Mapping[str, Any], variant: str, rows: int) -> DoesNotApply | None:
    refusal = refused(fit, method, args, variant, "")
    if refusal is None and rows <= fit.p:
        return _cannot(
            method, args, variant,
            f"{fit.n} rows are too few for {fit.p} coefficients once the first row is left out.",
        )
    return refusal


def _cannot(method: str, args: Mapping[str, Any], variant: str, reason: str) -> DoesNotApply:
    return DoesNotApply(method=method, args=args, variant=variant, reason=reason, cell_error="#NUM!")
