"""Regressions for the property tests: regular ones from a seed, awkward ones drawn cell by cell."""

from __future__ import annotations

import numpy as np
from hypothesis import assume
from hypothesis import strategies as st

from sheetfuncs.core.design import Category, Design, Numeric, build_design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.form import reset
from sheetfuncs.core.independence import breusch_godfrey, durbin_watson
from sheetfuncs.core.influence import outlier_test, press
from sheetfuncs.core.mean import residual_mean
from sheetfuncs.core.normality import jarque_bera, shapiro_wilk
from sheetfuncs.core.results import Result
from sheetfuncs.core.variance import breusch_pagan
from sheetfuncs.errors import SheetfuncsError

SEEDS = st.integers(0, 2**32 - 1)


def numeric(x: np.ndarray) -> list[Numeric]:
    return [Numeric(f"x{j + 1}", x[:, j]) for j in range(x.shape[1])]


def fitted(y: np.ndarray, x: np.ndarray, **options: object) -> Fit:
    return fit_design(build_design(y, numeric(x), **options))


@st.composite
def regular(draw, fewest: int = 12, most: int = 40) -> tuple[np.ndarray, np.ndarray]:
    """A response (n,) and predictors (n, k) that are normal draws, moderately related, away from zero."""
    random = np.random.default_rng(draw(SEEDS))
    n, k = draw(st.integers(fewest, most)), draw(st.integers(1, 4))
    x = random.normal(size=(n, k)) @ (np.eye(k) + 0.3 * random.normal(size=(k, k))) + random.normal(3, 2, size=k)
    # No design whose columns all but coincide: those have tests of their own, at tolerances of their own.
    assume(np.linalg.cond((x - x.mean(axis=0)) / x.std(axis=0)) < 100)
    return x @ random.normal(size=k) + random.normal(size=n) + 5, x


@st.composite
def with_category(draw) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Response, one numeric predictor, and codes of three levels that all occur."""
    random = np.random.default_rng(draw(SEEDS))
    n = draw(st.integers(15, 40))
    codes = random.permutation(np.arange(n) % 3)
    x = random.normal(size=(n, 1)) + codes[:, None]
    return 2 + x[:, 0] - codes + random.normal(size=n), x, codes


_CELLS = st.integers(-3, 3).map(float) | st.sampled_from([0.1, 0.2, 0.3, 1e6, -1e6, 1e-6])


@st.composite
def awkward(draw) -> Design:
    """Few rows, many ties, exact relations, wild scales: what a range in a workbook may hold. Refused ones do not
    come out of here, so that what does has a Fit or is refused by the factorization."""
    n, k = draw(st.integers(1, 12)), draw(st.integers(0, 3))
    columns = st.lists(_CELLS, min_size=n, max_size=n).map(np.array)
    scales = st.sampled_from([1.0] * 4 + [1e9, 1e-9, 1e100, 1e-100])
    y = draw(columns) * draw(scales) + draw(st.sampled_from([0.0] * 3 + [1e9]))
    predictors: list[Numeric | Category] = [Numeric(f"x{j}", draw(columns) * draw(scales)) for j in range(k)]
    if draw(st.booleans()):
        codes = np.array(draw(st.lists(st.integers(0, 2), min_size=n, max_size=n)))
        levels = np.unique(codes)
        predictors.append(Category("site", tuple("abc"[i] for i in levels), np.searchsorted(levels, codes)))
    order = np.array(draw(st.lists(st.integers(0, 5), min_size=n, max_size=n))) if draw(st.booleans()) else None
    try:
        return build_design(y, predictors, intercept=draw(st.booleans()), order=order)
    except SheetfuncsError:
        assume(False)
        raise


def every_test(fit: Fit) -> list[Result]:
    """Every result of the core on this fit, all variants."""
    return [*serial_tests(fit), *row_order_free_tests(fit)]


def serial_tests(fit: Fit) -> list[Result]:
    return [
        durbin_watson(fit),
        *(
            breusch_godfrey(fit, lags, distribution=distribution, before_first=before_first)
            for lags in (1, 3) for distribution in ("chi-square", "F") for before_first in ("zeros", "omitted")
        ),
    ]


def row_order_free_tests(fit: Fit) -> list[Result]:
    return [
        residual_mean(fit), breusch_pagan(fit), breusch_pagan(fit, studentize=False), shapiro_wilk(fit),
        jarque_bera(fit), *(reset(fit, powers, of=of) for powers in ((2,), (2, 3)) for of in ("fitted", "predictors")),
        outlier_test(fit), press(fit),
    ]


def assert_same(one: list[Result], other: list[Result], rel: float = 1e-8, without: tuple[str, ...] = ()) -> None:
    """The same figures, except of the methods `without`; those in the response's units do not take part."""
    for a, b in zip(one, other, strict=True):
        if a.method in (*without, "residual_mean", "press"):
            continue
        label = f"{a.method} {dict(a.args)}: {a} against {b}"
        assert a.applies == b.applies, label
        if a.applies:
            np.testing.assert_allclose(a.statistic, b.statistic, rtol=rel, atol=rel, err_msg=label)
            assert a.df == b.df, label
            if a.p is not None:
                np.testing.assert_allclose(a.p, b.p, rtol=100 * rel, atol=1e-12, err_msg=label)
