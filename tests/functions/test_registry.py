"""Declarations: complete, short enough for every host, in the order in which they are listed."""

from __future__ import annotations

import dataclasses
import inspect
import re

import pytest

from sheetfuncs.core.independence import breusch_godfrey
from sheetfuncs.errors import UnknownFunctionError
from sheetfuncs.functions.arguments import allowed
from sheetfuncs.functions.listing import functions_markdown, functions_text
from sheetfuncs.functions.registry import REGISTRY, WorksheetFunction

WITHOUT_RESPONSE = ("FIT_VIF", "FIT_CONDITION")
HELP_LIMIT = 255  # what a spreadsheet's function wizard shows

ORDER = [
    "FIT_COEFFICIENTS", "FIT_FITTED", "FIT_RESIDUALS", "FIT_PREDICT", "FIT_WHY", "FIT_RESIDUAL_MEAN",
    "FIT_DURBIN_WATSON", "FIT_DURBIN_WATSON_P", "FIT_DURBIN_WATSON_BOUNDS", "FIT_BREUSCH_GODFREY_P",
    "FIT_LJUNG_BOX_P", "FIT_AUTOCORRELATION",
    "FIT_BREUSCH_PAGAN_P", "FIT_WHITE_P", "FIT_GOLDFELD_QUANDT_P", "FIT_NORMALITY_P", "FIT_NORMAL_SCORES",
    "FIT_VIF", "FIT_CONDITION", "FIT_RESET_P", "FIT_RAINBOW_P", "FIT_HARVEY_COLLIER_P", "FIT_BOX_COX",
    "FIT_LEVERAGE", "FIT_COOKS_DISTANCE", "FIT_DFFITS", "FIT_OUTLIER_P", "FIT_PRESS", "FIT_ROWS",
]

functions = pytest.mark.parametrize("function", REGISTRY.values(), ids=lambda function: function.name)


def test_the_functions_and_their_order():
    assert list(REGISTRY) == ORDER
    groups = [function.group for function in REGISTRY.values()]
    assert list(dict.fromkeys(groups)) == [
        "fit", "mean", "independence", "constant variance", "normality", "collinearity", "form", "rows",
    ]
    assert groups == sorted(groups, key=groups.index)  # each group in one piece


def test_the_registry_cannot_be_changed():
    with pytest.raises(TypeError):
        REGISTRY["FIT_VIF"] = None
    with pytest.raises(dataclasses.FrozenInstanceError):
        REGISTRY["FIT_VIF"].name = "FIT_OTHER"


@functions
def test_every_text_fits_a_function_wizard(function: WorksheetFunction):
    for text in (function.summary, *(argument.help for argument in function.arguments)):
        assert 20 <= len(text) <= HELP_LIMIT, (len(text), text)
        assert text.endswith((".", ".)")), text
        assert text == " ".join(text.split())


@functions
def test_arguments_are_well_formed(function: WorksheetFunction):
    names = [argument.name for argument in function.arguments]
    assert len(set(names)) == len(names)
    assert all(re.fullmatch("[a-z]+(_[a-z]+)*", name) for name in names)
    optional = [argument.optional for argument in function.arguments]
    assert optional == sorted(optional)  # what may be omitted comes last
    first = ["predictors"] if function.name in WITHOUT_RESPONSE else ["response"]
    if function.name == "FIT_DURBIN_WATSON_BOUNDS":
        first = ["row_count", "predictor_count"]
    assert names[: len(first)] == first
    assert names[-1] == ("order" if first == ["response"] else "intercept")
    for argument in function.arguments:
        assert (argument.kind == "choice") == bool(argument.choices)
        if argument.choices:
            assert argument.default == argument.choices[0]
            assert all(f'"{word}"' in argument.help for word in argument.choices)
            assert argument.choices == tuple(word.lower() for word in argument.choices)
        if argument.default not in (None, True):
            assert str(argument.default) in argument.help
        assert argument.optional or argument.kind == "range" or argument.name in first


@functions
def test_what_comes_back_is_described(function: WorksheetFunction):
    assert function.shape
    assert bool(function.columns) == (function.returns == "table")


@functions
def test_a_p_value_says_what_a_small_one_means(function: WorksheetFunction):
    assert function.name.endswith("_P") == function.summary.startswith("p of ")
    assert function.name.endswith("_P") == ("A small p is evidence" in function.summary)


def test_defaults_are_those_of_the_core():
    core = inspect.signature(breusch_godfrey).parameters
    lags = next(a for a in REGISTRY["FIT_BREUSCH_GODFREY_P"].arguments if a.name == "lags")
    assert lags.default == core["lags"].default == 1
    assert core["distribution"].default == "chi-square"
    assert core["before_first"].default == "zeros"


def test_durbin_watson_help_has_the_direction_right():
    summary = REGISTRY["FIT_DURBIN_WATSON"].summary
    assert "below 2 with positive, above 2 with negative" in summary


def test_allowed_values_in_words():
    words = {a.name: allowed(a) for function in REGISTRY.values() for a in function.arguments}
    assert words["level"] == "a number from 0.5 to 0.9999"
    assert words["lags"] == "a whole number from 1"
    assert words["intercept"] == "TRUE or FALSE"
    assert words["variant"] == '"studentized" or "original"'
    assert words["standard_errors"] == '"ordinary", "hc0", "hc1", "hc2", "hc3", "hc4" or "newey-west"'
    assert words["predictor"] == "a header, or a column's place counted from 1"
    assert words["response"] == "a range"


def test_markdown_lists_every_function_once():
    markdown = functions_markdown()
    rows = re.findall(r"^\| `(\w+)\((.*)\)` \| (.+) \|$", markdown, re.MULTILINE)
    assert [row[0] for row in rows] == ORDER
    for name, arguments, summary in rows:
        assert summary == REGISTRY[name].summary
        assert [a.strip("[]") for a in arguments.split(", ")] == [a.name for a in REGISTRY[name].arguments]


def test_text_lists_every_function():
    text = functions_text()
    assert re.findall(r"FIT_\w+", text) == ORDER
    assert max(map(len, text.splitlines())) <= 100


@functions
def test_text_of_one_function_explains_every_argument(function: WorksheetFunction):
    text = functions_text(function.name.lower())
    flat = " ".join(text.split())
    assert flat.startswith(function.signature)
    assert function.summary in flat
    assert all(f"{a.name}" in flat and a.help in flat for a in function.arguments)
    assert max(map(len, text.splitlines())) <= 100


def test_text_of_an_unknown_function():
    with pytest.raises(UnknownFunctionError, match="did you mean FIT_VIF"):
        functions_text("FIT_VFI")
