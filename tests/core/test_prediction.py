"""Predictions against statsmodels' own, and far from the origin."""

import numpy as np
import pytest
import statsmodels.api as sm

from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.prediction import predict


@pytest.mark.parametrize("intercept", [True, False])
def test_against_statsmodels_get_prediction(intercept):
    random = np.random.default_rng(4)
    x = random.normal(size=(30, 2)) + 3
    y = 2 + x @ [1.5, -2.0] + random.normal(size=30)
    fit = fit_design(build_design(y, [Numeric("a", x[:, 0]), Numeric("b", x[:, 1])], intercept=intercept))
    at = np.array([[3.0, 3.0], [9.0, -4.0]])
    ours = predict(fit, at, 0.9)
    with_constant = (lambda m: sm.add_constant(m, has_constant="add")) if intercept else (lambda m: m)
    theirs = sm.OLS(y, with_constant(x)).fit().get_prediction(with_constant(at)).summary_frame(alpha=0.1)
    np.testing.assert_allclose(ours.value, theirs["mean"], rtol=1e-11)
    np.testing.assert_allclose(ours.average_low, theirs["mean_ci_lower"], rtol=1e-10)
    np.testing.assert_allclose(ours.new_high, theirs["obs_ci_upper"], rtol=1e-10)
    assert ours.outside.tolist() == [False, True]


def test_a_far_origin_costs_no_digits():
    x = np.arange(20.0)
    y = 3 * x + np.where(np.arange(20) % 2, 0.5, -0.5)
    near = predict(fit_design(build_design(y, [Numeric("x", x)])), np.array([[10.0]]))
    far = predict(fit_design(build_design(y, [Numeric("x", x + 1e9)])), np.array([[1e9 + 10.0]]))
    np.testing.assert_allclose(far.value, near.value, rtol=1e-14)
    np.testing.assert_allclose(far.new_low, near.new_low, rtol=1e-12)


def test_a_fit_without_error_bars_predicts_without_limits():
    fit = fit_design(build_design(np.array([1.0, 2.0]), [Numeric("x", np.array([1.0, 3.0]))]))
    ours = predict(fit, np.array([[2.0]]))
    assert ours.value[0] == pytest.approx(1.5)
    assert np.isnan(ours.new_low).all()
