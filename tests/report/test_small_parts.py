"""Formats, text widths, axes, normal scores, page breaks, and the fingerprint, each on its own."""

from __future__ import annotations

import hashlib
import json
import math
import struct

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from report_cases import categories, orders

from sheetfuncs.core.fingerprint import data_fingerprint
from sheetfuncs.report.formats import column_format, data_format, digits_format, estimate_format
from sheetfuncs.report.ledger import MOST_RANGES, ranges_text
from sheetfuncs.report.names import settings_to_names
from sheetfuncs.report.normal_scores import normal_scores, pointwise_limits
from sheetfuncs.report.paging import PAGE_POINTS, page_breaks
from sheetfuncs.report.scales import nice_axis
from sheetfuncs.report.text import line_count, shortened, text_width
from sheetfuncs.workbook.settings import settings_from_names


@pytest.mark.parametrize(("value", "digits", "expected"), [
    (0.0, 4, "0"), (1234.5, 4, "#,##0"), (12.3456, 4, "#,##0.00"), (0.00123, 3, "#,##0.00000"),
    (1e-7, 3, "0.00E+00"), (2e12, 4, "0.000E+00"), (-0.5, 2, "#,##0.00"),
])
def test_digits_that_mean_something(value, digits, expected):
    assert digits_format(value, digits) == expected


def test_an_estimate_is_shown_to_three_digits_of_its_error():
    assert estimate_format(12.34567, 0.0423) == "#,##0.0000"
    assert estimate_format(12.34567, 42.3) == "#,##0.0"
    assert estimate_format(12.34567, math.nan) == digits_format(12.34567, 6)


def test_data_keep_the_decimals_they_have():
    assert data_format([1.0, 20.0, 3.0]) == "#,##0"
    assert data_format([1.25, 20.0]) == "#,##0.00"
    assert data_format([1 / 3, 20.0]) == "#,##0.0000"
    assert column_format([math.nan]) == "0"


def test_widths_are_those_of_the_typeface():
    # Helvetica's published metrics: W 944, i 222, digits 556 thousandths (from memory); Arial has the same.
    per_unit = text_width("W", 9) / 944
    assert text_width("i", 9) / 222 == pytest.approx(per_unit)
    assert text_width("0123456789", 9) / 5560 == pytest.approx(per_unit)
    assert text_width("重", 9) > text_width("M", 9)


def test_lines_are_counted_by_words():
    assert line_count("one two three", 1000, 9) == 1
    assert line_count("one\ntwo", 1000, 9) == 2
    assert line_count("a" * 100, text_width("a" * 40, 9), 9) == 3
    assert shortened("a  b\nc", 10) == "a b c"
    assert shortened("abcdefghij", 5) == "abcd…"


@given(st.lists(st.floats(-1e12, 1e12), min_size=1, max_size=30))
@example([5e-324])
def test_axes_contain_their_values_in_round_steps(values):
    axis = nice_axis("x", values)
    if axis.step is None:
        largest = max(abs(v) for v in values)
        assert max(values) - min(values) < 1e-3 * largest or largest < 1e-289  # no digits left for a step
        return
    assert axis.low <= min(values) + 1e-6 * axis.step
    assert axis.high >= max(values) - 1e-6 * axis.step
    assert 1 <= round((axis.high - axis.low) / axis.step) <= 9
    assert float(f"{axis.step:.2g}") == pytest.approx(axis.step)


def test_normal_scores_against_expected_order_statistics():
    # Expected values of standard normal order statistics, n = 5: 1.16296, 0.49502, 0 (Harter 1961, Biometrika 48,
    # table 1, from memory); Blom's scores are an approximation good to about 0.02.
    assert normal_scores(5) == pytest.approx([-1.16296, -0.49502, 0.0, 0.49502, 1.16296], abs=0.02)


def test_pointwise_limits_cover_what_they_say():
    """A single place near the middle leaves the limits in about one of twenty samples of normal values."""
    draws = np.random.default_rng(3)
    n, place = 101, 50
    scores = normal_scores(n)
    low, high = pointwise_limits(scores, n)
    middles = np.sort(draws.normal(size=(4000, n)), axis=1)[:, place]
    outside = np.mean((middles < low[place]) | (middles > high[place]))
    assert 0.03 < outside < 0.07


def test_pages_begin_before_what_must_stay_together():
    heights = dict.fromkeys(range(1, 31), PAGE_POINTS / 10.0001)
    assert page_breaks(heights, 30, [], 0.0) == (10, 20)
    assert page_breaks(heights, 30, [], PAGE_POINTS / 10) == (9, 18, 27)
    breaks = page_breaks(heights, 30, [(8, 13)], 0.0)
    assert breaks[0] == 7
    # Two stretches that overlap count as one, as long as it fits a page.
    assert page_breaks(heights, 30, [(8, 11), (11, 13)], 0.0)[0] == 7
    assert page_breaks(heights, 30, [(8, 28)], 0.0)[0] == 10


def test_ranges_of_rows():
    assert ranges_text([4]) == "row 4"
    assert ranges_text([4, 5, 6, 9, 10, 12]) == "rows 4 to 6, 9, 10, 12"
    assert ranges_text(list(range(1, 400, 2))).endswith(f"and {200 - MOST_RANGES} more")


@given(st.dictionaries(st.text(max_size=40), st.text(max_size=400), max_size=5))
def test_settings_survive_their_names(settings):
    names = settings_to_names(settings)
    assert all(len(formula) <= 257 and "!" not in formula and formula.isascii() for formula in names.values())
    assert settings_from_names(names.items()) == json.loads(json.dumps(settings))


@pytest.mark.parametrize("make", [orders, categories])
def test_the_fingerprint_can_be_computed_again_from_its_description(make):
    design = make().design
    digest = hashlib.sha256()
    digest.update("".join(f"{name}\n" for name in (design.response_name, *design.column_names)).encode() + b"\n")
    for y, x in zip(design.response, design.columns, strict=True):
        digest.update(struct.pack(f"<{1 + len(x)}d", y, *x))
    assert data_fingerprint(design) == digest.hexdigest()


def test_the_fingerprint_sees_one_changed_digit():
    check = orders()
    before = data_fingerprint(check.design)
    check.design.columns[3, 1] = np.nextafter(check.design.columns[3, 1], 99.0)
    assert data_fingerprint(check.design) != before
