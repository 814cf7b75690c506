"""Predictions at given predictor values, with intervals for the average and for one new value."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import stdtrit

from sheetfuncs.core.fit import Fit


@dataclass(frozen=True, eq=False)
class Prediction:
    """Arrays (m,). average_*: limits for the mean response there; new_*: limits for one new response there.

    leverage: of the place; above the largest leverage of the rows it lies outside the data.
    """

    value: np.ndarray
    average_low: np.ndarray
    average_high: np.ndarray
    new_low: np.ndarray
    new_high: np.ndarray
    leverage: np.ndarray
    outside: np.ndarray


def predict(fit: Fit, columns: np.ndarray, level: float = 0.95) -> Prediction:
    """Predict at columns (m, k): values of the design's columns, categories as 0/1, without the constant.

    Ordinary least squares with t(n - p): standard error sigma sqrt(h) for the average and sigma sqrt(1 + h) for a new
    value, h = x'(X'X)^-1 x (Draper and Smith 1998, Applied Regression Analysis, 3rd edition, sections 3.1 and 5.2;
    sections from memory). Limits are NaN where the fit has no error bars.
    """
    basis = fit.basis
    left = (np.asarray(columns, dtype=np.float64) - basis.centre) / basis.scale
    along = left @ basis.r_inverse
    h = np.einsum("ij,ij->i", along, along)
    if basis.intercept:
        h = h + 1.0 / fit.n
        # About the centre of the data, where the constant of a far-off origin cannot cost digits.
        middle = float(fit.design.response.mean())
        value = middle + (np.asarray(columns) - basis.centre) @ fit.coefficients[1:]
    else:
        value = np.asarray(columns) @ fit.coefficients
    outside = h > float(fit.leverage.max()) * (1 + 1e-9)
    if not fit.has_error_bars:
        nothing = np.full(h.shape, np.nan)
        return Prediction(value, nothing, nothing, nothing, nothing, h, outside)
    reach = float(stdtrit(fit.df, 0.5 + level / 2)) * fit.sigma
    average, new = reach * np.sqrt(h), reach * np.sqrt(1.0 + h)
    return Prediction(value, value - average, value + average, value - new, value + new, h, outside)
