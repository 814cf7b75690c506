"""Form: is a straight line in these predictors enough?"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.linalg import lapack
from scipy.special import fdtrc

from sheetfuncs.core.auxiliary import Addition, add_columns, refused
from sheetfuncs.core.basis import EPS, ROUNDINGS
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError

STRAIGHT = "no power of {} adds anything to the straight line"
# From so many rows on, cross products in blocks are gathered faster than columns are projected.
MANY_ROWS, BLOCK = 2_000, 4_096
# A share that must be left of a power beside the predictors and the other powers: less could cost digits.
CLOSE = 0.02
_TYPES = {"fitted": "fitted", "predictors": "regressor"}


def reset(fit: Fit, powers: Sequence[int] = (2, 3), *, of: str = "fitted") -> Result:
    """RESET: F of adding powers of the fitted values, or of the numeric predictors (Ramsey 1969, JRSS B 31:350-371).

    Powers are taken of centred and scaled values, so that large numbers cost no digit (without an intercept only
    scaled: there the centre would change the test). With 2, or 2 and 3, this is the same test as with powers of the
    values themselves; with 3 alone it is not. The numerator's degrees of freedom are the rank that the powers add.
    """
    powers = tuple(powers)
    if of not in _TYPES:
        raise ArgumentError(f'"{of}" has no powers to take: use fitted or predictors.')
    if not powers or any(not float(power).is_integer() or power < 2 for power in powers):
        raise ArgumentError(f"{list(powers)} are not powers to add: use whole numbers from 2 up.")
    powers = tuple(sorted({int(power) for power in powers}))
    args = {"power": list(powers) if len(powers) > 1 else powers[0], "type": _TYPES[of]}
    what = "the fitted values" if of == "fitted" else "the predictors"
    variant = f"power{'s' if len(powers) > 1 else ''} {' and '.join(map(str, powers))} of {what}"
    null = STRAIGHT.format(what)
    refusal = refused(fit, "reset", args, variant, null)
    if refusal:
        return refusal

    def cannot(reason: str, cell_error: str = "#N/A") -> DoesNotApply:
        return DoesNotApply(
            method="reset", args=args, variant=variant, null=null, reason=reason, cell_error=cell_error
        )

    base = _base(fit, of)
    if not base.shape[1]:
        return cannot(f"{what.capitalize()} do not vary, so they have no powers to add.")
    added = _added_by_products(fit, base, powers) or add_columns(fit.basis, fit.residuals, _powers(base, powers))
    left = fit.df - added.rank
    if added.rank == 0 or (of == "fitted" and added.rank < min(len(powers), fit.df)):
        return cannot(f"The powers of {what} are already determined by the predictors, so nothing can be added.")
    if left < 1:
        return cannot(f"{fit.n} rows are too few to add powers of {what} to {fit.p} coefficients.", "#NUM!")
    if added.fits_perfectly(fit.noise):
        return cannot("With the powers added the fit is perfect, so that F has no denominator.", "#NUM!")
    statistic = added.part / added.rank / (added.rest / left)
    return Statistic(
        method="reset", args=args, variant=variant, statistic=statistic, df=(added.rank, left),
        p=float(fdtrc(added.rank, left, statistic)), null=null,
    )


def _base(fit: Fit, of: str) -> np.ndarray:
    """The columns to take powers of, (n, m): largest value 1, about their means where there is an intercept. Those that
    do not vary beyond rounding are left out."""
    if of == "fitted":
        base, whole = fit.fitted_about_mean[:, None], fit.design.response[:, None]
    else:
        whole = _numeric_columns(fit)
        base = whole - whole.mean(axis=0) if fit.design.intercept else whole
    if not base.shape[1]:
        return base
    size = np.abs(base).max(axis=0)
    varies = size > ROUNDINGS * EPS * np.abs(whole).max(axis=0)
    return base[:, varies] / size[varies]


def _added_by_products(fit: Fit, base: np.ndarray, powers: Sequence[int]) -> Addition | None:
    """What the powers explain, by cross products with the basis gathered block by block, so that many rows need little
    memory; None for few rows, and where the powers lie so close to the predictors or to each other that it could cost
    digits."""
    n, basis = fit.n, fit.basis
    if n < MANY_ROWS:
        return None
    width = base.shape[1] * len(powers)
    with_basis, with_each_other = np.zeros((basis.q.shape[1], width)), np.zeros((width, width))
    with_residuals, total = np.zeros(width), np.zeros(width)
    with few_threads(BLOCK):
        for start in range(0, n, BLOCK):
            rows = slice(start, start + BLOCK)
            block = _powers(base[rows], powers)
            with_basis += basis.q[rows].T @ block
            with_each_other += block.T @ block
            with_residuals += fit.residuals[rows] @ block
            if basis.intercept:
                total += np.add.reduce(block, axis=0)
    left = with_each_other - with_basis.T @ with_basis - np.outer(total, total) / n
    before, after = np.diag(with_each_other), np.diag(left)
    if (after < CLOSE * before).any():
        return None
    length = np.sqrt(after)
    root, info = lapack.dpotrf(left / np.outer(length, length), lower=1)
    if info != 0 or np.diag(root).min() < CLOSE:
        return None
    along, _ = lapack.dtrtrs(root, with_residuals / length, lower=1)
    part = float(along @ along)
    return Addition(part, fit.rss - part, width) if part < 0.99 * fit.rss else None


def _powers(base: np.ndarray, powers: Sequence[int]) -> np.ndarray:
    """All columns to each power, side by side, by multiplication: numpy's own power is twenty times slower."""
    pieces, raised, reached = [], base, 1
    for power in powers:
        for _ in range(power - reached):
            raised = raised * base
        reached = power
        pieces.append(raised)
    return np.hstack(pieces)


def _numeric_columns(fit: Fit) -> np.ndarray:
    """Predictors of numbers; a category's 0/1 columns have no powers."""
    if not fit.design.base_levels:
        return fit.design.columns
    categories = {name for name, _ in fit.design.base_levels}
    kept = [group.start for group in fit.design.groups if group.name not in categories]
    return fit.design.columns[:, kept]
