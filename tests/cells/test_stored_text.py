"""Text that reads as a number, and dates as serial numbers."""

from __future__ import annotations

import datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.cells.serial_dates import date_of_serial, serial_of_text, text_of_serial
from sheetfuncs.cells.stored_text import reads_as_number, shown


@pytest.mark.parametrize("text", ["12", "12.5", "12,5", "1,234.5", "1.234,5", "1 234,5", "1\u00a0234", "1\u202f234,5",
                                  "1'234.5", "1’234", "12 %", "12%", " 3 ", "1e3", "1.5E-07", "-3", "−3", "3-",
                                  "(12)", "+1",
                                  ".5", "5.", "'7", "$12", "12 €", "£1,000", "\u00a012", "1,23,456.0",
                                  "0012"])  # fmt: skip
def test_reads_as_a_number(text):
    assert reads_as_number(text)


@pytest.mark.parametrize("text", ["", " ", "n/a", "12 kg", "A12", "1/2", "12:30", "2024-03-01", "1.2.3.4a", "e3", "-",
"%",
                                  "nan", "inf", "north", "12 13x", "#N/A", "0x1F", "1_000", "line 3",
                                  "9" * 80])  # fmt: skip
def test_does_not_read_as_a_number(text):
    assert not reads_as_number(text)


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_numbers_as_python_writes_them(number):
    assert reads_as_number(repr(number))
    assert reads_as_number(repr(number).replace(".", ","))


@given(st.text(max_size=100))
def test_no_text_takes_long_or_breaks_a_sentence(text):
    reads_as_number(text)
    assert shown(text).isprintable()
    assert len(shown(text)) <= 42


# ISO/IEC 29500-1, 18.17.4.1: 1 is 1900-01-01, 60 the day that never was, 61 is 1900-03-01, 39448 is 2008-01-01;
# in the 1904 system 0 is 1904-01-01 and 37986 is 2008-01-01.
@pytest.mark.parametrize(("serial", "system", "text"), [(1, False, "1900-01-01"), (59, False, "1900-02-28"),
                                                        (61, False, "1900-03-01"), (39448, False, "2008-01-01"),
                                                        (0, True, "1904-01-01"), (37986, True, "2008-01-01"),
                                                        (39448.75, False, "2008-01-01 18:00:00")])  # fmt: skip
def test_serial_numbers_of_the_standard(serial, system, text):
    assert text_of_serial(serial, system) == text
    assert serial_of_text(text.replace(" ", "T"), system) == serial


@given(st.datetimes(datetime.datetime(1904, 1, 2), datetime.datetime(9999, 1, 1)), st.booleans())
def test_dates_come_back(moment, system):
    moment = moment.replace(microsecond=0)
    assert date_of_serial(serial_of_text(moment.isoformat(), system), system) == moment


@pytest.mark.parametrize(("text", "serial"), [("12:00", 0.5), ("T06:00:00", 0.25), ("2008-01-01T00:00:00+01:00",
39448 - 1 / 24),
                                              ("soon", None), ("2008-13-01", None), ("", None)])  # fmt: skip
def test_other_moments(text, serial):
    assert serial_of_text(text) == (serial if serial is None else pytest.approx(serial, abs=1e-9))


def test_serial_numbers_outside_the_calendar_stay_numbers():
    assert text_of_serial(1e12) == "1000000000000"
    assert text_of_serial(-1e12) == "-1000000000000"
