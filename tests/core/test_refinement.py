"""Refinement in extended precision: right to the last digit where it is called for, and not called for otherwise."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_cases import NAMES, ROUNDING_NOISE, load_case

from sheetfuncs.core import fit as fit_module
from sheetfuncs.core.basis import factorize
from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.refinement import RefinedBasis, ill_conditioned, refined_basis


def fitted(y, x, *, intercept=True):
    return fit_design(build_design(y, [Numeric(f"x{j}", column) for j, column in enumerate(x.T)], intercept=intercept))


def solved(matrix, right):
    """Gauss-Jordan elimination in rational numbers: matrix x = right, right (p, m)."""
    rows = [[*a, *b] for a, b in zip(matrix, right, strict=True)]
    for i in range(len(rows)):
        pivot = next(j for j in range(i, len(rows)) if rows[j][i])
        rows[i], rows[pivot] = rows[pivot], rows[i]
        rows[i] = [value / rows[i][i] for value in rows[i]]
        for j in range(len(rows)):
            if j != i and rows[j][i]:
                rows[j] = [a - rows[j][i] * b for a, b in zip(rows[j], rows[i], strict=True)]
    return [row[len(rows):] for row in rows]


def without_rounding(y, x, intercept):
    """Coefficients, standard errors, residuals and leverages from the normal equations in rational numbers."""
    columns = [[Fraction(v) for v in column] for column in x.T.tolist()]
    if intercept:
        columns.insert(0, [Fraction(1)] * len(y))
    response, p = [Fraction(v) for v in y.tolist()], len(columns)
    cross = [[sum(a * b for a, b in zip(one, two, strict=True)) for two in columns] for one in columns]
    inverse = solved(cross, [[Fraction(int(i == j)) for j in range(p)] for i in range(p)])
    moments = [sum(a * b for a, b in zip(column, response, strict=True)) for column in columns]
    b = [sum(inverse[i][j] * moments[j] for j in range(p)) for i in range(p)]
    e = [value - sum(b[j] * columns[j][i] for j in range(p)) for i, value in enumerate(response)]
    variance = sum(v * v for v in e) / (len(y) - p)
    leverage = [
        sum(columns[j][i] * inverse[j][k] * columns[k][i] for j in range(p) for k in range(p)) for i in range(len(y))
    ]
    as_doubles = [np.array([float(v) for v in values]) for values in (b, e, leverage)]
    errors = np.sqrt([float(inverse[j][j] * variance) for j in range(p)])
    return as_doubles[0], errors, as_doubles[1], as_doubles[2]


@settings(max_examples=25)
@given(
    seed=st.integers(0, 2**32 - 1), gap=st.sampled_from([1e-3, 1e-6, 1e-9, 1e-11]),
    unit=st.sampled_from([1.0, 1e-30, 1e60]), intercept=st.booleans(),
)
def test_near_collinear_columns_against_rational_arithmetic(seed, gap, unit, intercept):
    """x2 = x1 + gap * noise: variance inflation up to 1e23, and every figure still right to the last digits."""
    random = np.random.default_rng(seed)
    x1 = random.normal(10, 3, size=11)
    x = np.column_stack([(x1 + gap * random.normal(size=11)) * unit, x1, random.normal(size=11)])
    y = 1 + 2 * x1 - x[:, 2] + random.normal(size=11)
    fit = fitted(y, x, intercept=intercept)
    coefficients, errors, residuals, leverage = without_rounding(y, x, intercept)
    assert isinstance(fit.basis, RefinedBasis)
    np.testing.assert_allclose(fit.coefficients, coefficients, rtol=4e-16)
    np.testing.assert_allclose(fit.standard_errors, errors, rtol=4e-15)
    np.testing.assert_allclose(fit.residuals, residuals, rtol=4e-16, atol=1e-25 * fit.sigma)
    np.testing.assert_allclose(fit.leverage, leverage, atol=4e-15)


@pytest.mark.parametrize("offset", [1e3, 1e6, 1e9])
def test_near_collinear_columns_far_from_zero(offset):
    random = np.random.default_rng(3)
    x1 = np.round(random.normal(10, 3, size=12), 3) + offset
    x = np.column_stack([x1, x1 + 1e-3 * random.normal(size=12)])
    y = 1 + 2 * (x1 - offset) + random.normal(size=12)
    fit = fitted(y, x)
    coefficients, errors, residuals, _ = without_rounding(y, x, True)
    np.testing.assert_allclose(fit.coefficients, coefficients, rtol=4e-16)
    np.testing.assert_allclose(fit.standard_errors, errors, rtol=4e-15)
    np.testing.assert_allclose(fit.residuals, residuals, rtol=4e-16, atol=1e-22 * fit.sigma)


def test_an_intercept_that_cancels_and_small_residuals():
    """Well-conditioned columns, but the intercept is 1e-7 of the mean, or the residuals are 1e-9 of the response."""
    random = np.random.default_rng(4)
    x = random.normal(1e4, 100.0, size=(15, 2))
    for noise in (1e-3, 1e-7):
        y = 1e-3 + x @ [1.0, 2.0] + noise * random.normal(size=15)
        fit = fitted(y, x)
        coefficients, errors, residuals, _ = without_rounding(y, x, True)
        assert not isinstance(fit.basis, RefinedBasis)
        np.testing.assert_allclose(fit.coefficients, coefficients, rtol=4e-16)
        np.testing.assert_allclose(fit.standard_errors, errors, rtol=4e-15)
        np.testing.assert_allclose(fit.residuals, residuals, rtol=4e-16)


def test_many_rows_in_blocks_and_columns_permuted():
    """More rows than one block holds; the decomposition is orthonormal, and gives the columns back."""
    random = np.random.default_rng(5)
    x = random.normal(size=(20_001, 3))
    x[:, 0] = x[:, 1] + 1e-7 * random.normal(size=20_001) + 50.0
    y = x @ [1.0, 2.0, 3.0] + random.normal(size=20_001)
    fit, other = fitted(y, x), fitted(y, x[:, [2, 0, 1]])
    q, basis = fit.basis.q, fit.basis
    assert np.abs(q.T @ q - np.eye(3)).max() < 1e-14
    assert np.abs(q.mean(axis=0)).max() < 1e-17
    centred = (x - basis.centre)[:, basis.pivot] / basis.scale[basis.pivot]
    np.testing.assert_allclose(q @ basis.r, centred, atol=1e-15)
    np.testing.assert_allclose(basis.r_inverse[basis.pivot] @ basis.r, np.eye(3), atol=1e-8)
    np.testing.assert_allclose(fit.coefficients[[0, 3, 1, 2]], other.coefficients, rtol=4e-16)
    np.testing.assert_allclose(fit.standard_errors[[0, 3, 1, 2]], other.standard_errors, rtol=4e-15)
    assert np.abs(fit.residuals.mean()) < 1e-17


@pytest.mark.parametrize("offset", [0.0, 100.0])
def test_refining_well_conditioned_columns_changes_nothing(offset):
    random = np.random.default_rng(6)
    x = random.normal(offset, 1.0, size=(40, 3))
    basis = factorize(x, ["a", "b", "c"], intercept=True)
    refined = refined_basis(basis, x)
    np.testing.assert_allclose(refined.q, basis.q, atol=1e-13)
    np.testing.assert_allclose(refined.r, basis.r, atol=1e-13)
    np.testing.assert_allclose(refined.r_inverse, basis.r_inverse, atol=1e-13)
    np.testing.assert_allclose(refined.coefficient_root, basis.coefficient_root, rtol=1e-12, atol=1e-14)


@pytest.mark.parametrize("name", [n for n in NAMES if n not in (*ROUNDING_NOISE, "syn_constcol_a")])
def test_ordinary_cases_are_not_refined(name, monkeypatch):
    called = []
    refine = fit_module.refined_solution
    monkeypatch.setattr(fit_module, "refined_solution", lambda *given: called.append(1) or refine(*given))
    fit = fit_design(load_case(name).design())
    assert bool(called) == isinstance(fit.basis, RefinedBasis) == (name in ("longley", "syn_nearcol_a"))


def test_standardized_columns_and_many_rows_are_not_refined(monkeypatch):
    """A response and predictors of mean zero make the intercept a rounding: that calls for nothing."""
    monkeypatch.setattr(fit_module, "refined_solution", lambda *given: pytest.fail("refined"))
    random = np.random.default_rng(7)
    x = random.normal(size=(100_000, 4))
    y = x @ [1.0, 0.5, 0.0, 0.0] + random.normal(size=100_000)
    x = (x - x.mean(axis=0)) / x.std(axis=0)
    assert not ill_conditioned(fitted((y - y.mean()) / y.std(), x).basis)


def test_a_zero_coefficient_settles():
    """Exact zeros among coefficients and residuals have no digits to wait for."""
    x = np.arange(1.0, 21.0)
    fit = fitted(3.0 * x**3, np.column_stack([x, x**2, x**3, x**4]))
    assert isinstance(fit.basis, RefinedBasis)
    assert fit.perfect
    assert np.abs(fit.coefficients - [0, 0, 0, 3, 0]).max() <= 1e-13 * fit.design.response.std()
    assert fit.coefficients[3] == 3.0
    assert np.abs(fit.coefficients[[1, 2, 4]]).max() < 1e-20
