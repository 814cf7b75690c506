"""A smooth line through scattered points, for the eye and for the size of a bend."""

from __future__ import annotations

import numpy as np


def local_line(x: np.ndarray, y: np.ndarray, *, places: int = 25, share: float = 0.6) -> tuple[np.ndarray, np.ndarray]:
    """Local straight lines with tricube weights at evenly ranked places (Cleveland 1979, without its robust steps).

    x, y: (n,). share: part of the rows that each place sees. Returns places and values, at most `places` of each;
    empty where there are fewer than 8 rows or x does not vary.
    """
    n = x.shape[0]
    if n < 8 or np.ptp(x) == 0:
        return np.empty(0), np.empty(0)
    rank = np.argsort(x, kind="stable")
    xs, ys = x[rank], y[rank]
    at = np.unique(np.quantile(xs, np.linspace(0, 1, places)))
    window = max(5, round(share * n))
    values = np.array([_line_at(xs, ys, place, window) for place in at])
    return at, values


def _line_at(xs: np.ndarray, ys: np.ndarray, place: float, window: int) -> float:
    first = int(np.clip(np.searchsorted(xs, place) - window // 2, 0, xs.shape[0] - window))
    # Slide until the window is the nearest one; sorted x needs only its two ends compared.
    while first > 0 and place - xs[first - 1] < xs[first + window - 1] - place:
        first -= 1
    while first + window < xs.shape[0] and xs[first + window] - place < place - xs[first]:
        first += 1
    x, y = xs[first:first + window] - place, ys[first:first + window]
    reach = max(abs(x[0]), abs(x[-1])) * 1.0001
    weights = (1.0 - (np.abs(x) / reach) ** 3) ** 3 if reach > 0 else np.ones_like(x)
    total = weights.sum()
    mx, my = weights @ x / total, weights @ y / total
    sxx = weights @ (x - mx) ** 2
    slope = weights @ ((x - mx) * (y - my)) / sxx if sxx > 1e-12 * total * reach**2 else 0.0
    return float(my - slope * mx)


def spread_by_groups(
    fitted: np.ndarray, residuals: np.ndarray, groups: int = 5
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Root mean square residual in groups of equal size by fitted value.

    Returns the groups' mean fitted value, root mean square residual and row count. Ties in the fitted values may fall
    on both sides of a border.
    """
    rank = np.argsort(fitted, kind="stable")
    parts = np.array_split(rank, groups)
    middle = np.array([fitted[part].mean() for part in parts])
    spread = np.array([np.sqrt(np.mean(residuals[part] ** 2)) for part in parts])
    return middle, spread, np.array([len(part) for part in parts])


def autocorrelations(residuals: np.ndarray, lags: int) -> np.ndarray:
    """Autocorrelations r_1 .. r_lags of residuals in time order, sums of squares about zero (Box and Pierce 1970)."""
    total = residuals @ residuals
    return np.array([residuals[lag:] @ residuals[:-lag] / total for lag in range(1, lags + 1)])
