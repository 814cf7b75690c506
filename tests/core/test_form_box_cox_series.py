"""The power series of the Box-Cox likelihood against the sum of squares computed power by power."""

from __future__ import annotations

import numpy as np
import pytest

from sheetfuncs.core import box_cox as module
from sheetfuncs.core.box_cox import box_cox
from sheetfuncs.core.box_cox_series import BLOCK, power_series
from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import fit_design


def made(n: int, seed: int = 6) -> tuple[np.ndarray, np.ndarray]:
    random = np.random.default_rng(seed)
    x = random.normal(size=(n, 2))
    return np.exp(0.3 * random.normal(size=n) + 0.2 * x.sum(axis=1)), x


def fitted(y: np.ndarray, x: np.ndarray):
    return fit_design(build_design(y, [Numeric(f"x{j}", x[:, j]) for j in range(x.shape[1])]))


@pytest.mark.parametrize("n", [12, 60, BLOCK + 100])
@pytest.mark.parametrize(("centre", "reach"), [(0.0, 0.5), (0.2, 0.5), (1.0, 0.5), (-2.0, 0.3), (3.0, 1.0)])
def test_against_the_sum_of_squares_at_each_power(n, centre, reach):
    y, x = made(n)
    q, u = fitted(y, x).basis.q, module._log_ratio(y)
    series, profile = power_series(u, q, True, centre, reach), module._Profile(u, q, True)
    for power in centre + reach * np.linspace(-0.99, 0.99, 7):
        rss, half = profile.one(float(power))
        height, slope, bend = series.at(float(power))
        assert np.exp(height) == pytest.approx(rss, rel=1e-12)
        assert slope == pytest.approx(2.0 * half / rss, rel=1e-9, abs=1e-9)
        step = 1e-4
        if abs(power - centre) < reach - step:
            ahead, behind = series.at(float(power + step))[1], series.at(float(power - step))[1]
            assert bend == pytest.approx((ahead - behind) / (2 * step), rel=1e-5)


def test_it_ends_where_it_does_not_reach():
    y, x = made(60)
    q, u = fitted(y, x).basis.q, module._log_ratio(y)
    series = power_series(u, q, True, 2.0, 0.1)
    assert all(np.isnan(series.at(2.2)))
    assert series.lowest() is None  # it lies near 0
    assert power_series(u, q, True, 0.0, 100.0) is None  # too many terms


@pytest.mark.parametrize("n", [12, 60, 700, 3000])
def test_the_search_without_a_series_finds_the_same(n, monkeypatch):
    y, x = made(n)
    by_series = box_cox(fitted(y, x))
    monkeypatch.setattr(module, "_by_series", lambda *_: None)
    searched = box_cox(fitted(y, x))
    assert by_series.statistic == pytest.approx(searched.statistic, rel=1e-8, abs=1e-10)
    assert by_series.details["ci95"] == pytest.approx(searched.details["ci95"], rel=1e-8)
    assert by_series.details["loglik_max"] == pytest.approx(searched.details["loglik_max"], rel=1e-12)
    for name in ("LR_lambda_0", "LR_lambda_1"):
        assert by_series.details[name] == pytest.approx(searched.details[name], rel=1e-7, abs=1e-10)
