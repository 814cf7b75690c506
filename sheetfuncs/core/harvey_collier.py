"""The Harvey-Collier test: do rows, one after the other, bend away from the line through those before?"""

from __future__ import annotations

from math import sqrt

import numpy as np
from scipy.special import stdtr

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import ROUNDINGS
from sheetfuncs.core.design import Design
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.rainbow import column_named
from sheetfuncs.core.recursive_residuals import recursive_residuals
from sheetfuncs.core.results import DoesNotApply, Result, Statistic

STRAIGHT = "rows lie on average on the line through the rows before them"
SIGN_NOTE = "Positive where rows lie above what the rows before them predict; p is two-sided."


def harvey_collier(fit: Fit, *, by: str | None = None) -> Result:
    """Harvey-Collier test (Harvey and Collier 1977, Journal of Econometrics 6:103-119): t of the mean of the recursive
    residuals.

    mean / (s / sqrt(m)), m recursive residuals, s their standard deviation with divisor m - 1; signed, two-sided t
    with m - 1 degrees of freedom. by None: rows taken in time order; the name of a predictor's column: sorted by it,
    ties in row order. m is n - p, or less where the first p rows cannot tell the predictors apart: the recursive
    residuals then start with the first row that comes after enough of them, which variant and note say.

    details: n_start, how many first rows have no recursive residual; first_row, the row that the residuals start with.
    """
    args = {"order_by": by or "row order"}
    order = fit.design.order if by is None else np.argsort(column_named(fit.design, by), kind="stable")
    variant = "rows in their order" if by is None else f"rows sorted by {by}"
    refusal = refused(fit, "harvey_collier", args, variant, STRAIGHT)
    if refusal:
        return refusal

    def cannot(reason: str, variant: str) -> DoesNotApply:
        return DoesNotApply(
            method="harvey_collier", args=args, variant=variant, null=STRAIGHT, reason=reason, cell_error="#NUM!"
        )

    found = recursive_residuals(fit, order)
    values, count = found.values, found.values.shape[0]
    late = found.start > fit.p
    if count < 2:
        return cannot(
            f"It takes the first {found.start} of {fit.n} rows to tell the predictors apart, which leaves "
            f"{'no row' if count == 0 else 'one row'} to predict from the rows before.", variant,
        )
    first_row = _row(fit.design, order, found.start)
    if late:
        variant += f", from row {first_row} on"
    mean = float(np.add.reduce(values)) / count
    about = values - mean
    spread = sqrt(float(about @ about) / (count - 1))
    if spread * sqrt(count - 1) <= ROUNDINGS * fit.noise:
        return cannot("The recursive residuals are all equal, so that their mean has no error bar.", variant)
    statistic = mean * sqrt(count) / spread
    note = SIGN_NOTE if not late else (
        f"{SIGN_NOTE} The first {found.start} rows are needed to tell the {fit.p} coefficients apart, so that it "
        f"starts with row {first_row}."
    )
    return Statistic(
        method="harvey_collier", args=args, variant=variant, statistic=statistic, df=count - 1,
        p=2.0 * float(stdtr(count - 1, -abs(statistic))), null=STRAIGHT, note=note,
        details={"n_start": found.start, "first_row": first_row},
    )


def _row(design: Design, order: np.ndarray | None, place: int) -> int:
    return int(design.rows[place if order is None else order[place]])
