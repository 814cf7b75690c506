"""Form: is a straight line in these predictors enough?"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.special import fdtrc

from sheetfuncs.core.auxiliary import explained, refused
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.errors import ArgumentError

STRAIGHT = "no power of {} adds anything to the straight line"
_TYPES = {"fitted": "fitted", "predictors": "regressor"}


def reset(fit: Fit, powers: Sequence[int] = (2, 3), *, of: str = "fitted") -> Result:
    """RESET: F of adding powers of the fitted values, or of the numeric predictors (Ramsey 1969, JRSS B 31:350-371).

    Powers are taken of centred and scaled values, so that large numbers cost no digit (without an intercept only
    scaled: there the centre would change the test). The numerator's degrees of freedom are the rank that the powers
    add.
    """
    powers = tuple(powers)
    if of not in _TYPES:
        raise ArgumentError(f'"{of}" has no powers to take: use fitted or predictors.')
    if not powers or any(power != int(power) or power < 2 for power in powers):
        raise ArgumentError(f"{list(powers)} are not powers to add: use whole numbers from 2 up.")
    args = {"power": list(powers) if len(powers) > 1 else powers[0], "type": _TYPES[of]}
    what = "the fitted values" if of == "fitted" else "the predictors"
    variant = f"power{'s' if len(powers) > 1 else ''} {' and '.join(map(str, powers))} of {what}"
    null = STRAIGHT.format(what)
    refusal = refused(fit, "reset", args, variant, null)
    if refusal:
        return refusal

    def cannot(reason: str) -> DoesNotApply:
        return DoesNotApply(method="reset", args=args, variant=variant, null=null, reason=reason)

    base = fit.fitted[:, None] if of == "fitted" else _numeric_columns(fit)
    if fit.design.intercept:
        base = base - base.mean(axis=0)
    size = np.abs(base).max(axis=0)
    base = base[:, size > 0] / size[size > 0]
    if not base.shape[1]:
        return cannot(f"{what.capitalize()} do not vary, so they have no powers to add.")
    added = fit.basis.project_out(np.hstack([base**power for power in powers]))
    added[:, np.linalg.norm(added, axis=0) < 1e-10 * np.sqrt(fit.n)] = 0.0
    part, rank = explained(fit.residuals, added)
    left = fit.df - rank
    if rank == 0 or (of == "fitted" and rank < len(powers)):
        return cannot(f"The powers of {what} are already determined by the predictors, so nothing can be added.")
    if left < 1:
        return cannot(f"{fit.n} rows are too few to add {rank} powers to {fit.p} coefficients.")
    rest = fit.rss - part
    if rest <= 0 or np.sqrt(rest) <= 1e-10 * np.sqrt(fit.rss):
        return cannot("With the powers added the fit is perfect, so that there is nothing to compare with.")
    statistic = part / rank / (rest / left)
    return Statistic(
        method="reset", args=args, variant=variant, statistic=statistic, df=(rank, left),
        p=float(fdtrc(rank, left, statistic)), null=null,
    )


def _numeric_columns(fit: Fit) -> np.ndarray:
    """Predictors of numbers; a category's 0/1 columns have no powers."""
    categories = {name for name, _ in fit.design.base_levels}
    kept = [group.start for group in fit.design.groups if group.name not in categories]
    return fit.design.columns[:, kept]
