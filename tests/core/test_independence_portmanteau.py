"""Ljung-Box and Box-Pierce against R (stats::Box.test) and statsmodels; autocorrelations and their bands."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_checks import FITTED, NOISE, fit_of, fitted, made_fit, r_results, same

from sheetfuncs.core.portmanteau import (
    autocorrelation_table,
    box_pierce,
    default_lags,
    ljung_box,
    portmanteau_tests,
)
from sheetfuncs.errors import ArgumentError, NoVariationError

TESTS = {"ljung_box": ljung_box, "box_pierce": box_pierce}


@pytest.mark.parametrize("name", FITTED)
@pytest.mark.parametrize("method", TESTS)
def test_against_R(name, method):
    fit = fitted(name)
    results = r_results(name, method)
    assert results
    for expected in results:
        ours = TESTS[method](fit, expected["args"]["lag"])
        assert ours.args == expected["args"]
        same(ours, expected)


@pytest.mark.parametrize("name", NOISE)
def test_nothing_is_tested_on_rounding_noise(name):
    fit = fitted(name)
    for result in (ljung_box(fit, 1), box_pierce(fit, 1)):
        assert result.reason == fit.nothing_left()
    with pytest.raises(NoVariationError):
        autocorrelation_table(fit, 1)


@pytest.mark.parametrize("n", [30, 700])
@pytest.mark.parametrize("intercept", [True, False])
def test_against_statsmodels_with_few_and_with_many_lags(n, intercept):
    """statsmodels acorr_ljungbox and acf."""
    from statsmodels.stats.diagnostic import acorr_ljungbox
    from statsmodels.tsa.stattools import acf

    fit = made_fit(n, 2, intercept=intercept, shift=0.5)
    for lags in (1, 5, 24, 25, n - 1):
        theirs = acorr_ljungbox(fit.residuals, lags=[lags], boxpierce=True).iloc[0]
        ours, pierce = ljung_box(fit, lags), box_pierce(fit, lags)
        assert (ours.statistic, ours.p) == pytest.approx((theirs["lb_stat"], theirs["lb_pvalue"]), rel=1e-9)
        assert (pierce.statistic, pierce.p) == pytest.approx((theirs["bp_stat"], theirs["bp_pvalue"]), rel=1e-9)
        table = autocorrelation_table(fit, lags)
        r = acf(fit.residuals, nlags=lags, fft=False)[1:]
        np.testing.assert_allclose(table.r, r, rtol=1e-9, atol=1e-14)
        variance = [(1 + 2 * np.sum(r[:k] ** 2)) / n for k in range(lags)]  # Bartlett 1946, cut at the lag before
        np.testing.assert_allclose(table.bartlett_band, 1.959963984540054 * np.sqrt(variance), rtol=1e-9)
        assert table.band == pytest.approx(1.959963984540054 / np.sqrt(n), rel=1e-14)
        assert table.lags.tolist() == list(range(1, lags + 1))


@settings(max_examples=40, deadline=None)
@given(st.integers(0, 500), st.integers(8, 80), st.sampled_from([1e-9, 1.0, 1e8]), st.floats(-1e3, 1e3))
def test_units_and_offsets_of_the_response_do_not_matter(seed, n, unit, offset):
    plain = made_fit(n, 2, seed=seed)
    other = fit_of((plain.design.response + offset) * unit, plain.design.columns)
    np.testing.assert_allclose(
        autocorrelation_table(other, 5).r, autocorrelation_table(plain, 5).r, rtol=1e-8, atol=1e-9
    )


@pytest.mark.parametrize("intercept", [True, False])
def test_all_at_once_are_the_same(intercept):
    fit, lags = made_fit(40, 2, intercept=intercept), (10, 1, 30, 4, 40)
    together = portmanteau_tests(fit, lags)
    alone = (*(ljung_box(fit, lag) for lag in lags), *(box_pierce(fit, lag) for lag in lags))
    for ours, expected in zip(together, alone, strict=True):
        assert (ours.method, ours.args, ours.reason) == (expected.method, expected.args, expected.reason)
        if expected.applies:
            assert (ours.statistic, ours.p) == pytest.approx((expected.statistic, expected.p), rel=1e-10)
    perfect = fitted(NOISE[0])
    assert {one.reason for one in portmanteau_tests(perfect, (1, 2))} == {perfect.nothing_left()}
    assert portmanteau_tests(fit, ()) == ()


def test_time_order_is_that_of_sorted_rows():
    time = np.random.default_rng(1).permutation(50).astype(float)
    by_time = made_fit(50, 2, order=time)
    rank = np.argsort(time)
    in_rows = fit_of(by_time.design.response[rank], by_time.design.columns[rank])
    assert ljung_box(by_time, 4).statistic == pytest.approx(ljung_box(in_rows, 4).statistic, rel=1e-9)
    assert ljung_box(by_time, 4).statistic != pytest.approx(ljung_box(made_fit(50, 2), 4).statistic, rel=1e-3)


def test_a_series_worked_by_hand():
    """Residuals 1, 2, -1, -2 about their mean: r1 = (2 - 2 + 2)/10, r2 = (-1 - 4)/10."""
    fit = fit_of(np.array([1.0, 2.0, -1.0, -2.0]) + 7, np.empty((4, 0)))
    table = autocorrelation_table(fit, 2)
    np.testing.assert_allclose(table.r, [0.2, -0.5], rtol=1e-14)
    assert ljung_box(fit, 2).statistic == pytest.approx(4 * 6 * (0.04 / 3 + 0.25 / 2), rel=1e-13)
    assert box_pierce(fit, 2).statistic == pytest.approx(4 * 0.29, rel=1e-13)
    np.testing.assert_allclose(table.bartlett_band, [table.band, table.band * np.sqrt(1.08)], rtol=1e-13)


def test_refusals_say_why():
    fit = made_fit(12, 2)
    for lags in (12, 500):
        assert f"12 rows are too few for {lags} lags" in ljung_box(fit, lags).reason
        assert box_pierce(fit, lags).cell_error == "#NUM!"
        with pytest.raises(NoVariationError, match="too few"):
            autocorrelation_table(fit, lags)
    alike = fit_of(np.full(6, 2.0) + np.array([1.0, -1.0] * 3), np.array([[1.0, -1.0] * 3]).T, intercept=False)
    assert "alike" in ljung_box(alike, 2).reason
    with pytest.raises(NoVariationError, match="alike"):
        autocorrelation_table(alike, 2)
    for wrong in (0, -1, 1.5, float("inf")):
        with pytest.raises(ArgumentError):
            ljung_box(fit, wrong)


def test_default_lags_are_a_fifth_of_the_rows():
    assert [default_lags(n) for n in (3, 5, 9, 10, 49, 50, 1_000)] == [1, 1, 1, 2, 9, 10, 10]
