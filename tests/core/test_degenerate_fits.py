"""Fits on which a figure would be rounding noise or a division by zero: a reason instead, and never another row."""

from __future__ import annotations

import numpy as np
import pytest

from sheetfuncs.core.design import Category, Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.form import reset
from sheetfuncs.core.independence import breusch_godfrey
from sheetfuncs.core.influence import outlier_test, row_measures
from sheetfuncs.core.mean import residual_mean
from sheetfuncs.core.normality import jarque_bera, shapiro_wilk
from sheetfuncs.core.threads import blas_libraries, few_threads
from sheetfuncs.core.variance import breusch_pagan
from sheetfuncs.errors import ArgumentError, CollinearPredictorsError, NoVariationError

I = np.arange(12.0)


def fitted(y, *columns, **options):
    return fit_design(build_design(y, [Numeric(f"x{j + 1}", c) for j, c in enumerate(columns)], **options))


def test_equal_residuals_have_no_shape_and_no_spread():
    """Possible without an intercept."""
    fit = fitted(np.ones(12), (-1.0) ** I, intercept=False)
    for result in (shapiro_wilk(fit), jarque_bera(fit)):
        assert result.reason == "All residuals are equal, so that they have no shape."
        assert result.cell_error == "#NUM!"
    assert residual_mean(fit).statistic == 1.0
    assert dict(residual_mean(fit).details) == {}


def test_residuals_of_one_size_leave_breusch_pagan_nothing_to_explain():
    """Their squares differ by rounding only, of which the studentized form would make a p-value."""
    fit = fitted(np.where(I % 4 < 2, 0.1, -0.1) + 0.3 * (I % 2), I % 2)
    for studentize in (True, False):
        result = breusch_pagan(fit, studentize=studentize)
        assert "same size" in result.reason


def test_lags_that_determine_the_residuals_leave_F_no_denominator():
    fit = fitted((-1.0) ** I)
    refusal = breusch_godfrey(fit, distribution="F", before_first="omitted")
    assert "determine the residuals exactly" in refusal.reason
    assert breusch_godfrey(fit, before_first="omitted").statistic == pytest.approx(11.0)


def test_nothing_is_left_when_only_the_first_rows_have_residuals():
    y = np.zeros(8)
    y[2] = 1.0
    result = breusch_godfrey(fitted(y, np.eye(8)[7], intercept=False), 3, before_first="omitted")
    assert result.reason == "Without the first rows the fit is perfect, so that nothing can be tested on it."


def test_an_auxiliary_regression_without_degrees_of_freedom_is_refused():
    """n R2 would be the number of rows, whatever the data: R prints 5 with p = .025 on syn_smalln_a."""
    fit = fitted(np.array([1.0, 3, 2, 5, 4, 6]), I[:6], I[:6] ** 2, I[:6] ** 3)
    assert not breusch_godfrey(fit, 2).applies
    assert breusch_godfrey(fit, 2).cell_error == "#NUM!"
    assert "6 rows are too few for 4 coefficients and 2 lags" in breusch_godfrey(fit, 2).reason
    assert "5 of 6 rows are too few" in breusch_godfrey(fit, 1, before_first="omitted").reason


def test_reset_refuses_what_does_not_vary_and_what_is_there_already():
    flat = fitted(np.array([1.0, 2, 1, 1, 3, 1]), np.array([-1.0, 0, 1, -1, 0, 1]))  # slope 0 up to rounding
    assert "do not vary" in reset(flat).reason
    two_values = fitted(I % 5, I % 2)
    assert "already determined" in reset(two_values).reason
    assert "already determined" in reset(two_values, of="predictors").reason
    parabola = fitted(I**2, I)
    assert "F has no denominator" in reset(parabola, (2,)).reason
    small = fitted(np.array([1.0, 3, 2, 5]), np.array([0.0, 1, 2, 4]))
    assert reset(small).cell_error == "#NUM!"
    assert "too few" in reset(small).reason


def test_powers_that_nearly_fit_keep_the_digits_of_what_they_leave():
    """The rest is 1e-15 of the sum of squares; taking the explained part off the whole would leave no digit of it."""
    y = I**2 + 1e-6 * np.sin(9 * I)
    longer = fitted(y, I, I**2)
    result = reset(fitted(y, I), (2,), of="predictors")
    assert longer.rss < 1e-14 * fitted(y, I).rss
    assert result.statistic == pytest.approx((fitted(y, I).rss - longer.rss) / (longer.rss / longer.df), rel=1e-6)


def test_reset_leaves_categories_out_of_the_powers():
    random = np.random.default_rng(1)
    x, codes = random.normal(size=30), np.arange(30) % 3
    design = build_design(random.normal(size=30), [Numeric("x", x), Category("site", ("a", "b", "c"), codes)])
    assert reset(fit_design(design), of="predictors").df == (2, 30 - 4 - 2)


def test_the_row_that_spoils_a_perfect_fit_is_named():
    y = 2 * I + 1
    y[4] += 5
    fit = fitted(y, I, rows=np.arange(2, 14))
    assert outlier_test(fit).reason.startswith("Without row 6 the other rows fit perfectly")
    assert row_measures(fit).spoils_perfect_fit.tolist() == [i == 4 for i in range(12)]


def test_a_row_far_off_a_quiet_line_keeps_its_digits():
    """The others' standard deviation is 1e-8 of the row's error: the shortcut from rss has no digit of it."""
    y = 2 * I + 1 + 1e-8 * np.sin(9 * I)
    y[4] += 5
    others = I != 4
    result = outlier_test(fitted(y, I))
    without = fitted(y[others], I[others])
    assert result.details["row_of_used"] == 5
    predicted = without.coefficients @ [1.0, 4.0]
    error = without.sigma / np.sqrt(1 - fitted(y, I).leverage[4])
    assert result.statistic == pytest.approx((y[4] - predicted) / error, rel=1e-6)


def test_one_degree_of_freedom_leaves_no_row_to_compare():
    fit = fitted(np.array([1.0, 2, 4]), np.array([0.0, 1, 2]))
    assert "too few rows" in outlier_test(fit).reason
    assert np.isnan(row_measures(fit).externally_studentized).all()


@pytest.mark.parametrize("value", [0.1, 1e9, -7.0])
def test_a_constant_response_is_called_that(value):
    fit = fitted(np.full(12, value), I)
    assert "same value of response" in fit.nothing_left()
    assert np.isnan(fit.r_squared)
    assert fitted(np.zeros(12), I, intercept=False).nothing_left().startswith("Every used row has a zero of response")


@pytest.mark.parametrize("unit", [1e-160, 1e-200, 5e-324])
def test_values_too_small_to_square_are_refused(unit):
    """Squares underflow there: digits go without a word first, then the fit looks perfect."""
    with pytest.raises(NoVariationError, match="too small"):
        fitted((I + np.sin(9 * I)) * unit, I)
    with pytest.raises(NoVariationError, match="x1 are too small"):
        fitted(I + np.sin(9 * I), I * unit)


def test_a_copy_far_from_zero_is_refused():
    """Its roundings, not those of the column that comes out last, are what is left."""
    x = np.sin(9 * I)
    for far in (1e3, 1e6, 1e9):
        with pytest.raises(CollinearPredictorsError) as refusal:
            fitted(np.cos(I), x, x + far)
        assert refusal.value.predictors == ("x1", "x2")


def test_shapiro_wilk_needs_three_rows():
    result = shapiro_wilk(fitted(np.array([1.0, 2]), np.array([1.0, 3]), intercept=False))
    assert (result.applies, result.cell_error) == (False, "#N/A")


@pytest.mark.parametrize("call", [
    lambda fit: breusch_godfrey(fit, 0), lambda fit: breusch_godfrey(fit, 1.5),
    lambda fit: breusch_godfrey(fit, float("nan")), lambda fit: breusch_godfrey(fit, distribution="t"),
    lambda fit: breusch_godfrey(fit, before_first="mean"), lambda fit: reset(fit, ()), lambda fit: reset(fit, (1, 2)),
    lambda fit: reset(fit, (2.5,)), lambda fit: reset(fit, (float("inf"),)), lambda fit: reset(fit, of="residuals"),
])
def test_options_that_are_not_allowed_are_refused_in_a_sentence(call):
    with pytest.raises(ArgumentError, match=r"use .*\.$"):
        call(fitted(np.sin(9 * I), I))


def test_small_work_runs_on_one_thread_and_the_setting_comes_back():
    before = [library.num_threads for library in blas_libraries()]
    assert before
    with few_threads(100):
        assert {library.num_threads for library in blas_libraries()} == {1}
        with few_threads(100):
            pass
        assert {library.num_threads for library in blas_libraries()} == {1}
    assert [library.num_threads for library in blas_libraries()] == before
    with pytest.raises(ZeroDivisionError), few_threads(100):
        raise ZeroDivisionError
    assert [library.num_threads for library in blas_libraries()] == before
    with few_threads(10**9):
        assert [library.num_threads for library in blas_libraries()] == before
