"""Auxiliary regressions from cross products give what the decomposition of the columns themselves gives."""

from __future__ import annotations

import numpy as np
import pytest

from sheetfuncs.core import independence, some_rows
from sheetfuncs.core.cross_products import coordinates, leading
from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.goldfeld_quandt import goldfeld_quandt
from sheetfuncs.core.independence import breusch_godfrey_both


def made_fit(n: int, k: int, *, intercept: bool = True, ordered: bool = False, seed: int = 3) -> Fit:
    random = np.random.default_rng(seed)
    x = random.normal(size=(n, k)) + 2.0
    errors = random.normal(size=n)
    for i in range(1, n):
        errors[i] += 0.5 * errors[i - 1]
    predictors = [Numeric(f"x{j}", x[:, j]) for j in range(k)]
    order = random.permutation(n) if ordered else None
    return fit_design(build_design(1 + x.sum(axis=1) + errors, predictors, intercept=intercept, order=order))


def test_coordinates_by_their_definition():
    """Squares of the first few are what these few columns explain, the last is what all of them leave."""
    columns = np.random.default_rng(1).normal(size=(40, 5))
    gram, target = columns.T @ columns, columns[:, -1]
    found = coordinates(gram)
    for count in range(5):
        fitted = columns[:, :count] @ np.linalg.lstsq(columns[:, :count], target, rcond=None)[0]
        assert found[:count] @ found[:count] == pytest.approx(fitted @ fitted, rel=1e-12)
        part = coordinates(leading(gram, count))
        np.testing.assert_allclose(part[:-1], found[:count], rtol=1e-12)
        assert part[-1] ** 2 == pytest.approx(target @ target - fitted @ fitted, rel=1e-12)


@pytest.mark.parametrize("share", [0.0, 1e-3, 0.05])
def test_columns_close_to_each_other_have_none(share):
    random = np.random.default_rng(2)
    columns = random.normal(size=(30, 3))
    columns[:, 1] = columns[:, 0] + share * columns[:, 1]
    assert coordinates(columns.T @ columns) is None
    columns = random.normal(size=(30, 3))
    columns[:, 2] = columns[:, 0] + share * columns[:, 2]  # nothing much left of the last
    assert coordinates(columns.T @ columns) is None


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("ordered", [True, False])
@pytest.mark.parametrize("fill", ["zeros", "omitted"])
@pytest.mark.parametrize("lags", [1, 2, 4])
def test_breusch_godfrey_by_products_and_by_columns(lags, fill, ordered, intercept, monkeypatch):
    fit = made_fit(50, 3, intercept=intercept, ordered=ordered)
    by_products = breusch_godfrey_both(fit, lags, before_first=fill)
    monkeypatch.setattr(independence, "_sums_by_products", lambda *_, **__: None)
    for one, other in zip(by_products, breusch_godfrey_both(fit, lags, before_first=fill), strict=True):
        assert one.statistic == pytest.approx(other.statistic, rel=1e-11)
        assert one.p == pytest.approx(other.p, rel=1e-10)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("rows", [slice(0, 30), slice(25, 60), np.arange(0, 60, 2)])
def test_the_rest_of_some_rows_by_a_fit_of_their_own(rows, intercept):
    fit = made_fit(60, 3, intercept=intercept)
    design = fit.design
    own = fit_design(build_design(
        design.response[rows], [Numeric(f"x{j}", design.columns[rows, j]) for j in range(3)], intercept=intercept
    ))
    assert some_rows.rest_of_rows(fit, rows) == pytest.approx(own.rss, rel=1e-12)


def test_a_part_that_cross_products_cannot_tell_apart_is_decomposed():
    """In the later half x1 lies within a ten-millionth of x0."""
    random = np.random.default_rng(4)
    x = random.normal(size=(60, 2))
    x[30:, 1] = x[30:, 0] + 1e-7 * x[30:, 1]
    y = random.normal(size=60)
    fit = fit_design(build_design(y, [Numeric("x0", x[:, 0]), Numeric("x1", x[:, 1])]))
    assert some_rows.rest_of_rows(fit, slice(30, 60)) is None
    halves = [fit_design(build_design(y[part], [Numeric("x0", x[part, 0]), Numeric("x1", x[part, 1])]))
              for part in (slice(0, 30), slice(30, 60))]
    assert goldfeld_quandt(fit).statistic == pytest.approx(halves[1].rss / halves[0].rss, rel=1e-7)
