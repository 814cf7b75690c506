"""1,000 random blocks through the whole check, some as far as the drawn sheet: figures, or a named refusal."""

from __future__ import annotations

import io
import json

import numpy as np
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.observations import read_observations
from sheetfuncs.checking import check_observations
from sheetfuncs.errors import SheetfuncsError
from sheetfuncs.judgement.uses import next_steps, uses
from sheetfuncs.report.draw import draw_report

plain = st.floats(-1e6, 1e6).map(lambda v: round(v, 3))
awkward = st.floats(allow_nan=False, allow_infinity=False) | st.sampled_from([0.0, 1.0, 1e300, 1e-300, 1e9, -5.0])
cell = st.one_of(
    plain, plain, plain, plain, awkward, st.none(), st.just(""), st.booleans(),
    st.sampled_from(["#N/A", "north", "1,5"]),
)
columns = {
    "numbers": plain, "whole": st.integers(0, 5).map(float), "levels": st.sampled_from(["north", "south", "=A1+1"]),
    "mixed": cell, "awkward": awkward, "gaps": st.one_of(plain, plain, plain, st.none()),
}


@st.composite
def tables(draw):
    """Rows of cells: a response, one to four predictors, often a header row."""
    kinds = [draw(st.sampled_from(["numbers", "numbers", "gaps", "mixed", "awkward"]))]
    kinds += draw(st.lists(st.sampled_from(list(columns)), min_size=1, max_size=4))
    height = draw(st.integers(1, 30))
    rows = [[draw(columns[kind]) for kind in kinds] for _ in range(height)]
    if draw(st.booleans()):
        rows.insert(0, [f"{'=@'[j % 2]}head {j}" for j in range(len(kinds))])
    return rows


def checked(rows, intercept, with_order):
    block = Block.from_rows(rows, sheet="Jobs", first_row=3, first_column=2)
    response, predictors = block.columns([0]), block.columns(range(1, block.column_count))
    order = None
    if with_order:
        numbers = np.random.default_rng(0).permutation(block.row_count).astype(float)[:, None]
        order = Block(numbers, np.full(numbers.shape, Kind.DATE, np.uint8), sheet="Jobs", first_row=3, first_column=9)
    observations = read_observations(response, predictors, order, dates="check")
    return check_observations(observations, intercept=intercept, sheet="Jobs", area="B3:F33")


def holds_no_nan(value):
    text = json.dumps(value, allow_nan=False)
    assert "NaN" not in text


@settings(max_examples=1000, suppress_health_check=list(HealthCheck))
@given(tables(), st.booleans(), st.booleans())
def test_figures_or_a_named_refusal(rows, intercept, with_order):
    try:
        check = checked(rows, intercept, with_order)
    except SheetfuncsError as refusal:
        sentence = str(refusal)
        assert len(sentence) > 20
        assert sentence.strip().endswith((".", "?"))
        return
    holds_no_nan(check.to_dict())
    for result in check.statistics:
        if result.applies:
            assert np.isfinite(result.statistic), result
            assert result.p is None or 0.0 <= result.p <= 1.0, result
        else:
            assert result.reason.endswith(".")
    nothing_left = check.fit.nothing_left()
    assert len(uses(check.evidence, nothing_left=nothing_left)) == 3
    assert next_steps(check.evidence, nothing_left=nothing_left)


@settings(max_examples=60, suppress_health_check=list(HealthCheck))
@given(tables(), st.booleans())
def test_what_can_be_checked_can_be_drawn(rows, intercept):
    try:
        check = checked(rows, intercept, False)
    except SheetfuncsError:
        return
    drawn = io.BytesIO()
    draw_report(check, drawn, title="Check of Jobs", data_sheet="Jobs", data_area="B3:F33")
    assert drawn.getvalue().startswith(b"PK")
