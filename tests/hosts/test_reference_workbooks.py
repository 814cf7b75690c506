"""`sheetfuncs check --json` on a workbook built from each reference case gives the reference's numbers."""

from __future__ import annotations

import json
import math

import pytest
import xlsxwriter
from click.testing import CliRunner
from reference_cases import NAMES, ROUNDING_NOISE, as_number, load_case

from sheetfuncs.cli import main

FIRST_ROW, FIRST_COLUMN = 4, 2
# R's results on the original scale lose a column or digits there; core tests hold these against exact results.
HARD = ("syn_constcol_a", "syn_nearcol_a", "syn_offset_a")


def build_workbook(case, folder):
    """The case's table as a person would have it: not in the corner, a note above it, another sheet before it."""
    path = folder / f"{case.name}.xlsx"
    book = xlsxwriter.Workbook(str(path))
    book.add_worksheet("Notes").write(0, 0, "Reference data")
    sheet = book.add_worksheet("Data of the case")
    sheet.activate()
    sheet.write(0, 0, case.facts["title"])
    for r, row in enumerate(case.cells()):
        for c, value in enumerate(row):
            if value is not None:
                sheet.write(FIRST_ROW - 1 + r, FIRST_COLUMN - 1 + c, value)
    book.close()
    last = f"{chr(64 + FIRST_COLUMN + len(case.predictors))}{FIRST_ROW + len(case.rows)}"
    return path, f"'Data of the case'!B{FIRST_ROW}:{last}"


def figures_of(case, folder, *options):
    path, area = build_workbook(case, folder)
    arguments = ["check", str(path), area, "--no-sheet", "--json", "-", *options]
    arguments += [part for name, level in case.base_levels.items() for part in ("--base", f"{name}={level}")]
    if not case.intercept:
        arguments.append("--no-intercept")
    result = CliRunner().invoke(main, arguments, catch_exceptions=False)
    assert result.exit_code == 0, result.stderr
    return json.loads(result.stdout)


@pytest.mark.parametrize("name", [n for n in NAMES if n not in (*HARD, *ROUNDING_NOISE)])
def test_check_json_against_reference(name, tmp_path):
    case = load_case(name)
    figures = figures_of(case, tmp_path)
    r_ols = next(result for result in case.results if result["method"] == "ols")
    ours = {term["term"]: term for term in figures["fit"]["terms"]}
    assert len(ours) == len(r_ols["coefficients"])
    for term, value in r_ols["coefficients"].items():
        if name == "syn_tiny_a" and not math.isfinite(as_number(value)):
            continue
        entry = ours[case.term(term)]
        assert entry["estimate"] == pytest.approx(as_number(value), rel=1e-9)
        assert entry["error"] == pytest.approx(as_number(r_ols["std_errors"][term]), rel=1e-9)
        assert entry["p"] == pytest.approx(as_number(r_ols["p_values"][term]), rel=1e-7)
    compared = 0
    for entry in figures["statistics"]:
        r = matching(case, entry)
        if r is None or entry.get("reason") or (name == "publicschools" and entry["args"].get("type") == "regressor"):
            continue
        if entry["statistic"] is not None and "statistic" in r:
            assert entry["statistic"] == pytest.approx(as_number(r["statistic"]), rel=1e-9, abs=1e-14), entry
            compared += 1
        if entry["method"] == "lilliefors":  # R's p is from a formula, ours from a simulated table
            continue
        p = entry.get("unadjusted_p", entry["p"])
        if p is not None and as_number(r.get("p", "nan")) > 1e-10 and "unreliable" not in r:
            assert p == pytest.approx(as_number(r["p"]), rel=1e-6), entry
    assert compared >= (8 if name == "syn_smalln_a" else 30)
    dropped = {row["row"] - FIRST_ROW for row in figures["rows"]["excluded"]}
    assert dropped == set(case.facts["rows_dropped_1based"])
    assert figures["rows"]["used"] == case.facts["rows_used"]
    assert figures["by_row"]["row"] == [FIRST_ROW + 1 + i for i in case.used]


def matching(case, entry):
    found = [
        r for r in case.results
        if r["method"] == entry["method"] and "order_by" not in r["args"] and r["method"] != "residual_mean"
        and all(r["args"].get(key) == value for key, value in entry["args"].items())
    ]
    return found[0] if len(found) == 1 else None


@pytest.mark.parametrize("name", ROUNDING_NOISE)
def test_a_fit_without_anything_left_says_so_for_every_test(name, tmp_path):
    figures = figures_of(load_case(name), tmp_path)
    assert figures["fit"]["reason"]
    assert all(term["p"] is None for term in figures["fit"]["terms"])
    tests = [entry for entry in figures["statistics"] if entry["method"] != "vif"]
    assert tests
    assert all(entry["reason"] and entry["p"] is None for entry in tests)


def test_a_constant_column_is_refused_by_its_header(tmp_path):
    path, area = build_workbook(load_case("syn_constcol_a"), tmp_path)
    result = CliRunner().invoke(main, ["check", str(path), area])
    assert result.exit_code == 1
    assert result.stderr.startswith("x2 has the same value in every used row")
    assert result.stderr.count("\n") == 1
    assert not (tmp_path / "syn_constcol_a-checked.xlsx").exists()


def test_ordering_by_a_column_against_R_dwtest(tmp_path):
    """lmtest::dwtest(fit, order.by = t, ...), ties in stable order."""
    case = load_case("syn_ties_a")
    figures = figures_of(case, tmp_path, "--order", "t", "--predictors", "x1,t")
    expected = next(
        r for r in case.results if r["method"] == "durbin_watson_test" and r["args"].get("order_by") == "t"
    )
    ours = next(s for s in figures["statistics"] if s["method"] == "durbin_watson")
    assert ours["statistic"] == pytest.approx(expected["statistic"], rel=1e-9)
