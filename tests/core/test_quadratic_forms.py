"""Exact Durbin-Watson p: against eigenvalues in 34 digits (mpmath), one route against another, and its properties.

The reference cases are in test_tests_against_reference.py.
"""

from __future__ import annotations

import csv
from functools import cache
from itertools import pairwise

import mpmath
import numpy as np
import pytest
from hypothesis import assume, example, given, settings
from hypothesis import strategies as st
from mpmath import mp, mpf
from reference_cases import FOLDER

from sheetfuncs.core import determinant_form, quadratic_forms
from sheetfuncs.core.basis import factorize
from sheetfuncs.core.inversion import EigenvalueForm, tails_at_zero
from sheetfuncs.core.lagged_products import LaggedProducts
from sheetfuncs.core.quadratic_forms import EIGENVALUES_UP_TO, durbin_watson_bounds, durbin_watson_tails


def columns(kind, n, k, seed=0):
    random = np.random.default_rng(seed)
    if kind == "walks":
        return np.cumsum(random.normal(size=(n, k)), axis=0)
    if kind == "trends":  # they take the low frequencies, so that the saddlepoint moves beyond a pole
        return np.polynomial.legendre.legvander(np.linspace(-1.0, 1.0, n), k)[:, 1:]
    return random.normal(size=(n, k))


def basis_of(x, intercept=True):
    return factorize(x, [f"x{j}" for j in range(x.shape[1])], intercept=intercept)


@cache
def precise_eigenvalues(kind, n, k, intercept):
    """Of M A M in 34 digits, without the p zeros of the columns."""
    mp.dps = 34
    x = columns(kind, n, k)
    z = mpmath.matrix((np.column_stack([np.ones(n), x]) if intercept else x).tolist())
    projector = mp.eye(n) - z * mp.inverse(z.T * z) * z.T
    step = mpmath.matrix((np.diff(np.eye(n), axis=0).T @ np.diff(np.eye(n), axis=0)).tolist())
    return sorted(mp.eigsy(projector * step * projector, eigvals_only=True))[k + int(intercept):]


def precise_tail(shifted):
    """P(sum shifted z^2 < 0) or P(> 0), on the thinner side, to 20 digits: the integral along a vertical line."""
    side = -1 if sum(shifted) > 0 else 1
    near, far = mpf(0), 1 / (2 * (min(shifted) if side < 0 else max(shifted)))
    for _ in range(60):
        place = (near + far) / 2
        slope = sum(v / (1 - 2 * place * v) for v in shifted) - 1 / place
        near, far = (near, place) if slope * side > 0 else (place, far)
    width = 1 / mp.sqrt(sum(2 * (v / (1 - 2 * place * v)) ** 2 for v in shifted) + 1 / place**2)
    total, x, first = mpf(0), mpf(0), None
    while True:
        s = mp.mpc(place, width * mp.sinh(x))
        value = mp.fprod(1 / mp.sqrt(1 - 2 * s * v) for v in shifted) / s * mp.cosh(x)
        first = first or abs(value)
        total += value.real / (1 if x else 2)
        if abs(value) < first * mpf(10) ** -22:
            return abs(total) * width / 12 / mp.pi
        x += mpf(1) / 12


PRECISE = [
    ("normal", 44, 4, True, (2.1, 1.2, 0.3, 0.07, 3.95)),
    ("walks", 30, 3, True, (1.9, 0.6, 0.15, 3.6)),
    ("normal", 26, 2, False, (2.0, 0.4, 0.03, 3.9)),
    ("trends", 12, 2, True, (1.2, 0.6, 3.7)),
    ("normal", 6, 1, True, (2.2, 0.7)),
]


@pytest.mark.parametrize("route", ["eigenvalues", "determinants"])
@pytest.mark.parametrize(("kind", "n", "k", "intercept", "places"), PRECISE)
def test_against_mpmath(kind, n, k, intercept, places, route, monkeypatch):
    """Right to 1e-12 relative, and to 1e-11 down to 1e-52."""
    if route == "determinants":
        monkeypatch.setattr(quadratic_forms, "EIGENVALUES_UP_TO", 0)
        monkeypatch.setattr(quadratic_forms, "ROWS_PER_COEFFICIENT", 0)
    eigenvalues = precise_eigenvalues(kind, n, k, intercept)
    for d in places:
        shifted = [value - mpf(d) for value in eigenvalues]
        expected = precise_tail(shifted)
        tails = durbin_watson_tails(basis_of(columns(kind, n, k), intercept), d)
        ours = tails.lower if sum(shifted) > 0 else tails.upper
        assert abs(float(ours / expected - 1)) < (1e-12 if expected > 1e-20 else 1e-11), (d, expected)


def test_the_precise_cases_reach_1e_30():
    tail = precise_tail([value - mpf(0.07) for value in precise_eigenvalues("normal", 44, 4, True)])
    assert tail < 1e-30


@pytest.mark.parametrize("m", [2, 3, 4, 7, 40])
def test_an_even_spectrum_is_even(m):
    """Eigenvalues in pairs of opposite sign: either tail is a half, by symmetry."""
    values = np.linspace(0.1, 2.0, m)
    tails = tails_at_zero(EigenvalueForm(np.concatenate([-values, values])))
    assert tails.lower == pytest.approx(0.5, rel=1e-13)


def test_two_eigenvalues_against_the_closed_form():
    """P(a z1^2 < b z2^2) = (2/pi) arctan(sqrt(b/a)), the angle of a normal pair."""
    for a, b in ((1.0, 1.0), (1.0, 0.01), (3.0, 1e-6)):
        lower = tails_at_zero(EigenvalueForm(np.array([a, -b]))).lower
        assert lower == pytest.approx(2 / np.pi * np.arctan(np.sqrt(b / a)), rel=1e-13)


def test_four_equal_eigenvalues_against_the_F_distribution():
    """P(sum of 3 squares < c times the sum of 5 others) = P(F(3, 5) < 5c/3)."""
    from scipy.stats import f

    for c in (1.0, 0.1, 1e-4):
        lower = tails_at_zero(EigenvalueForm(np.array([1.0] * 3 + [-c] * 5))).lower
        assert lower == pytest.approx(f.cdf(5 * c / 3, 3, 5), rel=1e-12)


ROUTES = [
    ("normal", 101, 3, True), ("trends", 120, 20, True), ("normal", 150, 0, True), ("walks", 170, 5, False),
    ("walks", 400, 10, True), ("trends", 400, 60, True),
]


@pytest.mark.parametrize(("kind", "n", "k", "intercept"), ROUTES)
def test_every_route_gives_the_same(kind, n, k, intercept, monkeypatch):
    """All eigenvalues; small determinants by frequencies; small determinants by lagged products."""
    monkeypatch.setattr(quadratic_forms, "ROWS_PER_COEFFICIENT", 0)
    basis = basis_of(columns(kind, n, k), intercept)
    for z in (0.0, 2.0, 5.0, 10.0, -3.0, -8.0):
        d = 2.0 - 2.0 * z / np.sqrt(n)
        found = []
        for eigenvalues, frequencies in ((n, 0), (0, n), (0, 0)):
            if (eigenvalues, frequencies) == (0, 0) and n < 300:
                continue  # lags beyond the rows would count
            monkeypatch.setattr(quadratic_forms, "EIGENVALUES_UP_TO", eigenvalues)
            monkeypatch.setattr(determinant_form, "FREQUENCIES_UP_TO", frequencies)
            found.append(durbin_watson_tails(basis, d))
        for tails in found[1:]:
            assert tails.lower == pytest.approx(found[0].lower, rel=1e-11, abs=0)
            assert tails.upper == pytest.approx(found[0].upper, rel=1e-11, abs=0)


@pytest.mark.parametrize("limit", [EIGENVALUES_UP_TO, determinant_form.FREQUENCIES_UP_TO])
@pytest.mark.parametrize("d", [1.3, 1.9, 2.6])
def test_no_step_where_the_route_changes(limit, d):
    """One row more changes p by about what the row before it did."""
    x = columns("walks", limit + 3, 2)
    logs = []
    for n in range(limit - 1, limit + 3):
        tails = durbin_watson_tails(basis_of(x[:n]), d)
        logs.append(np.log(min(tails.lower, tails.upper)))
    steps = np.diff(logs)
    assert abs(steps[1] - steps[0]) < 1.5 * abs(steps[2] - steps[0]) + 0.05 * abs(steps[0]) + 1e-12


DESIGNS = {
    "kind": st.sampled_from(["normal", "walks", "trends"]), "n": st.sampled_from([5, 9, 30, 99, 102, 300, 1100]),
    "k": st.integers(0, 3), "intercept": st.booleans(), "seed": st.integers(0, 2**32 - 1),
}


@settings(max_examples=60)
@given(d=st.floats(0.0, 4.0), **DESIGNS)
@example(d=2.0, kind="normal", n=1100, k=3, intercept=True, seed=0)
def test_tails_are_probabilities_and_sum_to_one(d, kind, n, k, intercept, seed):
    assume(k or intercept)
    tails = durbin_watson_tails(basis_of(columns(kind, n, k, seed), intercept), d)
    assert 0.0 <= tails.lower <= 1.0
    assert tails.lower + tails.upper == 1.0


@settings(max_examples=40)
@given(places=st.lists(st.floats(0.0, 4.0), min_size=2, max_size=5), **DESIGNS)
def test_p_grows_with_d(places, kind, n, k, intercept, seed):
    assume(k or intercept)
    basis = basis_of(columns(kind, n, k, seed), intercept)
    found = [durbin_watson_tails(basis, d) for d in sorted(places)]
    for one, other in pairwise(found):
        assert one.lower <= other.lower * (1 + 1e-11)
        assert one.upper >= other.upper * (1 - 1e-11)


@settings(max_examples=30)
@given(d=st.floats(0.2, 3.8), **DESIGNS)
def test_time_may_run_backwards_and_columns_may_be_rescaled(d, kind, n, k, intercept, seed):
    assume(k)
    x = columns(kind, n, k, seed)
    one = durbin_watson_tails(basis_of(x, intercept), d)
    other = durbin_watson_tails(basis_of(1e6 * x[::-1, ::-1], intercept), d)
    turned = durbin_watson_tails(basis_of(x, intercept), d, order=np.arange(n)[::-1])
    for tails in (other, turned):
        assert tails.lower == pytest.approx(one.lower, rel=1e-10, abs=0)
        assert tails.upper == pytest.approx(one.upper, rel=1e-10, abs=0)


@pytest.mark.parametrize("n", [8, 99, 102, 1100, 20_000])
def test_outside_the_possible_range(n):
    basis = basis_of(columns("normal", n, 2))
    for d, lower in ((-0.5, 0.0), (0.0, 0.0), (4.0, 1.0), (7.0, 1.0)):
        tails = durbin_watson_tails(basis, d)
        assert (tails.lower, tails.upper) == (lower, 1.0 - lower)


@pytest.mark.parametrize("n", [12, 140])
def test_few_degrees_of_freedom(n):
    """With one left the statistic has a single possible value; with two, P = (2/pi) arctan of a root of a ratio."""
    random = np.random.default_rng(n)
    for left in (1, 2):
        basis = basis_of(columns("normal", n, n - 1 - left))
        differences = np.diff(np.linalg.qr(basis.project_out(random.normal(size=(n, left))))[0], axis=0)
        possible = np.linalg.eigvalsh(differences.T @ differences)
        assert durbin_watson_tails(basis, possible[0] - 1e-9).lower == 0.0
        assert durbin_watson_tails(basis, possible[-1] + 1e-9).upper == 0.0
        if left == 2:
            d = possible.mean() - 0.1 * np.ptp(possible)
            expected = 2 / np.pi * np.arctan(np.sqrt((d - possible[0]) / (possible[1] - d)))
            assert durbin_watson_tails(basis, d).lower == pytest.approx(expected, rel=1e-9)


def test_a_long_series_far_from_independent_is_cut_short(monkeypatch):
    """At 200,000 rows and d = 0.5 p is below the smallest double, which a bound tells without any product."""
    basis = basis_of(columns("normal", 200_000, 1))
    monkeypatch.setattr(determinant_form, "_log_pivots", lambda matrices: pytest.fail("computed in full"))
    assert durbin_watson_tails(basis, 0.5).lower == 0.0
    assert durbin_watson_tails(basis, 3.6).upper == 0.0


def test_lagged_products_against_their_definition():
    """Moments of the spectrum: sums over the frequencies of cos(m theta) times outer products of its rows."""
    from scipy.fft import dct

    for n, k in ((50, 2), (1501, 3)):
        q = basis_of(columns("walks", n, k)).q
        spectrum = dct(q, type=2, axis=0, norm="ortho")
        theta = np.pi * np.arange(n) / n
        for lag, moment in enumerate(LaggedProducts(q).moments):
            np.testing.assert_allclose(moment, spectrum.T @ (np.cos(lag * theta)[:, None] * spectrum), atol=1e-13)


# Printed values (significance, rows, predictors) that stand more than half a unit of their last decimal from the bound.
SLIPS_OF_DL = [(0.01, 23, 1), (0.01, 31, 20), (0.05, 28, 3), (0.05, 45, 13), (0.05, 85, 1)]
SLIPS_OF_DU = [
    (0.01, 15, 5), (0.01, 19, 4), (0.01, 23, 4), (0.01, 23, 10), (0.01, 25, 4), (0.01, 27, 12), (0.01, 29, 4),
    (0.01, 29, 18), (0.01, 31, 2), (0.01, 36, 17), (0.01, 65, 11), (0.01, 95, 11), (0.05, 20, 14), (0.05, 21, 8),
    (0.05, 27, 6), (0.05, 27, 13), (0.05, 29, 13), (0.05, 34, 7), (0.05, 35, 6), (0.05, 36, 20), (0.05, 55, 3),
    (0.05, 70, 16),
]


@pytest.mark.slow
def test_all_bounds_against_Savin_and_White():
    """Savin and White 1977, Econometrica 45:1989-1996: all 3,160 values, printed to three decimals."""
    with open(FOLDER / "dw_bounds" / "savin_white_1977.csv", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 1580
    slips = {"dL": [], "dU": []}
    for row in rows:
        cell = (float(row["alpha"]), int(row["n"]), int(row["k_excl_intercept"]))
        alpha, n, predictors = cell
        for name, ours in zip(("dL", "dU"), durbin_watson_bounds(n, predictors, alpha), strict=True):
            assert ours == pytest.approx(float(row[f"{name}_computed"]), abs=1e-8), cell
            miss = abs(ours - float(row[f"{name}_published"]))
            assert miss < 0.0006, cell
            if miss > 0.0005:
                slips[name].append(cell)
    assert sorted(slips["dL"]) == SLIPS_OF_DL
    assert sorted(slips["dU"]) == SLIPS_OF_DU
    assert len(SLIPS_OF_DL) + len(SLIPS_OF_DU) == 27


def below(possible, d):
    """P(ratio < d)."""
    if not possible.min() < d < possible.max():
        return float(d >= possible.max())
    return tails_at_zero(EigenvalueForm(possible - d)).lower


@pytest.mark.parametrize("intercept", [True, False])
def test_the_bounds_are_where_their_probability_is(intercept):
    """Down to two eigenvalues, and from ordinary to very small significance; a single eigenvalue is its own bound."""
    for n, predictors in ((6, 1), (6, 3 + int(not intercept)), (30, 20), (150, 3)):
        possible = determinant_form.frequencies(n)[int(intercept):]
        kept = possible.shape[0] - predictors
        for alpha in (0.5, 0.05, 1e-3, 1e-8):
            bounds = durbin_watson_bounds(n, predictors, alpha, intercept=intercept)
            for part, d in zip((possible[:kept], possible[predictors:]), bounds, strict=True):
                assert below(part, d * (1 - 1e-11)) < alpha < below(part, d * (1 + 1e-11))
            assert bounds[0] < bounds[1]
    assert durbin_watson_bounds(6, 4, 0.05)[0] == pytest.approx(2 - 2 * np.cos(np.pi / 6), rel=1e-14)
