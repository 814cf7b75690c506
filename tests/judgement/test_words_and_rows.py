"""How numbers are said, and which rows are named."""

from __future__ import annotations

import numpy as np
import pytest
from reference_cases import NAMES, ROUNDING_NOISE, load_case

from sheetfuncs.core.design import Numeric, build_design
from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.influence import row_measures
from sheetfuncs.core.shifts import coefficient_shifts
from sheetfuncs.judgement.rows import rows_to_look_at
from sheetfuncs.judgement.words import listed, number, pvalue, signed, times


@pytest.mark.parametrize(("value", "said"), [
    (0, "0"), (12.3456, "12.3"), (12345.6, "12,300"), (0.045678, "0.0457"), (3.1e-7, "3.10e-07"), (-2.5, "-2.50"),
    (9.999, "10.0"), (float("inf"), "not a number"),
])
def test_number(value, said):
    assert number(value) == said


@pytest.mark.parametrize(("p", "said"), [
    (0.5, "p = 0.5"), (0.032, "p = 0.032"), (0.0004, "p < 0.001"), (3e-9, "p < 1e-8"), (0.0, "p < 1e-300"),
])
def test_pvalue(p, said):
    assert pvalue(p) == said


def test_signed():
    assert [signed(v) for v in (0.584, -1.2, -0.001, 0.0)] == ["+0.58", "-1.20", "0.00", "0.00"]


def test_lists_and_ratios():
    assert (listed([]), listed(["a"]), listed(["a", "b", "c"])) == ("nothing", "a", "a, b and c")
    assert (times(2.44), times(1234.0)) == ("2.4 times", "1,234 times")


def line_with(outlier=0.0, far=0.0, n=40):
    random = np.random.default_rng(7)
    x = random.normal(size=n)
    x[0] += far
    y = 2 + 3 * x + random.normal(size=n)
    y[5] += outlier
    return fit_design(build_design(y, [Numeric("x", x)], rows=np.arange(n) + 10))


def test_nothing_is_named_in_ordinary_data():
    fit = line_with()
    assert rows_to_look_at(fit, row_measures(fit)) == ()


def test_an_outlier_is_named_by_its_worksheet_row():
    fit = line_with(outlier=12)
    flagged = rows_to_look_at(fit, row_measures(fit))
    assert flagged[0].row == 15
    assert "above what the other rows predict" in flagged[0].reason
    assert flagged[0].reason.endswith(".")


def test_a_far_row_is_named_by_how_much_of_itself_it_determines():
    fit = line_with(far=60)
    flagged = rows_to_look_at(fit, row_measures(fit))
    assert flagged[0].row == 10
    assert "of its own fitted value" in flagged[0].reason


def test_a_row_of_leverage_one():
    fit = fit_design(load_case("syn_lev1_a").design())
    flagged = rows_to_look_at(fit, row_measures(fit))
    assert flagged[0].index == 0
    assert "leverage 1" in flagged[0].reason


@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_no_row_is_named_where_nothing_is_left(name):
    fit = fit_design(load_case(name).design())
    assert rows_to_look_at(fit, row_measures(fit)) == ()
    assert np.isnan(coefficient_shifts(fit)).all()


@pytest.mark.parametrize("name", [n for n in NAMES if n not in (*ROUNDING_NOISE, "syn_big_a", "syn_constcol_a")])
def test_shifts_against_refits(name):
    """The closed form against leaving each row out (for real), where a fit without it exists."""
    design = load_case(name).design()
    fit = fit_design(design)
    shifts = coefficient_shifts(fit)
    predictors = [Numeric(n, c) for n, c in zip(design.column_names, design.columns.T, strict=True)]
    tolerance = 1e-4 if name == "syn_nearcol_a" else 1e-8
    for i in range(min(design.n, 12)):
        if fit.fits_itself[i]:
            assert np.isnan(shifts[i]).all()
            continue
        keep = np.arange(design.n) != i
        without = fit_design(build_design(
            design.response[keep], [Numeric(p.name, p.values[keep]) for p in predictors], intercept=design.intercept
        ))
        expected = (without.coefficients - fit.coefficients) / fit.standard_errors
        np.testing.assert_allclose(shifts[i], expected, rtol=tolerance, atol=tolerance)


def test_the_one_row_off_a_perfect_line_is_named():
    x = np.arange(12.0)
    y = 2 + 3 * x
    y[7] += 5
    fit = fit_design(build_design(y, [Numeric("x", x)]))
    flagged = rows_to_look_at(fit, row_measures(fit))
    assert flagged[0].row == 8
    assert "Without it the fit is perfect" in flagged[0].reason
