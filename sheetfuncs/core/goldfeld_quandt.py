"""Goldfeld and Quandt's test: are the errors wider in the later rows, or where a predictor is larger?"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
from scipy.special import fdtr, fdtrc

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import ROUNDINGS, factorize
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.some_rows import rest_of_rows
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError, NumbersError

SAME_SPREAD = "the errors have the same variance in both parts of the rows"
_ALTERNATIVES = {"greater": "greater", "less": "less", "two-sided": "two.sided"}
_AGAINST = {"greater": "against a wider spread in the later part", "less": "against a wider spread in the earlier part",
            "two-sided": "against a wider spread in either part"}


def goldfeld_quandt(
    fit: Fit, *, point: float = 0.5, fraction: float = 0.0, alternative: str = "greater", by: str | int | None = None
) -> Result:
    """Goldfeld-Quandt test (1965, JASA 60:539-547): fit both parts of the rows, compare their residual variances.

    F = later part's variance over the earlier part's, with (later n - p, earlier n - p) degrees of freedom.
    point: share of the rows before the split, 0.5 is floor(n/2) and the rest. fraction: share left out around it, half
    on each side (the split is that of R's lmtest 0.9-40, gqtest). alternative: "greater" spread in the later part,
    "less", or "two-sided" (twice the smaller tail). by: None for time order, or a predictor column (its name, or its
    place from 0) whose values sort the rows, ties in the rows' own order.
    Does not apply where a part has no degrees of freedom, cannot tell the predictors apart, or is fitted perfectly.
    """
    return _tests(fit, point, fraction, (alternative,), by)[0]


def goldfeld_quandt_tests(
    fit: Fit, *, point: float = 0.5, fraction: float = 0.0, by: str | int | None = None
) -> tuple[Result, ...]:
    """The test against each alternative, "greater", "less" and "two-sided", from one pair of fits."""
    return _tests(fit, point, fraction, tuple(_ALTERNATIVES), by)


def _tests(
    fit: Fit, point: float, fraction: float, alternatives: tuple[str, ...], by: str | int | None
) -> tuple[Result, ...]:
    column = _checked(fit, point, fraction, alternatives, by)
    first, second = _split(fit.n, point, fraction)
    sorting: dict[str, Any] = {"order_by": "row order"} if column is None else {
        "order_by": fit.design.column_names[column], "ties": "stable order"
    }
    named: list[dict[str, Any]] = [
        {
            "method": "goldfeld_quandt", "null": SAME_SPREAD,
            "args": {"point": point, "fraction": fraction, "alternative": _ALTERNATIVES[alternative], **sorting},
            "variant": _variant(fit, first, second, alternative, column),
        }
        for alternative in alternatives
    ]
    refusal = refused(fit, **named[0]) or _too_few(fit, first, second, named[0])
    sums = (0.0, 0.0)
    if refusal is None:
        order = fit.design.order if column is None else np.argsort(fit.design.columns[:, column], kind="stable")
        with few_threads(fit.basis.q.size):
            found = _both_sums(fit, first, second, order, named[0])
        if isinstance(found, DoesNotApply):
            refusal = found
        else:
            sums = found
    if refusal is not None:
        return tuple(replace(refusal, args=one["args"], variant=one["variant"]) for one in named)
    df = (fit.n - second - fit.p, first - fit.p)
    statistic = sums[1] / df[0] / (sums[0] / df[1])
    greater, less = float(fdtrc(*df, statistic)), float(fdtr(*df, statistic))
    p = {"greater": greater, "less": less, "two-sided": min(1.0, 2.0 * min(greater, less))}
    return tuple(
        Statistic(**one, statistic=statistic, df=df, p=p[alternative])
        for one, alternative in zip(named, alternatives, strict=True)
    )


def _too_few(fit: Fit, first: int, second: int, named: dict[str, Any]) -> DoesNotApply | None:
    if min(first, fit.n - second) > fit.p:
        return None
    return DoesNotApply(
        **named, cell_error="#NUM!",
        reason=f"{fit.n} rows are too few: parts of {max(first, 0)} and {max(fit.n - second, 0)} rows must each have "
               f"more rows than the {fit.p} coefficients.",
    )


def _both_sums(
    fit: Fit, first: int, second: int, order: np.ndarray | None, named: dict[str, Any]
) -> tuple[float, float] | DoesNotApply:
    """Residual sums of squares of the earlier and the later part, or why there are none."""
    sums = []
    for rows, where in ((slice(0, first), "earlier"), (slice(second, fit.n), "later")):
        try:
            sums.append(_residual_sum(fit, rows if order is None else order[rows]))
        except NumbersError as refusal:
            return DoesNotApply(**named, reason=f"The {where} part cannot be fitted on its own: {refusal}")
        if sums[-1] <= (ROUNDINGS * fit.noise) ** 2:
            return DoesNotApply(
                **named, cell_error="#NUM!",
                reason=f"The {where} part is fitted perfectly, so that its errors show no spread to compare.",
            )
    return sums[0], sums[1]


def _checked(
    fit: Fit, point: float, fraction: float, alternatives: tuple[str, ...], by: str | int | None
) -> int | None:
    """The column that sorts the rows, None for time order. Raises ArgumentError for options that cannot be."""
    for alternative in set(alternatives) - set(_ALTERNATIVES):
        raise ArgumentError(f'"{alternative}" is not an alternative: use greater, less or two-sided.')
    if not 0.0 < point < 1.0:
        raise ArgumentError(f"The rows cannot be split at {point:g}: use a share between 0 and 1.")
    if not 0.0 <= fraction < 1.0:
        raise ArgumentError(f"{fraction:g} of the rows cannot be left out: use a share from 0 to below 1.")
    names = fit.design.column_names
    if isinstance(by, str) and by in names:
        return names.index(by)
    if isinstance(by, int) and 0 <= by < len(names):
        return by
    if by is not None:
        raise ArgumentError(f"There is no predictor column {by} to sort by: use one of {', '.join(names)}.")
    return None


def _split(n: int, point: float, fraction: float) -> tuple[int, int]:
    """Places from 0: the earlier part ends before the first, the later part begins at the second."""
    first = math.floor((point - fraction / 2) * n)
    return first, math.ceil((point + fraction / 2) * n + 0.01) - 1


def _variant(fit: Fit, first: int, second: int, alternative: str, column: int | None) -> str:
    order = "in time order" if column is None else f"sorted by {fit.design.column_names[column]}"
    dropped = second - first
    between = f"{dropped} between left out" if dropped > 0 else "none left out"
    return (f"last {max(fit.n - second, 0)} rows over first {max(first, 0)}, {order}, {between}, "
            f"{_AGAINST[alternative]}")


def _residual_sum(fit: Fit, rows: slice | np.ndarray) -> float:
    """Residual sum of squares of these rows' own fit; from cross products where they are good enough for it."""
    found = rest_of_rows(fit, rows)
    if found is not None:
        return found
    basis = factorize(fit.design.columns[rows], fit.design.column_names, intercept=fit.design.intercept)
    left = basis.project_out(fit.residuals[rows])
    return float(left @ left)
