"""The rainbow test: does the middle of the data lie on a straighter line than the whole?"""

from __future__ import annotations

import numpy as np
from scipy.special import fdtrc

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import DETERMINED, EPS, ROUNDINGS
from sheetfuncs.core.design import Design
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.some_rows import fit_rows
from sheetfuncs.errors import ArgumentError

STRAIGHT = "the straight line that fits the middle of the rows fits the others as well"
NEAREST = "mahalanobis"


def rainbow(fit: Fit, *, fraction: float = 0.5, by: str | None = None) -> Result:
    """Rainbow test (Utts 1982, Communications in Statistics, Theory and Methods 11:2801-2815).

    F of what the other rows add to the squared residuals of the middle rows' own fit. fraction: share of the rows that
    counts as the middle, floor(fraction n) of them. by None: the middle of the rows in time order; the name of a
    predictor's column: the middle when sorted by it (ties in row order); "mahalanobis": the rows nearest to the
    predictors' means, the distance measured by their cross products.
    Degrees of freedom: n - m - (p - rank) and m - rank, m middle rows in which the predictors have this rank.
    """
    if not 0.0 < fraction < 1.0:
        raise ArgumentError(f"{fraction:g} is not a share of the rows: use a number between 0 and 1, such as 0.5.")
    args = {"fraction": fraction, "order_by": by or "row order"}
    variant = _variant(fit.design, fraction, by)
    rows = _middle(fit, fraction, by)
    refusal = refused(fit, "rainbow", args, variant, STRAIGHT)
    if refusal:
        return refusal

    def cannot(reason: str) -> DoesNotApply:
        return DoesNotApply(
            method="rainbow", args=args, variant=variant, null=STRAIGHT, reason=reason, cell_error="#NUM!"
        )

    count = int(fraction * fit.n)
    if count <= fit.p:
        return cannot(
            f"The middle has {count} of {fit.n} rows: too few for a fit of its own with {fit.p} coefficients."
        )
    middle = fit_rows(fit, rows)
    df = (fit.n - count - (fit.p - middle.rank), count - middle.rank)
    if df[0] < 1:
        return cannot("The rows outside the middle are all needed to tell the predictors apart.")
    if middle.rss <= (ROUNDINGS * fit.noise) ** 2:
        return cannot("The middle rows fit perfectly on their own, so that F has no denominator.")
    statistic = max(0.0, fit.rss - middle.rss) / df[0] / (middle.rss / df[1])
    note = "" if middle.rank == fit.p else (
        f"In the middle rows only {middle.rank} of the {fit.p} coefficients can be told apart; the degrees of freedom "
        "count these."
    )
    return Statistic(
        method="rainbow", args=args, variant=variant, statistic=statistic, df=df,
        p=float(fdtrc(df[0], df[1], statistic)), null=STRAIGHT, note=note,
        details={"middle_rows": count, "middle_rss": middle.rss},
    )


def column_named(design: Design, name: str) -> np.ndarray:
    """The values (n,) of one predictor column. Raises ArgumentError where there is none of this name."""
    if name not in design.column_names:
        raise ArgumentError(
            f'There is no column of numbers called "{name}" to sort by: use one of {", ".join(design.column_names)}.'
            if design.column_names else f'There is no column called "{name}": the fit has no predictors to sort by.'
        )
    return design.columns[:, design.column_names.index(name)]


def _variant(design: Design, fraction: float, by: str | None) -> str:
    share = f"the middle {100 * fraction:g} % of the rows"
    if by is None:
        return f"{share}, in their order"
    if by == NEAREST:
        return f"the {100 * fraction:g} % of the rows nearest to the predictors' means"
    return f"{share}, sorted by {by}"


def _middle(fit: Fit, fraction: float, by: str | None) -> slice | np.ndarray:
    if by == NEAREST:
        return _nearest(fit, int(fraction * fit.n))
    order = fit.design.order if by is None else np.argsort(column_named(fit.design, by), kind="stable")
    # The lower quartile's place, of the rows numbered from 1, rounded up (for one half).
    first = int(np.ceil(1.0 + (fit.n - 1) * (0.5 - fraction / 2.0) - 1e-9)) - 1
    middle = slice(first, first + int(fraction * fit.n))
    return middle if order is None else order[middle]


def _nearest(fit: Fit, count: int) -> np.ndarray:
    """The count rows nearest to the predictors' means. Equally distant ones, up to rounding, in row order."""
    q = fit.basis.q if fit.design.intercept else fit.basis.q - fit.basis.q.mean(axis=0)
    distance = np.einsum("ij,ij->i", q, q)
    if count < 1:
        return np.empty(0, np.intp)
    last = np.partition(distance, count - 1)[count - 1]
    rounding = max(DETERMINED, ROUNDINGS * EPS * fit.basis.amplification) * last
    nearer = distance < last - rounding
    equal = np.flatnonzero(np.abs(distance - last) <= rounding)
    nearer[equal[: count - np.count_nonzero(nearer)]] = True
    return np.flatnonzero(nearer)
