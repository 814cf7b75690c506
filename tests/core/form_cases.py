"""What the tests of form, rows and remedies share: fits of the reference cases with R's results, and awkward data."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
from hypothesis import strategies as st
from reference_cases import NAMES, ROUNDING_NOISE, as_number, load_case

from sheetfuncs.core.design import Design, Numeric, build_design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.errors import SheetfuncsError

# R's fit loses digits or drops a column in these; their results_alt are of the same problem exactly re-expressed.
RE_EXPRESSED = tuple(name for name in NAMES if "results_alt" in load_case(name).facts)
MEANINGFUL = tuple(name for name in NAMES if name not in ROUNDING_NOISE)
SEEDS = st.integers(0, 2**32 - 1)


def design_of(name: str) -> Design:
    """The case's design; without the constant column that is refused beside an intercept."""
    return load_case(name).design(("x1",) if name == "syn_constcol_a" else None)


def fit_case(name: str) -> Fit:
    return fit_design(design_of(name))


def r_results(name: str, method: str) -> list[dict[str, Any]]:
    """R's results of this method, where it needs them on the problem re-expressed."""
    case = load_case(name)
    results = case.facts["results_alt"] if name in RE_EXPRESSED else case.results
    return [result for result in results if result["method"] == method]


# The problem is re-expressed for R with another column or another zero: these coefficients are not the same ones.
OTHER_COEFFICIENT = {"syn_nearcol_a": ("intercept", "x1", "x2", "d"), "syn_offset_a": ("intercept",)}


def r_fits(name: str, method: str) -> list[dict[str, Any]]:
    """R's fits by this method: as `r_results`, but in the units of the data."""
    if name == "syn_tiny_a":
        return [result for result in load_case(name).results if result["method"] == method]
    return r_results(name, method)


def same_terms(name: str, terms: tuple[str, ...], ours: np.ndarray, expected: dict[str, Any], tolerance: float) -> int:
    """Compare a figure of each term that is the same coefficient in both; returns how many were."""
    mine = dict(zip(terms, ours.tolist(), strict=True))
    kept = {load_case(name).term(term): as_number(value) for term, value in expected.items()}
    kept = {term: value for term, value in kept.items() if term not in OTHER_COEFFICIENT.get(name, ())}
    assert kept.keys() <= mine.keys()
    np.testing.assert_allclose([mine[term] for term in kept], list(kept.values()), rtol=tolerance)
    return len(kept)


def r_numbers(values: dict[str, Any] | list[Any]) -> np.ndarray:
    return np.array([as_number(value) for value in (values.values() if isinstance(values, dict) else values)])


def design_with(y: np.ndarray, x: np.ndarray, **options: object) -> Design:
    columns = [Numeric(f"x{j + 1}", x[:, j]) for j in range(x.shape[1])]
    return build_design(np.asarray(y, float), columns, **options)


def fit_of(y: np.ndarray, x: np.ndarray, **options: object) -> Fit:
    return fit_design(design_with(y, x, **options))


def regression(seed: int, n: int, k: int = 3) -> tuple[np.ndarray, np.ndarray]:
    """A positive response (n,) that bends a little, and predictors (n, k), away from zero."""
    random = np.random.default_rng(seed)
    x = random.normal(3.0, 1.0, size=(n, k))
    return np.exp(0.2 * (x @ np.linspace(1.0, -0.5, k) + random.normal(size=n))) * 10.0, x


def raw(design: Design) -> np.ndarray:
    """The design's matrix (n, p) with its constant."""
    return np.column_stack([np.ones(design.n), design.columns]) if design.intercept else design.columns


@st.composite
def awkward_fits(draw) -> Fit | None:
    """Few rows, ties, exact relations, wild scales; None where the fit is refused."""
    n, k = draw(st.integers(2, 12)), draw(st.integers(0, 3))
    cells = st.integers(-3, 3).map(float) | st.sampled_from([0.1, 0.2, 0.3, 1e6, -1e6, 1e-6])
    column = st.lists(cells, min_size=n, max_size=n).map(np.array)
    y = draw(column)
    if draw(st.booleans()):
        y = np.abs(y) + draw(st.sampled_from([0.0, 0.5, 1e6]))
    x = np.column_stack([draw(column) for _ in range(k)]) if k else np.empty((n, 0))
    try:
        return fit_of(y, x, intercept=draw(st.booleans()))
    except SheetfuncsError:
        return None


def assert_fit_or_reason(result: Any) -> None:
    """A remedy's answer: finite figures that JSON can hold, or a reason in a sentence."""
    if result.applies:
        assert np.isfinite(result.coefficients).all()
        assert (result.standard_errors > 0).all()
        json.dumps(result.to_dict(), allow_nan=False)
    else:
        assert result.reason.endswith(".")
