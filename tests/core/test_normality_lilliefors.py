"""Lilliefors against R's nortest::lillie.test (statistic), statsmodels' simulated table, and two p formulas."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from reference_cases import ROUNDING_NOISE, as_number
from statsmodels.stats._lilliefors_critical_values import PERCENTILES, critical_values
from statsmodels.stats.diagnostic import kstest_normal

from sheetfuncs.core.normality_tests import lilliefors
from sheetfuncs.core.simulated_tables import LOWEST_P, simulated_table
from tests.core.normality_cases import COMPARED, FEW, SEEDS, all_alike, assert_invariant, fit_of, reference
from tests.tables.make_normality_tables import LEVELS


def dallal_wilkinson(d: float, n: int) -> float:
    """Dallal and Wilkinson 1986, The American Statistician 40:294-296: made for p <= 0.1; above 100 rows, as
    nortest::lillie.test, by D (n/100)^0.49 at 100."""
    if n > 100:
        d, n = d * (n / 100) ** 0.49, 100
    shifted = n + 2.78019
    return math.exp(
        -7.01256 * d**2 * shifted + 2.99587 * d * math.sqrt(shifted) - 0.122119 + 0.974598 / math.sqrt(n) + 1.67997 / n
    )


def stephens(d: float, n: int) -> float:
    """The polynomials that nortest::lillie.test uses for p > 0.1, in Stephens' modified D."""
    k = d * (math.sqrt(n) - 0.01 + 0.85 / math.sqrt(n))
    if k <= 0.302:
        return 1.0
    if k <= 0.5:
        return 2.76773 - 19.828315 * k + 80.709644 * k**2 - 138.55152 * k**3 + 81.218052 * k**4
    if k <= 0.9:
        return -4.901232 + 40.662806 * k - 97.490286 * k**2 + 94.029866 * k**3 - 32.355711 * k**4
    return 6.198765 - 19.558097 * k + 23.186922 * k**2 - 12.234627 * k**3 + 2.423045 * k**4


def as_in_nortest(d: float, n: int) -> float:
    p = dallal_wilkinson(d, n)
    return p if p <= 0.1 else stephens(d, n)


# How far the formulas stray from the simulated distribution for 6 to 200 rows and p from 0.01 to 0.95, relative to p
# (p <= 0.1, p > 0.1). test_what_the_formulas_are_worth measures it.
FORMULA_ERROR = {True: 0.06, False: 0.065}


@pytest.mark.parametrize("name", COMPARED)
def test_against_R_nortest_lillie_test(name):
    """The same statistic. R's p is that of the formulas: ours is as near to it as they are to the distribution."""
    fit, r = reference(name, "lilliefors")
    result = lilliefors(fit)
    if name in ROUNDING_NOISE:
        assert not result.applies
        assert result.reason == fit.nothing_left()
        return
    assert result.statistic == pytest.approx(as_number(r["statistic"]), rel=1e-9)
    formula = as_in_nortest(result.statistic, fit.n)
    assert formula == pytest.approx(as_number(r["p"]), rel=1e-7)
    if formula < LOWEST_P:
        assert result.p == LOWEST_P
        assert result.note.endswith("p < 1e-4, where the table ends.")
    else:
        assert result.p == pytest.approx(formula, rel=FORMULA_ERROR[formula <= 0.1])


@pytest.mark.parametrize("n", [6, 8, 10, 15, 20, 30, 50, 100, 200])
def test_what_the_formulas_are_worth(n):
    table, scale = simulated_table("lilliefors"), math.sqrt(n) - 0.01 + 0.85 / math.sqrt(n)
    for value in np.linspace(0.42, 1.05, 127):
        p, formula = table.p(float(value), n)[0], as_in_nortest(value / scale, n)
        if 0.01 <= p <= 0.95:
            assert formula == pytest.approx(p, rel=FORMULA_ERROR[formula <= 0.1]), value


def test_the_formula_of_Dallal_and_Wilkinson_does_not_know_how_far_five_rows_can_go():
    """At 5 rows D has an end; near it the formula's p is about twice the simulated one."""
    value = simulated_table("lilliefors")._quantiles(5)[0][np.argmin(np.abs(np.array(LEVELS)[::-1] - 0.001))]
    scale = math.sqrt(5) - 0.01 + 0.85 / math.sqrt(5)
    assert 0.0015 < dallal_wilkinson(value / scale, 5) < 0.0025


@pytest.mark.parametrize("n", [5, 6, 9, 13, 20, 30, 50, 100, 200, 400, 1600])
def test_against_critical_values_that_statsmodels_simulated(n):
    """Its table rests on ten million samples a row: shares beyond agree within five standard errors of both."""
    critical = critical_values["normal"][n]
    table, scale = simulated_table("lilliefors"), math.sqrt(n) - 0.01 + 0.85 / math.sqrt(n)
    for percentile, d in zip(PERCENTILES, critical, strict=True):
        if percentile == 1:
            continue  # ours has few levels there
        expected = 1 - percentile / 100
        p, error = table.p(float(d) * scale, n)
        assert abs(p - expected) < 5 * math.hypot(error, math.sqrt(expected * (1 - expected) / 1e7)), percentile


@pytest.mark.parametrize("n", [5, 60, 61, 4000])
def test_statistic_against_statsmodels_kstest_normal(n):
    """Its p is not compared: it runs straight between few levels and strays by 40 % between them."""
    fit = fit_of(np.random.default_rng(n).standard_t(4, size=n))
    assert lilliefors(fit).statistic == pytest.approx(kstest_normal(fit.residuals)[0], rel=1e-9)


def test_ties_count_as_steps():
    """Two values, four times each: the step at each of them is one half, at +-sqrt(7/8) standard deviations."""
    result = lilliefors(fit_of(np.repeat([0.0, 1.0], 4)))
    at = 0.5 * math.erfc(math.sqrt(7 / 8) / math.sqrt(2))
    assert result.statistic == pytest.approx(0.5 - at, rel=1e-14)


def test_refusals():
    equal = lilliefors(all_alike())
    assert (equal.applies, equal.cell_error) == (False, "#NUM!")
    assert "equal" in equal.reason
    few = lilliefors(fit_of(np.array([1.0, 2, 4, 7])))
    assert (few.applies, few.cell_error) == (False, "#NUM!")
    assert few.reason == "Its table holds for 5 rows and more; there are 4."
    assert lilliefors(fit_of(np.array([1.0, 2, 4, 7, 1]))).applies


@settings(max_examples=25, deadline=None)
@given(SEEDS, FEW)
def test_invariant_under_units_zeros_and_order(seed, n):
    assert_invariant(lilliefors, seed, n)
