"""Jarque-Bera with a p for small samples: R's tseries::jarque.bera.test for the statistic, simulations for p."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.stats
from hypothesis import given, settings
from reference_cases import ROUNDING_NOISE, as_number

from sheetfuncs.core.normality import jarque_bera
from sheetfuncs.core.normality_tests import jarque_bera_small_sample
from sheetfuncs.core.simulated_tables import LOWEST_P, simulated_table
from tests.core.normality_cases import COMPARED, FEW, SEEDS, all_alike, assert_invariant, fit_of, reference


@pytest.mark.parametrize("name", COMPARED)
def test_statistic_against_R_tseries_jarque_bera_test(name):
    fit, r = reference(name, "jarque_bera")
    result = jarque_bera_small_sample(fit)
    if name in ROUNDING_NOISE:
        assert not result.applies
        assert result.reason == fit.nothing_left()
        return
    assert result.statistic == pytest.approx(as_number(r["statistic"]), rel=1e-9)
    asymptotic = jarque_bera(fit)
    assert result.statistic == asymptotic.statistic
    assert (dict(asymptotic.args), dict(result.args)) == ({}, {"distribution": "small-sample table"})
    assert result.variant != asymptotic.variant


@pytest.mark.parametrize("n", [7, 23, 70])
def test_p_against_a_simulation_by_another_generator(n):
    """200,000 samples in double precision by PCG64; the table rests on single precision and SFC64. Five standard
    errors of both."""
    random = np.random.default_rng(n)
    values = np.concatenate([_statistics(random.normal(size=(10_000, n))) for _ in range(20)])
    table = simulated_table("jarque_bera")
    for p in (0.5, 0.1, 0.05, 0.01, 0.001):
        ours, error = table.p(float(np.quantile(values, 1 - p)), n)
        assert abs(ours - p) < 5 * np.hypot(error, np.sqrt(p * (1 - p) / 200_000)), p


def _statistics(draws: np.ndarray) -> np.ndarray:
    """scipy's statistic of each row of draws (samples, n)."""
    return scipy.stats.jarque_bera(draws, axis=1).statistic


def test_chi_square_rejects_too_rarely_at_5_percent_and_too_often_far_out():
    """20 rows: the 5 % point is below chi-square's 5.99, the 1 % point above its 9.21 (Deb and Sefton 1996, Economics
    Letters 51:123-130, find the same)."""
    table = simulated_table("jarque_bera")
    assert table.p(5.99, 20)[0] < 0.03
    assert table.p(9.21, 20)[0] > 0.0105


def test_many_rows_come_to_the_asymptotic_p():
    result, asymptotic = (
        test(fit_of(np.random.default_rng(8).normal(size=300_000))) for test in (jarque_bera_small_sample, jarque_bera)
    )
    assert result.p == pytest.approx(asymptotic.p, rel=0.01)


def test_below_the_table():
    result = jarque_bera_small_sample(fit_of(np.r_[np.random.default_rng(3).normal(size=30), 40.0]))
    assert result.p == LOWEST_P
    assert result.note.endswith("p < 1e-4, where the table ends.")


def test_refusals():
    equal = jarque_bera_small_sample(all_alike())
    assert (equal.applies, equal.cell_error) == (False, "#NUM!")
    few = jarque_bera_small_sample(fit_of(np.array([1.0, 2, 4, 7])))
    assert (few.applies, few.cell_error) == (False, "#NUM!")
    assert few.reason == "Its table holds for 5 rows and more; there are 4."
    assert jarque_bera_small_sample(fit_of(np.array([1.0, 2, 4, 7, 1]))).applies


@settings(max_examples=25, deadline=None)
@given(SEEDS, FEW)
def test_invariant_under_units_zeros_and_order(seed, n):
    assert_invariant(jarque_bera_small_sample, seed, n)
