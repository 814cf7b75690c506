"""Goldfeld-Quandt against R (lmtest::gqtest), statsmodels, and two fits of its own."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_checks import FITTED, NOISE, fit_of, fitted, made_fit, r_results, same, says_nothing
from scipy.special import fdtr, fdtrc

from sheetfuncs.core.goldfeld_quandt import goldfeld_quandt, goldfeld_quandt_tests
from sheetfuncs.errors import ArgumentError

# R divides by degrees of freedom that count columns which a part cannot tell apart; those parts are refused here.
R_COUNTS_ALIASED_COLUMNS = {
    ("mtcars", "wt", 0), ("mtcars", "wt", 0.2), ("prestige", "row order", 0.2),
    *(("syn_lev1_a", by, fraction) for by in ("row order", "x1") for fraction in (0, 0.2)),
}


def run(fit, args):
    alternative = {"two.sided": "two-sided"}.get(args["alternative"], args["alternative"])
    by = None if args["order_by"] == "row order" else args["order_by"]
    return goldfeld_quandt(fit, point=args["point"], fraction=args["fraction"], alternative=alternative, by=by)


@pytest.mark.parametrize("name", FITTED)
def test_against_R(name):
    """On the ill-conditioned case on R's own scale: its alternative form has another first predictor."""
    fit = fitted(name)
    results = r_results(name, "goldfeld_quandt", exact=name != "syn_nearcol_a")
    assert len(results) >= 6
    for expected in results:
        ours = run(fit, expected["args"])
        assert ours.args == expected["args"]
        if says_nothing(expected):
            assert not ours.applies
            assert ours.cell_error == "#NUM!"
        elif (name, expected["args"]["order_by"], expected["args"]["fraction"]) in R_COUNTS_ALIASED_COLUMNS:
            assert "cannot be fitted on its own" in ours.reason
        else:
            same(ours, expected)


@pytest.mark.parametrize("name", NOISE)
def test_nothing_is_tested_on_rounding_noise(name):
    fit = fitted(name)
    assert goldfeld_quandt(fit).reason == fit.nothing_left()


@pytest.mark.filterwarnings("ignore:.*plain tuple:FutureWarning")
def test_against_statsmodels_where_both_halves_are_equal():
    """statsmodels het_goldfeldquandt swaps the degrees of freedom of p where they differ (CONVENTIONS.md)."""
    from statsmodels.stats.diagnostic import het_goldfeldquandt

    fit = made_fit(80, 3)
    x = np.column_stack([np.ones(80), fit.design.columns])
    for alternative, theirs in (("greater", "increasing"), ("less", "decreasing"), ("two-sided", "two-sided")):
        f, p, _ = het_goldfeldquandt(fit.design.response, x, alternative=theirs)
        ours = goldfeld_quandt(fit, alternative=alternative)
        assert (ours.statistic, ours.p) == pytest.approx((f, p), rel=1e-9)
        f, p, _ = het_goldfeldquandt(fit.design.response, x, idx=2, alternative=theirs)
        ours = goldfeld_quandt(fit, alternative=alternative, by="x2")
        assert (ours.statistic, ours.p) == pytest.approx((f, p), rel=1e-9)


@settings(max_examples=60, deadline=None)
@given(
    st.integers(0, 500), st.integers(16, 90), st.sampled_from([0.0, 0.1, 0.2, 0.4]), st.sampled_from([0.4, 0.5, 0.6]),
    st.booleans(), st.booleans(), st.sampled_from([None, 0, 1]), st.sampled_from([(1.0, 0.0), (1e-9, 0.0), (1.0, 1e7)]),
)
def test_against_two_fits_of_its_own(seed, n, fraction, point, intercept, ordered, by, unit):
    """With degrees of freedom (later, earlier), and sorting the rows or a time column the same."""
    rng = np.random.default_rng(seed)
    scale, shift = unit
    time = rng.integers(0, 9, n).astype(float) if ordered else None
    fit = made_fit(n, 2, seed=seed, intercept=intercept, order=time, scale=scale, shift=shift if intercept else 0.0)
    key = fit.design.columns[:, by] if by is not None else (time if ordered else np.arange(n))
    rows = np.argsort(key, kind="stable")
    first = int(np.floor((point - fraction / 2) * n))
    second = int(np.ceil((point + fraction / 2) * n + 0.01)) - 1
    sums, counts = [], []
    ours = goldfeld_quandt(fit, point=point, fraction=fraction, by=by)
    if min(first, n - second) <= fit.p:
        assert not ours.applies
        return
    for part in (rows[:first], rows[second:]):
        own = fit_of(fit.design.response[part], fit.design.columns[part], intercept=intercept)
        sums.append(own.rss / own.df)
        counts.append(own.df)
    assert ours.statistic == pytest.approx(sums[1] / sums[0], rel=1e-8)
    assert ours.df == (counts[1], counts[0])
    assert ours.p == pytest.approx(fdtrc(counts[1], counts[0], ours.statistic), rel=1e-12)
    less = goldfeld_quandt(fit, point=point, fraction=fraction, by=by, alternative="less")
    assert less.p == pytest.approx(fdtr(counts[1], counts[0], ours.statistic), rel=1e-12)
    both = goldfeld_quandt(fit, point=point, fraction=fraction, by=by, alternative="two-sided")
    assert both.p == pytest.approx(min(1.0, 2 * min(ours.p, less.p)), rel=1e-12)


def test_a_part_that_nearly_fits_or_nearly_repeats_keeps_its_digits():
    """The residuals of one part a millionth of the other's; a predictor that hardly varies in one part."""
    rng = np.random.default_rng(8)
    n = 40
    x = rng.normal(size=(n, 2))
    x[: n // 2, 1] = 3.0 + 1e-6 * x[: n // 2, 1]
    y = x.sum(axis=1) + rng.normal(size=n) * np.repeat([1e-6, 1.0], n // 2)
    halves = [fit_of(y[part], x[part]) for part in (slice(0, n // 2), slice(n // 2, n))]
    ours = goldfeld_quandt(fit_of(y, x))
    assert ours.statistic == pytest.approx(halves[1].rss / halves[0].rss, rel=1e-7)
    assert ours.p < 1e-50


def test_all_alternatives_at_once_are_the_same():
    for fit in (made_fit(31, 2), made_fit(6, 2), fitted(NOISE[0]), fitted("syn_lev1_a")):
        together = goldfeld_quandt_tests(fit, fraction=0.1, by=0)
        alone = [goldfeld_quandt(fit, fraction=0.1, by=0, alternative=a) for a in ("greater", "less", "two-sided")]
        assert list(together) == alone


def test_the_variant_names_sides_and_what_is_left_out():
    fit = made_fit(25, 2)
    assert goldfeld_quandt(fit).variant == (
        "last 13 rows over first 12, in time order, none left out, against a wider spread in the later part"
    )
    assert goldfeld_quandt(fit, fraction=0.2, alternative="less", by="x2").variant == (
        "last 10 rows over first 10, sorted by x2, 5 between left out, against a wider spread in the earlier part"
    )
    assert goldfeld_quandt(fit, by=1).args["order_by"] == "x2"


def test_refusals_say_why():
    rng = np.random.default_rng(1)
    x, y = rng.normal(size=(20, 2)), rng.normal(size=20)
    assert "must each have more rows than the 3 coefficients" in goldfeld_quandt(fit_of(y[:7], x[:7])).reason
    assert goldfeld_quandt(fit_of(y[:8], x[:8])).applies
    x[:10, 1] = 2.0
    assert "The earlier part cannot be fitted on its own: x2 has the same value" in goldfeld_quandt(fit_of(y, x)).reason
    x = rng.normal(size=(20, 2))
    y[10:] = 1 + 2 * x[10:, 0]
    y[:10] += 5 * rng.normal(size=10)
    refusal = goldfeld_quandt(fit_of(np.where(np.arange(20) < 10, y, 1 + x[:, 0]), x))
    assert "The later part is fitted perfectly" in refusal.reason
    assert refusal.cell_error == "#NUM!"


@pytest.mark.parametrize(
    "options", [{"point": 0.0}, {"point": 1.0}, {"fraction": -0.1}, {"fraction": 1.0}, {"alternative": "greater than"},
                {"by": "x9"}, {"by": 3}, {"by": -1}],
)
def test_options_that_cannot_be(options):
    with pytest.raises(ArgumentError):
        goldfeld_quandt(made_fit(), **options)
