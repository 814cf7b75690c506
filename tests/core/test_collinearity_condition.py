"""Condition indices against R (svd), 60-digit arithmetic, and Belsley, Kuh and Welsch 1980."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_cases import NAMES, load_case
from reference_checks import fitted, made_fit, r_results

from sheetfuncs.core.basis import factorize
from sheetfuncs.core.condition import condition_indices
from sheetfuncs.errors import NoVariationError

CASES = [name for name in NAMES if name != "syn_constcol_a"]


def of(columns, *, centred=False, intercept=True):
    columns = np.asarray(columns, dtype=float)
    names = [f"x{j + 1}" for j in range(columns.shape[1])]
    return condition_indices(factorize(columns, names, intercept=intercept), names, centred=centred)


@pytest.mark.parametrize("name", CASES)
def test_against_R(name):
    """svd of the columns scaled to unit length; the two ill-conditioned cases in their re-expressed form below."""
    fit = fitted(name)
    results = r_results(name, "condition_indices", exact=False)
    assert results
    if name in ("syn_nearcol_a", "syn_offset_a"):
        return  # R's own digits end; `test_small_singular_values_keep_their_digits` has exact ones
    for expected in results:
        ours = condition_indices(
            fit.basis, fit.design.column_names, centred=expected["args"]["scaling"].startswith("centred")
        )
        # Longley: R's smallest singular value is good to its condition number in roundings.
        np.testing.assert_allclose(ours.indices, expected["condition_indices"], rtol=1e-9)
        rows = expected["proportions_rows_are_condition_indices"]
        assert [load_case(name).term(term) for term in rows[0]] == list(ours.terms)
        np.testing.assert_allclose(ours.proportions, [list(row.values()) for row in rows], rtol=1e-7, atol=1e-9)


def exact_indices(columns):
    """Condition indices of columns with 60 digits, from the eigenvalues of their scaled cross products."""
    with mpmath.workdps(60):
        x = mpmath.matrix(columns.tolist())
        n, m = x.rows, x.cols
        length = [mpmath.sqrt(mpmath.fsum(x[i, j] ** 2 for i in range(n))) for j in range(m)]
        gram = mpmath.matrix(m, m)
        for i in range(m):
            for j in range(m):
                gram[i, j] = mpmath.fsum(x[r, i] * x[r, j] for r in range(n)) / length[i] / length[j]
        values, vectors = mpmath.eigsy(gram)
        order = sorted(range(m), key=lambda i: -values[i])
        shares = [[vectors[j, i] ** 2 / values[i] for j in range(m)] for i in order]
        totals = [mpmath.fsum(row[j] for row in shares) for j in range(m)]
        indices = [float(mpmath.sqrt(values[order[0]] / values[i])) for i in order]
        return np.array(indices), np.array([[float(row[j] / totals[j]) for j in range(m)] for row in shares])


@pytest.mark.parametrize("name", ["syn_nearcol_a", "syn_offset_a", "longley", "syn_tiny_a"])
def test_small_singular_values_keep_their_digits(name):
    fit = fitted(name)
    indices, proportions = exact_indices(np.column_stack([np.ones(fit.n), fit.design.columns]))
    ours = condition_indices(fit.basis, fit.design.column_names)
    # Rounding of the basis grows with the condition of the centred columns alone.
    loss = fit.basis.amplification * 1e-14
    np.testing.assert_allclose(ours.indices, indices, rtol=1e-12 + loss)
    np.testing.assert_allclose(ours.proportions, proportions, rtol=1e-9 + loss, atol=1e-12)


@pytest.mark.parametrize("offset", [1e9, 1e11])
def test_a_condition_of_1e11_from_an_offset(offset):
    rng = np.random.default_rng(1)
    columns = np.column_stack([offset + rng.normal(size=30).round(3), rng.normal(size=30)])
    ours = of(columns)
    indices, _ = exact_indices(np.column_stack([np.ones(30), columns]))
    assert ours.number > offset / 2
    np.testing.assert_allclose(ours.indices, indices, rtol=1e-11)
    assert [one.terms for one in ours.near_dependencies] == [("intercept", "x1")]
    assert of(columns, centred=True).near_dependencies == ()


def test_a_condition_of_1e11_between_predictors():
    rng = np.random.default_rng(2)
    x = rng.normal(size=40)
    columns = np.column_stack([x, x + 1e-11 * rng.normal(size=40), rng.normal(size=40)])
    ours = of(columns, centred=True)
    indices, _ = exact_indices(columns - columns.mean(axis=0))
    assert ours.number > 5e10
    # What the columns' own last digits leave of their difference.
    assert ours.number == pytest.approx(indices[-1], rel=1e-4)
    assert [one.terms for one in ours.near_dependencies] == [("x1", "x2")]


def test_against_Belsley_Kuh_and_Welsch():
    """Longley's data: the largest scaled condition index is 43,275 (Belsley, Kuh and Welsch 1980, and handbooks)."""
    fit = fitted("longley")
    ours = condition_indices(fit.basis, fit.design.column_names)
    assert round(ours.number) == 43275
    [group] = ours.near_dependencies
    assert set(group.terms) >= {"intercept", "x2", "x5", "x6"}


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 500), st.integers(12, 60), st.lists(st.integers(-120, 120), min_size=3, max_size=3))
def test_pure_scaling_never_raises_an_alarm(seed, n, powers):
    """Nor does it change any figure."""
    plain = np.random.default_rng(seed).normal(size=(n, 3))
    for centred in (False, True):
        expected, ours = of(plain, centred=centred), of(plain * 10.0 ** np.array(powers), centred=centred)
        np.testing.assert_allclose(ours.indices, expected.indices, rtol=1e-10)
        np.testing.assert_allclose(ours.proportions, expected.proportions, rtol=1e-7, atol=1e-10)
        assert ours.near_dependencies == () == expected.near_dependencies


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 500), st.floats(-6, -2), st.floats(-6, -2), st.permutations(range(6)))
def test_two_near_dependencies_are_told_apart(seed, first, second, places):
    """However close in strength: their columns' shares of variance mix then, the groups must not."""
    rng = np.random.default_rng(seed)
    base, noise = rng.normal(size=(60, 4)), rng.normal(size=(60, 2))
    columns = np.column_stack([
        base[:, 0], base[:, 1], base[:, 0] + 10**first * noise[:, 0], base[:, 1] + 10**second * noise[:, 1],
        base[:, 2], base[:, 3],
    ])[:, places]
    names = [f"x{1 + places.index(j)}" for j in range(6)]
    expected = {tuple(sorted((names[0], names[2]))), tuple(sorted((names[1], names[3])))}
    for centred in (False, True):
        ours = of(columns, centred=centred)
        assert {one.terms for one in ours.near_dependencies} == expected
        strength = {one.terms: one.index for one in ours.near_dependencies}
        if abs(first - second) > 0.7:
            stronger = tuple(sorted((names[0], names[2]) if first < second else (names[1], names[3])))
            assert max(strength, key=strength.get) == stronger


def test_equally_strong_near_dependencies_and_a_chain():
    rng = np.random.default_rng(3)
    a, b, c, e = rng.normal(size=(4, 50))
    two = of(np.column_stack([a, a + 1e-4 * e, b, b + 1e-4 * c]), centred=True)
    assert [one.terms for one in two.near_dependencies] in (
        [("x1", "x2"), ("x3", "x4")], [("x3", "x4"), ("x1", "x2")]
    )
    chain = of(np.column_stack([a, a + 1e-4 * e, a + 1e-4 * b, c]), centred=True)
    assert [one.terms for one in chain.near_dependencies] == [("x1", "x2", "x3")]
    assert "x1, x2 and x3 move together" in chain.near_dependencies[0].sentence


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 500), st.integers(10, 40), st.booleans(), st.booleans())
def test_proportions_are_shares_and_order_of_rows_and_columns_does_not_matter(seed, n, intercept, centred):
    rng = np.random.default_rng(seed)
    columns = rng.normal(size=(n, 3)) + 2.0
    form = {"centred": centred and intercept, "intercept": intercept}
    ours, places = of(columns, **form), rng.permutation(3)
    other = of(columns[rng.permutation(n)][:, places], **form)
    np.testing.assert_allclose(ours.proportions.sum(axis=0), 1.0, rtol=1e-12)
    assert ours.indices[0] == 1.0
    assert (np.diff(ours.indices) >= 0).all()
    np.testing.assert_allclose(other.indices, ours.indices, rtol=1e-10)
    first = len(ours.terms) - 3
    np.testing.assert_allclose(other.proportions[:, first:], ours.proportions[:, first:][:, places], rtol=1e-6,
                               atol=1e-9)


def test_orthogonal_columns_have_indices_of_one():
    ours = of([[1, 1], [1, -1], [-1, 1], [-1, -1]])
    np.testing.assert_allclose(ours.indices, 1.0, rtol=1e-15)
    assert ours.terms == ("intercept", "x1", "x2")
    single = of([[1.0], [2.0], [4.0]], centred=True)
    assert (single.number, single.proportions.tolist()) == (1.0, [[1.0]])


def test_the_centred_form_needs_an_intercept():
    fit = made_fit(intercept=False)
    with pytest.raises(NoVariationError, match="needs an intercept"):
        condition_indices(fit.basis, fit.design.column_names, centred=True)


@pytest.mark.parametrize("copies", [2, 4, 5, 7, 12])
def test_any_number_of_columns_that_follow_one_base_are_one_group(copies):
    random = np.random.default_rng(5)
    base, other = random.normal(size=(2, 80))
    follow = base[:, None] + 1e-3 * random.normal(size=(80, copies))
    pair = other[:, None] + 1e-3 * random.normal(size=(80, 2))
    columns = np.column_stack([follow, pair, random.normal(size=80)])
    names = [*(f"copy {j}" for j in range(copies)), "left", "right", "apart"]
    found = condition_indices(factorize(columns, names, intercept=True), names).near_dependencies
    assert {frozenset(group.terms) for group in found} == {frozenset(names[:copies]), frozenset({"left", "right"})}
