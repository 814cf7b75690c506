"""Tails in closed form against mpmath's regularized incomplete gamma function."""

from __future__ import annotations

import math

import pytest
from mpmath import gammainc, mp, mpf

from sheetfuncs.core.tails import chi_square_tail


@pytest.mark.parametrize("df", [1, 2, 3, 4, 8, 10, 12, 31])
@pytest.mark.parametrize("statistic", [0.0, 1e-12, 0.03, 1.0, 3.841459, 18.3, 250.0, 1399.9, 1400.1, 1460.0])
def test_chi_square_tail_against_mpmath(df, statistic):
    with mp.workdps(40):
        expected = float(gammainc(mpf(df) / 2, mpf(statistic) / 2, regularized=True))
    assert chi_square_tail(df, statistic) == pytest.approx(expected, rel=2e-13, abs=1e-312)


@pytest.mark.parametrize("df", [1, 2, 4, 7])
def test_chi_square_tail_of_what_is_no_number(df):
    assert math.isnan(chi_square_tail(df, math.nan))
    assert chi_square_tail(df, math.inf) == 0.0
