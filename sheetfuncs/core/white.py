"""White's test: does the errors' spread change with any predictor, its square, or a product of two?"""

from __future__ import annotations

from math import sqrt
from typing import Any

import numpy as np
from scipy.special import fdtrc

from sheetfuncs.core.auxiliary import Addition, add_columns, refused
from sheetfuncs.core.basis import DETERMINED, ROUNDINGS
from sheetfuncs.core.fit import Fit, once_per_fit
from sheetfuncs.core.products import PRODUCTS_AT_MOST, explain_by_products, explain_if_apart, number_of_products
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.tails import chi_square_tail
from sheetfuncs.core.variance import CONSTANT

# Up to this many elements the orthogonal decomposition is the faster one for columns that are close to each other;
# above, further passes of cross products by blocks of rows.
DECOMPOSED_UP_TO = 6_000
_NO_CONSTANT = "The auxiliary regression has a constant although the fit has none."


def white(fit: Fit) -> Result:
    """White's test with levels, squares and cross products of the predictors (White 1980, Econometrica 48:817-838).

    Null: constant variance. n R2 of the squared residuals on a constant and these columns; chi-square. A column that
    the others determine (a 0/1 column is its own square) counts for nothing: df is the rank less the constant. The F
    of the same regression, with (df, n - 1 - df), stands in the details. A constant is always there, without an
    intercept in the fit too. Does not apply where the auxiliary regression has no degree of freedom left: n R2 is then
    n, whatever the data.
    """
    args = {"terms": "levels + squares + cross products, constant; redundant columns dropped; df = rank-1"}
    named: dict[str, Any] = {
        "method": "white", "args": args, "variant": "levels, squares and products of the predictors", "null": CONSTANT,
    }
    refusal = refused(fit, **named)
    if refusal:
        return refusal
    k = fit.design.columns.shape[1]
    if k == 0:
        return DoesNotApply(**named, reason="The test needs at least one predictor beside the intercept.")
    if number_of_products(k) > PRODUCTS_AT_MOST and fit.n > number_of_products(k):
        return DoesNotApply(
            **named, reason=f"{k} predictor columns have {number_of_products(k)} squares and products; the test is "
                            f"made for up to {PRODUCTS_AT_MOST}. Use the form with the fitted values.",
        )
    ratio, total = _squared_residuals(fit)
    if total <= 0.0:
        return _all_alike(named)
    if fit.n * number_of_products(k) <= DECOMPOSED_UP_TO or fit.n < 3 * number_of_products(k):
        added = explain_if_apart(fit.basis, ratio) or _decomposed(fit, ratio)
    else:
        added = explain_by_products(fit.basis, ratio)
    return _result(fit, named, added, total, "" if fit.design.intercept else _NO_CONSTANT)


def white_fitted(fit: Fit) -> Result:
    """White's test with the fitted value and its square in place of all products (Wooldridge, Introductory
    Econometrics, section 8.3): the same null, n R2, 2 degrees of freedom; 1 where the fitted values are two only."""
    named: dict[str, Any] = {
        "method": "white_special_fitted", "args": {"terms": "fitted, fitted^2"},
        "variant": "the fitted values and their squares", "null": CONSTANT,
    }
    refusal = refused(fit, **named)
    if refusal:
        return refusal
    ratio, total = _squared_residuals(fit)
    if total <= 0.0:
        return _all_alike(named)
    level = fit.fitted_about_mean - np.add.reduce(fit.fitted_about_mean) / fit.n
    length = sqrt(level @ level)
    noise = ROUNDINGS * fit.noise
    if length <= noise:
        return DoesNotApply(**named, reason="All fitted values are alike, so that the errors' spread has nothing to "
                                            "change with.")
    level /= length
    square = level**2
    before = sqrt(square @ square)
    for _ in range(2):
        square -= np.add.reduce(square) / fit.n
        square -= level * float(level @ square)
    left = sqrt(square @ square)
    along, part, rank = float(level @ ratio), 0.0, 2
    if left > max(DETERMINED, noise / length) * before:
        part, rank = float(square @ ratio / left) ** 2, 3
    part += along**2
    return _result(fit, named, Addition(part, total - part, rank), total, "")


@once_per_fit
def _squared_residuals(fit: Fit) -> tuple[np.ndarray, float]:
    """Squared residuals over their mean, less 1, (n,), and their sum of squares; 0 where that is rounding."""
    ratio = fit.residuals**2 / (fit.rss / fit.n) - 1.0
    ratio -= np.add.reduce(ratio) / fit.n
    total = float(ratio @ ratio)
    return ratio, 0.0 if total <= fit.n * (ROUNDINGS * fit.relative_noise) ** 2 else total


def _decomposed(fit: Fit, ratio: np.ndarray) -> Addition:
    """The same as `explain_by_products`, by an orthogonal decomposition of all products at once."""
    basis = fit.basis
    first, second = np.triu_indices(basis.q.shape[1])
    products = basis.q[:, first] * basis.q[:, second]
    products *= np.sqrt(fit.n)
    if not fit.design.intercept:
        products = np.column_stack([np.ones(fit.n), products])
    left = basis.project_out(ratio)
    added = add_columns(basis, left, products)
    return Addition(float(ratio @ ratio) - added.rest, added.rest, basis.rank + added.rank)


def _result(fit: Fit, named: dict[str, Any], added: Addition, total: float, note: str) -> Result:
    df, left = added.rank - 1, fit.n - added.rank
    if left < 1:
        return DoesNotApply(
            **named, cell_error="#NUM!",
            reason=f"{fit.n} rows are too few for the {df} terms of the auxiliary regression: it would fit perfectly, "
                   "whatever the data.",
        )
    statistic = fit.n * min(max(added.part / total, 0.0), 1.0)
    details: dict[str, Any] = {}
    if added.rest > DETERMINED**2 * total:
        f = max(added.part, 0.0) / df / (added.rest / left)
        details = {"F": f, "F_df": (df, left), "F_p": float(fdtrc(df, left, f))}
    return Statistic(**named, statistic=statistic, df=df, p=chi_square_tail(df, statistic), note=note, details=details)


def _all_alike(named: dict[str, Any]) -> DoesNotApply:
    return DoesNotApply(
        **named, cell_error="#NUM!",
        reason="All residuals have the same size, so their squares show no variation to explain.",
    )
