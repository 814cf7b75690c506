"""Every spelling of a function's name in formulas, and what only looks like one."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.functions.spellings import CALC_PREFIX, Spellings, calls, leads_to_our_addin

SPELLINGS = Spellings(REGISTRY)
CALC_NAMES = {name: CALC_PREFIX.upper() + name.replace("_", "") for name in REGISTRY}


@pytest.mark.parametrize("name", REGISTRY)
def test_every_function_comes_back_from_every_spelling(name):
    spelled = [CALC_NAMES[name], CALC_NAMES[name].lower(), name.lower()]
    prefixes = ("_xlfn.", "_xludf.", "_xll.", "_XLFN.", "_xlfn._xlws.", "[1]!", "[12]!")
    spelled += [prefix + name for prefix in prefixes]
    for one in spelled:
        assert SPELLINGS.plain(f"1+{one}(A1:B9, 2)*2") == f"1+{name}(A1:B9, 2)*2", one
    assert SPELLINGS.changes(f"{name}(A1)", lambda link: True) == []


@pytest.mark.parametrize(
    ("formula", "plain"),
    [
        ("_xlfn.FIT_VIF (A1)", "FIT_VIF (A1)"),
        ("IF(_xll.FIT_VIF(A1)>3,[1]!fit_press(A1,B1),_xlfn.XLOOKUP(1,A:A,B:B))",
         "IF(FIT_VIF(A1)>3,FIT_PRESS(A1,B1),_xlfn.XLOOKUP(1,A:A,B:B))"),
        ("-_xlfn.SINGLE(_xludf.FIT_VIF(Jobs!A1:B9))", "-_xlfn.SINGLE(FIT_VIF(Jobs!A1:B9))"),
        ("_xlfn.FIT_VIF('It''s fit_vif(x) here'!A1)", "FIT_VIF('It''s fit_vif(x) here'!A1)"),
        ("_xlfn.FIT_VIF([1]Jobs!A1,'[1]Job list'!A1,Jobs[[#All],[fit_vif(x)]])",
         "FIT_VIF([1]Jobs!A1,'[1]Job list'!A1,Jobs[[#All],[fit_vif(x)]])"),
        ("1+#REF!1!fit_vif(A1)+#REF!!ORG.SHEETFUNCS.CALC.FUNCTIONS.FITVIF(A1)+#REF! fit_vif(A1)+#REF!1!other(A1)",
         "1+FIT_VIF(A1)+FIT_VIF(A1)+FIT_VIF(A1)+#REF!1!other(A1)"),
        ("fit_vif(A1)&\"fit_vif(\"\"A1\"\")\"&fit_vif(A2)", "FIT_VIF(A1)&\"fit_vif(\"\"A1\"\")\"&FIT_VIF(A2)"),
    ],
)  # fmt: skip
def test_calls_are_found_between_other_things(formula, plain):
    assert SPELLINGS.plain(formula) == plain
    assert SPELLINGS.plain(plain) == plain


@pytest.mark.parametrize(
    "formula",
    [
        '"_xlfn.FIT_VIF(A1)"', '"a "" _xlfn.FIT_VIF(A1)"', "'_xlfn.FIT_VIF(1)'!A1", "Jobs['[_xlfn.FIT_VIF(]",
        "Jobs[_xlfn.FIT_VIF(x)]", "_xlfn.FIT_VIF", "_xlfn.FIT_VIF+(1)", "_xlfn.FIT_VIFX(A1)", "my_xlfn.FIT_VIF(A1)",
        "Übung_xlfn.FIT_VIF(A1)", "_xlfn.FIT_NOTHING(A1)", "ORG.OTHERS.FUNCTIONS.FITVIF(A1)", "fitvif(A1)",
        "Jobs!fit_vif(A1)", "'Job list'!fit_vif(A1)", "[1]Jobs!fit_vif(A1)", "[0]!FIT_VIF(A1)",
    ],
)  # fmt: skip
def test_what_only_looks_like_a_call_of_ours_stays(formula):
    assert SPELLINGS.plain(formula) == formula


def test_a_call_through_a_link_is_ours_only_where_the_link_is():
    formula = "[1]!FIT_VIF(A1)+[2]!FIT_VIF(A1)+[1]!OTHER(A1)"
    assert SPELLINGS.plain(formula, lambda link: link == 2) == "[1]!FIT_VIF(A1)+FIT_VIF(A1)+[1]!OTHER(A1)"
    assert [(call.name, call.link) for call in calls(formula)] == [("FIT_VIF", 1), ("FIT_VIF", 2), ("OTHER", 1)]


@pytest.mark.parametrize(
    ("target", "ours"),
    [
        ("file:///C:\\Users\\Ida\\AppData\\Roaming\\Microsoft\\Excel\\XLSTART\\sheetfuncs.xlam", True),
        ("/Volumes/Shared/Sheetfuncs-signed.xlam", True), ("other.xlam", False), ("sheetfuncs/other.xlsm", False),
        ("costs.xlsx", True), ("", True),
    ],
)  # fmt: skip
def test_which_links_lead_to_our_addin(target, ours):
    assert leads_to_our_addin(target) is ours


@given(st.text(alphabet="_xlfn.FIT_VIF(1)[]!'\"a,; Ü\0", max_size=60))
def test_any_text_is_done_in_one_pass(text):
    plain = SPELLINGS.plain(text)
    assert SPELLINGS.plain(plain) == plain


@pytest.mark.parametrize("text", ['"' * 30_001, "'" * 30_001, "[" * 30_000, "[a" * 15_000, "x" * 30_000, "x(" * 15_000])
def test_a_long_text_takes_no_time_worth_naming(text):
    assert SPELLINGS.plain(text) == text
