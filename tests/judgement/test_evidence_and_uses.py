"""Evidence is worded as evidence: no verdict, a direction that is right, and what it bears on."""

from __future__ import annotations

import re

import numpy as np
import pytest
from reference_cases import NAMES, load_case

import sheetfuncs
from sheetfuncs.judgement.uses import next_steps, uses

ASSUMPTIONS = ["mean", "form", "constant variance", "independence", "normality", "collinearity", "rows"]
VERDICTS = ("holds", "in doubt", "fails", "cannot tell", "valid", "passed", "OK", "significant")


def check_of(error, n=80, seed=3, predictors=2, **options):
    random = np.random.default_rng(seed)
    x = random.normal(size=(n, predictors))
    return sheetfuncs.check(5 + x.sum(axis=1) + error(random, x, n), x, **options)


def plain(random, x, n):
    return random.normal(size=n)


def drifting(random, x, n):
    errors = random.normal(size=n)
    for i in range(1, n):
        errors[i] += 0.8 * errors[i - 1]
    return errors


def alternating(random, x, n):
    errors = random.normal(size=n)
    for i in range(1, n):
        errors[i] -= 0.8 * errors[i - 1]
    return errors


def spreading(random, x, n):
    return random.normal(size=n) * np.exp(x.sum(axis=1))


def bent(random, x, n):
    return random.normal(size=n) + 2 * x.sum(axis=1) ** 2


def skewed(random, x, n):
    return random.exponential(size=n) ** 2


def evidence_of(check):
    return {e.assumption: e for e in check.evidence}


def test_every_assumption_has_one_line_without_a_verdict():
    for error in (plain, drifting, spreading, bent, skewed):
        check = check_of(error)
        assert [e.assumption for e in check.evidence] == ASSUMPTIONS
        for e in check.evidence:
            assert (e.p is not None) == (e.with_test != e.finding)
            assert e.p is None or (f" ({e.test})" in e.with_test and not re.search("p [=<>]", e.without_p))
            said = f" {e.finding} {e.size} "
            assert not any(f" {word} " in said for word in VERDICTS), said
            assert e.finding.endswith(".")
            assert e.question.endswith("?")
            assert e.test


def test_nothing_found_is_said_not_to_be_proof():
    check = check_of(plain)
    for name in ("form", "constant variance", "independence", "normality"):
        assert "not proof" in evidence_of(check)[name].finding
    assert all("not proof" in use.sentence for use in uses(check.evidence))
    assert "not proof" in next_steps(check.evidence)[0]


@pytest.mark.parametrize(("error", "assumption"), [
    (drifting, "independence"), (spreading, "constant variance"), (bent, "form"), (skewed, "normality"),
])
def test_a_violation_is_found_where_it_is(error, assumption):
    check = check_of(error)
    evidence = evidence_of(check)[assumption]
    assert evidence.strength == "clear"
    assert evidence.against
    assert evidence.finding.startswith("Clear evidence against")
    touched = {use.use: use.sentence for use in uses(check.evidence)}
    assert "evidence against" in touched["new value"]


def test_the_direction_of_correlation():
    assert "correlate +" in evidence_of(check_of(drifting))["independence"].size
    assert "correlate -" in evidence_of(check_of(alternating))["independence"].size


def test_normality_bears_on_new_values_and_not_on_averages():
    sentences = {use.use: use.sentence for use in uses(check_of(skewed, n=300).evidence)}
    assert "normality" in sentences["new value"]
    assert "normality" not in sentences["average value"]


def test_collinearity_names_the_predictor_and_how_much_wider():
    random = np.random.default_rng(1)
    weight = random.normal(size=50)
    x = np.column_stack([weight, weight + 0.01 * random.normal(size=50), random.normal(size=50)])
    check = sheetfuncs.check(weight + random.normal(size=50), x, names=["weight", "volume", "holes"])
    evidence = evidence_of(check)["collinearity"]
    widest = max(check.inflation, key=lambda i: i.vif)
    assert widest.predictor in ("weight", "volume")
    assert evidence.finding.startswith(f"{widest.predictor}'s interval is {np.sqrt(widest.vif):.0f} times as wide")
    assert "weight and volume move together" in evidence.size
    assert "holes" not in evidence.finding + evidence.size


@pytest.mark.parametrize("name", [n for n in NAMES if n != "syn_constcol_a"])
def test_every_reference_case_can_be_worded(name):
    case = load_case(name)
    design = case.design()
    check = sheetfuncs.check(design.response, design.columns, names=design.column_names, intercept=case.intercept)
    assert [e.assumption for e in check.evidence] == ASSUMPTIONS
    sentences = [u.sentence for u in uses(check.evidence, nothing_left=check.fit.nothing_left())]
    assert len(sentences) == 3
    assert all(s.endswith(".") for s in sentences)
    assert 1 <= len(next_steps(check.evidence, nothing_left=check.fit.nothing_left())) <= 3


def test_residuals_of_one_size_are_worded_too():
    check = sheetfuncs.check(np.ones(12), np.tile([1.0, -1.0], 6), intercept=False)
    assert [e.assumption for e in check.evidence] == ASSUMPTIONS
