"""How far each row moves each coefficient, by a closed form instead of n refits."""

from __future__ import annotations

import numpy as np

from sheetfuncs.core.fit import Fit
from sheetfuncs.core.influence import RowMeasures


def coefficient_shifts(fit: Fit) -> np.ndarray:
    """Change of every coefficient when a row is left out, in the coefficient's standard errors: (n, p).

    Entry (i, j) is (b_j without row i - b_j) / se_j, with b - b(i) = (X'X)^-1 x_i e_i / (1 - h_i)
    (Belsley, Kuh and Welsch 1980, equation 2.1). NaN for rows of leverage 1, without which there is no fit, and
    everywhere where there are no error bars.
    """
    if not fit.has_error_bars:
        return np.full((fit.n, fit.p), np.nan)
    return -_standardized_changes(fit) / fit.sigma


def dfbetas(fit: Fit, measures: RowMeasures) -> np.ndarray:
    """DFBETAS (n, p): (b_j - b_j without row i) over s(i) sqrt((X'X)^-1_jj), s(i) from the fit without the row
    (Belsley, Kuh and Welsch 1980, equation 2.7, number from memory).

    NaN for rows of leverage 1, for rows without which the others fit perfectly, and where there are no error bars.
    """
    if not fit.has_error_bars:
        return np.full((fit.n, fit.p), np.nan)
    without = np.where(measures.sigma_without > 0.0, measures.sigma_without, np.nan)
    return _standardized_changes(fit) / without[:, None]


def _standardized_changes(fit: Fit) -> np.ndarray:
    """(n, p): (b_j - b_j without row i) / sqrt((X'X)^-1_jj)."""
    with np.errstate(divide="ignore", invalid="ignore"):
        alone = fit.residuals / (1.0 - fit.leverage)
    if fit.some_fit_themselves:
        alone[fit.fits_itself] = np.nan
    directions = fit.basis.coefficient_root / fit.basis.root_lengths[:, None]
    along = fit.orthonormal[:-1].T @ directions.T
    along *= alone[:, None]
    return along
