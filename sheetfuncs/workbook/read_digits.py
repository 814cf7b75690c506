"""Decimal text to numbers for many cells at once, eight characters a step, rounded as `float` rounds.

A decimal of up to 19 digits is an integer m and a power of ten: m / 10^k with k at most 22, where both have exact
doubles (m in two parts). The quotient is formed to twice the precision by error-free transformations (T. J. Dekker,
"A floating-point technique for extending the available precision", Numerische Mathematik 18, 1971, 224-242) and
rounded once; the few that come to lie next to a rounding boundary are left to `float`.
"""

from __future__ import annotations

import re

import numpy as np

_ONES = np.uint64(0x0101010101010101)
_HIGH = np.uint64(0x8080808080808080)
_QUOTES = np.uint64(0x2222222222222222)
_SHIFT = np.array([8 * (8 - digits) for digits in range(9)], np.uint64)
_ZEROS = np.array([int.from_bytes(b"0" * (8 - digits), "little") for digits in range(9)], np.uint64)
_POWERS = 10 ** np.arange(20, dtype=np.uint64)
_EXACT_POWERS = 10.0 ** np.arange(23)
_SPLITTER = 134217729.0  # 2^27 + 1, Dekker's constant for 53 bits
_MOST_DIGITS = 19
_PLAIN = re.compile(rb"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,4})?")


def words_of(data: bytes) -> np.ndarray:
    """The eight bytes from each place on as one number, lowest byte first; places end eight before the data's end."""
    return np.ndarray((len(data) - 7,), "<u8", data, strides=(1,))


def digits_before_quote(words: np.ndarray) -> np.ndarray:
    """How many bytes of each word stand before its first quotation mark; 8 where it has none."""
    marks = words ^ _QUOTES
    marks = (marks - _ONES) & ~marks & _HIGH  # the lowest bit set is right, ones above it may be carries
    lowest = marks & (~marks + np.uint64(1))
    count = (((lowest - np.uint64(1)) & _ONES) * _ONES) >> np.uint64(56)
    return np.where(marks == 0, 8, count.astype(np.int64) - 1)


def parse_whole(words: np.ndarray, starts: np.ndarray, lengths: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Whole numbers without sign: uint64 values, and whether each is digits only (1 to 19 of them).

    words: from `words_of`. starts, lengths: int64 (n,).
    """
    value = np.zeros(len(starts), np.uint64)
    good = (lengths >= 1) & (lengths <= _MOST_DIGITS)
    longest = min(int(lengths.max(initial=0)), _MOST_DIGITS)
    for begin in range(0, longest, 8):
        count = np.clip(lengths - begin, 0, 8)
        part, is_digits = _parse_eight(words[np.minimum(starts + begin, len(words) - 1)], count)
        value = value * _POWERS[count] + part
        good &= is_digits
    return value, good


def _parse_eight(word: np.ndarray, count: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The number that the first `count` characters of each word form, and whether they all are digits."""
    word = (word << _SHIFT[count]) | _ZEROS[count]
    nibbles = np.uint64(0xF0F0F0F0F0F0F0F0)
    good = (word & (word + np.uint64(0x0606060606060606)) & nibbles) == np.uint64(0x3030303030303030)
    word = ((word & np.uint64(0x0F0F0F0F0F0F0F0F)) * np.uint64(2561)) >> np.uint64(8)
    word = ((word & np.uint64(0x00FF00FF00FF00FF)) * np.uint64(6553601)) >> np.uint64(16)
    word = ((word & np.uint64(0x0000FFFF0000FFFF)) * np.uint64(42949672960001)) >> np.uint64(32)
    return word, good


def parse_decimals(
    data: bytes, words: np.ndarray, starts: np.ndarray, ends: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Decimal numbers between starts and ends: float64 values, and whether each text is one.

    "-12.5" and "7" are parsed together, forms such as "1.5E-7" one by one.
    """
    negative = np.frombuffer(data, np.uint8)[starts] == ord("-")
    first = starts + negative
    dots = np.append(np.flatnonzero(np.frombuffer(data, np.uint8) == ord(".")), len(data))
    dot = np.minimum(dots[np.searchsorted(dots, first)], ends)
    places = np.maximum(ends - dot - 1, 0)
    whole, good = parse_whole(words, first, dot - first)
    fraction, fraction_good = parse_whole(words, dot + 1, places)
    good &= (fraction_good | (dot == ends)) & (dot - first + places <= _MOST_DIGITS)
    places = np.where(good, places, 0)
    value, sure = _divide(np.where(good, whole * _POWERS[places] + fraction, 0).astype(np.uint64), places)
    value = np.where(negative, -value, value)
    good &= sure
    for index in np.flatnonzero(~good).tolist():
        text = data[starts[index] : ends[index]]
        if _PLAIN.fullmatch(text):
            value[index], good[index] = float(text), True
    return value, good


def _divide(mantissa: np.ndarray, places: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """mantissa / 10^places rounded to nearest, and whether the rounding is beyond doubt."""
    high = mantissa.astype(np.float64)
    low = (mantissa - high.astype(np.uint64)).astype(np.int64).astype(np.float64)
    power = _EXACT_POWERS[places]
    quotient = high / power
    product, error = _two_product(quotient, power)
    rest = ((high - product) - error + low) / power
    value = quotient + rest
    lost = np.abs(rest - (value - quotient))
    halves = lost / np.spacing(value)  # a half, or a quarter below a power of two, is a rounding boundary
    near = (np.abs(halves - 0.5) < 1e-6) | (np.abs(halves - 0.25) < 1e-6)
    return value, ~near


def _two_product(a: np.ndarray, b: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """a * b as a rounded product and its error."""
    product = a * b
    t = _SPLITTER * a
    a_high = t - (t - a)
    a_low = a - a_high
    t = _SPLITTER * b
    b_high = t - (t - b)
    b_low = b - b_high
    return product, ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low
