"""One formula as text: what is parsed, what is refused with a sentence, and its value."""

from __future__ import annotations

from contextlib import suppress

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.cells.block import Block
from sheetfuncs.errors import AddressError, ArgumentError, SheetfuncsError, UnknownFunctionError
from sheetfuncs.functions.evaluate import evaluate
from sheetfuncs.functions.formula import ParsedCall, RangeText, evaluate_formula, parse_formula


def arguments(text: str) -> list[object]:
    """The parsed arguments, a range as ("range", text)."""
    parsed = parse_formula(f"=FIT_VIF({text})").arguments
    return [("range", a.text) if isinstance(a, RangeText) else a for a in parsed]


@pytest.mark.parametrize(
    "text",
    [
        "=FIT_VIF(Jobs!C4:F64)", "FIT_VIF(Jobs!C4:F64)", " = fit_vif ( Jobs!C4:F64 ) ", "=_xlfn.FIT_VIF(Jobs!C4:F64)",
        "=_xludf.FIT_VIF(Jobs!C4:F64)", "=_xll.FIT_VIF(Jobs!C4:F64)", "=_xlfn._xlws.FIT_VIF(Jobs!C4:F64)",
        "=[1]!FIT_VIF(Jobs!C4:F64)", "{=FIT_VIF(Jobs!C4:F64)}", "=@FIT_VIF(Jobs!C4:F64)",
        "=sheetfuncs.xlam!FIT_VIF(Jobs!C4:F64)", r"='C:\Add-ins (ours)\sheetfuncs.xlam'!FIT_VIF(Jobs!C4:F64)",
        "=ORG.SHEETFUNCS.CALC.FUNCTIONS.FITVIF(Jobs!C4:F64)",
    ],
)
def test_a_call_is_read_however_a_file_writes_it(text):
    assert parse_formula(text) == ParsedCall("FIT_VIF", (RangeText("Jobs!C4:F64"),))


@pytest.mark.parametrize(
    "text",
    [
        "C4", "$C$4:$F$64", "C:F", "Jobs!C:F", "'Job list'!C4:F64", "'It''s, (new); list'!C4:F64", "Jobs[Cost]",
        "Kosten", "Jobs[[#All],[Cost, net]:[Holes]]", "Jobs[[#Data],[Cost]]", "Jobs['[odd'] name]",
        "[Book.xlsx]Jobs!C4:F64", "$Jobs.C4:F64", "'C:\\a b\\[Book.xlsx]Jobs'!C4", "A1#",
        "Jobs!#REF!", "Année!C4:F64", "Jobs[Cost (net)]",
    ],
)
def test_a_range_is_kept_as_it_is_written(text):
    assert arguments(text) == [("range", text)]
    assert arguments(f"{text}, 2") == [("range", text), 2.0]
    assert arguments(f" {text} ;2") == [("range", text), 2.0]


@pytest.mark.parametrize(
    ("text", "values"),
    [
        ('1,-2,+3,.5,1e-3,1E+2,50%', [1.0, -2.0, 3.0, 0.5, 0.001, 100.0, 0.5]),
        ("0,95;-1,5e2;2", [0.95, -150.0, 2.0]),
        ('"plain","say ""so""",""', ["plain", 'say "so"', ""]),
        ('"a,b;c)","=SUM(A1)"', ["a,b;c)", "=SUM(A1)"]),
        ("TRUE,false,True(),FALSE( )", [True, False, True, False]),
        (",,", [None, None, None]),
        ("1,,2", [1.0, None, 2.0]),
        ("1;;2", [1.0, None, 2.0]),
        ("", []),
        ("#N/A,#div/0!", ["#N/A", "#DIV/0!"]),
        ("{1,2;3,4}", [((1.0, 2.0), (3.0, 4.0))]),
        ('{1;"a;""b";TRUE}', [((1.0,), ('a;"b',), (True,))]),
        ("{1\\2,5;3\\4};2", [((1.0, 2.5), (3.0, 4.0)), 2.0]),
    ],
)
def test_values(text, values):
    assert arguments(text) == values
    assert [type(value) for value in arguments(text)] == [type(value) for value in values]


@pytest.mark.parametrize(
    ("text", "part"),
    [
        ("", "is not a call of one function"),
        ("=Jobs!C4:F64", "is not a call of one function"),
        ("=1+FIT_VIF(A1)", "is not a call of one function"),
        ("=FIT_VIF(A1:B9)*2", "holds “*2”"),
        ("=FIT_VIF(A1:B9*2)", "holds “A1:B9*2”"),
        ("=FIT_VIF(A1:B9 C1:D9)", "holds “A1:B9 C1:D9”"),
        ("=FIT_VIF((A1:A9,C1:C9))", "holds “(A1:A9,C1:C9)”"),
        ("=FIT_VIF(A1:B9;C1,C2)", "holds “C1,C2”"),
        ("=FIT_VIF(Job list!A1:B9)", "holds “Job list!A1:B9”"),
        ("=FIT_VIF(OFFSET(A1,1,1))", "calls OFFSET inside another function"),
        ("=FIT_VIF(A1:B9,-ROW())", "calls ROW inside another function"),
        ("=FIT_VIF(A1:B9", "do not pair at its end"),
        ('=FIT_VIF("A1:B9)', 'do not pair at "'),
        ("=FIT_VIF('Jobs!A1:B9)", "do not pair at '"),
        ("=FIT_VIF(Jobs[Cost)", "do not pair at ["),
        ("=FIT_VIF({1,2)", "do not pair at {"),
        ("=FIT_VIF(A1})", "do not pair at }"),
        ("=FIT_VIF({1,A1})", "holds an array"),
        ("=FIT_VIF({1,,2})", "holds an array"),
        ("=FIT_VIF(" + "A" * 9_000 + ")", "a cell holds at most"),
    ],
)
def test_anything_else_is_one_sentence(text, part):
    with pytest.raises(ArgumentError) as refused:
        parse_formula(text)
    assert part in str(refused.value)
    assert len(str(refused.value)) < 300


@given(st.text(alphabet="=FITVAB19(),;:!'\"[]{}#.-+%& \\", max_size=40))
def test_no_text_ends_in_a_traceback(text):
    for formula in (text, f"=FIT_VIF({text})"):
        with suppress(ArgumentError):
            assert isinstance(parse_formula(formula), ParsedCall)


@pytest.mark.parametrize(
    "inside", ['"' * 8_000, "'" * 8_001, "[" * 8_000, "{" + " " * 8_000, "{" * 8_000, "1" * 8_000 + "x"]
)
def test_a_long_text_is_read_in_one_pass(inside):
    with pytest.raises(ArgumentError):
        parse_formula(f"=FIT_VIF(1+{inside})")


ROWS = [[float(i), float(i * i % 7)] for i in range(12)]
RESPONSE = [[float(3 * i + i % 3)] for i in range(12)]


def read(text: str) -> Block:
    if text not in ("Jobs!B2:B13", "Jobs!C2:D13", "Jobs!A1"):
        raise AddressError(f"{text} is not there.")
    return Block.from_rows({"Jobs!B2:B13": RESPONSE, "Jobs!C2:D13": ROWS, "Jobs!A1": [[2.0]]}[text])


def test_a_formula_gives_what_evaluate_gives():
    assert evaluate_formula("=FIT_VIF(Jobs!C2:D13)", read) == evaluate("FIT_VIF", ROWS)
    assert evaluate_formula("=FIT_VIF(Jobs!C2:D13, Jobs!A1)", read) == evaluate("FIT_VIF", ROWS, 2)
    assert evaluate_formula('=FIT_RESIDUALS(Jobs!B2:B13; Jobs!C2:D13; "Leave-One-Out"; FALSE)', read) == evaluate(
        "FIT_RESIDUALS", RESPONSE, ROWS, kind="leave-one-out", intercept=False
    )
    four = [[1, 2], [2, 5], [3, 3], [4, 9]]
    assert evaluate_formula("=FIT_VIF({1,2;2,5;3,3;4,9})", read) == evaluate("FIT_VIF", four)
    assert evaluate_formula("=FIT_VIF(Jobs!C2:D13, 3)", read) == "#VALUE!"


def test_a_range_is_read_once():
    asked = []
    evaluate_formula("=FIT_DURBIN_WATSON(Jobs!B2:B13,Jobs!C2:D13,,Jobs!B2:B13)", lambda t: asked.append(t) or read(t))
    assert asked == ["Jobs!B2:B13", "Jobs!C2:D13"]


@pytest.mark.parametrize(
    ("text", "error", "part"),
    [
        ("=FIT_VFI(Jobs!C2:D13)", UnknownFunctionError, "FIT_VIF"),
        ("=SUM(Jobs!C2:D13)", UnknownFunctionError, "There is no function SUM here"),
        ("=FIT_VIF()", ArgumentError, "needs a range as predictors"),
        ("=FIT_DURBIN_WATSON(Jobs!B2:B13)", ArgumentError, "needs a range as predictors"),
        ("=FIT_VIF(Jobs!C2:D13,1,TRUE,4)", ArgumentError, "at most 3 arguments and 4 were given"),
        ("=FIT_VIF(Jobz!C2:D13)", AddressError, "Jobz!C2:D13 is not there"),
    ],
)
def test_what_no_cell_would_accept_is_a_sentence(text, error, part):
    with pytest.raises(error) as refused:
        evaluate_formula(text, read)
    assert isinstance(refused.value, SheetfuncsError)
    assert part in str(refused.value)
