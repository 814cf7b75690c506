"""What the evidence touches, for each use of the fit, and what to do next. Worded as evidence, not as a verdict."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from sheetfuncs.judgement.evidence import Evidence
from sheetfuncs.judgement.words import listed

# Which assumptions each use leans on, most important first. Common practice, as set out for instance in
# Weisberg 2014, Applied Linear Regression, chapters 7 to 9 (chapters from memory).
LEANS_ON = {
    "coefficient": ("form", "independence", "constant variance", "rows"),
    "average value": ("form", "independence", "constant variance", "rows"),
    "new value": ("form", "constant variance", "normality", "independence", "rows"),
}
TITLES = {
    "coefficient": "Read a coefficient",
    "average value": "Predict an average value",
    "new value": "Predict one new value",
}
SHORT = {
    "form": "the straight-line form", "independence": "independence", "constant variance": "constant variance",
    "normality": "normality",
}
NEXT = {
    "form": "Look at the chart of residuals against fitted values; try a transformed or added predictor, and check "
            "again.",
    "independence": "Make sure the rows stand in time order, then look for what drifts: a season, a machine, a batch. "
                    "Until then read the error bars as too narrow.",
    "constant variance": "Look at the spread chart; if errors grow with size, try weights or a logarithm of the "
                         "response, and check again.",
    "normality": "Look at the normal scores: is it a few rows, or a skewed response? Intervals for new values need "
                 "it most.",
    "rows": "Look at the rows listed below at their source; fit with and without them and report both. Do not delete "
            "a row because it disagrees.",
}


@dataclass(frozen=True)
class Use:
    """One use of the fit and the sentence that concerns it."""

    use: str
    title: str
    sentence: str


def uses(evidence: Sequence[Evidence], *, nothing_left: str = "") -> tuple[Use, ...]:
    """A sentence for each use."""
    return tuple(Use(use, TITLES[use], _sentence(use, evidence, nothing_left)) for use in LEANS_ON)


def next_steps(evidence: Sequence[Evidence], *, nothing_left: str = "") -> tuple[str, ...]:
    """What to do next, at most three sentences."""
    if nothing_left:
        return (nothing_left,)
    by_name = {e.assumption: e for e in evidence}
    order = ("form", "independence", "constant variance", "rows", "normality")
    steps = [NEXT[name] for name in order if _concerns(by_name[name])]
    return tuple(steps[:3]) or (
        "Nothing found that asks for action. That is not proof: check that the rows cover the range you will use it "
        "for, and look at the charts once.",
    )


def _concerns(evidence: Evidence) -> bool:
    if evidence.assumption == "rows":
        return evidence.finding.endswith(".") and "a look" in evidence.finding
    return evidence.against


def _sentence(use: str, evidence: Sequence[Evidence], nothing_left: str) -> str:
    if nothing_left:
        return "The fit leaves nothing to judge an error bar by."
    by_name = {e.assumption: e for e in evidence}
    against = [SHORT[name] for name in LEANS_ON[use] if name != "rows" and by_name[name].against]
    untested = [SHORT[name] for name in LEANS_ON[use] if name != "rows" and by_name[name].strength == "not tested"]
    rows = _concerns(by_name["rows"])
    if against:
        sentence = f"There is evidence against {listed(against)}, on which this rests"
        sentence += ", and single rows stand out." if rows else "."
    elif rows:
        sentence = "No test found evidence against what this rests on, but single rows stand out."
    else:
        sentence = "No test found evidence against what this rests on; that is not proof."
    if untested:
        sentence += f" Not tested: {listed(untested)}."
    return sentence
