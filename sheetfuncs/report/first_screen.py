"""The first screen: what was fitted, what it can be used for, what to do next, and one line an assumption."""

from __future__ import annotations

from sheetfuncs.checking import Check
from sheetfuncs.judgement.evidence import Evidence
from sheetfuncs.judgement.uses import next_steps, uses
from sheetfuncs.judgement.words import counted, listed, number
from sheetfuncs.report import style as looks
from sheetfuncs.report.formats import PVALUE
from sheetfuncs.report.layout import COUNT, FIRST, LAST, ROW_POINTS, Head, Page
from sheetfuncs.report.links import to_area
from sheetfuncs.report.text import shortened

CAUTION = (
    "A test that finds nothing is not proof, and evidence is no guarantee. Where a result can hurt someone, have it "
    "reviewed by a qualified person; local codes and rules come first."
)
JUMPS = (
    ("charts", "Charts"), ("rows", "Single rows"), ("statistics", "Statistics"), ("fit", "The fit"),
    ("ledger", "Rows used"), ("cross-check", "Cross-check"), ("decision", "Decision"), ("settings", "Settings"),
)
_QUESTION, _FINDING, _SIZE, _TEST = 2, 3, 4, 4
_LEAST = 13.5  # rows stand closer here than below, so that all of it fits one screen


def write_first_screen(page: Page, check: Check, data_sheet: str, data_area: str) -> None:
    """Everything that must be seen without scrolling; row 2 is left free for the jumps."""
    page.least = _LEAST
    page.put(FIRST, page.title, looks.TITLE, span=COUNT)
    page.ask_height(25.0)
    page.next(2)
    page.gap(6.0)
    _write_what(page, check, data_sheet, data_area)
    page.gap(6.0)
    _write_uses(page, check)
    page.gap(6.0)
    _write_assumptions(page, check)
    page.gap(4.0)
    page.put(FIRST, CAUTION, looks.QUIET_WRAPPED, span=COUNT)
    page.next()
    page.least = ROW_POINTS


def write_jumps(page: Page, row: int = 2) -> None:
    """The line of jumps to the sections, once their rows are known."""
    with page.at(row):
        column = FIRST
        for anchor, label in JUMPS:
            if anchor in page.anchors:
                with page.at(page.anchors[anchor]):
                    target = page.here(1)
                page.put(column, label, looks.LINK, link=target)
                column += 1


def what_was_fitted(check: Check) -> str:
    """"Cost from Weight and Holes, a straight-line fit with an intercept." in one sentence."""
    settings = check.settings
    names = [shortened(name, 60 if len(settings.predictors) < 4 else 32) for name in settings.predictors]
    if len(names) > 8:
        names = [*names[:7], f"{len(names) - 7} more"]
    intercept = "with an intercept" if settings.intercept else "through zero, without an intercept"
    return f"{shortened(settings.response, 60)} from {listed(names)}, fitted by least squares {intercept}."


def how_many_rows(check: Check) -> str:
    """How many rows were used, left out, hidden, in one sentence."""
    ledger = check.observations.ledger
    parts = [f"{counted(len(ledger.used), 'row')} used"]
    if ledger.excluded:
        parts.append(f"{len(ledger.excluded):,} left out (listed under Rows used)")
    if ledger.hidden:
        parts.append(f"{ledger.hidden:,} of the used rows hidden or filtered out, and counted all the same")
    return ", ".join(parts) + "."


def how_well(check: Check) -> str:
    """The size of the errors, and the share that the fit explains, in one sentence; empty where neither exists."""
    fit = check.fit
    if not fit.has_error_bars:
        return ""
    about = "" if check.settings.intercept else ", counted from zero"
    return (
        f"A typical error of {number(fit.sigma)} in {shortened(check.settings.response, 40)} is left; "
        f"R² is {fit.r_squared:.3f}{about}."
    )


def _write_what(page: Page, check: Check, data_sheet: str, data_area: str) -> None:
    page.put(FIRST, what_was_fitted(check), looks.LEAD.but(wrap=True), span=COUNT - 3)
    label = f"To the data: {shortened(data_sheet, 22)}!{data_area}"
    page.put(LAST - 2, label, looks.LINK.but(align="right", upright="vcenter"), span=3,
             link=to_area(data_sheet, data_area))
    page.ask_height(18.0)
    page.next()
    page.put(FIRST, " ".join(filter(None, (how_many_rows(check), how_well(check)))), looks.WRAPPED, span=COUNT)
    page.next()
    if check.remarks:
        remarks = check.remarks if len(check.remarks) < 3 else (*check.remarks[:2], "More under Rows used.")
        page.put(FIRST, " ".join(remarks), looks.WRAPPED, span=COUNT)
        page.next()


def _write_uses(page: Page, check: Check) -> None:
    nothing_left = check.fit.nothing_left()
    for use in uses(check.evidence, nothing_left=nothing_left):
        page.put(FIRST, use.title, looks.STRONG, span=2)
        page.put(FIRST + 2, use.sentence, looks.WRAPPED, span=COUNT - 2)
        page.next()
    page.gap(6.0)
    for place, step in enumerate(next_steps(check.evidence, nothing_left=nothing_left)):
        page.put(FIRST, "What to do next" if place == 0 else None, looks.STRONG, span=2)
        page.put(FIRST + 2, step, looks.WRAPPED, span=COUNT - 2)
        page.next()


def _write_assumptions(page: Page, check: Check) -> None:
    finding = FIRST + _QUESTION
    size = finding + _FINDING
    test = size + _SIZE
    page.table_head([
        Head(FIRST, _QUESTION, "Question"), Head(finding, _FINDING, "What was found"), Head(size, _SIZE, "How large"),
        Head(test, _TEST, "Test and variant"), Head(LAST, 1, "p", right=True),
    ])
    nothing_left = check.fit.nothing_left()
    for evidence in check.evidence:
        line = looks.HAIRLINE
        page.put(FIRST, evidence.question, looks.WRAPPED.but(below=line), span=_QUESTION)
        text = "Not tested." if evidence.finding == nothing_left else without_p(evidence)
        page.put(finding, text, finding_look(evidence).but(below=line, indent=1), span=_FINDING)
        page.put(size, sentence(evidence.size), looks.BESIDE.but(below=line), span=_SIZE)
        page.put(test, evidence.test, looks.QUIET_BESIDE.but(below=line), span=_TEST)
        if evidence.p is None:
            page.put(LAST, None, looks.NUMBER.but(below=line))
        else:
            page.number(LAST, evidence.p, PVALUE, looks.NUMBER.but(below=line))
        page.next()


def without_p(evidence: Evidence) -> str:
    """The finding without its p, where p has a column of its own."""
    if evidence.strength == "not tested":
        return f"Not tested. {evidence.finding}"
    return evidence.without_p


def finding_look(evidence: Evidence) -> looks.Style:
    """Evidence against stands in bold, so that it carries in grey and without colour; what was not tested is quiet."""
    if evidence.against:
        return looks.WRAPPED.but(bold=True, colour=looks.SMOOTH if evidence.strength == "clear" else looks.INK)
    return looks.QUIET_WRAPPED if evidence.strength == "not tested" else looks.WRAPPED


def sentence(text: str) -> str:
    """With a capital and a full stop."""
    return text and text[:1].upper() + text[1:] + ("" if text.endswith(".") else ".")
