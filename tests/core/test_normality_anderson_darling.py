"""Anderson-Darling against R's nortest::ad.test, mpmath, statsmodels, and printed critical points."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from reference_cases import ROUNDING_NOISE, as_number
from statsmodels.stats.diagnostic import normal_ad

from sheetfuncs.core.normality_tests import ANDERSON_DARLING_LOWEST, _anderson_darling_p, anderson_darling
from tests.core.normality_cases import COMPARED, FEW, SEEDS, all_alike, assert_invariant, fit_of, reference


@pytest.mark.parametrize("name", COMPARED)
def test_against_R_nortest_ad_test(name):
    fit, r = reference(name, "anderson_darling")
    result = anderson_darling(fit)
    if name in ROUNDING_NOISE:
        assert not result.applies
        assert result.reason == fit.nothing_left()
    elif "error" in r:
        assert not result.applies
        assert result.reason == "Its p-value is established for 8 rows and more; there are 6."
    else:
        assert result.statistic == pytest.approx(as_number(r["statistic"]), rel=1e-9)
        assert result.p == pytest.approx(as_number(r["p"]), rel=1e-7)
        assert math.log(result.p) == pytest.approx(math.log(as_number(r["p"])), rel=1e-7)


@pytest.mark.parametrize(("a", "p"), [(0.470, 0.25), (0.561, 0.15), (0.631, 0.10), (0.752, 0.05), (0.873, 0.025),
                                      (1.035, 0.01), (1.159, 0.005)])
def test_p_against_critical_points_of_DAgostino_and_Stephens_1986(a, p):
    """Goodness-of-Fit Techniques, table 4.7, case 3 (values from memory): the formula keeps to them within 2.5 %."""
    assert _anderson_darling_p(a) == pytest.approx(p, rel=0.025)


@pytest.mark.parametrize("n", [8, 9, 40, 1001])
def test_against_statsmodels_normal_ad(n):
    fit = fit_of(np.random.default_rng(n).gumbel(size=n))
    result = anderson_darling(fit)
    statistic, p = normal_ad(fit.residuals)
    assert result.statistic == pytest.approx(statistic, rel=1e-9)
    assert result.p == pytest.approx(p, rel=1e-7)


@pytest.mark.parametrize("outlier", [6.0, 1e9])
def test_against_mpmath_with_a_value_44_standard_deviations_out(outlier):
    """2,000 rows, one of them far off: F there is below the smallest double, its logarithm is not."""
    y = np.random.default_rng(5).normal(size=2000)
    y[17] = outlier
    fit = fit_of(y)
    with mpmath.workdps(40):
        e = [mpmath.mpf(float(value)) for value in np.sort(fit.residuals)]
        mean = mpmath.fsum(e) / 2000
        sd = mpmath.sqrt(mpmath.fsum((value - mean) ** 2 for value in e) / 1999)
        z = [(value - mean) / sd for value in e]
        logs = [mpmath.log(mpmath.erfc(value / mpmath.sqrt(2)) / 2) for value in z]
        below = [mpmath.log(mpmath.erfc(-value / mpmath.sqrt(2)) / 2) for value in z]
        exact = -2000 - mpmath.fsum((2 * i + 1) * (below[i] + logs[1999 - i]) for i in range(2000)) / 2000
    assert anderson_darling(fit).statistic == pytest.approx(float(exact), rel=1e-9)


def test_p_where_its_formula_ends():
    fit = fit_of(np.exp(np.random.default_rng(2).normal(size=400)))
    result = anderson_darling(fit)
    assert result.details["corrected"] > 10
    assert result.p == ANDERSON_DARLING_LOWEST
    assert "or less" in result.note


@pytest.mark.parametrize("join", [0.2, 0.34, 0.6, 10.0])
def test_the_published_formula_jumps_by_less_than_3_percent_where_its_parts_join(join):
    """At 0.6 its p rises from 0.1169 to 0.1194."""
    before, after = _anderson_darling_p(join - 1e-9), _anderson_darling_p(join)
    assert after == pytest.approx(before, rel=0.03)


def test_refusals():
    equal = anderson_darling(all_alike())
    assert (equal.applies, equal.cell_error) == (False, "#NUM!")
    assert "equal" in equal.reason
    few = anderson_darling(fit_of(np.array([1.0, 2, 4, 7, 1, 3, 9])))
    assert (few.applies, few.cell_error) == (False, "#NUM!")
    assert anderson_darling(fit_of(np.array([1.0, 2, 4, 7, 1, 3, 9, 4]))).applies


@settings(max_examples=25, deadline=None)
@given(SEEDS, FEW)
def test_invariant_under_units_zeros_and_order(seed, n):
    assert_invariant(anderson_darling, seed, n)
