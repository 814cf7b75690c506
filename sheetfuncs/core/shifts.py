"""How far each row moves each coefficient, by a closed form instead of n refits."""

from __future__ import annotations

import numpy as np

from sheetfuncs.core.fit import Fit


def coefficient_shifts(fit: Fit) -> np.ndarray:
    """Change of every coefficient when a row is left out, in the coefficient's standard errors: (n, p).

    Entry (i, j) is (b_j without row i - b_j) / se_j, with b - b(i) = (X'X)^-1 x_i e_i / (1 - h_i)
    (Belsley, Kuh and Welsch 1980, equation 2.1). NaN for rows of leverage 1, without which there is no fit, and
    everywhere where there are no error bars.
    """
    if not fit.has_error_bars:
        return np.full((fit.n, fit.p), np.nan)
    basis = fit.basis
    with np.errstate(divide="ignore", invalid="ignore"):
        alone = np.where(fit.fits_itself, np.nan, fit.residuals / (1.0 - fit.leverage))
    root = basis.coefficient_root
    directions = root / np.linalg.norm(root, axis=1)[:, None] / fit.sigma
    if basis.intercept:
        along = basis.q @ directions[:, 1:].T + directions[:, 0] / np.sqrt(fit.n)
    else:
        along = basis.q @ directions.T
    return -along * alone[:, None]
