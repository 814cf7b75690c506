"""How a call is read: arguments by place and name, options and their kinds, refusals as error values."""

from __future__ import annotations

import doctest
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import sheetfuncs
from sheetfuncs.cells.block import Block
from sheetfuncs.functions.evaluate import evaluate, why
from sheetfuncs.functions.registry import REGISTRY, WorksheetFunction

# Invented: hours for batches of tiles, by area and by number of colours.
AREA = [12.0, 18.0, 25.0, 31.0, 40.0, 44.0, 52.0, 61.0, 70.0, 75.0, 83.0, 91.0]
COLOURS = [1.0, 3.0, 2.0, 1.0, 4.0, 2.0, 3.0, 1.0, 2.0, 4.0, 3.0, 2.0]
HOURS = [3.1, 5.6, 5.9, 5.8, 10.2, 9.1, 11.5, 11.0, 13.4, 16.9, 16.6, 17.2]

RESPONSE = [[hours] for hours in HOURS]
PREDICTORS = [list(row) for row in zip(AREA, COLOURS, strict=True)]
EXTRA = {"at": [[50.0, 2.0]], "row_count": 12, "predictor_count": 2}

ON_PREDICTORS = [f for f in REGISTRY.values() if any(a.name == "predictors" for a in f.arguments)]

functions = pytest.mark.parametrize("function", REGISTRY.values(), ids=lambda function: function.name)


def call(function: WorksheetFunction, response: object = RESPONSE, predictors: object = PREDICTORS, **options: object):
    """Evaluate any function on these blocks."""
    values = {"response": response, "predictors": predictors} | EXTRA
    given = {a.name: values[a.name] for a in function.arguments if a.name in values}
    return evaluate(function.name, **(given | options))


@functions
def test_every_function_gives_what_it_declares(function: WorksheetFunction):
    value = call(function)
    if function.returns == "number":
        assert type(value) is float
    elif function.returns == "text":
        assert value == "ok"
    else:
        width = (len(function.columns) or 1) + (1 + len(PREDICTORS[0])) * bool(function.term_columns)
        assert {len(row) for row in value} == {width}
        assert all(type(cell) is float or isinstance(cell, str) for row in value for cell in row)
        assert not any(str(cell).startswith("#") for row in value for cell in row)


@functions
def test_the_same_value_by_place_by_name_and_from_blocks(function: WorksheetFunction):
    by_name = call(function)
    values = {"response": RESPONSE, "predictors": PREDICTORS} | EXTRA
    places = [values.get(a.name, a.default) for a in function.arguments]
    blocks = [Block.from_rows(p) if isinstance(p, list) else p for p in places]
    tuples = [tuple(map(tuple, p)) if isinstance(p, list) else p for p in places]
    omitted = [values.get(a.name) for a in function.arguments]
    assert by_name == evaluate(function.name, *places) == evaluate(function.name, *blocks)
    assert by_name == evaluate(function.name, *tuples) == evaluate(function.name, *omitted)
    assert by_name == evaluate(f" {function.name.lower()} ", *places) == sheetfuncs.evaluate(function.name, *places)


@functions
def test_wrong_names_and_too_many_arguments_are_type_errors(function: WorksheetFunction):
    with pytest.raises(TypeError, match=f"{function.name} has no argument 'colour'"):
        call(function, colour=1)
    with pytest.raises(TypeError, match="takes at most"):
        evaluate(function.name, *[None] * (len(function.arguments) + 1))
    with pytest.raises(TypeError, match="twice"):
        evaluate(function.name, RESPONSE, **{function.arguments[0].name: RESPONSE})


@functions
def test_a_missing_argument_is_a_value_error(function: WorksheetFunction):
    assert evaluate(function.name) == "#VALUE!"
    assert "is missing" in why(function.name)
    for argument in function.arguments:
        if not argument.optional:
            assert call(function, **{argument.name: None}) == "#VALUE!"
            if argument.kind != "range":
                assert call(function, **{argument.name: [[None]]}) == "#VALUE!"  # a blank cell


def test_an_unknown_function():
    for name in ("FIT_NOTHING", "", "SUM", None, 3):
        assert evaluate(name, RESPONSE, PREDICTORS) == "#NAME?"  # type: ignore[arg-type]
    assert "did you mean FIT_VIF" in why("FIT_VFI", PREDICTORS)


@functions
def test_intercept_may_be_a_boolean_or_zero_or_one(function: WorksheetFunction):
    with_constant, without = call(function, intercept=True), call(function, intercept=False)
    blocks = [Block.from_rows([[True]]), Block.from_rows([[1.0]])]
    for yes in (1, 1.0, np.float64(1), [[True]], *blocks, None, "", [[None]]):
        assert call(function, intercept=yes) == with_constant
    for no in (0, 0.0, np.False_, [[False]], Block.from_rows([[False]])):
        assert call(function, intercept=no) == without
    for wrong in ("TRUE", "yes", 2, -1.0, 0.5, [[True, False]], [[True], [True]], [], Block.from_rows([[1.0, 1.0]])):
        assert call(function, intercept=wrong) == "#VALUE!"


OPTIONS = [(f, a) for f in REGISTRY.values() for a in f.arguments if a.kind != "range"]
options = pytest.mark.parametrize(("function", "option"), OPTIONS, ids=lambda part: part.name)


@options
def test_an_error_given_as_an_option_comes_back(function, option):
    for error in ("#N/A", "#DIV/0!", "#NAME?", "#REF!"):
        assert call(function, **{option.name: error}) == error
        assert call(function, **{option.name: [[error]]}) == error
        assert call(function, **{option.name: Block.from_rows([[error]])}) == error


@functions
def test_an_error_in_place_of_a_range_comes_back(function):
    for argument in function.arguments:
        if argument.kind == "range":
            assert call(function, **{argument.name: "#REF!"}) == "#REF!"


@options
def test_options_of_a_wrong_kind_are_value_errors(function, option):
    wrong = {
        "number": ["0.9", True, float("nan"), float("inf"), 10**400, object(), 1j, b"1", {}, -1],
        "whole number": ["2", True, 1.5, float("nan"), float("-inf"), 10**400, object(), [1], -3],
        "choice": [1, True, 0.0, "other", "#no error", object(), []],
        "yes or no": ["TRUE", 2, object()],
        "column": ["no such header", True, 1.5, 0, 3, -1, float("nan"), 10**400, object()],
    }
    beyond = [] if option.lowest is None else [option.lowest - 0.1, option.lowest - 1]
    beyond += [] if option.highest is None else [option.highest + 0.1, option.highest + 1]
    for value in wrong[option.kind] + beyond:
        assert call(function, **{option.name: value}) == "#VALUE!", value


@options
def test_the_default_is_what_an_omitted_option_means(function, option):
    if option.default is not None:
        assert call(function, **{option.name: option.default}) == call(function)


@options
def test_choices_are_read_in_any_case(function, option):
    for word in option.choices:
        value = call(function, **{option.name: word})
        assert value == call(function, **{option.name: word.upper()}) == call(function, **{option.name: f" {word} "})


def test_refusals_are_the_error_of_their_kind():
    assert evaluate("FIT_PRESS", RESPONSE[:5], PREDICTORS) == "#VALUE!"  # unequal heights
    assert evaluate("FIT_PRESS", [["many"], *RESPONSE[1:6], ["x"]], PREDICTORS[:7]) == "#VALUE!"  # text
    assert evaluate("FIT_PRESS", RESPONSE[:2], PREDICTORS[:2]) == "#NUM!"  # too few rows
    assert evaluate("FIT_PRESS", RESPONSE, [[a, 2 * a] for a in AREA]) == "#NUM!"  # collinear
    assert evaluate("FIT_DURBIN_WATSON", [[2 * a + 1] for a in AREA], PREDICTORS) == "#NUM!"  # perfect fit
    assert evaluate("FIT_BREUSCH_GODFREY_P", RESPONSE, PREDICTORS, 500) in ("#N/A", "#NUM!")


def test_the_example_gives_what_it_shows():
    assert doctest.testmod(sys.modules[evaluate.__module__]) == (0, 1)


def test_why_gives_the_sentence_behind_an_error():
    assert why("FIT_DURBIN_WATSON", RESPONSE, PREDICTORS) == "ok"
    assert "perfect" in why("FIT_DURBIN_WATSON", [[2 * a + 1] for a in AREA], PREDICTORS)
    assert why("FIT_BREUSCH_PAGAN_P", RESPONSE, PREDICTORS, "raw") == (
        'The argument variant is the text "raw"; it may be "studentized" or "original".'
    )
    assert why("FIT_BREUSCH_GODFREY_P", RESPONSE, PREDICTORS, 0.5) == (
        "The argument lags is 0.5; it may be a whole number from 1."
    )
    assert why("FIT_VIF", PREDICTORS, 3) == (
        "There is no predictor 3: give a place from 1 to 2, or one of predictor 1, predictor 2."
    )


@pytest.mark.parametrize("range_", [3.0, "text", True, [1.0, 2.0], object(), [[object()]], {}, [], [[]], [[], []]])
def test_ranges_that_are_none_are_errors_too(range_):
    for function in ON_PREDICTORS:
        value = call(function, predictors=range_)
        assert value in ("#VALUE!", "#NUM!") or (function.returns == "text" and value.endswith("."))


IN_TIME = ("FIT_GOLDFELD_QUANDT_P", "FIT_RAINBOW_P", "FIT_HARVEY_COLLIER_P")


def test_order_changes_the_tests_in_time_only():
    order = [[float(-i)] for i in [3, 1, 2, 7, 5, 4, 6, 12, 9, 8, 11, 10]]
    for function in ON_PREDICTORS:
        if function.arguments[-1].name == "order":
            in_time = function.group == "independence" or function.name in IN_TIME
            assert (call(function, order=order) != call(function)) == in_time, function.name


def test_order_gives_what_sorting_the_rows_gives():
    order = [3.0, 1.0, 2.0, 7.0, 5.0, 4.0, 6.0, 12.0, 9.0, 8.0, 11.0, 10.0]
    rank = np.argsort(order)
    for name in ("FIT_DURBIN_WATSON", "FIT_BREUSCH_GODFREY_P"):
        expected = evaluate(name, [RESPONSE[i] for i in rank], [PREDICTORS[i] for i in rank])
        assert evaluate(name, RESPONSE, PREDICTORS, order=[[v] for v in order]) == pytest.approx(expected, rel=1e-12)


def test_vif_of_one_predictor():
    headed = [["Area", "Colours"], *PREDICTORS]
    both = evaluate("FIT_VIF", headed)
    assert both == evaluate("FIT_VIF", PREDICTORS)
    correlation = np.corrcoef(AREA, COLOURS)[0, 1]
    assert both == [[pytest.approx(1 / (1 - correlation**2), rel=1e-12)]] * 2
    assert evaluate("FIT_VIF", headed, "colours") == evaluate("FIT_VIF", headed, 2.0) == both[1][0]
    assert evaluate("FIT_VIF", [[a] for a in AREA]) == [[pytest.approx(1.0, rel=1e-15)]]


@pytest.mark.parametrize("name", ["FIT_DURBIN_WATSON", "FIT_COEFFICIENTS", "FIT_BREUSCH_PAGAN_P", "FIT_NORMALITY_P"])
def test_the_first_answer_loads_nothing_slow(name):
    program = (
        f"import sys, sheetfuncs\nvalue = sheetfuncs.evaluate({name!r}, {RESPONSE!r}, {PREDICTORS!r})\n"
        "assert not isinstance(value, str), value\n"
        "assert not {'scipy.stats', 'statsmodels', 'pandas', 'xlwings', 'lxml', 'xlsxwriter'} & sys.modules.keys()\n"
    )
    root = Path(sheetfuncs.__file__).parents[1]
    run = subprocess.run([sys.executable, "-c", program], cwd=root, capture_output=True, text=True)
    assert run.returncode == 0, run.stderr
