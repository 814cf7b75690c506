"""FIT_PREDICT, FIT_COEFFICIENTS and FIT_WHY: tables, categories, and what is said about rows."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from sheetfuncs.cells.block import Block
from sheetfuncs.functions.evaluate import evaluate

# Invented: kilowatt hours of drying rooms, by load and by wood.
LOAD = [3.0, 4.0, 5.5, 6.0, 7.5, 8.0, 9.5, 10.0, 11.5, 12.0]
WOOD = ["ash", "oak", "ash", "larch", "oak", "ash", "larch", "oak", "larch", "ash"]
ENERGY = [11.0, 17.5, 17.0, 22.5, 26.0, 22.5, 31.0, 32.5, 36.5, 31.0]
HEADED = [["Energy"], *[[v] for v in ENERGY]], [["Load", "Wood"], *map(list, zip(LOAD, WOOD, strict=True))]


def matrix() -> np.ndarray:
    return np.column_stack([np.ones(10), LOAD, [w == "oak" for w in WOOD], [w == "larch" for w in WOOD]])


def test_coefficients_name_their_terms():
    found = evaluate("FIT_COEFFICIENTS", *HEADED)
    assert [row[0] for row in found] == ["intercept", "Load", "Wood: oak", "Wood: larch"]
    expected = np.linalg.lstsq(matrix(), np.array(ENERGY), rcond=None)[0]
    assert [row[1] for row in found] == pytest.approx(expected.tolist(), rel=1e-11)
    for _, estimate, error, t, p, low, high in found:
        assert t == pytest.approx(estimate / error)
        assert p == pytest.approx(2 * stats.t.sf(abs(t), 6), rel=1e-9)
        assert (low, high) == pytest.approx(stats.t.interval(0.95, 6, estimate, error), rel=1e-9)


def test_coefficients_without_a_header_are_named_by_letter():
    response, predictors = (block[1:] for block in HEADED)
    terms = [row[0] for row in evaluate("FIT_COEFFICIENTS", response, predictors, intercept=False)]
    assert len(terms) == 3
    assert terms[1].endswith(": oak")


def test_a_wider_level_gives_wider_intervals():
    narrow, wide = (evaluate("FIT_COEFFICIENTS", *HEADED, level=level) for level in (0.5, 0.99))
    assert all(w[5] < n[5] < n[6] < w[6] for n, w in zip(narrow, wide, strict=True))


def test_predictions_against_the_textbook_formula():
    # Draper and Smith (1998), sections 3.1 and 5.2 (sections from memory): s sqrt(h) and s sqrt(1 + h).
    x = matrix()
    coefficients, (rss,), *_ = np.linalg.lstsq(x, np.array(ENERGY), rcond=None)
    place = np.array([1.0, 7.0, 0.0, 1.0])
    h = place @ np.linalg.inv(x.T @ x) @ place
    value, sigma = place @ coefficients, np.sqrt(rss / 6)
    found = evaluate("FIT_PREDICT", *HEADED, [[7.0, "larch"]], level=0.9)
    expected = [
        value, *stats.t.interval(0.9, 6, value, sigma * np.sqrt(h)),
        *stats.t.interval(0.9, 6, value, sigma * np.sqrt(1 + h)),
    ]
    assert found == [pytest.approx(expected, rel=1e-10)]


def test_predictions_at_the_rows_are_the_fitted_values():
    found = evaluate("FIT_PREDICT", *HEADED, HEADED[1])
    assert found[0] == ["value", "average low", "average high", "new low", "new high"]
    fitted = evaluate("FIT_FITTED", *HEADED)
    assert [row[0] for row in found[1:]] == pytest.approx([row[0] for row in fitted[1:]], rel=1e-12)


def test_headed_columns_may_stand_in_any_order():
    usual = evaluate("FIT_PREDICT", *HEADED, [["Load", "Wood"], [7.0, "larch"]])
    assert evaluate("FIT_PREDICT", *HEADED, [["Wood", "Load"], ["larch", 7.0]]) == usual
    assert evaluate("FIT_PREDICT", *HEADED, Block.from_rows([["Wood", "Load"], ["larch", 7.0]])) == usual
    assert usual[1:] == evaluate("FIT_PREDICT", *HEADED, [[7.0, "larch"]])
    below_a_blank_row = [[None, ""], ["Wood", "Load"], ["larch", 7.0]]
    assert evaluate("FIT_PREDICT", *HEADED, below_a_blank_row) == [["#N/A"] * 5, *usual]


def test_rows_without_a_prediction_say_why_in_their_cells():
    undefined = [[None, "larch"], [7.0, ""], ["#DIV/0!", "ash"], ["seven", "ash"], [7.0, "beech"], [7.0, 3.0]]
    found = evaluate("FIT_PREDICT", *HEADED, [[7.0, "larch"], *undefined])
    assert [row[0] for row in found[1:]] == ["#N/A", "#N/A", "#DIV/0!", "#VALUE!", "#VALUE!", "#VALUE!"]
    assert all(len(set(row)) == 1 for row in found[1:])
    assert type(found[0][0]) is float


@pytest.mark.parametrize("at", [[[7.0]], [[7.0, "ash", 1.0]], 7.0, [], [[]], "ash", None])
def test_other_columns_than_the_predictors_are_refused(at):
    assert evaluate("FIT_PREDICT", *HEADED, at) == "#VALUE!"


def test_a_perfect_fit_predicts_without_limits():
    response = [[2 * load] for load in LOAD]
    found = evaluate("FIT_PREDICT", response, [[load] for load in LOAD], [[7.0]])
    assert found == [[pytest.approx(14.0), "#NUM!", "#NUM!", "#NUM!", "#NUM!"]]


def test_why_is_ok_or_says_what_was_left_out():
    assert evaluate("FIT_WHY", *HEADED) == "ok"
    response = [*HEADED[0][:3], [None], *HEADED[0][4:]]
    text = evaluate("FIT_WHY", response, HEADED[1])
    assert text.startswith("ok; 1 of 10 rows left out: row 4 (")


def test_why_names_worksheet_rows():
    response = Block.from_rows([*HEADED[0][:3], ["#N/A"], *HEADED[0][4:]], sheet="Kiln", first_row=21, first_column=2)
    predictors = Block.from_rows(HEADED[1], sheet="Kiln", first_row=21, first_column=3)
    assert "row 24 (" in evaluate("FIT_WHY", response, predictors)


def test_why_stays_short():
    response = [[v] if i % 2 else [None] for i, v in enumerate(ENERGY * 100)]
    text = evaluate("FIT_WHY", response, [[v] for v in LOAD * 100])
    assert "500 of 1000 rows left out" in text
    assert text.endswith(", and 495 more.")
    assert len(text) < 400


@pytest.mark.parametrize(
    ("response", "predictors", "part"),
    [
        ([[1.0], [2.0]], [[1.0], [2.0], [3.0]], ""),
        ([[1.0]], [[1.0]], "rows"),
        ([[v] for v in ENERGY], [[v, 3 * v] for v in LOAD], "determined exactly by"),
        ([[3 * v] for v in LOAD], [[v] for v in LOAD], "perfect"),
        ([[1.0], [3.0], [2.0]], [[1.0, 2.0], [2.0, 5.0], [3.0, 1.0]], "no degrees of freedom"),
    ],
)
def test_why_gives_the_sentence_that_stops_the_fit(response, predictors, part):
    text = evaluate("FIT_WHY", response, predictors)
    assert part in text
    assert not text.startswith(("ok", "#"))
    assert text.endswith(".")
