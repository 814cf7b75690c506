"""Closed forms for single rows against what they stand for: leaving the row out and fitting again."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from properties_designs import fitted, regular

from sheetfuncs.core.influence import outlier_test, press, row_measures
from sheetfuncs.core.prediction import predict
from sheetfuncs.core.shifts import coefficient_shifts

both = pytest.mark.parametrize("intercept", [True, False])


@both
@settings(max_examples=30)
@given(data=regular(most=20))
def test_measures_against_refits(intercept, data):
    y, x = data
    fit = fitted(y, x, intercept=intercept)
    rows, shifts = row_measures(fit), coefficient_shifts(fit)
    for i in range(fit.n):
        others = np.arange(fit.n) != i
        without = fitted(y[others], x[others], intercept=intercept)
        there = float(predict(without, x[i : i + 1]).value[0])
        moved = predict(fit, x).value - predict(without, x).value
        assert rows.leave_one_out[i] == pytest.approx(y[i] - there, rel=1e-8, abs=1e-9)
        assert rows.cooks_distance[i] == pytest.approx(moved @ moved / fit.p / fit.sigma**2, rel=1e-7, abs=1e-12)
        spread = without.sigma * np.sqrt(fit.leverage[i])
        assert rows.dffits[i] == pytest.approx(moved[i] / spread, rel=1e-7, abs=1e-9)
        error = without.sigma * np.sqrt(1.0 - fit.leverage[i])
        assert rows.externally_studentized[i] == pytest.approx(fit.residuals[i] / error, rel=1e-8, abs=1e-10)
        np.testing.assert_allclose(
            shifts[i], (without.coefficients - fit.coefficients) / fit.standard_errors, rtol=1e-6, atol=1e-9
        )
    total = float(np.sum(rows.leave_one_out**2))
    assert press(fit).statistic == pytest.approx(total, rel=1e-12)
    assert press(fit).details["predicted_r_squared"] == pytest.approx(1 - total / fit.tss, rel=1e-12)


@both
@settings(max_examples=30)
@given(data=regular(most=20))
def test_externally_studentized_is_the_t_of_a_column_that_marks_the_row(intercept, data):
    """Cook and Weisberg 1982: the mean-shift outlier model. The outlier test is its largest t, p times n."""
    y, x = data
    fit = fitted(y, x, intercept=intercept)
    marked = [fitted(y, np.column_stack([x, np.arange(fit.n) == i]), intercept=intercept) for i in range(fit.n)]
    t = np.array([m.t[-1] for m in marked])
    np.testing.assert_allclose(row_measures(fit).externally_studentized, t, rtol=1e-7, atol=1e-9)
    largest = int(np.argmax(np.abs(t)))
    result = outlier_test(fit)
    assert result.details["row_of_used"] == largest + 1
    assert result.p == pytest.approx(min(1.0, fit.n * marked[largest].p_values[-1]), rel=1e-6)
    assert result.df == fit.df - 1


@given(data=regular())
def test_sums_of_leverage_and_residuals(data):
    y, x = data
    fit = fitted(y, x)
    assert fit.leverage.sum() == pytest.approx(fit.p, rel=1e-12)
    assert (fit.leverage >= 1 / fit.n - 1e-15).all()
    rows = row_measures(fit)
    assert float(np.sum(rows.internally_studentized**2 * (1 - fit.leverage))) == pytest.approx(fit.df, rel=1e-10)
    assert (rows.internally_studentized**2 <= fit.df * (1 + 1e-12)).all()


@given(data=regular(), place=st.integers(0, 11), quiet=st.sampled_from([1e-2, 1e-5, 1e-8, 1e-10]))
def test_one_gross_error_among_rows_that_fit_closely_is_the_one_reported(data, place, quiet):
    """rss - e^2/(1-h) would lose the others' sum of squares to rounding here, and with it the row."""
    y, x = data
    close = fitted(y, x)
    y = close.fitted + quiet * close.residuals
    y[place] += 10.0
    fit = fitted(y, x)
    others = np.arange(fit.n) != place
    without = fitted(y[others], x[others])
    expected = (y[place] - predict(without, x[place : place + 1]).value[0]) * np.sqrt(1 - fit.leverage[place])
    result = outlier_test(fit)
    assert result.details["row_of_used"] == place + 1
    assert result.statistic == pytest.approx(expected / without.sigma, rel=max(1e-7, 1e-12 / quiet))
    assert result.p < 1e-3


@given(place=st.integers(0, 11), slope=st.integers(-5, 5))
def test_a_row_that_spoils_a_perfect_fit_is_named_and_never_passed_over(place, slope):
    x = np.arange(12.0)
    y = slope * x + 1
    y[place] += 4.0
    rows = row_measures(fitted(y, x[:, None]))
    assert np.flatnonzero(rows.spoils_perfect_fit).tolist() == [place]
    assert np.isnan(rows.externally_studentized[place])
    assert np.isfinite(np.delete(rows.externally_studentized, place)).all()
    result = outlier_test(fitted(y, x[:, None], rows=np.arange(5, 17)))
    assert not result.applies
    assert f"row {place + 5} " in result.reason
