"""Error bars of the coefficients that stand unequal spread, or related neighbours, of the errors."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from scipy.special import stdtr

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import EPS, ROUNDINGS
from sheetfuncs.core.fit import Fit, once_per_fit
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError

HETEROSCEDASTIC_KINDS = ("HC0", "HC1", "HC2", "HC3", "HC4")
NEWEY_WEST = "Newey-West"
KINDS = ("ordinary", *HETEROSCEDASTIC_KINDS, NEWEY_WEST)
# Up to so many rows all kinds are computed at once when one is asked for.
TOGETHER_UP_TO = 2_000
# Matrix (p, p); standard errors, t and p, (p,) each; whether there are errors everywhere.
_Bars = tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray, bool]
_WIDER = {
    "HC0": "squared residuals as they are (White 1980)",
    "HC1": "squared residuals times n/(n - p) (Hinkley 1977)",
    "HC2": "squared residuals over 1 - leverage (MacKinnon and White 1985)",
    "HC3": "squared residuals over (1 - leverage)^2 (Davidson and MacKinnon 1993)",
    "HC4": "squared residuals over (1 - leverage)^min(4, n leverage/p) (Cribari-Neto 2004)",
}


@dataclass(frozen=True, kw_only=True, eq=False)
class Covariance:
    """Covariance of the coefficients, and what follows from it.

    kind: one of KINDS. matrix: (p, p), the constant first. standard_errors, t, p, low, high: (p,); p two-sided and the
    limits of the interval from t with n - p degrees of freedom. Where the error is zero but for rounding (a coefficient
    that only rows of leverage 1 determine), error, t, p and limits are NaN and the note says so.
    method, args, details: as in `Statistic`.
    """

    kind: str
    method: str
    args: Mapping[str, Any]
    matrix: np.ndarray
    standard_errors: np.ndarray
    t: np.ndarray
    p: np.ndarray
    low: np.ndarray
    high: np.ndarray
    note: str = ""
    details: Mapping[str, Any] = field(default_factory=dict)

    applies = True
    reason: None = None


def covariance(fit: Fit, kind: str = "ordinary", *, level: float = 0.95) -> Covariance | DoesNotApply:
    """The covariance of this kind, each with its defaults; level: of the intervals."""
    if kind == NEWEY_WEST:
        return newey_west(fit, level=level)
    if kind in HETEROSCEDASTIC_KINDS:
        return heteroscedasticity_consistent(fit, kind, level=level)
    if kind != "ordinary":
        raise ArgumentError(f'"{kind}" is not a kind of standard error: use {", ".join(KINDS[:-1])} or {KINDS[-1]}.')
    args = {"type": "const", "dist": "t"}
    refusal = refused(fit, "hc_se", args, kind, "")
    if refusal:
        return refusal
    bars = _error_bars(fit, fit.sigma**2 * fit.unscaled_covariance[None])[0]
    return _covariance(fit, kind, "hc_se", args, bars, level, "equal spread and independent errors are assumed")


def heteroscedasticity_consistent(fit: Fit, kind: str = "HC3", *, level: float = 0.95) -> Covariance | DoesNotApply:
    """(X'X)^-1 X' diag(w e^2) X (X'X)^-1, right for large n whatever each error's variance is, if they are independent.

    w: HC0 1 (White 1980, Econometrica 48:817); HC1 n/(n - p) (Hinkley 1977, Technometrics 19:285); HC2 1/(1 - h) and
    HC3 1/(1 - h)^2 (MacKinnon and White 1985, J. Econometrics 29:305; HC3 as Davidson and MacKinnon 1993 have it);
    HC4 (1 - h)^-min(4, n h/p) (Cribari-Neto 2004, Comp. Stat. Data Anal. 45:215), h the leverage.
    HC2 to HC4 do not apply where a row has leverage 1: its residual is 0 whatever its error was.
    """
    if kind not in HETEROSCEDASTIC_KINDS:
        raise ArgumentError(f'"{kind}" is not one of {", ".join(HETEROSCEDASTIC_KINDS)}.')
    args = {"type": kind, "dist": "t"}
    refusal = refused(fit, "hc_se", args, kind, "")
    if refusal:
        return refusal
    if kind in ("HC2", "HC3", "HC4") and fit.some_fit_themselves:
        return DoesNotApply(method="hc_se", args=args, variant=kind, reason=_leverage_one(fit, kind))
    together = _possible_kinds(fit) if fit.n <= TOGETHER_UP_TO else (kind,)
    return _covariance(fit, kind, "hc_se", args, _heteroscedastic(fit, together)[kind], level, _WIDER[kind])


def newey_west(
    fit: Fit, lag: int | None = None, *, small_sample: bool = False, level: float = 0.95
) -> Covariance | DoesNotApply:
    """Errors of any spread, related with up to `lag` errors before (Newey and West 1987, Econometrica 55:703-708).

    Bartlett weights 1 - l/(lag + 1), no prewhitening, rows in time order. lag: None for the rule floor(4 (n/100)^(2/9))
    (Newey and West 1994; Stock and Watson's textbooks). small_sample: times n/(n - p).
    """
    rule = rule_of_thumb_lag(fit.n)
    chosen = rule if lag is None else lag
    if not float(chosen).is_integer() or chosen < 0:
        raise ArgumentError(f"{lag} is not a number of lags: use a whole number from 0 up.")
    chosen = int(chosen)
    args = {
        "lag": chosen, "kernel": "Bartlett 1-l/(L+1)", "prewhite": False,
        "small_sample_n_over_n_minus_p": small_sample, "rule_of_thumb": chosen == rule,
    }
    source = " = floor(4 (n/100)^(2/9))" if chosen == rule else ""
    note = f"lag {chosen}{source}, Bartlett weights, {'times n/(n - p), ' if small_sample else ''}no prewhitening"
    return _newey_west(fit, chosen, "newey_west", args, note, level, small_sample=small_sample)


def newey_west_automatic(fit: Fit, *, level: float = 0.95) -> Covariance | DoesNotApply:
    """As `newey_west`, with the lag that the data choose (Newey and West 1994, Rev. Econ. Stud. 61:631-653, Table I).

    Scores summed over the predictors, the constant left out, so that the lag depends on the predictors' units.
    """
    args = {"prewhite": False, "selector": "Newey-West 1994"}
    refusal = refused(fit, "newey_west_auto", args, NEWEY_WEST, "")
    if refusal:
        return refusal
    bandwidth = _bandwidth(fit)
    if bandwidth is None or bandwidth >= fit.n:
        return DoesNotApply(
            method="newey_west_auto", args=args, variant=NEWEY_WEST,
            reason="The data choose no lag below the number of rows: give one.",
        )
    lag = math.floor(bandwidth)
    note = f"lag {lag}, chosen by the data (Newey and West 1994), Bartlett weights, no prewhitening"
    return _newey_west(fit, lag, "newey_west_auto", args, note, level, details={"bandwidth": bandwidth, "lag": lag})


def rule_of_thumb_lag(n: int) -> int:
    """floor(4 (n/100)^(2/9))."""
    return math.floor(4.0 * (n / 100.0) ** (2.0 / 9.0))


def _newey_west(
    fit: Fit, lag: int, method: str, args: Mapping[str, Any], note: str, level: float, *, small_sample: bool = False,
    details: Mapping[str, Any] | None = None,
) -> Covariance | DoesNotApply:
    refusal = refused(fit, method, args, NEWEY_WEST, "")
    if refusal:
        return refusal
    if lag >= fit.n:
        return DoesNotApply(
            method=method, args=args, variant=NEWEY_WEST, cell_error="#NUM!",
            reason=f"{fit.n} rows are too few for {lag} lags: a lag needs at least one pair of rows.",
        )
    middle = _bartlett_sum(fit, lag) * (fit.n / fit.df if small_sample else 1.0)
    bars = _error_bars(fit, _sandwich(fit, middle[None]))[0]
    return _covariance(fit, NEWEY_WEST, method, args, bars, level, note, details)


def _bartlett_sum(fit: Fit, lag: int) -> np.ndarray:
    """Sum of the scores' cross products at all lags, Bartlett weights, (p, p), in the basis' coordinates.

    Moving sums S_t of lag + 1 scores (zeros beyond both ends) have sum of S_t S_t' = (lag + 1) times that: no loop over
    lags, and never an indefinite matrix.
    """
    n, order = fit.n, fit.design.order
    lines = fit.orthonormal if order is None else fit.orthonormal[:, order]
    running = np.zeros((fit.p, n + 2 * lag + 1))
    scores = running[:, lag + 1 : lag + 1 + n]
    np.multiply(lines[:-1], lines[-1], out=scores)
    with few_threads(running.size):
        if lag == 0:
            return scores @ scores.T
        np.cumsum(scores, axis=1, out=scores)
        running[:, lag + 1 + n :] = scores[:, -1:]
        sums = running[:, lag + 1 :] - running[:, : -lag - 1]
        return sums @ sums.T / (lag + 1.0)


def _bandwidth(fit: Fit) -> float | None:
    """Newey and West's plug-in bandwidth for the Bartlett kernel; None where the scores show no long-run variance."""
    n, columns = fit.n, fit.design.columns
    k = columns.shape[1]
    # A column of ones is the constant, whoever put it there; alone it counts.
    ones = [j for j in range(k) if k > 1 and columns[0, j] == 1.0 and (columns[:, j] == 1.0).all()]
    wanted = np.ones(k)
    wanted[ones] = 0.0
    scores = fit.design.in_order((columns @ wanted if k else 1.0) * fit.residuals)
    size = float(np.abs(scores).max())
    if size == 0.0:
        return None
    scores = scores / size
    scores /= np.linalg.norm(scores)
    lags = min(rule_of_thumb_lag(n), n - 1)
    covariances = np.array([scores[lag:] @ scores[: n - lag] for lag in range(lags + 1)])
    level = covariances[0] + 2.0 * covariances[1:].sum()
    slope = 2.0 * float(np.arange(1, lags + 1) @ covariances[1:])
    if abs(level) <= ROUNDINGS * EPS:
        return None
    return float(1.1447 * ((slope / level) ** 2) ** (1.0 / 3.0) * n ** (1.0 / 3.0))


def _possible_kinds(fit: Fit) -> tuple[str, ...]:
    return HETEROSCEDASTIC_KINDS[:2] if fit.some_fit_themselves else HETEROSCEDASTIC_KINDS


@once_per_fit
def _heteroscedastic(fit: Fit, kinds: tuple[str, ...]) -> dict[str, _Bars]:
    """All these kinds, their scores multiplied with the basis at once: with few rows a step outweighs its work."""
    if kinds == ("HC1",):
        plain = _heteroscedastic(fit, ("HC0",))["HC0"][0]
        return {"HC1": _error_bars(fit, plain[None] * (fit.n / fit.df))[0]}
    lines, e = fit.orthonormal[:-1], fit.orthonormal[-1]
    weights = np.empty((len(kinds), 1, fit.n))
    np.multiply(e, e, out=weights[:, 0])
    for place, kind in enumerate(kinds):
        weights[place, 0] *= _weights(fit, kind)
    with few_threads(fit.basis.q.size):
        scores = (weights * lines).reshape(-1, fit.n)
        middles = (scores @ lines.T).reshape(-1, fit.p, fit.p)
    return dict(zip(kinds, _error_bars(fit, _sandwich(fit, middles)), strict=True))


def _weights(fit: Fit, kind: str) -> np.ndarray | float:
    if kind == "HC0":
        return 1.0
    if kind == "HC1":
        return fit.n / fit.df
    left = 1.0 - fit.leverage
    if kind == "HC4":
        return np.exp(np.minimum(4.0, fit.leverage * (fit.n / fit.p)) * -np.log(left))  # in half the time of a power
    return 1.0 / left if kind == "HC2" else 1.0 / (left * left)


def _sandwich(fit: Fit, middles: np.ndarray) -> np.ndarray:
    """Covariances (m, p, p) of the coefficients from those in the basis' coordinates."""
    outer = fit.basis.coefficient_root * fit.length
    matrices = outer @ middles @ outer.T
    matrices *= 0.5
    return matrices + matrices.transpose(0, 2, 1)


def _error_bars(fit: Fit, matrices: np.ndarray) -> list[_Bars]:
    errors = np.sqrt(np.maximum(matrices.diagonal(axis1=1, axis2=2), 0.0))
    # Rounding alone makes this much.
    least = (ROUNDINGS * EPS * fit.length) * fit.basis.root_lengths
    all_there = (errors > least).all(axis=1).tolist()
    if not all(all_there):
        errors = np.where(errors > least, errors, np.nan)
    t = fit.coefficients / errors
    return list(zip(matrices, errors, t, 2.0 * stdtr(fit.df, -np.abs(t)), all_there, strict=True))


def _covariance(
    fit: Fit, kind: str, method: str, args: Mapping[str, Any], bars: _Bars, level: float, note: str,
    details: Mapping[str, Any] | None = None,
) -> Covariance:
    matrix, errors, t, p, all_there = bars
    if not all_there:
        note += "; no error where only rows of leverage 1 determine a coefficient"
    half = fit.quantile(level) * errors
    return Covariance(
        kind=kind, method=method, args=args, matrix=matrix, standard_errors=errors, t=t, p=p,
        low=fit.coefficients - half, high=fit.coefficients + half, note=note, details=details or {},
    )


def _leverage_one(fit: Fit, kind: str) -> str:
    rows = fit.design.rows[fit.fits_itself]
    which = f"Row {rows[0]} has" if rows.shape[0] == 1 else f"{rows.shape[0]} rows, the first of them {rows[0]}, have"
    return (f"{which} leverage 1 and so a residual of 0 whatever the error was: {kind} divides by 1 - leverage. Use "
            "HC0 or HC1.")
