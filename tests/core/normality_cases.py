"""What the tests of normality share: fits of the reference cases with R's results, and invariances."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Any

import numpy as np
from hypothesis import strategies as st
from reference_cases import NAMES, load_case

from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.results import Result

# R's fit loses digits or drops a column in these; their results_alt are of the same problem exactly re-expressed.
RE_EXPRESSED = tuple(name for name in NAMES if "r_results_warning" in load_case(name).facts)
# Refused as a design: a constant column beside the intercept.
COMPARED = tuple(name for name in NAMES if name != "syn_constcol_a")
SEEDS = st.integers(0, 2**32 - 1)
FEW = st.integers(10, 40)


def reference(name: str, method: str) -> tuple[Fit, dict[str, Any]]:
    """The fit of a case, and R's result of the method on its residuals."""
    case = load_case(name)
    results = case.facts.get("results_alt", case.results) if name in RE_EXPRESSED else case.results
    found = [result for result in results if result["method"] == method]
    assert len(found) == 1
    return fit_design(case.design()), found[0]


def fit_of(y: np.ndarray, x: np.ndarray | None = None, *, intercept: bool = True) -> Fit:
    """Least squares of y (n,) on the columns of x (n, k), or on a constant alone."""
    columns = [] if x is None else [Numeric(f"x{j + 1}", x[:, j]) for j in range(x.shape[1])]
    return fit_design(build_design(np.asarray(y, dtype=float), columns, intercept=intercept))


def all_alike() -> Fit:
    """A fit without intercept that leaves ten equal residuals."""
    x = np.tile([1.0, -1.0], 5)
    return fit_of(3.0 + 2.0 * x, x[:, None], intercept=False)


def regression(seed: int, n: int) -> tuple[np.ndarray, np.ndarray]:
    """A response (n,) with errors of heavy tails, and three predictors (n, 3)."""
    random = np.random.default_rng(seed)
    x = random.normal(size=(n, 3))
    return x @ [1.0, -2.0, 0.5] + random.standard_t(4, size=n), x


def re_expressed(y: np.ndarray, x: np.ndarray, seed: int) -> Iterator[Fit]:
    """The same regression in other units, from other zeros, with its columns and its rows in another order."""
    random = np.random.default_rng(seed)
    yield fit_of(-3e5 * y, x)
    yield fit_of(y, x * [1e-6, 20.0, 7e4])
    yield fit_of(y + 1e3, x - [5.0, 200.0, 0.0])
    yield fit_of(y + x @ [3.0, 1.0, -7.0], x)
    yield fit_of(y, x[:, [2, 0, 1]])
    rows = random.permutation(y.shape[0])
    yield fit_of(y[rows], x[rows])


def assert_invariant(test: Callable[[Fit], Result], seed: int, n: int) -> None:
    """The statistic and p of the test are the same for every re-expression."""
    y, x = regression(seed, n)
    result = test(fit_of(y, x))
    for fit in re_expressed(y, x, seed):
        other = test(fit)
        assert other.applies
        np.testing.assert_allclose((other.statistic, other.p), (result.statistic, result.p), rtol=1e-8, atol=1e-10)
