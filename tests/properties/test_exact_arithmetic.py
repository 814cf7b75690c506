"""Ill-conditioned designs against rational arithmetic, which has no rounding: offsets, near-collinear columns."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from properties_designs import SEEDS, fitted

from sheetfuncs.core.collinearity import variance_inflation


def solve(matrix: list[list[Fraction]], right: list[list[Fraction]]) -> list[list[Fraction]]:
    """Gauss-Jordan elimination of matrix x = right."""
    size = len(matrix)
    rows = [[*matrix[i], *right[i]] for i in range(size)]
    for i in range(size):
        pivot = next(j for j in range(i, size) if rows[j][i])
        rows[i], rows[pivot] = rows[pivot], rows[i]
        rows[i] = [value / rows[i][i] for value in rows[i]]
        for j in range(size):
            if j != i and rows[j][i]:
                rows[j] = [a - rows[j][i] * b for a, b in zip(rows[j], rows[i], strict=True)]
    return [row[size:] for row in rows]


def exact_fit(y: np.ndarray, x: np.ndarray) -> dict[str, np.ndarray]:
    """Least squares with an intercept by the normal equations, without any rounding up to the last conversion."""
    columns = [[Fraction(1)] * len(y), *[[Fraction(v) for v in column] for column in x.T]]
    response = [Fraction(v) for v in y]
    p = len(columns)
    cross = [[sum(a * b for a, b in zip(one, two, strict=True)) for two in columns] for one in columns]
    identity = [[Fraction(int(i == j)) for j in range(p)] for i in range(p)]
    inverse = solve(cross, identity)
    moments = [sum(a * b for a, b in zip(column, response, strict=True)) for column in columns]
    b = [sum(inverse[i][j] * moments[j] for j in range(p)) for i in range(p)]
    residuals = [
        value - sum(b[j] * columns[j][i] for j in range(p)) for i, value in enumerate(response)
    ]
    rss = sum(e * e for e in residuals)
    centred = [cross[j][j] - cross[0][j] ** 2 / len(y) for j in range(1, p)]
    leverage = [
        sum(columns[j][i] * inverse[j][k] * columns[k][i] for j in range(p) for k in range(p)) for i in range(len(y))
    ]
    return {
        "coefficients": np.array([float(v) for v in b]),
        "errors": np.array([float(inverse[j][j] * rss / (len(y) - p)) ** 0.5 for j in range(p)]),
        "residuals": np.array([float(v) for v in residuals]),
        "rss": float(rss),
        "vif": np.array([float(inverse[j + 1][j + 1] * centred[j]) for j in range(p - 1)]),
        "leverage": np.array([float(v) for v in leverage]),
    }


# How close the two columns are, and how far from zero: 1e-5 apart at 1e9 is a hundred roundings, and refused.
PLACES = [(1.0, 0.0), (1e-3, 0.0), (1e-5, 0.0), (1e-6, 0.0), (1e-6, 1e3), (1.0, 1e9), (1e-3, 1e9)]


@settings(max_examples=40)
@given(seed=SEEDS, place=st.sampled_from(PLACES), unit=st.sampled_from([1.0, 1e-9, 1e12]))
def test_against_rational_arithmetic(seed, place, unit):
    """x2 = x1 + gap * noise: variance inflation up to 1e13. Digits left are those that the columns carry."""
    gap, offset = place
    random = np.random.default_rng(seed)
    x1 = np.round(random.normal(10, 3, size=12), 6)
    x2 = x1 + gap * random.normal(size=12)
    x = np.column_stack([(x1 + offset) * unit, x2 + offset])
    y = 1 + 2 * x1 - x2 + random.normal(size=12)
    exact, fit = exact_fit(y, x), fitted(y, x)
    eps = np.finfo(float).eps
    rel = 100 * eps * fit.basis.amplification
    slopes, errors = exact["coefficients"][1:], exact["errors"]
    assert (np.abs(fit.coefficients[1:] - slopes) <= rel * (np.abs(slopes) + errors[1:])).all()
    assert abs(fit.coefficients[0] - exact["coefficients"][0]) <= rel * (
        errors[0] + np.abs(slopes * x.mean(axis=0)).sum()
    )
    np.testing.assert_allclose(fit.standard_errors, errors, rtol=rel)
    np.testing.assert_allclose(fit.residuals, exact["residuals"], atol=rel * fit.sigma)
    np.testing.assert_allclose(fit.rss, exact["rss"], rtol=rel)
    np.testing.assert_allclose(fit.leverage, exact["leverage"], atol=rel)
    factors = [inflation.vif for inflation in variance_inflation(fit.basis, fit.design.groups)]
    np.testing.assert_allclose(factors, exact["vif"], rtol=10 * rel)
