"""Box-Cox on the regression: exact maximum and interval (mpmath, and R 4.2.2 on MASS::boxcox's profile), scipy for a
constant alone, properties and edges."""

from __future__ import annotations

import math

import numpy as np
import pytest
import scipy.stats
from form_cases import MEANINGFUL, SEEDS, awkward_fits, fit_case, fit_of, r_results, regression
from hypothesis import given, settings
from reference_cases import ROUNDING_NOISE, load_case

from sheetfuncs.core import box_cox as module
from sheetfuncs.core.box_cox import box_cox
from sheetfuncs.errors import ArgumentError

WITH_RESULT = [name for name in MEANINGFUL if r_results(name, "box_cox")]
EXACT = [name for name in WITH_RESULT if "box_cox" in load_case(name).exact]


@pytest.mark.parametrize("name", EXACT)
def test_against_mpmath(name):
    exact, result = load_case(name).exact["box_cox"], box_cox(fit_case(name))
    assert result.statistic == result.details["lambda"]
    assert result.statistic == pytest.approx(float(exact["lambda"]), rel=1e-11)
    assert result.details["ci95"] == pytest.approx([float(end) for end in exact["ci95"]], rel=1e-11)
    for name in ("LR_lambda_0", "LR_lambda_1"):
        assert result.details[name]["statistic"] == pytest.approx(float(exact[name]), rel=1e-10)


@pytest.mark.parametrize("name", WITH_RESULT)
def test_against_R_on_the_profile_of_MASS_boxcox(name):
    """R finds the maximum to about 1e-9, since it is flat there; ends and tests to 1e-12."""
    (r,) = r_results(name, "box_cox")
    details = box_cox(fit_case(name), without_intercept=True).details
    assert details["lambda"] == pytest.approx(r["lambda"], rel=1e-7)
    assert details["loglik_max"] == pytest.approx(r["loglik_max"], rel=1e-9)
    assert details["ci95"] == pytest.approx(r["ci95"], rel=1e-9)
    for test in ("LR_lambda_0", "LR_lambda_1"):
        assert details[test]["statistic"] == pytest.approx(r[test]["statistic"], rel=1e-9)
        assert details[test]["p"] == pytest.approx(r[test]["p"], rel=1e-7)


def test_every_case_without_a_result_is_refused():
    for name in set(MEANINGFUL) - set(WITH_RESULT):
        assert box_cox(fit_case(name)).reason.startswith("Powers need a positive response: row ")


@pytest.mark.parametrize("seed", range(5))
def test_a_constant_alone_against_scipy_boxcox_normmax(seed):
    y, _ = regression(seed, 50)
    result = box_cox(fit_of(y, np.empty((50, 0))))
    assert result.statistic == pytest.approx(scipy.stats.boxcox_normmax(y, method="mle"), abs=1e-6)


def test_the_printed_power_of_the_cherry_trees():
    """Volume on Girth and Height: 0.307 (help page of car::powerTransform and MASS::boxcox; figure from memory)."""
    assert round(box_cox(fit_case("trees")).statistic, 3) == 0.307


def test_the_profile_at_the_ends_of_the_interval():
    """By definition: n log(rss / least rss) is the chi-square quantile there, rss from plain least squares."""
    y, x = regression(4, 40)
    z = np.column_stack([np.ones(40), x])
    u = y / np.exp(np.log(y).mean())

    def rss(power):
        left = (u**power - 1) / power
        left = left - z @ np.linalg.lstsq(z, left, rcond=None)[0]
        return left @ left

    for level in (0.5, 0.9, 0.99):
        result = box_cox(fit_of(y, x), level=level)
        for end in result.details[f"ci{100 * level:g}"]:
            ratio = 40 * math.log(rss(end) / rss(result.statistic))
            assert ratio == pytest.approx(scipy.stats.chi2.ppf(level, 1), rel=1e-9)


@settings(max_examples=60, deadline=None)
@given(SEEDS)
def test_the_unit_of_the_response_and_the_predictors_do_not_matter(seed):
    y, x = regression(seed, 30)
    result = box_cox(fit_of(y, x))
    rows = np.random.default_rng(seed).permutation(30)
    others = [
        fit_of(3e5 * y, x), fit_of(1e-9 * y, x), fit_of(y, x * [1e-6, 20.0, 7e4] + np.array([0.0, 1e3, 1.0])),
        fit_of(y, x[:, [1, 2, 0]]), fit_of(y[rows], x[rows]),
    ]
    for other in map(box_cox, others):
        assert other.statistic == pytest.approx(result.statistic, rel=1e-8, abs=1e-9)
        assert other.details["ci95"] == pytest.approx(result.details["ci95"], rel=1e-8, abs=1e-9)


@settings(max_examples=60, deadline=None)
@given(SEEDS)
def test_the_inverse_response_has_the_opposite_power(seed):
    """1/y to the power lambda is y to the power -lambda."""
    y, x = regression(seed, 30)
    one, other = box_cox(fit_of(y, x)), box_cox(fit_of(1.0 / y, x))
    assert other.statistic == pytest.approx(-one.statistic, rel=1e-7, abs=1e-8)
    low, high = one.details["ci95"]
    assert other.details["ci95"] == pytest.approx([-high, -low], rel=1e-7, abs=1e-8)


@settings(max_examples=30, deadline=None)
@given(SEEDS)
def test_no_power_nearby_is_likelier(seed):
    y, x = regression(seed, 25)
    result = box_cox(fit_of(y, x))
    profile = module._Profile(module._log_ratio(y), fit_of(y, x).basis.q, True)
    rss, _ = profile.at(result.statistic + np.linspace(-4, 4, 81))
    assert rss.min() >= float(profile.at(np.array([result.statistic]))[0][0]) * (1 - 1e-12)


def test_many_rows_start_from_some_of_them_and_end_at_the_same_power(monkeypatch):
    y, x = regression(9, 20_000)
    fit = fit_of(y, x)
    result = box_cox(fit)
    monkeypatch.setattr(module, "THIN", 20_000)
    monkeypatch.setattr(module, "CHUNK", 3_000)
    whole = box_cox(fit)
    assert result.statistic == pytest.approx(whole.statistic, rel=1e-8)
    assert result.details["ci95"] == pytest.approx(whole.details["ci95"], rel=1e-8)
    assert result.details["LR_lambda_1"] == pytest.approx(whole.details["LR_lambda_1"], rel=1e-8)


def test_many_rows_sorted_so_that_every_fifth_says_something_else(monkeypatch):
    """The rows that the search starts from all lie on another curve: it starts anew."""
    monkeypatch.setattr(module, "THIN", 100)
    random = np.random.default_rng(5)
    x = random.uniform(1, 3, size=1000)
    y = np.exp(x + 0.1 * random.normal(size=1000))
    y[::10] = 5 + 2 * x[::10] + 0.01 * random.normal(size=100)
    fit = fit_of(y, x[:, None])
    result = box_cox(fit)
    monkeypatch.setattr(module, "THIN", 1000)
    assert result.statistic == pytest.approx(box_cox(fit).statistic, rel=1e-8)


@pytest.mark.parametrize("spread", [1e-3, 1e-6])
def test_a_response_that_hardly_varies_keeps_its_digits(spread):
    """With y = 1 + spread v, the interval in units of 1/spread hardly depends on the spread."""
    v, x = regression(6, 40)
    v = (v - v.mean()) / v.std()
    result = box_cox(fit_of(1e5 * (1 + spread * v), x))
    smaller = box_cox(fit_of(1e5 * (1 + spread / 8 * v), x))
    low, high = result.details["ci95"]
    assert np.isfinite([low, high]).all()
    assert result.statistic * spread == pytest.approx(smaller.statistic * spread / 8, rel=5 * spread)


def test_without_an_intercept_it_is_refused_unless_asked_for():
    fit = fit_case("syn_noint_a")
    result = box_cox(fit)
    assert result.cell_error == "#N/A"
    assert result.reason.startswith("Without an intercept the likeliest power changes with what the response is")
    said = box_cox(fit, without_intercept=True)
    assert "for the response divided by its geometric mean" in said.note
    assert said.statistic == pytest.approx(1.1605, abs=5e-5)  # CONVENTIONS.md, MASS scaling


def test_refusals():
    y, x = regression(1, 12)
    y[4] = 0.0
    assert box_cox(fit_of(y, x)).reason == "Powers need a positive response: row 5 has 0."
    y, x = regression(1, 5)
    assert box_cox(fit_of(y, x)).reason == "5 rows are too few to find a power beside 4 coefficients."
    for level in (0.2, 1.0, float("nan")):
        with pytest.raises(ArgumentError, match="not between"):
            box_cox(fit_of(y, x), level=level)


@pytest.mark.parametrize("power", [0.0, 0.5, -1.0, 2.0])
def test_a_perfect_fit_of_some_power_is_refused(power):
    line = 2.0 + 0.1 * np.arange(15.0)
    y = np.exp(line) if power == 0.0 else line ** (1.0 / power)
    result = box_cox(fit_of(y, np.arange(15.0)[:, None]))
    assert not result.applies
    assert result.cell_error == "#NUM!"
    assert "the fit is perfect" in result.reason


@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_nothing_is_fitted_to_rounding_noise(name):
    fit = fit_case(name)
    assert box_cox(fit).reason == fit.nothing_left()


@settings(max_examples=400, deadline=None)
@given(awkward_fits())
def test_awkward_rows_give_a_figure_or_a_reason(fit):
    if fit is None:
        return
    result = box_cox(fit, without_intercept=True)
    if result.applies:
        low, high = result.details["ci95"]
        assert math.isfinite(result.statistic)
        assert low is None or low <= result.statistic
        assert high is None or high >= result.statistic
        assert all(0.0 <= result.details[test]["p"] <= 1.0 for test in ("LR_lambda_0", "LR_lambda_1"))
    else:
        assert result.reason.endswith(".")
