"""What the tests against reference cases share."""

from __future__ import annotations

import math

import numpy as np
import pytest
from reference_cases import NAMES, ROUNDING_NOISE, as_number, load_case

from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import Fit, fit_design

# Cases that a fit exists for: the constant column of syn_constcol_a is refused.
FITTED = [name for name in NAMES if name not in (*ROUNDING_NOISE, "syn_constcol_a")]
NOISE = ROUNDING_NOISE


def r_results(name: str, method: str, *, exact: bool = True) -> list[dict]:
    """R's results of this method; on a hard case those of the same problem exactly re-expressed, if exact."""
    facts = load_case(name).facts
    key = "results_alt" if exact and "results_alt" in facts else "results"
    return [result for result in facts[key] if result["method"] == method]


def fitted(name: str) -> Fit:
    return fit_design(load_case(name).design())


def says_nothing(result: dict) -> bool:
    """Whether R stopped, or printed NaN or Inf."""
    return "error" in result or not math.isfinite(as_number(result["statistic"]))


def same(ours, expected: dict, *, rel: float = 1e-9) -> None:
    """Statistic, degrees of freedom and p."""
    label = (expected["method"], expected["args"])
    assert ours.applies, (label, ours.reason)
    assert ours.statistic == pytest.approx(as_number(expected["statistic"]), rel=rel), label
    assert np.atleast_1d(ours.df).tolist() == np.atleast_1d(expected["df"]).tolist(), label
    same_p(ours.p, as_number(expected["p"]), label)


def same_p(ours: float, expected: float, label: object = "") -> None:
    if expected == 0.0:
        assert ours < 1e-15, label  # R prints 1 - P there
    elif expected < 1e-10:
        assert math.log(ours) == pytest.approx(math.log(expected), rel=1e-7), label
    else:
        assert ours == pytest.approx(expected, rel=1e-7), label


def made_fit(
    n: int = 60, k: int = 3, *, seed: int = 1, intercept: bool = True, order=None, scale: float = 1.0,
    shift: float = 0.0,
) -> Fit:
    """A fit of made-up numbers whose spread grows with the first predictor."""
    rng = np.random.default_rng(seed)
    x = rng.normal(size=(n, k))
    y = 1 + x.sum(axis=1) + rng.normal(size=n) * (1 + 0.5 * np.abs(x[:, 0]))
    return fit_of(y, x * scale + shift, intercept=intercept, order=order)


def fit_of(y, x, *, intercept: bool = True, order=None) -> Fit:
    columns = [Numeric(f"x{j + 1}", x[:, j]) for j in range(x.shape[1])]
    return fit_design(build_design(np.asarray(y), columns, intercept=intercept, order=order))
