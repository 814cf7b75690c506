"""Form: is a straight line in these predictors enough?"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache

import numpy as np
from scipy.special import fdtrc

from sheetfuncs.core.auxiliary import Addition, add_columns, refused
from sheetfuncs.core.basis import EPS, ROUNDINGS, column_means
from sheetfuncs.core.cross_products import FAR_APART, coordinates, leading
from sheetfuncs.core.fit import Fit, once_per_fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError

STRAIGHT = "no power of {} adds anything to the straight line"
# From so many rows on, cross products are gathered faster than columns are projected; rows at a time.
MANY_ROWS, BLOCK = 12, 4_096
_TYPES = {"fitted": "fitted", "predictors": "regressor"}


def reset(fit: Fit, powers: Sequence[int] = (2, 3), *, of: str = "fitted") -> Result:
    """RESET: F of adding powers of the fitted values, or of the numeric predictors (Ramsey 1969, JRSS B 31:350-371).

    Powers are taken of centred and scaled values, so that large numbers cost no digit (without an intercept only
    scaled: there the centre would change the test). With 2, or 2 and 3, this is the same test as with powers of the
    values themselves; with 3 alone it is not. The numerator's degrees of freedom are the rank that the powers add.
    """
    if of not in _TYPES:
        raise ArgumentError(f'"{of}" has no powers to take: use fitted or predictors.')
    powers = _checked(tuple(powers))
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
    added = _added_by_products(fit, of, powers) or _added_by_columns(fit, base, powers)
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


@lru_cache(maxsize=64)
def _checked(powers: tuple[float, ...]) -> tuple[int, ...]:
    if not powers or any(not float(power).is_integer() or power < 2 for power in powers):
        raise ArgumentError(f"{list(powers)} are not powers to add: use whole numbers from 2 up.")
    return tuple(sorted({int(power) for power in powers}))


@once_per_fit
def _base(fit: Fit, of: str) -> np.ndarray:
    """The columns to take powers of, (n, m): largest value 1, about their means where there is an intercept. Those that
    do not vary beyond rounding are left out."""
    if of == "fitted":
        base, whole = fit.fitted_about_mean[:, None], np.abs(fit.design.response).max(keepdims=True)
    else:
        base, whole = _numeric_columns(fit), np.zeros(1)
        if not base.shape[1]:
            return base
        if fit.design.intercept:
            mean = column_means(base)
            base, whole = base - mean, np.abs(mean)
    size = np.maximum(base.max(axis=0), -base.min(axis=0))
    varies = size > ROUNDINGS * EPS * (whole + size)
    return base / size if varies.all() else base[:, varies] / size[varies]


def _added_by_products(fit: Fit, of: str, powers: tuple[int, ...]) -> Addition | None:
    """What the powers explain, by cross products; None for the fewest rows, and where the powers lie so close to the
    predictors or to each other that it could cost digits."""
    if fit.n < MANY_ROWS or fit.told_apart_to > FAR_APART:
        return None
    # The squares' cross products are among those of squares and cubes, and so are, as a rule, their coordinates.
    together = (2, 3) if powers == (2,) else powers
    found = _power_coordinates(fit, of, together)
    gram = _power_products(fit, of, together)
    width = (gram.shape[0] - 1 - fit.p) * len(powers) // len(together)
    if found is None and together != powers:
        found = coordinates(leading(gram, fit.p + width))
    if found is None:
        return None
    squares = fit.rss * found[fit.p :] ** 2
    return Addition(float(np.add.reduce(squares[:width])), float(np.add.reduce(squares[width:])), width)


@once_per_fit
def _power_coordinates(fit: Fit, of: str, powers: tuple[int, ...]) -> np.ndarray | None:
    return coordinates(_power_products(fit, of, powers))


def _added_by_columns(fit: Fit, base: np.ndarray, powers: tuple[int, ...]) -> Addition:
    columns = np.empty((base.shape[1] * len(powers), fit.n))
    return add_columns(fit.basis, fit.residuals, _raise(base.T, powers, columns).T)


@once_per_fit
def _power_products(fit: Fit, of: str, powers: tuple[int, ...]) -> np.ndarray:
    """Cross products of the basis, all base columns to each power, and the residuals; gathered block by block, so that
    many rows need little memory."""
    base = _base(fit, of).T
    p, size = fit.p, fit.p + base.shape[0] * len(powers) + 1
    lines, gram = np.empty((size, min(fit.n, BLOCK))), np.zeros((size, size))
    with few_threads(lines.size):
        for start in range(0, fit.n, BLOCK):
            rows = slice(start, start + BLOCK)
            known = fit.orthonormal[:, rows]
            block = lines[:, : known.shape[1]]
            block[:p], block[-1] = known[:-1], known[-1]
            _raise(base[:, rows], powers, block[p:-1])
            gram += block @ block.T
    return gram


def _raise(base: np.ndarray, powers: Sequence[int], out: np.ndarray) -> np.ndarray:
    """base (m, n) to each power, one after the other in out, by multiplication: numpy's own power takes twenty times as
    long."""
    raised, reached, m = base, 1, base.shape[0]
    for place, power in enumerate(powers):
        target = out[place * m : (place + 1) * m]
        for _ in range(power - reached):
            raised = np.multiply(raised, base, out=target)
        reached = power
    return out


def _numeric_columns(fit: Fit) -> np.ndarray:
    """Predictors of numbers; a category's 0/1 columns have no powers."""
    if not fit.design.base_levels:
        return fit.design.columns
    categories = {name for name, _ in fit.design.base_levels}
    kept = [group.start for group in fit.design.groups if group.name not in categories]
    return fit.design.columns[:, kept]
