"""Whatever numbers come in: finite figures or a reason, no NaN, no warning (warnings are errors here), no traceback."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from properties_designs import awkward, every_test, fitted, numeric, regular

from sheetfuncs.core.collinearity import variance_inflation
from sheetfuncs.core.design import Category, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.influence import row_measures
from sheetfuncs.errors import CollinearPredictorsError, SheetfuncsError, TooFewRowsError


def fit_or_refusal(design):
    try:
        return fit_design(design)
    except SheetfuncsError as refusal:
        return str(refusal)


@settings(max_examples=1000, suppress_health_check=[HealthCheck.too_slow, HealthCheck.filter_too_much])
@given(design=awkward())
def test_finite_figures_or_a_reason(design):
    fit = fit_or_refusal(design)
    if isinstance(fit, str):
        assert fit.endswith(".")
        return
    assert np.isfinite(fit.coefficients).all()
    assert np.isfinite(fit.residuals).all()
    for result in every_test(fit):
        label = f"{result.method} {dict(result.args)}"
        if not result.applies:
            assert result.reason.endswith("."), label
            assert result.cell_error in ("#NUM!", "#N/A"), label
            continue
        assert not fit.nothing_left(), label
        for value in (result.statistic, *np.atleast_1d(result.df or 0), *result.details.values()):
            assert type(value) is not np.float64, label
            assert math.isfinite(value), label
        if result.p is not None:
            assert 0.0 <= result.p <= 1.0, label
            assert result.null, label
    for inflation in variance_inflation(fit.basis, design.groups):
        assert 1.0 <= inflation.vif < math.inf
    rows = row_measures(fit)
    undefined = np.isnan(rows.leave_one_out)
    assert ((rows.leverage >= 0) & (rows.leverage <= 1)).all()
    if fit.has_error_bars:
        assert (undefined == fit.fits_itself).all()
        assert np.isfinite(rows.cooks_distance[~undefined]).all()


@given(data=regular(), column=st.integers(0, 3), factor=st.sampled_from([1.0, -2.0, 0.3048, 1e9]),
       origin=st.sampled_from([0.0, 32.0, 1e6]))
def test_a_column_that_another_determines_is_refused_by_name(data, column, factor, origin):
    y, x = data
    same = x[:, column % x.shape[1]] * factor + origin
    with pytest.raises(CollinearPredictorsError) as refusal:
        fitted(y, np.column_stack([x, same]))
    named = {f"x{column % x.shape[1] + 1}", f"x{x.shape[1] + 1}"}
    assert named <= set(refusal.value.predictors)
    assert all(name in str(refusal.value) for name in named)


@given(data=regular(), factor=st.sampled_from([1.0, 1e-9, 1e9]))
def test_a_sum_of_columns_is_refused(data, factor):
    y, x = data
    total = x.sum(axis=1) * factor
    with pytest.raises(CollinearPredictorsError):
        fitted(y, np.column_stack([x, total]), intercept=False)


@given(data=regular(), counts=st.lists(st.integers(1, 5), min_size=2, max_size=4))
def test_a_column_for_every_level_beside_an_intercept_is_refused(data, counts):
    y, x = data
    codes = np.arange(len(y)) % len(counts)
    marks = (codes[:, None] == np.arange(len(counts))).astype(float)
    with pytest.raises(CollinearPredictorsError):
        fitted(y, np.column_stack([x, marks]))
    levels = tuple("abcd"[: len(counts)])
    assert fit_design(build_design(y, [*numeric(x), Category("site", levels, codes)])).p == x.shape[1] + len(counts)


@given(data=regular(), intercept=st.booleans())
def test_as_many_rows_as_coefficients(data, intercept):
    y, x = data
    p = x.shape[1] + intercept
    fit = fitted(y[:p], x[:p], intercept=intercept)
    assert (fit.df, fit.has_error_bars) == (0, False)
    np.testing.assert_allclose(x[:p] @ fit.coefficients[int(intercept):] + (fit.coefficients[0] if intercept else 0),
                               y[:p], rtol=1e-6, atol=1e-6)
    assert not any(result.applies for result in every_test(fit))
    assert all("degrees of freedom" in result.reason for result in every_test(fit))
    if p > 1:
        with pytest.raises(TooFewRowsError):
            fitted(y[: p - 1], x[: p - 1], intercept=intercept)


@given(data=regular(), slopes=st.lists(st.integers(-9, 9), min_size=4, max_size=4),
       unit=st.sampled_from([1, 1e-9, 1e9]))
def test_a_perfect_fit_is_recognised_whatever_the_unit(data, slopes, unit):
    _, x = data
    y = (2 + x @ np.array(slopes[: x.shape[1]], float)) * unit
    fit = fitted(y, x)
    assert fit.perfect
    assert not fit.residuals.any()
    assert not any(result.applies for result in every_test(fit))


@given(data=regular(), quiet=st.sampled_from([1e-3, 1e-6, 1e-9, 1e-11]))
def test_small_errors_are_not_taken_for_a_perfect_fit(data, quiet):
    y, x = data
    fit = fitted(y, x)
    close = fitted(fit.fitted + quiet * fit.residuals, x)
    assert not close.perfect
    np.testing.assert_allclose(close.sigma, quiet * fit.sigma, rtol=1e-3)
