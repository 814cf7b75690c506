"""Harvey-Collier test and recursive residuals: R 4.2.2 lmtest::harvtest (which gives the absolute value), mpmath where
R inverts a matrix that it should not, refits row by row, and edges."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest
from form_cases import MEANINGFUL, SEEDS, awkward_fits, fit_case, fit_of, r_results, raw, regression
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_cases import ROUNDING_NOISE, as_number

from sheetfuncs.core import recursive_residuals as module
from sheetfuncs.core.design import Category, Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.harvey_collier import harvey_collier
from sheetfuncs.core.recursive_residuals import recursive_residuals
from sheetfuncs.errors import ArgumentError

# lmtest inverts X'X of the first rows; where their columns nearly coincide its digits are gone (Longley: 3 are left).
R_LOSES_DIGITS = {("hartnagel", "row order"), ("longley", "row order"), ("longley", "x1"), ("publicschools", "Income")}
# Where lmtest stops or gives NaN because the first p rows are singular: how many it takes instead.
LATE = {
    ("cars", "row order"): 3, ("cars", "speed"): 3, ("mtcars", "row order"): 6, ("mtcars", "wt"): 14,
    ("prestige", "row order"): 31, ("prestige", "income"): 30, ("stackloss", "Air.Flow"): 6,
    ("syn_het_a", "row order"): 9, ("syn_het_a", "x1"): 6, ("syn_lev1_a", "x1"): 9, ("syn_ties_a", "t"): 4,
}


def by_of(r):
    return None if r["args"]["order_by"] == "row order" else r["args"]["order_by"]


def row_order(fit, by):
    if by is None:
        return np.arange(fit.n)
    return np.argsort(fit.design.columns[:, fit.design.column_names.index(by)], kind="stable")


def exact_recursive_residuals(fit, order, start):
    """At 50 digits, from the definition: a fit of the rows before for every row."""
    with mpmath.workdps(50):
        x, y = raw(fit.design)[order], fit.design.response[order]
        values = []
        for t in range(start, fit.n):
            before, row = mpmath.matrix(x[:t].tolist()), mpmath.matrix(x[t].tolist())
            gram = before.T * before
            b = mpmath.lu_solve(gram, before.T * mpmath.matrix(y[:t].tolist()))
            size = (row.T * mpmath.lu_solve(gram, row))[0]
            values.append((mpmath.mpf(y[t]) - (row.T * b)[0]) / mpmath.sqrt(1 + size))
        mean = sum(values) / len(values)
        spread = mpmath.sqrt(sum((v - mean) ** 2 for v in values) / (len(values) - 1))
        return [float(v) for v in values], float(mean * mpmath.sqrt(len(values)) / spread)


@pytest.mark.parametrize("name", MEANINGFUL)
def test_against_R_lmtest_harvtest(name):
    fit = fit_case(name)
    for r in r_results(name, "harvey_collier"):
        key = (name, r["args"]["order_by"])
        result = harvey_collier(fit, by=by_of(r))
        assert result.args == r["args"]
        if key in LATE:
            assert "error" in r or math.isnan(as_number(r["statistic"]))
            assert result.details["n_start"] == LATE[key]
            assert result.df == fit.n - LATE[key] - 1
        elif key not in R_LOSES_DIGITS:
            assert abs(result.statistic) == pytest.approx(r["statistic"], rel=1e-9)
            assert result.df == r["df"]
            assert result.p == pytest.approx(r["p"], rel=1e-7)
            assert result.details["n_start"] == fit.p


EXACT = [*sorted(R_LOSES_DIGITS), *sorted(key for key in LATE if key[0] != "prestige"), ("trees", "row order"),
         ("syn_offset_a", "row order"), ("syn_tiny_a", "x1"), ("syn_noint_a", "row order"), ("gesell", "age")]


@pytest.mark.parametrize(("name", "by"), EXACT)
def test_against_mpmath_at_50_digits(name, by):
    fit = fit_case(name)
    by = None if by == "row order" else by
    result = harvey_collier(fit, by=by)
    values, statistic = exact_recursive_residuals(fit, row_order(fit, by), result.details["n_start"])
    assert result.statistic == pytest.approx(statistic, rel=1e-11)
    ours = recursive_residuals(fit, row_order(fit, by)).values
    np.testing.assert_allclose(ours, values, rtol=0, atol=1e-11 * fit.sigma)


def refitted(y, x, intercept, start):
    """Recursive residuals from a refit before every row."""
    constant = np.ones((y.shape[0], int(intercept)))
    z = np.hstack([constant, x])
    values = []
    for t in range(start, y.shape[0]):
        fit = fit_of(y[:t], x[:t], intercept=intercept)
        size = z[t] @ fit.unscaled_covariance @ z[t]
        values.append((y[t] - z[t] @ fit.coefficients) / np.sqrt(1.0 + size))
    return np.array(values)


@settings(max_examples=40, deadline=None)
@given(SEEDS, st.integers(6, 90), st.integers(1, 4), st.booleans())
def test_against_refits(seed, n, k, intercept):
    y, x = regression(seed, n, k)
    fit = fit_of(y, x, intercept=intercept)
    if n < fit.p + 2:
        return
    found = recursive_residuals(fit)
    assert found.start == fit.p
    np.testing.assert_allclose(found.values, refitted(y, x, intercept, fit.p), rtol=0, atol=1e-7 * fit.sigma)


@pytest.mark.parametrize("n", [64, 68, 69, 132, 133, 1000, 2200])
@pytest.mark.parametrize("intercept", [True, False])
def test_wherever_the_blocks_end_squares_add_up(n, intercept):
    """Sum of squares: rss, less what the first p rows leave, which is nothing."""
    y, x = regression(n, n, 4)
    fit = fit_of(y, x, intercept=intercept)
    found = recursive_residuals(fit)
    assert found.values.shape == (n - fit.p,)
    assert found.values @ found.values == pytest.approx(fit.rss, rel=1e-12)
    last = fit_of(y[:-1], x[:-1], intercept=intercept)
    assert found.values[-1] ** 2 == pytest.approx(fit.rss - last.rss, rel=1e-7, abs=1e-9 * fit.rss)


def test_many_blocks_at_once_give_what_single_blocks_give(monkeypatch):
    y, x = regression(8, 3000, 3)
    fit = fit_of(y, x)
    together = recursive_residuals(fit).values
    monkeypatch.setattr(module, "_well_apart", lambda gram: False)
    np.testing.assert_allclose(recursive_residuals(fit).values, together, rtol=0, atol=1e-12)


def test_a_time_trend_and_its_square_keep_their_digits():
    """The first rows of 700 lie within a hundredth of the range: in coordinates of all rows they nearly coincide."""
    t = np.arange(700.0)
    x = np.column_stack([t, t**2])
    y = 5 + 0.1 * t + np.random.default_rng(3).normal(size=700)
    fit = fit_of(y, x)
    ours = recursive_residuals(fit).values[:40]
    first = fit_of(y[:43], x[:43])
    values, _ = exact_recursive_residuals(first, np.arange(43), 3)
    np.testing.assert_allclose(ours, values, rtol=0, atol=1e-12)


def test_an_offset_of_a_billion_costs_no_digit():
    y, x = regression(5, 40, 2)
    u = np.round(x, 4)
    far = fit_of(y, u + 1e9)
    np.testing.assert_allclose(
        recursive_residuals(far).values, recursive_residuals(fit_of(y, (u + 1e9) - 1e9)).values, rtol=0, atol=1e-10
    )


def test_the_sign_is_that_of_the_bend():
    """Later rows above the line through the rows before: positive; the mirror image negative, with the same p."""
    x = np.arange(1.0, 31.0)
    y = 0.02 * x**2 + np.random.default_rng(7).normal(size=30) * 0.1
    up, down = harvey_collier(fit_of(y, x[:, None])), harvey_collier(fit_of(-y, x[:, None]))
    assert up.statistic > 5
    assert down.statistic == pytest.approx(-up.statistic, rel=1e-12)
    assert up.p == pytest.approx(down.p, rel=1e-9)
    assert up.p < 1e-5


def test_a_late_start_is_said():
    codes = np.array([0, 0, 0, 0, 0, 1, 0, 1, 1, 0, 1, 0])
    y, x = regression(11, 12, 1)
    fit = fit_design(build_design(
        y, [Numeric("x", x[:, 0]), Category("site", ("a", "b"), codes)], rows=np.arange(12) + 5,
    ))
    result = harvey_collier(fit)
    assert (result.details["n_start"], result.df) == (6, 12 - 6 - 1)
    assert result.details["first_row"] == 11
    assert result.variant == "rows in their order, from row 11 on"
    assert "The first 6 rows are needed to tell the 3 coefficients apart" in result.note


def test_a_level_that_comes_last_leaves_nothing_to_predict():
    codes = np.array([0] * 11 + [1])
    y, x = regression(12, 12, 1)
    fit = fit_design(build_design(y, [Numeric("x", x[:, 0]), Category("site", ("a", "b"), codes)]))
    assert harvey_collier(fit).reason == (
        "It takes the first 12 of 12 rows to tell the predictors apart, which leaves no row to predict from the rows "
        "before."
    )


def test_time_order_is_the_rows_order():
    y, x = regression(13, 40)
    shuffled = np.random.default_rng(13).permutation(40)
    fit = fit_of(y[shuffled], x[shuffled], order=shuffled.astype(float))
    assert harvey_collier(fit).statistic == pytest.approx(harvey_collier(fit_of(y, x)).statistic, rel=1e-10)
    assert harvey_collier(fit_of(y, x), by="x2").p == pytest.approx(
        harvey_collier(fit_of(y, x, order=x[:, 1])).p, rel=1e-10
    )


@settings(max_examples=40, deadline=None)
@given(SEEDS)
def test_units_zeros_and_order_of_columns_do_not_matter(seed):
    y, x = regression(seed, 30)
    statistic = harvey_collier(fit_of(y, x)).statistic
    others = [
        fit_of(3e5 * y, x), fit_of(y, x * [1e-6, 20.0, 7e4]), fit_of(y + 1e3, x + np.array([5.0, 200.0, 0.0])),
        fit_of(y + x @ [3.0, 1.0, -7.0], x), fit_of(y, x[:, [2, 0, 1]]),
    ]
    for other in others:
        assert harvey_collier(other).statistic == pytest.approx(statistic, rel=1e-7, abs=1e-9)


@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_nothing_is_tested_on_rounding_noise(name):
    fit = fit_case(name)
    result = harvey_collier(fit)
    assert (result.applies, result.reason, result.cell_error) == (False, fit.nothing_left(), "#NUM!")


def test_a_column_that_is_not_there():
    y, x = regression(1, 12)
    with pytest.raises(ArgumentError, match='no column of numbers called "speed"'):
        harvey_collier(fit_of(y, x), by="speed")


@settings(max_examples=300, deadline=None)
@given(awkward_fits())
def test_awkward_rows_give_a_figure_or_a_reason(fit):
    if fit is None:
        return
    result = harvey_collier(fit)
    if result.applies:
        assert math.isfinite(result.statistic)
        assert 0.0 <= result.p <= 1.0
        assert result.df >= 1
    else:
        assert result.reason.endswith(".")
