"""RESET on many rows goes by cross products in blocks; it gives what adding the columns gives."""

from __future__ import annotations

import numpy as np
import pytest

from sheetfuncs.core import form
from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.form import reset


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("of", ["fitted", "predictors"])
@pytest.mark.parametrize("powers", [(2,), (2, 3), (2, 3, 4)])
def test_both_routes_give_the_same(of, powers, intercept, monkeypatch):
    random = np.random.default_rng(8)
    x = random.normal(size=(9000, 3)) + np.array([0.0, 5.0, -2.0])
    y = 3 + x @ [1.0, 2.0, -1.0] + 0.02 * x[:, 0] ** 2 + random.normal(size=9000)
    fit = fit_design(build_design(y, [Numeric(f"x{j}", x[:, j]) for j in range(3)], intercept=intercept))
    by_products = reset(fit, powers, of=of)
    monkeypatch.setattr(form, "MANY_ROWS", 10**9)
    by_columns = reset(fit, powers, of=of)
    assert by_products.statistic == pytest.approx(by_columns.statistic, rel=1e-10)
    assert by_products.df == by_columns.df
    assert by_products.p == pytest.approx(by_columns.p, rel=1e-9)


def test_powers_that_the_predictors_hold_are_not_counted_on_many_rows():
    random = np.random.default_rng(8)
    x = random.normal(size=5000) + 1.0
    fit = fit_design(build_design(1 + x + random.normal(size=5000), [Numeric("x", x), Numeric("x squared", x**2)]))
    assert reset(fit, (2,), of="predictors").df[0] == 1  # of x^2 and x^4 only the second is new
