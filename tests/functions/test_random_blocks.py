"""Whatever stands in the cells, every function gives a number, cells, or an error value: no exception, no warning."""

from __future__ import annotations

import math

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from sheetfuncs.cells.block import ERROR_TEXTS, Block
from sheetfuncs.functions.evaluate import evaluate, why
from sheetfuncs.functions.registry import REGISTRY

ordinary = st.integers(-9, 9).map(float) | st.floats(-1e3, 1e3)
extreme = st.sampled_from(
    [1e308, -1.7e308, 1e200, 1e155, -1e154, 1e100, 1e16, 1e-16, 1e-155, 1e-200, 5e-324, -0.0, 0.0]
)
wild = st.floats() | st.integers(-(10**400), 10**400)
rare = st.sampled_from([None, "", " ", "12", "1,5", "north", "=A1", True, False, *sorted(ERROR_TEXTS)])
text = st.text(max_size=3) | st.sampled_from(["north", "south"])


@st.composite
def column(draw, height: int) -> list[object]:
    """One column: mostly of one sort of cell, so that many regressions get as far as their tests."""
    sort = draw(st.sampled_from([ordinary] * 4 + [extreme, ordinary | extreme, wild, text, st.just(3.0), rare]))
    cells = draw(st.lists(sort, min_size=height, max_size=height))
    if cells and draw(st.booleans()):
        for place in draw(st.lists(st.integers(0, height - 1), max_size=2)):
            cells[place] = draw(rare | ordinary)
    if cells and draw(st.integers(0, 5)) == 0:
        cells[0] = draw(text)
    scale, shift = draw(st.sampled_from([(1.0, 0.0)] * 6 + [(1e-150, 0.0), (1e150, 0.0), (1.0, 1e9), (1e-9, 1e6)]))
    return [cell * scale + shift if type(cell) is float else cell for cell in cells]


@st.composite
def ranges(draw) -> dict[str, object]:
    """A response, predictors, an order and places to predict at; seldom of unequal height or jagged."""
    height = draw(st.integers(0, 3) | st.integers(4, 14))
    count = draw(st.integers(0, 4))
    odd = draw(st.integers(0, 12))
    heights = [height + (odd == 1), height, height + 2 * (odd == 2)]
    response = [[cell] for cell in draw(column(heights[0]))]
    predictors = [list(row) for row in zip(*[draw(column(heights[1])) for _ in range(count)], strict=True)]
    if odd == 3 and predictors:
        predictors[-1].append(1.0)
    order = draw(st.none() | column(heights[2]).map(lambda cells: [[cell] for cell in cells]))
    at = [list(row) for row in zip(*[draw(column(3)) for _ in range(count)], strict=True)]
    return {"response": response, "predictors": predictors, "order": order, "at": at}


any_option = st.none() | wild | rare | text | st.sampled_from([[], [[1.0]], [[1.0, 2.0]], object(), -1, 0, 5])


OPTIONS = {a.name: a for function in REGISTRY.values() for a in function.arguments if a.kind != "range"}


@st.composite
def chosen_options(draw) -> dict[str, object]:
    """Some options, mostly with values that they may have."""
    options = {}
    for argument in draw(st.lists(st.sampled_from(list(OPTIONS.values())), unique=True, max_size=4)):
        usual = st.sampled_from(argument.choices) if argument.choices else st.just(argument.default)
        usual = usual if argument.optional else st.integers(0, 30)
        options[argument.name] = draw(usual | usual | st.integers(0, 3) | any_option)
    return options


def is_cell(cell: object) -> bool:
    return (type(cell) is float and math.isfinite(cell)) or isinstance(cell, str)


@settings(max_examples=1_000, deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large])
@given(ranges(), chosen_options())
def test_a_number_or_rows_or_an_error_value(blocks, chosen):
    as_blocks = {name: Block.from_rows(rows) if isinstance(rows, list) else rows for name, rows in blocks.items()}
    for function in REGISTRY.values():
        given_ranges = {a.name: blocks[a.name] for a in function.arguments if a.kind == "range"}
        options = {a.name: chosen[a.name] for a in function.arguments if a.name in chosen}
        value = evaluate(function.name, **given_ranges, **options)
        if isinstance(value, list):
            assert function.returns in ("column", "table")
            assert value
            assert all(is_cell(cell) for row in value for cell in row)
            terms = 0
            if function.term_columns:
                terms = len(evaluate("FIT_COEFFICIENTS", **given_ranges, **options))
            assert {len(row) for row in value} == {(len(function.columns) or 1) + terms}
            if function.returns == "column" and function.name != "FIT_VIF":
                assert len(value) == len(blocks["response"])
        elif function.returns == "text" and value not in ERROR_TEXTS:
            assert isinstance(value, str)
            assert value == "ok" or value.endswith((".", "..."))
        elif isinstance(value, str):
            assert value in ERROR_TEXTS
            assert why(function.name, **given_ranges, **options).endswith((".", "?"))
        else:
            assert type(value) is float
            assert math.isfinite(value)
            assert function.returns == "number" or options.get("predictor") is not None
            if function.name.endswith("_P"):
                assert 0.0 <= value <= 1.0
        assert evaluate(function.name, **{name: as_blocks[name] for name in given_ranges}, **options) == value
