"""D'Agostino and Pearson's K squared against the reference's script, scipy, and a printed example."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.stats
from hypothesis import given, settings
from reference_cases import ROUNDING_NOISE, as_number

from sheetfuncs.core.normality_tests import _z_kurtosis, _z_skewness, dagostino_k2
from tests.core.normality_cases import COMPARED, FEW, SEEDS, all_alike, assert_invariant, fit_of, reference


@pytest.mark.parametrize("name", COMPARED)
def test_against_dago_in_R(name):
    """`dago` in tests/reference/make_reference.R."""
    fit, r = reference(name, "dagostino_k2")
    result = dagostino_k2(fit)
    if name in ROUNDING_NOISE:
        assert not result.applies
        assert result.reason == fit.nothing_left()
        return
    if "error" in r:
        assert not result.applies
        assert result.reason == "Its transformation of the kurtosis is valid for 8 rows and more; there are 6."
        return
    assert result.statistic == pytest.approx(as_number(r["statistic"]), rel=1e-9)
    assert result.df == r["df"]
    assert result.p == pytest.approx(as_number(r["p"]), rel=1e-7)
    assert np.log(result.p) == pytest.approx(np.log(as_number(r["p"])), rel=1e-7)
    for ours, key in (("z_skewness", "z_skew"), ("z_kurtosis", "z_kurt"), ("skewness", "skew"), ("kurtosis", "kurt")):
        assert result.details[ours] == pytest.approx(r[key], rel=1e-9), key
    assert ("unreliable" in result.note) == (fit.n < 20)


def test_against_DAgostino_Belanger_and_DAgostino_1990():
    """The American Statistician 44:316-321, cholesterol of 62 people: skewness 1.02 and kurtosis 4.58, as printed, give
    z of 3.14 and 2.21 (figures from memory). The last digits of what is printed bound ours."""
    assert _z_skewness(1.015, 62) < 3.145
    assert _z_skewness(1.025, 62) > 3.135
    assert _z_kurtosis(4.575, 62) < 2.215
    assert _z_kurtosis(4.585, 62) > 2.205
    assert _z_skewness(1.025, 62) - _z_skewness(1.015, 62) < 0.03  # so that this says something


@pytest.mark.parametrize("n", [8, 9, 20, 300])
@pytest.mark.parametrize("draw", ["normal", "exponential", "uniform"])
def test_against_scipy_normaltest(n, draw):
    fit = fit_of(getattr(np.random.default_rng(n), draw)(size=n))
    result = dagostino_k2(fit)
    expected = scipy.stats.normaltest(fit.residuals)
    assert result.statistic == pytest.approx(expected.statistic, rel=1e-9)
    assert result.p == pytest.approx(expected.pvalue, rel=1e-7)


def test_a_flat_distribution_has_a_negative_z_of_kurtosis():
    """Two far groups: kurtosis 1, where the published cube root has passed infinity and turned positive."""
    two_groups = np.repeat([-1.0, 1.0], 100) + np.linspace(0, 1e-3, 200)
    result = dagostino_k2(fit_of(two_groups))
    assert result.details["kurtosis"] == pytest.approx(1.0, abs=1e-5)
    assert result.details["z_kurtosis"] < -5
    assert result.statistic == pytest.approx(scipy.stats.normaltest(two_groups).statistic, rel=1e-9)


def test_no_infinity_at_the_pole_of_the_cube_root():
    low, high = 1.0, 2.5
    for _ in range(8):  # closes in on the pole, a thousandth of the way each time
        around = np.linspace(low, high, 1001)
        values = np.array([_z_kurtosis(float(kurtosis), 50) for kurtosis in around])
        assert np.isfinite(values).all()
        low, high = around[max(values.argmin() - 1, 0)], around[values.argmin() + 1]
    assert values.min() < -1000


def test_refusals():
    equal = dagostino_k2(all_alike())
    assert (equal.applies, equal.cell_error) == (False, "#NUM!")
    assert "equal" in equal.reason
    few = dagostino_k2(fit_of(np.array([1.0, 2, 4, 7, 1, 3, 9])))
    assert (few.applies, few.cell_error) == (False, "#NUM!")
    assert dagostino_k2(fit_of(np.array([1.0, 2, 4, 7, 1, 3, 9, 4]))).applies


@settings(max_examples=25, deadline=None)
@given(SEEDS, FEW)
def test_invariant_under_units_zeros_and_order(seed, n):
    assert_invariant(dagostino_k2, seed, n)
