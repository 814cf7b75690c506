"""What must not change the figures: units, origins, the order of rows and columns, the base of a category."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from properties_designs import (
    assert_same,
    every_test,
    fitted,
    numeric,
    regular,
    row_order_free_tests,
    serial_tests,
    with_category,
)

from sheetfuncs.core.collinearity import variance_inflation
from sheetfuncs.core.design import Category, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.influence import row_measures

scale = st.sampled_from([1e-100, 1e-9, -0.37, 5.0, 1e9, 1e100])
few = settings(max_examples=40)
both = pytest.mark.parametrize("intercept", [True, False])


@both
@few
@given(data=regular(), unit=scale)
def test_unit_of_the_response(intercept, data, unit):
    y, x = data
    before, after = fitted(y, x, intercept=intercept), fitted(y * unit, x, intercept=intercept)
    np.testing.assert_allclose(after.coefficients, before.coefficients * unit, rtol=1e-9, atol=1e-12 * abs(unit))
    np.testing.assert_allclose(after.standard_errors, before.standard_errors * abs(unit), rtol=1e-9)
    np.testing.assert_allclose(after.t, before.t * np.sign(unit), rtol=1e-9, atol=1e-10)
    np.testing.assert_allclose(after.r_squared, before.r_squared, rtol=1e-10)
    assert_same(every_test(after), every_test(before), without=("outlier_test",) if unit < 0 else ())


@both
@few
@given(data=regular(), unit=scale)
def test_unit_of_a_predictor(intercept, data, unit):
    y, x = data
    scaled = x.copy()
    scaled[:, 0] *= unit
    before, after = fitted(y, x, intercept=intercept), fitted(y, scaled, intercept=intercept)
    np.testing.assert_allclose(after.t[-x.shape[1]], before.t[-x.shape[1]] * np.sign(unit), rtol=1e-8, atol=1e-10)
    np.testing.assert_allclose(after.residuals, before.residuals, atol=1e-10 * before.sigma)
    assert_same(every_test(after), every_test(before))
    for a, b in zip(*(variance_inflation(f.basis, f.design.groups) for f in (after, before)), strict=True):
        assert a.vif == pytest.approx(b.vif, rel=1e-9)


@few
@given(data=regular(), power=st.integers(0, 30), on_response=st.booleans())
def test_a_far_origin_costs_no_digit(data, power, on_response):
    """Values on a grid of 1/1024 plus up to 2^30, about 1e9: exact in double precision, so nothing may change."""
    y, x = (np.round(values * 1024) / 1024 for values in data)
    far = 2.0**power
    before = fitted(y, x)
    after = fitted(y + far, x) if on_response else fitted(y, x + far)
    np.testing.assert_allclose(after.coefficients[1:], before.coefficients[1:], rtol=1e-10, atol=1e-12)
    np.testing.assert_allclose(after.standard_errors[1:], before.standard_errors[1:], rtol=1e-10)
    np.testing.assert_allclose(after.r_squared, before.r_squared, rtol=1e-11)
    assert_same(every_test(after), every_test(before))


@few
@given(data=regular(), slopes=st.lists(st.floats(-5, 5), min_size=4, max_size=4))
def test_what_the_predictors_explain_does_not_show_in_the_residuals(data, slopes):
    y, x = data
    before, after = fitted(y, x), fitted(y + x @ np.array(slopes[: x.shape[1]]), x)
    np.testing.assert_allclose(after.residuals, before.residuals, atol=1e-12 * np.abs(y).max() * 10)
    keep = [r for r in every_test(before) if r.args.get("type") != "fitted"]
    assert_same([r for r in every_test(after) if r.args.get("type") != "fitted"], keep)


@both
@few
@given(data=regular(), seed=st.integers(0, 1000))
def test_order_of_rows(intercept, data, seed):
    """Without a time order the rows' order counts for the serial tests alone; with one, for nothing."""
    y, x = data
    shuffle = np.random.default_rng(seed).permutation(len(y))
    before = fitted(y, x, intercept=intercept)
    after = fitted(y[shuffle], x[shuffle], intercept=intercept, order=shuffle)
    assert_same(row_order_free_tests(after), row_order_free_tests(before))
    assert_same(serial_tests(after), serial_tests(before))
    rows_before, rows_after = row_measures(before), row_measures(after)
    for name in ("leverage", "externally_studentized", "cooks_distance", "dffits", "leave_one_out"):
        np.testing.assert_allclose(getattr(rows_after, name), getattr(rows_before, name)[shuffle], rtol=1e-8, atol=1e-9)


@both
@few
@given(data=regular(), seed=st.integers(0, 1000))
def test_order_of_columns(intercept, data, seed):
    y, x = data
    shuffle = np.random.default_rng(seed).permutation(x.shape[1])
    before, after = fitted(y, x, intercept=intercept), fitted(y, x[:, shuffle], intercept=intercept)
    slopes = slice(int(intercept), None)
    np.testing.assert_allclose(after.coefficients[slopes], before.coefficients[slopes][shuffle], rtol=1e-9, atol=1e-11)
    assert_same(every_test(after), every_test(before))
    factors = [np.array([i.vif for i in variance_inflation(f.basis, f.design.groups)]) for f in (after, before)]
    np.testing.assert_allclose(factors[0], factors[1][shuffle], rtol=1e-9)


@few
@given(data=with_category())
def test_base_level_of_a_category(data):
    y, x, codes = data

    def fit_with_base(levels):
        new = np.array([levels.index("abc"[c]) for c in codes])
        return fit_design(build_design(y, [*numeric(x), Category("site", levels, new)]))

    before, after = fit_with_base(("a", "b", "c")), fit_with_base(("c", "a", "b"))
    np.testing.assert_allclose(after.residuals, before.residuals, atol=1e-11)
    assert_same(every_test(after), every_test(before))
    for a, b in zip(*(variance_inflation(f.basis, f.design.groups) for f in (after, before)), strict=True):
        assert (a.predictor, a.df) == (b.predictor, b.df)
        assert a.vif == pytest.approx(b.vif, rel=1e-9)
        assert a.vif_per_df == pytest.approx(a.vif ** (1 / (2 * a.df)), rel=1e-12)
