"""Sheet names that are valid, settings in hidden names, and a sheet's name inside formulas."""

from __future__ import annotations

import io

import pytest
import xlsxwriter
from hypothesis import given
from hypothesis import strategies as st
from workbook_build import opened, sheet_to_insert
from workbook_hosts import HOSTS

from sheetfuncs.errors import SheetNameError
from sheetfuncs.report.names import settings_to_names
from sheetfuncs.workbook import find_our_sheets, insert_sheet, settings_from_names, sheet_title
from sheetfuncs.workbook.references import rename_sheet
from sheetfuncs.workbook.titles import check_title


@pytest.mark.parametrize(
    ("wanted", "taken", "title"),
    [
        ("Check of Jobs", [], "Check of Jobs"),
        ("Check of Jobs", ["check of JOBS"], "Check of Jobs (2)"),
        ("Check of Jobs", ["Check of Jobs", "CHECK OF JOBS (2)"], "Check of Jobs (3)"),
        ("Check of a very long sheet name indeed", [], "Check of a very long sheet name"),
        ("Check of a very long sheet name", ["Check of a very long sheet name"], "Check of a very long sheet (2)"),
        ("Check of [2024/25]: a*b?", [], "Check of -2024-25-- a-b-"),
        ("'quoted'", [], "quoted"),
        ("", [], "Sheet"),
        ("'''", [], "Sheet"),
        ("history", [], "history (2)"),
        ("Check of " + "\U0001f600" * 12, [], "Check of " + "\U0001f600" * 11),
    ],
)
def test_titles_are_made_to_fit(wanted, taken, title):
    assert sheet_title(wanted, taken=taken) == title


@given(st.text(max_size=60), st.lists(st.text(min_size=1, max_size=31), max_size=5))
def test_every_made_title_is_valid_and_free(wanted, taken):
    title = sheet_title(wanted, taken=taken)
    check_title(title)
    assert title.casefold() not in {name.casefold() for name in taken}


@pytest.mark.parametrize("wanted", ["x" * 32, "a/b", "[a]", "'a", "a'", " ", "", "History", "\U0001f600" * 16])
def test_names_that_are_not_allowed_are_refused_with_the_reason(wanted):
    with pytest.raises(SheetNameError, match="sheet name"):
        check_title(wanted)


json_values = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats(allow_nan=False, allow_infinity=False) | st.text(),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(), inner, max_size=4),
    max_leaves=20,
)


@given(st.dictionaries(st.text(), json_values, max_size=8))
def test_settings_come_back_from_their_names(settings):
    names = list(settings_to_names(settings).items())
    assert settings_from_names(names) == settings
    for _, formula in names:
        assert formula.startswith('="')
        assert formula.endswith('"')
        assert len(formula) <= 255 + 3
        assert formula.isascii()


def test_long_settings_survive_a_round_through_files():
    settings = {"range": "'Däta ☃'!A1:B4", "note": 'quotes " and \\ and <&>' * 60, "level": 0.95, "order": None}
    buffer = io.BytesIO()
    book = xlsxwriter.Workbook(buffer)
    book.add_worksheet("Check of Data").write(0, 0, 1)
    names = list(settings_to_names(settings).items())
    assert len(names) > 3
    for name, formula in names:
        book.define_name(f"'Check of Data'!{name}", formula)
    book.close()
    out = io.BytesIO()
    insert_sheet(io.BytesIO(HOSTS["xlsxwriter: active_and_hidden"]()), buffer, after="Data", out=out)
    (ours,) = find_our_sheets(out)
    assert (ours.name, ours.settings) == ("Check of Data", settings)
    defined = opened(out.getvalue())["Check of Data"].defined_names
    assert [defined[name].hidden for name, _ in names] == [True] * len(names)


def test_ours_are_found_whatever_they_are_called_now_and_others_are_not():
    book = io.BytesIO(HOSTS["xlsxwriter: active_and_hidden"]())
    assert find_our_sheets(book) == []
    for title, after in (("Check of Data", "Data"), ("Another", "Front")):
        out = io.BytesIO()
        insert_sheet(book, io.BytesIO(sheet_to_insert(title)), after=after, out=out)
        book = out
    found = find_our_sheets(book)
    assert [ours.name for ours in found] == ["Check of Data", "Another"]
    assert found[0].settings_json == '{"range":"Data!A1:B4"}'


@pytest.mark.parametrize("names", [[], [("other", '="{}"')], [("_sheetfuncs_settings", "=Sheet1!$A$1")]])
def test_names_without_settings(names):
    assert settings_from_names(names) is None


@pytest.mark.parametrize("text", ["{", "[]", '""x""', "[" * 100_000])
def test_damaged_settings_are_none(text):
    assert settings_from_names([("_sheetfuncs_settings", f'="{text}"')]) is None


@pytest.mark.parametrize(
    ("formula", "old", "renamed"),
    [
        ("=Old!A1+'Old'!B2", "Old", "='New one'!A1+'New one'!B2"),
        ("SUM(old!$A$1:$A$3)", "Old", "SUM('New one'!$A$1:$A$3)"),
        ('=IF(Old!A1,"Old!A1","say ""Old!"" twice")', "Old", '=IF(\'New one\'!A1,"Old!A1","say ""Old!"" twice")'),
        ("=Older!A1+MyOld!A1+'Old 2'!A1+Old+Old.x!A1", "Old", "=Older!A1+MyOld!A1+'Old 2'!A1+Old+Old.x!A1"),
        ("=[1]Old!A1+'[Book.xlsx]Old'!A1", "Old", "=[1]Old!A1+'[Book.xlsx]Old'!A1"),
        ("=#REF!+REF!A1", "REF", "=#REF!+'New one'!A1"),
        ("='It''s \"x\"'!A1&\"'It''s\"", 'It\'s "x"', "='New one'!A1&\"'It''s\""),
        ("='a!b'!A1+b!A1", "b", "='a!b'!A1+'New one'!A1"),
    ],
)
def test_a_sheet_name_is_exchanged_in_references_only(formula, old, renamed):
    assert rename_sheet(formula, old, "New one") == renamed
