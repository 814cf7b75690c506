"""Groups of columns that move together by their condition indices, and what each group means for the coefficients."""

from __future__ import annotations

from collections.abc import Sequence

from sheetfuncs.checking import Check
from sheetfuncs.core.condition import STRONG, Condition, NearDependency
from sheetfuncs.core.design import INTERCEPT
from sheetfuncs.judgement.words import listed, number
from sheetfuncs.report import style as looks
from sheetfuncs.report.formats import digits_format
from sheetfuncs.report.layout import COUNT, FIRST, Head, Page

TITLE = "Columns that move together"
_NAMES = 5
_SLOPES = (
    "Their coefficients cannot be told apart well: where one comes out too large, another comes out too small. Read "
    "them together; predictions inside the data are not harmed."
)
_LEVEL = (
    "Their values lie far from zero beside their variation, so that the intercept, which speaks of them at zero, is "
    "uncertain. The slopes are not harmed by that."
)


def write_near_dependencies(page: Page, check: Check) -> None:
    """A line a group, or one sentence where there is none."""
    groups = _groups(check)
    if not groups:
        page.gap(3.0)
        page.put(FIRST, _none(check), looks.WRAPPED, span=COUNT)
        page.next()
        return
    top = page.row
    page.subheading(TITLE)
    page.put(
        FIRST, f"Condition indices of the columns, each scaled to the same length. From {STRONG:g} on they count as "
        "strong (Belsley, Kuh and Welsch 1980); a group's columns each owe more than half of their variance to it.",
        looks.QUIET_WRAPPED, span=COUNT,
    )
    page.next()
    page.table_head([
        Head(FIRST, _NAMES, "Columns"), Head(FIRST + _NAMES, 1, "Condition\nindex", right=True),
        Head(FIRST + _NAMES + 1, COUNT - _NAMES - 1, "What it means"),
    ])
    for group, meaning in groups:
        first, *others = group.terms
        page.put(FIRST, listed(["Intercept" if meaning is _LEVEL else first, *others]), looks.WRAPPED, span=_NAMES)
        page.number(FIRST + _NAMES, group.index, digits_format(group.index, 3))
        page.put(FIRST + _NAMES + 1, meaning, looks.BESIDE, span=COUNT - _NAMES - 1)
        page.next()
    page.kept.append((top, page.row - 1))


def _groups(check: Check) -> list[tuple[NearDependency, str]]:
    """Slopes about their means, where there is an intercept; then those that the intercept belongs to."""
    if check.condition_centred is None:
        return [(group, _SLOPES) for group in _found(check.condition)]
    slopes = [(group, _SLOPES) for group in _found(check.condition_centred)]
    return slopes + [(group, _LEVEL) for group in _found(check.condition) if group.terms[0] == INTERCEPT]


def _found(condition: object) -> Sequence[NearDependency]:
    return condition.near_dependencies if isinstance(condition, Condition) else ()


def _none(check: Check) -> str:
    if not isinstance(check.condition, Condition):
        return check.condition.reason
    conditions = [one for one in (check.condition_centred, check.condition) if isinstance(one, Condition)]
    indices = listed([f"{number(one.number)}{' about their means' if one.centred else ' as they are'}"
                      for one in conditions])
    source = "(Belsley, Kuh and Welsch 1980)"
    if max(one.number for one in conditions) < STRONG:
        return (
            f"No group of columns moves together: the largest condition index is {indices}; from {STRONG:g} on it "
            f"would count as strong {source}."
        )
    return (
        f"The largest condition index is {indices}; from {STRONG:g} on it counts as strong {source}. Which columns "
        "move together cannot be told from it: the factors above say whose intervals are wide."
    )
