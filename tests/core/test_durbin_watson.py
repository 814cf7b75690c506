"""The exact Durbin-Watson test where the reference cases do not reach: many rows, extreme values, lagged responses."""

from __future__ import annotations

import numpy as np
import pytest

from sheetfuncs.core import quadratic_forms
from sheetfuncs.core.basis import factorize
from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.independence import durbin_watson_test, durbin_watson_tests, lagged_response
from sheetfuncs.core.quadratic_forms import durbin_watson_tails


def basis_of(n, k, seed=1, intercept=True):
    columns = np.random.default_rng(seed).normal(size=(n, k))
    return factorize(columns, [f"x{j}" for j in range(k)], intercept=intercept)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("d", [0.5, 1.2, 1.9, 2.3, 3.4])
@pytest.mark.parametrize("n", [161, 300])
def test_both_routes_give_the_same(n, d, intercept, monkeypatch):
    basis = basis_of(n, 3, intercept=intercept)
    by_determinants = durbin_watson_tails(basis, d)
    monkeypatch.setattr(quadratic_forms, "EIGENVALUES_UP_TO", n)
    by_eigenvalues = durbin_watson_tails(basis, d)
    assert by_determinants.lower == pytest.approx(by_eigenvalues.lower, rel=1e-11)
    assert by_determinants.upper == pytest.approx(by_eigenvalues.upper, rel=1e-11)


@pytest.mark.parametrize("n", [20, 500])
def test_outside_the_possible_range_one_tail_is_empty(n):
    basis = basis_of(n, 2)
    for d, lower in ((0.0, 0.0), (4.0, 1.0)):
        tails = durbin_watson_tails(basis, d)
        assert (tails.lower, tails.upper) == (lower, 1.0 - lower)


def test_against_simulation_at_a_thousand_rows():
    """200 simulated responses: their p-values are uniform (largest gap below the 0.1 % point of Kolmogorov)."""
    random = np.random.default_rng(5)
    basis = basis_of(1000, 2)
    residuals = basis.project_out(random.normal(size=(1000, 200)))
    d = np.sum(np.diff(residuals, axis=0) ** 2, axis=0) / np.sum(residuals**2, axis=0)
    p = np.sort([durbin_watson_tails(basis, value).lower for value in d])
    gap = np.abs(p - (np.arange(200) + 0.5) / 200).max() + 0.5 / 200
    assert gap < 1.95 / np.sqrt(200)


def test_a_row_order_sorts_the_rows_first():
    random = np.random.default_rng(2)
    x, y = random.normal(size=30), random.normal(size=30).cumsum()
    order = random.permutation(30)
    back = np.argsort(order)
    sorted_fit = fit_design(build_design(y, [Numeric("x", x)]))
    mixed = fit_design(build_design(y[back], [Numeric("x", x[back])], order=back.astype(float)))
    assert durbin_watson_test(mixed).p == pytest.approx(durbin_watson_test(sorted_fit).p, rel=1e-10)


def test_the_response_of_the_row_before_among_the_predictors():
    y = np.random.default_rng(3).normal(size=40).cumsum()
    fit = fit_design(build_design(y[1:], [Numeric("last week", y[:-1])]))
    assert lagged_response(fit) == "last week"
    for result in durbin_watson_tests(fit):
        assert not result.applies
        assert result.reason.startswith("last week is the response of the row before")
        assert result.cell_error == "#N/A"


def test_one_degree_of_freedom_leaves_nothing_to_test():
    fit = fit_design(build_design(np.array([1.0, 2.0, 4.0]), [Numeric("x", np.array([1.0, 2.0, 3.0]))]))
    for result in durbin_watson_tests(fit):
        assert not result.applies
        assert "one degree of freedom" in result.reason
