"""Rainbow test: R 4.2.2 lmtest::raintest(m, order.by = ...), refits of the middle rows, and edges."""

from __future__ import annotations

import math

import numpy as np
import pytest
from form_cases import MEANINGFUL, awkward_fits, fit_case, fit_of, r_results, raw, regression
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_cases import ROUNDING_NOISE

from sheetfuncs.core.design import Category, Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.rainbow import rainbow
from sheetfuncs.core.some_rows import fit_rows
from sheetfuncs.errors import ArgumentError

# A category is missing from the middle rows. R counts its coefficient among the degrees of freedom all the same; ours
# are the rank, so that the mean squares are divided by other numbers.
R_COUNTS_MISSING_LEVELS = {("syn_het_a", "mahalanobis"), ("syn_lev1_a", "row order"), ("syn_lev1_a", "mahalanobis")}


@pytest.mark.parametrize("name", MEANINGFUL)
def test_against_R_lmtest_raintest(name):
    fit = fit_case(name)
    results = r_results(name, "rainbow")
    assert len(results) == 3
    for r in results:
        by = r["args"]["order_by"]
        result = rainbow(fit, by=None if by == "row order" else by)
        assert result.args["order_by"] == by
        assert result.args["fraction"] == r["args"]["fraction"]
        if "error" in r:
            assert not result.applies
            continue
        if (name, by) in R_COUNTS_MISSING_LEVELS:
            assert result.df == (r["df"][0] - 1, r["df"][1] + 1)
            ratio = r["statistic"] * r["df"][0] / r["df"][1]
            assert result.statistic * result.df[0] / result.df[1] == pytest.approx(ratio, rel=1e-9)
            assert "only 3 of the 4 coefficients" in result.note
            continue
        assert result.statistic == pytest.approx(r["statistic"], rel=1e-9)
        assert list(result.df) == r["df"]
        assert result.p == pytest.approx(r["p"], rel=1e-7)
        assert result.note == ""


def test_the_degrees_of_freedom_without_a_level_against_a_fit_of_the_middle():
    """The middle rows' own fit, without the column that is constant there, in syn_lev1_a by numpy's least squares."""
    fit = fit_case("syn_lev1_a")
    x, y = raw(fit.design)[6:18], fit.design.response[6:18]
    b, _, rank, _ = np.linalg.lstsq(x, y, rcond=None)
    left = y - x @ b
    assert rank == 3
    result = rainbow(fit)
    assert result.df == (12 - 1, 12 - 3)
    assert result.statistic == pytest.approx((fit.rss - left @ left) / 11 / (left @ left / 9), rel=1e-10)


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 2**32 - 1), st.integers(14, 60), st.booleans(), st.sampled_from([0.3, 0.5, 0.62, 0.8]))
def test_against_refitting_the_middle(seed, n, intercept, fraction):
    y, x = regression(seed, n, 2)
    fit = fit_of(y, x, intercept=intercept)
    result = rainbow(fit, fraction=fraction, by="x2")
    count = math.floor(fraction * n)
    first = math.ceil(np.quantile(np.arange(1, n + 1), 0.5 - fraction / 2) - 1e-9) - 1
    rows = np.argsort(x[:, 1], kind="stable")[first : first + count]
    if count <= fit.p:
        assert not result.applies
        return
    own = fit_of(y[rows], x[rows], intercept=intercept)
    expected = (fit.rss - own.rss) / (n - count) / (own.rss / own.df)
    assert result.statistic == pytest.approx(expected, rel=1e-9)
    assert result.df == (n - count, own.df)


@settings(max_examples=40, deadline=None)
@given(st.integers(0, 2**32 - 1), st.sampled_from([None, "x1", "mahalanobis"]))
def test_units_zeros_and_order_of_columns_do_not_matter(seed, by):
    y, x = regression(seed, 30)
    result = rainbow(fit_of(y, x), by=by)
    others = [
        fit_of(-3e5 * y, x), fit_of(y, x * [1e-6, 20.0, 7e4]), fit_of(y + 1e3, x + np.array([5.0, 200.0, 0.0])),
        fit_of(y + x @ [3.0, 1.0, -7.0], x),
    ]
    for other in others:
        assert rainbow(other, by=by).statistic == pytest.approx(result.statistic, rel=1e-8)
    if by != "x1":
        assert rainbow(fit_of(y, x[:, [2, 0, 1]]), by=by).statistic == pytest.approx(result.statistic, rel=1e-8)


@given(st.integers(0, 2**32 - 1))
@settings(max_examples=30, deadline=None)
def test_rows_in_another_order_with_their_time_give_the_same(seed):
    y, x = regression(seed, 25)
    shuffled = np.random.default_rng(seed).permutation(25)
    fit = fit_of(y[shuffled], x[shuffled], order=shuffled.astype(float))
    assert rainbow(fit).statistic == pytest.approx(rainbow(fit_of(y, x)).statistic, rel=1e-9)


def test_equally_distant_rows_stand_in_row_order_whatever_the_rounding():
    """Eight distances, each several times: the cut goes through rows that are equally near."""
    x = np.repeat([-2.0, -1.0, 1.0, 2.0], 6)[:, None] * 0.1
    y = np.random.default_rng(1).normal(size=24)
    results = {rainbow(fit_of(y, x * scale + shift), fraction=0.4, by="mahalanobis").p for scale, shift in
               ((1.0, 0.0), (1 / 3, 0.0), (7.7, 0.1), (1e-9, 0.0))}
    assert max(results) == pytest.approx(min(results), rel=1e-9)
    near = np.flatnonzero(np.abs(x[:, 0]) < 0.15)[:9]
    own = fit_of(y[near], x[near])
    assert rainbow(fit_of(y, x), fraction=0.4, by="mahalanobis").details["middle_rss"] == pytest.approx(own.rss)


def test_a_predictor_that_does_not_vary_in_the_middle():
    x = np.concatenate([np.zeros(5), np.ones(20), np.zeros(5)])
    y = np.random.default_rng(2).normal(size=30) + x
    result = rainbow(fit_of(y, x[:, None]))
    middle = y[8:23]
    rss = float(np.sum((middle - middle.mean()) ** 2))
    assert result.df == (15 - 1, 15 - 1)
    assert result.details["middle_rss"] == pytest.approx(rss, rel=1e-12)


def test_some_rows_close_together_are_fitted_as_well_as_alone():
    """Rows within a millionth of the predictors' range: cross products alone would lose every digit."""
    random = np.random.default_rng(4)
    x = np.concatenate([random.normal(size=(20, 2)), 0.3 + 1e-7 * random.normal(size=(20, 2))])
    y = np.concatenate([random.normal(size=20), 1e7 * (x[20:] - 0.3) @ [1.0, 2.0] + random.normal(size=20)])
    part = fit_rows(fit_of(y, x), slice(20, None))
    own = fit_of(y[20:], x[20:])
    assert part.rank == 3
    assert part.rss == pytest.approx(own.rss, rel=1e-6)


@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_nothing_is_tested_on_rounding_noise(name):
    fit = fit_case(name)
    result = rainbow(fit)
    assert (result.applies, result.reason, result.cell_error) == (False, fit.nothing_left(), "#NUM!")


def test_refusals():
    y, x = regression(3, 12)
    fit = fit_of(y, x)
    assert rainbow(fit, fraction=0.3).reason == (
        "The middle has 3 of 12 rows: too few for a fit of its own with 4 coefficients."
    )
    with pytest.raises(ArgumentError, match='no column of numbers called "x9" to sort by: use one of x1, x2, x3'):
        rainbow(fit, by="x9")
    for fraction in (0.0, 1.0, -0.5, float("nan")):
        with pytest.raises(ArgumentError, match="not a share of the rows"):
            rainbow(fit, fraction=fraction)
    with pytest.raises(ArgumentError, match="no predictors to sort by"):
        rainbow(fit_of(y, x[:, :0]), by="x1")


def test_a_middle_that_fits_perfectly_is_refused():
    x = np.arange(20.0)
    y = 2.0 + 3.0 * x
    y[:4] += [1.0, -2.0, 1.5, 0.5]
    result = rainbow(fit_of(y, x[:, None]))
    assert result.reason == "The middle rows fit perfectly on their own, so that F has no denominator."
    assert result.cell_error == "#NUM!"


def test_rows_outside_that_are_needed_to_tell_the_predictors_apart():
    """The two rows outside the middle hold the only two rows of two levels."""
    codes = np.array([1, *[0] * 9, 2])
    y = np.random.default_rng(6).normal(size=11)
    fit = fit_design(build_design(y, [Numeric("x", y[::-1] ** 2), Category("kind", ("a", "b", "c"), codes)]))
    assert rainbow(fit, fraction=0.82).reason == (
        "The rows outside the middle are all needed to tell the predictors apart."
    )


@settings(max_examples=300, deadline=None)
@given(awkward_fits(), st.sampled_from([None, "mahalanobis"]), st.sampled_from([0.2, 0.5, 0.9]))
def test_awkward_rows_give_a_figure_or_a_reason(fit, by, fraction):
    if fit is None:
        return
    result = rainbow(fit, by=by, fraction=fraction)
    if result.applies:
        assert math.isfinite(result.statistic)
        assert 0.0 <= result.p <= 1.0
        assert min(result.df) >= 1
    else:
        assert result.reason.endswith(".")
