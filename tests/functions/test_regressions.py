"""The store of recent regressions: the same cells are fitted once, other cells never answer for them."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from sheetfuncs.cells.block import Block
from sheetfuncs.errors import CollinearPredictorsError, TooFewRowsError
from sheetfuncs.functions import regressions
from sheetfuncs.functions.evaluate import evaluate
from sheetfuncs.functions.regressions import Recent, content_key, find_regression

ROWS = 20
RNG = np.random.default_rng(5)
X = RNG.normal(size=(ROWS, 2))
Y = 3 + X @ [1.0, -2.0] + RNG.normal(size=ROWS)
RESPONSE, PREDICTORS = [[v] for v in Y.tolist()], X.tolist()


@pytest.fixture(autouse=True)
def _empty_store():
    regressions.RECENT.clear()


@pytest.fixture
def fits(monkeypatch) -> list[int]:
    """Grows by one with each fit that is really made."""
    made: list[int] = []
    fit_design = regressions.fit_design
    monkeypatch.setattr(regressions, "fit_design", lambda design: made.append(design.n) or fit_design(design))
    return made


def test_many_formulas_on_one_range_fit_once(fits):
    for name in ("FIT_DURBIN_WATSON", "FIT_PRESS", "FIT_WHY", "FIT_RESIDUALS", "FIT_COEFFICIENTS"):
        evaluate(name, RESPONSE, PREDICTORS)
    evaluate("FIT_PRESS", Block.from_rows(RESPONSE), Block.from_rows(PREDICTORS))
    assert fits == [ROWS]


def test_another_cell_option_or_order_fits_again(fits):
    changed = [list(row) for row in PREDICTORS]
    changed[7][1] += 1e-12
    values = {
        evaluate("FIT_DURBIN_WATSON", RESPONSE, PREDICTORS),
        evaluate("FIT_DURBIN_WATSON", RESPONSE, PREDICTORS, False),
        evaluate("FIT_DURBIN_WATSON", RESPONSE, PREDICTORS, order=[[float(i % 7)] for i in range(ROWS)]),
        evaluate("FIT_DURBIN_WATSON", RESPONSE, changed),
        evaluate("FIT_DURBIN_WATSON", RESPONSE[:-1], PREDICTORS[:-1]),
    }
    assert len(fits) == 5
    assert len(values) >= 4


def test_a_refusal_is_remembered_without_its_traceback():
    response, collinear = Block.from_rows(RESPONSE), Block.from_rows([[a, 2 * a] for a, _ in PREDICTORS])
    raised = []
    for _ in range(2):
        with pytest.raises(CollinearPredictorsError) as refused:
            find_regression(response, collinear, None, intercept=True)
        raised.append(refused.value)
    assert str(raised[0]) == str(raised[1])
    assert raised[0].predictors == raised[1].predictors != ()
    kept = regressions.RECENT.get(content_key((response, collinear, None), True))
    assert kept is not raised[1]
    assert kept.__traceback__ is None
    assert kept.__context__ is None


def block(rows: list[list[object]], **place: object) -> Block:
    return Block.from_rows(rows, **place)


@pytest.mark.parametrize(
    "other",
    [
        block([[1.0, 2.0], [3.0, 5.0]]),
        block([[1.0, 3.0], [2.0, 4.0]]),
        block([[1.0], [2.0], [3.0], [4.0]]),
        block([[1.0, 2.0, 3.0, 4.0]]),
        block([[1.0, 2.0], [3.0, None]]),
        block([[1.0, 2.0], [3.0, "4"]]),
        block([[1.0, 2.0], [3.0, "#N/A"]]),
        block([[True, 2.0], [3.0, 4.0]]),
        block([[1.0, 2.0], [3.0, 4.0]], first_row=2),
        block([[1.0, 2.0], [3.0, 4.0]], first_column=2),
        block([[1.0, 2.0], [3.0, 4.0]], sheet="Jobs"),
        block([[1.0, 2.0], [3.0, 4.0]], date1904=True),
        block([[1.0, 2.0], [3.0, 4.0]], hidden=np.array([False, False])),
        block([[1.0, 2.0], [3.0, 4.0]], hidden=np.array([False, True])),
        block([[1.0, 7.0, 2.0], [3.0, 7.0, 4.0]]).columns([0, 2]),
        Block(np.array([[1.0, 3.0], [2.0, 4.0]]), np.ones((2, 2), np.uint8)),
        None,
    ],
)
def test_keys_differ_with_every_part_of_a_block(other):
    here = block([[1.0, 2.0], [3.0, 4.0]])
    assert content_key((here,)) != content_key((other,))
    assert content_key((here, other)) != content_key((other, here))


def test_keys_differ_by_text_and_its_place():
    texts = [[["a", "b"]], [["b", "a"]], [["ab", ""]], [["", "ab"]], [["a\0", "b"]], [["a", "\0b"]], [["\ud800", "b"]]]
    assert len({content_key((block(rows),)) for rows in texts}) == len(texts)


def test_keys_do_not_depend_on_layout():
    rows = block([[1.0, 2.0], [3.0, "x"]])
    other = Block(np.ascontiguousarray(rows.numbers), np.ascontiguousarray(rows.kinds), rows.texts)
    assert rows.numbers.flags.f_contiguous
    assert content_key((rows,), True) == content_key((other,), True) != content_key((rows,), False)


def test_the_store_is_bounded_in_bytes_and_keeps_what_was_used_last():
    def find(height: int) -> regressions.Regression:
        return find_regression(
            Block.from_rows(RESPONSE[:height]), Block.from_rows(PREDICTORS[:height]), None, intercept=True
        )

    first, second, third = find(20), find(19), find(18)
    store = Recent(max_bytes=first.size + second.size)
    store.put(b"1", first)
    store.put(b"2", second)
    store.put(b"2", second)
    assert store.size == first.size + second.size
    assert store.get(b"1") is first
    store.put(b"3", third)
    assert (store.get(b"1"), store.get(b"2"), store.get(b"3")) == (first, None, third)
    assert store.size == first.size + third.size
    store.put(b"1", TooFewRowsError("Too few."))
    assert store.size < first.size + third.size
    Recent(max_bytes=10).put(b"1", first)


def test_what_is_larger_than_the_store_is_not_kept():
    store = Recent(max_bytes=10_000)
    store.put(b"1", find_regression(Block.from_rows(RESPONSE), Block.from_rows(PREDICTORS), None, intercept=True))
    assert len(store) == store.size == 0


def test_threads_get_their_own_answers(monkeypatch):
    monkeypatch.setattr(regressions, "RECENT", Recent(max_bytes=160_000))  # so that entries come and go
    heights = [8 + i % 12 for i in range(200)]
    expected = {h: evaluate("FIT_PRESS", RESPONSE[:h], PREDICTORS[:h]) for h in set(heights)}
    with ThreadPoolExecutor(4) as pool:
        found = pool.map(lambda h: evaluate("FIT_PRESS", RESPONSE[:h], PREDICTORS[:h]), heights)
    assert list(found) == [expected[h] for h in heights]


def test_key_follows_cells_that_may_be_written_to():
    written = block([[1.0], [2.0]])
    before = content_key((written,))
    written.numbers[1, 0] = 3.0
    assert content_key((written,)) != before
    for array in (written.numbers, written.kinds):
        array.flags.writeable = False
    assert content_key((written,)) == content_key((written,)) == content_key((block([[1.0], [3.0]]),))
