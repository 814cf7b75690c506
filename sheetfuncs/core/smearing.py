"""Smearing: averages on the scale of the response from a fit of its logarithm."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.results import DoesNotApply


@dataclass(frozen=True, eq=False)
class Smearing:
    """log_fit: the logarithm of the response on the same predictors. factor: mean of exp(residual), by which exp of a
    fitted logarithm, a median, falls short of the average there. normal_theory_factor: exp(sigma^2 / 2), the same if
    the errors of the logarithm are normal. medians, averages: (n,) on the scale of the response.
    """

    log_fit: Fit
    factor: float
    normal_theory_factor: float
    medians: np.ndarray
    averages: np.ndarray

    applies = True
    reason: None = None

    def to_dict(self) -> dict[str, object]:
        """Figures as plain Python values; what there is one of a row stays out."""
        return {
            "method": "smearing", "args": {"model": "log(y) on same regressors"}, "smearing_factor": self.factor,
            "normal_theory_factor": self.normal_theory_factor,
            "log_model_coefficients": dict(
                zip(self.log_fit.design.terms, self.log_fit.coefficients.tolist(), strict=True)
            ),
        }


def smearing(fit: Fit) -> Smearing | DoesNotApply:
    """Smearing estimate of the averages (Duan 1983, JASA 78:605-610): exp(fitted logarithm) times the mean of
    exp(residual), for errors of the logarithm that are equally distributed, normal or not."""
    y, rows = fit.design.response, fit.design.rows

    def cannot(reason: str, cell_error: str) -> DoesNotApply:
        return DoesNotApply(
            method="smearing", args={"model": "log(y) on same regressors"}, variant="logarithm of the response",
            reason=reason, cell_error=cell_error,
        )

    lowest = int(np.argmin(y))
    if y[lowest] <= 0.0:
        return cannot(f"Logarithms need a positive response: row {int(rows[lowest])} has {y[lowest]:g}.", "#N/A")
    if fit.df < 1:
        return cannot(fit.nothing_left(), "#NUM!")
    log_fit = fit_design(replace(fit.design, response=np.log(y), response_name=f"log of {fit.design.response_name}"))
    factor = float(np.mean(np.exp(log_fit.residuals)))
    medians = np.exp(log_fit.fitted)
    sigma = 0.0 if log_fit.perfect else log_fit.sigma
    return Smearing(log_fit, factor, float(np.exp(sigma**2 / 2.0)), medians, medians * factor)
