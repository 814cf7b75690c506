"""Double-double arithmetic against rational arithmetic, which has no rounding."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from sheetfuncs.core.double_double import add, product, quotient, total, two_prod, two_sum

# Products between 1e-290 and 1e300 keep their error terms.
SIZED = st.floats(1e-140, 1e140) | st.floats(-1e140, -1e-140) | st.just(0.0)


def exact(pair):
    return [Fraction(float(high)) + Fraction(float(low)) for high, low in zip(*map(np.atleast_1d, pair), strict=True)]


def pair_of(high, share):
    """high with a low part of this share of half a unit in its last place."""
    return np.array([high]), np.array([share * np.spacing(abs(high)) / 2])


@given(a=SIZED, b=SIZED)
def test_sums_and_products_have_no_error(a, b):
    """Dekker 1971, theorem 5.12: the error of a product is a double; Knuth: so is the error of a sum."""
    assert exact(two_sum(np.array([a]), np.array([b]))) == [Fraction(a) + Fraction(b)]
    assert exact(two_prod(np.array([a]), np.array([b]))) == [Fraction(a) * Fraction(b)]


SHARE = st.floats(-0.99, 0.99)


@given(a=SIZED, b=SIZED, low_a=SHARE, low_b=SHARE)
def test_pairs_keep_104_bits(a, b, low_a, low_b):
    assume(not 0 < abs(a) < 1e-100 and not 0 < abs(b) < 1e-100)  # the low parts stay above the smallest doubles
    one, other = pair_of(a, low_a), pair_of(b, low_b)
    x, y = exact(one)[0], exact(other)[0]
    assert abs(exact(add(one, other))[0] - (x + y)) <= (abs(x) + abs(y)) / 2**104
    assert abs(exact(product(one[0], other))[0] - Fraction(a) * y) <= abs(Fraction(a) * y) / 2**102
    if b:
        assert abs(exact(quotient(one, b))[0] - x / Fraction(b)) <= abs(x / Fraction(b)) / 2**102


@pytest.mark.parametrize("length", [1, 2, 3, 7, 64, 1001])
def test_a_total_survives_cancellation(length):
    """Sizes from 1e-8 to 1e8 that cancel to what one small number holds: plain sums keep none of its digits."""
    random = np.random.default_rng(length)
    values = random.normal(size=length) * 10.0 ** random.uniform(-8, 8, length)
    values = np.concatenate([values, [1e-9 / 3], -values[::-1]])
    pair = total((values, np.zeros_like(values)))
    assert abs(exact(pair)[0] - Fraction(1e-9 / 3)) <= Fraction(float(np.abs(values).sum())) * 12 / 2**104


def test_totals_along_either_axis():
    table = np.arange(15.0).reshape(3, 5) / 7
    for axis in (0, 1):
        high, low = total((table, np.zeros_like(table)), axis)
        expected = [sum(map(Fraction, line), Fraction()) for line in (table.T if axis == 0 else table).tolist()]
        assert high.shape == (table.shape[1 - axis],)
        assert all(abs(a - b) < Fraction(1, 10**30) for a, b in zip(exact((high, low)), expected, strict=True))
