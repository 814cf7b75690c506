"""The mean of the residuals, judged against their own scale."""

from __future__ import annotations

from math import sqrt

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import ROUNDINGS
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import Result, Statistic

# An intercept fit leaves a mean of about 1e-16 of the residuals' standard deviation; beyond this it is not rounding.
ZERO_BELOW = 1e-12


def residual_mean(fit: Fit) -> Result:
    """Mean of the residuals, in the response's units; details: mean_over_sd, its share of their standard deviation
    (divisor n - 1; left out where all residuals are equal).

    With an intercept it is zero by construction, up to rounding that is judged relative to the residuals, and tells
    nothing. Without one it is what it is, and no test is made of it: the fit forces something else to zero.
    """
    with_intercept = fit.design.intercept
    variant = "zero by construction" if with_intercept else "no intercept, so not fixed by the fit"
    null = "" if with_intercept else "the errors average zero"
    refusal = refused(fit, "residual_mean", {}, variant, null)
    if refusal:
        return refusal
    mean = float(fit.residuals.sum()) / fit.n
    left = fit.residuals - mean
    spread = sqrt(float(left @ left) / (fit.n - 1))
    share = mean / spread if spread > ROUNDINGS * fit.noise else None
    return Statistic(
        method="residual_mean", args={}, variant=variant, statistic=mean, null=null, note=_note(fit, share),
        details={} if share is None else {"mean_over_sd": share},
    )


def _note(fit: Fit, share: float | None) -> str:
    if not fit.design.intercept:
        return (
            "Without an intercept the residuals need not average zero; a mean that is large beside their spread says "
            "that the line misses the middle of the data."
        )
    if share is not None and abs(share) > ZERO_BELOW:
        return (
            "With an intercept this should be zero up to rounding and is not: the numbers are of such different sizes "
            "that digits were lost."
        )
    return "An intercept takes up any mean, so this carries no information about the model."
