"""White's test against R (n R2 of e^2 on Z, see make_reference.R), statsmodels, and a full decomposition."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_cases import as_number
from reference_checks import FITTED, NOISE, fit_of, fitted, made_fit, r_results, same, says_nothing
from scipy.special import chdtrc

from sheetfuncs.core import white as module
from sheetfuncs.core.design import Category, Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.products import explain_by_products
from sheetfuncs.core.white import white, white_fitted


@pytest.mark.parametrize("name", FITTED)
def test_white_against_R(name):
    [expected] = r_results(name, "white")
    ours = white(fitted(name))
    assert ours.args == expected["args"]
    if says_nothing(expected):
        assert not ours.applies
        assert "too few" in ours.reason
        assert ours.cell_error == "#NUM!"
        return
    same(ours, expected)
    assert ours.details["F"] == pytest.approx(as_number(expected["F"]), rel=1e-9)
    assert list(ours.details["F_df"]) == expected["F_df"]
    assert ours.details["F_p"] == pytest.approx(as_number(expected["F_p"]), rel=1e-7)


@pytest.mark.parametrize("name", FITTED)
def test_white_on_fitted_values_against_R(name):
    [expected] = r_results(name, "white_special_fitted")
    ours = white_fitted(fitted(name))
    assert ours.args == expected["args"]
    same(ours, expected)


@pytest.mark.parametrize("name", NOISE)
def test_nothing_is_tested_on_rounding_noise(name):
    fit = fitted(name)
    for result in (white(fit), white_fitted(fit)):
        assert not result.applies
        assert result.reason == fit.nothing_left()


@pytest.mark.parametrize("name", [name for name in FITTED if name not in ("longley", "syn_smalln_a")])
def test_both_ways_of_computing_agree(name):
    """Cross products in blocks against an orthogonal decomposition, on every case."""
    fit = fitted(name)
    ratio, _ = module._squared_residuals(fit)
    whole, blocks = module._decomposed(fit, ratio), explain_by_products(fit.basis, ratio)
    assert whole.rank == blocks.rank
    assert blocks.part == pytest.approx(whole.part, rel=1e-11)
    assert blocks.rest == pytest.approx(whole.rest, rel=1e-11)


@pytest.mark.parametrize(("n", "k"), [(400, 2), (3_000, 4), (20_000, 6)])
def test_white_against_statsmodels(n, k):
    """statsmodels 0.14 and later, het_white: right where no product is redundant (CONVENTIONS.md)."""
    from statsmodels.stats.diagnostic import het_white

    fit = made_fit(n, k)
    statistic, p, f, f_p = het_white(fit.residuals, np.column_stack([np.ones(n), fit.design.columns]))
    ours = white(fit)
    assert ours.statistic == pytest.approx(statistic, rel=1e-9)
    assert ours.p == pytest.approx(p, rel=1e-7)
    assert (ours.details["F"], ours.details["F_p"]) == pytest.approx((f, f_p), rel=1e-7)


@pytest.mark.parametrize("n", [60, 2_500])
@pytest.mark.parametrize("intercept", [True, False])
def test_redundant_columns_count_for_nothing(n, intercept):
    """By the definition: rank and R2 of all columns by singular values, with 0/1 columns, a category and a square."""
    rng = np.random.default_rng(3)
    x, flag, codes = rng.uniform(1, 4, n), rng.integers(0, 2, n).astype(float), rng.integers(0, 3, n)
    parts = [Numeric("x", x), Numeric("square", x**2), Numeric("flag", flag), Category("site", ("a", "b", "c"), codes)]
    fit = fit_design(build_design(x + flag + rng.normal(size=n) * x, parts, intercept=intercept))
    columns = np.column_stack([x, x**2, flag, codes == 1, codes == 2])
    i, j = np.triu_indices(5)
    z = np.column_stack([np.ones(n), columns, columns[:, i] * columns[:, j]])
    z /= np.abs(z).max(axis=0, initial=1e-300)
    u, s, _ = np.linalg.svd(z, full_matrices=False)
    rank = int((s > 1e-10 * s[0]).sum())
    f = fit.residuals**2
    f -= f.mean()
    r_squared = np.sum((u[:, :rank].T @ f) ** 2) / (f @ f)
    ours = white(fit)
    assert ours.df == rank - 1
    assert ours.statistic == pytest.approx(n * r_squared, rel=1e-9)
    assert ours.p == pytest.approx(chdtrc(rank - 1, n * r_squared), rel=1e-7)
    assert ("although the fit has none" in ours.note) != intercept


def test_a_column_of_signs_is_its_own_square_in_every_path():
    """A column of -1 and 1 with mean 0 has a square without variation."""
    for n in (40, 4_000):
        rng = np.random.default_rng(2)
        signs = np.tile([-1.0, 1.0], n // 2)
        fit = fit_of(signs + rng.normal(size=n), np.column_stack([signs, rng.normal(size=n), rng.normal(size=n)]))
        assert white(fit).df == 3 + 2 + 3  # levels, squares of two, products


@pytest.mark.parametrize("share", [1e-4, 1e-6, 1e-8, 1e-9])
def test_a_product_of_which_little_is_left_still_counts(share):
    """The columns x1 and its square, changed by little: the product's rest is far below what cross products see."""
    n = 5_000
    rng = np.random.default_rng(5)
    x = rng.normal(size=n)
    columns = np.column_stack([x, x**2 + share * rng.normal(size=n), rng.normal(size=n)])
    fit = fit_of(columns.sum(axis=1) + rng.normal(size=n), columns)
    ratio, _ = module._squared_residuals(fit)
    whole, blocks = module._decomposed(fit, ratio), explain_by_products(fit.basis, ratio)
    assert whole.rank == blocks.rank == 10
    # The roundings of the rest, relative to it.
    assert blocks.part == pytest.approx(whole.part, rel=max(1e-10, 1e-15 / share))


@settings(max_examples=40, deadline=None)
@given(
    st.integers(0, 1_000), st.sampled_from([40, 900]), st.sampled_from([1e-9, 1e6]),
    st.sampled_from([0.0, 1e3, -1e5]), st.booleans(),
)
def test_units_offsets_rows_and_places_do_not_matter(seed, n, unit, offset, permute):
    rng = np.random.default_rng(seed)
    x = rng.normal(size=(n, 3))
    y = x.sum(axis=1) + rng.normal(size=n) * (1 + x[:, 0] ** 2)
    plain = fit_of(y, x)
    rows, places = rng.permutation(n), rng.permutation(3)
    other = fit_of((y * unit)[rows], (x * unit + offset * unit)[rows][:, places])
    if not permute:
        other = fit_of(y * unit + 1e3 * unit, x * unit + offset * unit)
    for test in (white, white_fitted):
        assert test(other).statistic == pytest.approx(test(plain).statistic, rel=1e-6)
        assert test(other).df == test(plain).df


def test_no_predictors_or_too_many_or_residuals_of_one_size():
    n = 30
    y = np.random.default_rng(0).normal(size=n)
    only_constant = fit_of(y, np.empty((n, 0)))
    assert "at least one predictor" in white(only_constant).reason
    assert "fitted values are alike" in white_fitted(only_constant).reason
    square = fit_of(np.tile([1.0, -1.0, -1.0, 1.0], 5), np.repeat(np.arange(5.0), 4)[:, None])
    for result in (white(square), white_fitted(square)):
        assert "same size" in result.reason
        assert result.cell_error == "#NUM!"
    many = made_fit(2_200, 63)
    assert "2016 squares and products" in white(many).reason
    assert white_fitted(many).applies


def test_fitted_values_of_two_groups_have_one_degree_of_freedom():
    rng = np.random.default_rng(4)
    flag = np.repeat([0.0, 1.0], 15)
    fit = fit_of(flag + rng.normal(size=30) * (1 + flag), flag[:, None])
    assert white_fitted(fit).df == white(fit).df == 1
    assert white_fitted(fit).statistic == pytest.approx(white(fit).statistic, rel=1e-12)


def test_fewest_rows():
    rng = np.random.default_rng(6)
    x, y = rng.normal(size=(8, 2)), rng.normal(size=8)
    assert white(fit_of(y[:7], x[:7])).applies  # five terms and the constant leave one
    assert not white(fit_of(y[:6], x[:6])).applies
    assert not white_fitted(fit_of(y[:3], x[:3, :1])).applies
    assert white_fitted(fit_of(y[:4], x[:4])).applies
