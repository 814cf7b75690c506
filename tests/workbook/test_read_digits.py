"""Decimals parsed eight digits at a time are what `float` makes of them, to the last bit."""

from __future__ import annotations

import struct

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.workbook.read_digits import digits_before_quote, parse_decimals, parse_whole, words_of

PAD = b" " * 64


def parsed(texts: list[str]) -> tuple[np.ndarray, np.ndarray]:
    pieces = [text.encode() for text in texts]
    ends = np.cumsum([len(piece) + 1 for piece in pieces]) - 1
    starts = ends - [len(piece) for piece in pieces]
    data = b"<".join([*pieces, PAD])
    return parse_decimals(data, words_of(data), starts, ends)


def bits(number: float) -> bytes:
    return struct.pack("<d", number)


def assert_like_float(texts: list[str]) -> None:
    numbers, good = parsed(texts)
    assert good.all()
    for text, number in zip(texts, numbers.tolist(), strict=True):
        assert bits(number) == bits(float(text)), text


@given(st.lists(st.floats(allow_nan=False, allow_infinity=False).map(repr), min_size=1))
def test_shortest_forms_of_floats(texts):
    assert_like_float(texts)


@given(st.lists(st.from_regex(r"-?[0-9]{1,20}(\.[0-9]{1,22})?", fullmatch=True), min_size=1))
def test_any_decimals(texts):
    assert_like_float(texts)


@given(st.integers(1 << 52, (1 << 53) - 1), st.integers(-60, 8), st.integers(15, 19), st.sampled_from([0, 1, -1]))
def test_decimals_on_and_beside_the_boundaries_of_rounding(mantissa, exponent, digits, beside):
    """The number half way between two doubles, cut to as many digits, and its neighbours in the last digit."""
    middle = (2 * mantissa + 1) * 2.0 ** (exponent - 1)  # 54 bits would be needed: rounds to even, near the middle
    text = f"{middle:.{digits}g}"
    if "e" in text:
        return
    last = int(text.replace(".", "").lstrip("-") or 0) + beside
    places = len(text.partition(".")[2])
    number = f"{last:0{places + 1}d}"
    assert_like_float([f"{number[:-places]}.{number[-places:]}" if places else number])


def test_exact_ties_round_to_even():
    """2^53 + 1 and its like lie half way between two doubles."""
    assert_like_float([str(2**53 + 1), str(2**53 + 3), f"{2**52 + 1}.5", f"{2**52}.5", f"{2**51}.25", "0.5", "1.5"])


@pytest.mark.parametrize("text", ["1.0", "0", "-0", "-0.0", "007", "5.", ".5", "+3", "1E5", "-1.5e-300", "1e999",
                                  "9" * 19, "9" * 20, "0." + "0" * 25 + "1", "18446744073709551615"])  # fmt: skip
def test_single_forms(text):
    assert_like_float([text, "1", text])


@pytest.mark.parametrize("text", ["", "-", ".", "1,5", "1_0", "0x1", "1e", "1 2", "nan", "inf", "--1", "1.2.3", "١"])
def test_what_is_no_decimal_is_said_so(text):
    numbers, good = parsed([text, "2.5"])
    assert good.tolist() == [False, True]
    assert numbers[1] == 2.5


@given(st.lists(st.integers(0, 10**19 - 1), min_size=1))
def test_whole_numbers(numbers):
    texts = [str(number) for number in numbers]
    data = "x".join([*texts, PAD.decode()]).encode()
    ends = np.cumsum([len(text) + 1 for text in texts]) - 1
    lengths = np.array([len(text) for text in texts])
    found, good = parse_whole(words_of(data), ends - lengths, lengths)
    assert good.all()
    assert found.tolist() == numbers


@given(st.binary(min_size=8, max_size=8))
def test_digits_before_a_quote(eight):
    data = eight + PAD
    expected = eight.index(b'"') if b'"' in eight else 8
    assert digits_before_quote(words_of(data)[:1]).tolist() == [expected]
