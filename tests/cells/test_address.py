"""A1 references, as the formula language writes them (ODF OpenFormula 5.8, ISO/IEC 29500-1 18.17.2.3)."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.cells.address import (
    MAX_COLUMNS,
    MAX_ROWS,
    Area,
    cell_name,
    column_letters,
    column_number,
    format_area,
    is_address,
    parse_area,
    quote_sheet,
)
from sheetfuncs.errors import AddressError, SheetfuncsError

sheet_names = st.text(
    st.characters(exclude_characters=":\\/?*[]\n\r", exclude_categories=["Cc", "Cs"]), min_size=1, max_size=31
)
sheet_names = sheet_names.filter(
    lambda name: name.strip() == name and not name.startswith("'") and not name.endswith("'")
)


@given(st.integers(1, MAX_COLUMNS))
def test_letters_and_numbers_of_columns_agree(number):
    assert column_number(column_letters(number)) == column_number(column_letters(number).lower()) == number


@pytest.mark.parametrize(("letters", "number"), [("A", 1), ("Z", 26), ("AA", 27), ("AZ", 52), ("ZZ", 702), ("AAA", 703),
                                                 ("XFD", 16384)])  # fmt: skip
def test_known_columns(letters, number):
    assert (column_letters(number), column_number(letters)) == (letters, number)


@given(sheet_names | st.none(), st.integers(1, MAX_ROWS), st.integers(1, MAX_ROWS) | st.none(),
       st.integers(1, MAX_COLUMNS), st.integers(1, MAX_COLUMNS))  # fmt: skip
def test_what_is_written_is_read_again(sheet, first_row, last_row, first_column, last_column):
    rows = (1, None) if last_row is None else sorted((first_row, last_row))
    columns = sorted((first_column, last_column))
    area = Area(sheet, rows[0], columns[0], rows[1], columns[1])
    assert parse_area(format_area(area)) == area
    assert is_address(format_area(area))


@given(st.text(max_size=12) | st.text(alphabet="AB1$:!' ,", max_size=12))
def test_any_text_gives_an_area_or_a_sentence(text):
    is_address(text)
    try:
        area = parse_area(text)
    except AddressError as refusal:
        message = str(refusal)
        assert message.endswith(".")
    else:
        assert parse_area(format_area(area)) == area


@pytest.mark.parametrize(
    ("text", "area"),
    [
        ("Jobs!B3:F64", Area("Jobs", 3, 2, 64, 6)), ("=Jobs!$B$3:$F$64", Area("Jobs", 3, 2, 64, 6)),
        ("'Job list'!B3:F64", Area("Job list", 3, 2, 64, 6)), ("Job list!B3:F64", Area("Job list", 3, 2, 64, 6)),
        ("'It''s 3!'!B3", Area("It's 3!", 3, 2, 3, 2)), ("Größe!b3:f64", Area("Größe", 3, 2, 64, 6)),
        ("Jobs!B:D", Area("Jobs", 1, 2, None, 4)), ("$D:$B", Area(None, 1, 2, None, 4)), ("C17", Area(None, 17, 3, 17,
        3)),
        ("F64:B3", Area(None, 3, 2, 64, 6)), ("Jobs!B3:Jobs!F64", Area("Jobs", 3, 2, 64, 6)),
        ("XFD1048576", Area(None, 1048576, 16384, 1048576, 16384)), (" Jobs ! B3 : F64 ", Area("Jobs", 3, 2, 64, 6)),
    ],
)  # fmt: skip
def test_forms_that_are_understood(text, area):
    assert parse_area(text) == area


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("3:5", "whole rows"), ("Jobs!B3:B64,Jobs!E3:E64", "more than one area"), ("[Other.xlsx]Jobs!B3",
        "another workbook"),
        ("Jan:Dec!B3", "several sheets"), ("Jobs!B3:Costs!F64", "two sheets"), ("'Jobs!B3", "not closed"),
        ("!B3", "no sheet before"), ("XFE1", "XFE"), ("A1048577", "outside the sheet"), ("A0", "outside the sheet"),
        ("B3:F", "not an address"), ("", "not an address"), ("B3#", "not an address"), ("B3:C4:D5", "not an address"),
        ("Jobs!", "not an address"),
    ],
)  # fmt: skip
def test_forms_that_are_refused_say_why(text, said):
    with pytest.raises(AddressError, match=said) as refused:
        parse_area(text)
    assert refused.value.cell_error == "#REF!"


@pytest.mark.parametrize("text", ["Jobs", "JobsTable[Cost]", "Cost_2024", "ABCD1", "B", "x.y", "", "R1C1x", "A1B2"])
def test_names_are_no_addresses(text):
    assert not is_address(text)


@pytest.mark.parametrize(("name", "written"), [("Jobs", "Jobs"), ("Job list", "'Job list'"), ("It's", "'It''s'"),
                                               ("A1", "'A1'"), ("R1C1", "'R1C1'"), ("TRUE", "'TRUE'"), ("2024",
                                               "'2024'"),
                                               ("Größe", "Größe"), ("c", "'c'"), ("Jobs-2", "'Jobs-2'")])  # fmt: skip
def test_sheet_names_are_quoted_where_formulas_need_it(name, written):
    assert quote_sheet(name) == written
    assert cell_name(3, 2, name) == f"{written}!B3"


def test_numbers_beyond_the_sheet():
    for number in (0, MAX_COLUMNS + 1, -1):
        with pytest.raises(SheetfuncsError):
            column_letters(number)
