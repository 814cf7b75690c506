"""Cases where R drops a column or loses digits: against R on the same problem, exactly re-expressed.

`results_alt` of these cases is R 4.2.2 on an exact re-expression (a column shifted, rescaled, replaced or dropped; see
`alt_description`). What depends on the column space alone must come out the same from the problem as it stands.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from reference_cases import load_case
from test_tests_against_reference import all_tests, same_p

from sheetfuncs.core.fit import fit_design
from sheetfuncs.core.influence import press, row_measures

# Digits that the case's condition leaves: variance inflation 1e11 costs five and a half of sixteen.
LEFT = {"syn_constcol_a": 1e-9, "syn_nearcol_a": 1e-7, "syn_offset_a": 1e-9, "syn_tiny_a": 1e-9}
# Coefficients that the re-expression does not touch, in our terms.
SAME_TERMS = {
    "syn_constcol_a": ("intercept", "x1"), "syn_nearcol_a": ("x3",), "syn_offset_a": ("x1", "x2"),
    "syn_tiny_a": ("intercept", "x1", "x2"),
}


def fit_case(name):
    return fit_design(load_case(name).design(("x1",) if name == "syn_constcol_a" else None))


def r_result(name, method, args=None):
    found = [
        r for r in load_case(name).facts["results_alt"]
        if r["method"] == method and "order_by" not in r["args"]
        and all(r["args"].get(key) == value for key, value in (args or {}).items())
    ]
    assert len(found) == 1, (method, args)
    return found[0]


@pytest.mark.parametrize("name", LEFT)
def test_every_statistic_against_R_on_the_problem_re_expressed(name):
    compared = 0
    for result in all_tests(fit_case(name)):
        if name == "syn_nearcol_a" and result.args.get("type") == "regressor":
            continue  # powers of another column
        r = r_result(name, result.method, result.args)
        label = f"{result.method} {dict(result.args)}"
        assert result.applies, label
        assert result.statistic == pytest.approx(r.get("statistic", r.get("rstudent")), rel=LEFT[name]), label
        if "df" in r:
            assert np.atleast_1d(result.df).tolist() == np.atleast_1d(r["df"]).tolist(), label
        if "p" in r and LEFT[name] < 1e-8:
            same_p(result.details.get("unadjusted_p", result.p), r["p"], label)
        compared += 1
    assert compared >= 19


@pytest.mark.parametrize("name", LEFT)
def test_coefficients_against_R_on_the_problem_re_expressed(name):
    fit, r = fit_case(name), r_result(name, "ols")
    terms = {("intercept" if term == "(Intercept)" else term): place for place, term in enumerate(r["t"])}
    for term in SAME_TERMS[name]:
        ours, theirs = fit.design.terms.index(term), terms[term]
        assert fit.t[ours] == pytest.approx(list(r["t"].values())[theirs], rel=LEFT[name])
        assert fit.p_values[ours] == pytest.approx(list(r["p_values"].values())[theirs], rel=100 * LEFT[name])
    assert fit.r_squared == pytest.approx(r["r_squared"], rel=1e-9)
    assert fit.f_test[0] == pytest.approx(r["f_statistic"]["statistic"], rel=LEFT[name])


@pytest.mark.parametrize("name", LEFT)
def test_rows_against_R_on_the_problem_re_expressed(name):
    fit, r = fit_case(name), r_result(name, "influence")
    rows, rel = row_measures(fit), LEFT[name]
    for ours, key in (
        (rows.leverage, "leverage"), (rows.internally_studentized, "rstandard"),
        (rows.externally_studentized, "rstudent"), (rows.cooks_distance, "cooks_distance"), (rows.dffits, "dffits"),
    ):
        np.testing.assert_allclose(ours, r[key], rtol=10 * rel, atol=10 * rel, err_msg=key)
    figures = r_result(name, "press")
    unit = (1e-9 if name == "syn_tiny_a" else 1.0) ** 2
    assert press(fit).statistic == pytest.approx(figures["press"] * unit, rel=10 * rel)
    assert press(fit).details["predicted_r_squared"] == pytest.approx(figures["predicted_r_squared"], rel=10 * rel)


@pytest.mark.parametrize(
    "name", ["anscombe3", "gesell", "hartnagel", "longley", "prestige", "syn_noint_a", "syn_big_a"]
)
def test_press_against_R(name):
    """R: sum((resid(m) / (1 - hatvalues(m)))^2)"""
    case = load_case(name)
    ours = press(fit_design(case.design()))
    r = next(result for result in case.results if result["method"] == "press")
    assert ours.statistic == pytest.approx(r["press"], rel=1e-9)
    assert ours.details["predicted_r_squared"] == pytest.approx(r["predicted_r_squared"], rel=1e-9)


def test_press_is_refused_with_the_row_that_cannot_be_predicted():
    """R divides 0 by 0 there and prints NaN."""
    case = load_case("syn_lev1_a")
    r = next(result for result in case.results if result["method"] == "press")
    assert "error" in r or not math.isfinite(float(r["press"]))
    ours = press(fit_design(case.design()))
    assert not ours.applies
    assert "row 1 " in ours.reason
