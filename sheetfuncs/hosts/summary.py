"""A friendly summary of a check: a few lines for a terminal."""

from __future__ import annotations

import shutil
import textwrap
from collections.abc import Iterator
from typing import TYPE_CHECKING

from sheetfuncs.judgement.uses import next_steps, uses
from sheetfuncs.judgement.words import counted, listed, number

if TYPE_CHECKING:
    from sheetfuncs.hosts.files import Done


def summary_lines(done: Done) -> Iterator[str]:
    """What was fitted, one line an assumption, what to do next, where the sheet is."""
    check = done.check
    yield from _wrapped(_what(done))
    yield ""
    width = max(len(e.assumption) for e in check.evidence) + 2
    for evidence in check.evidence:
        text = evidence.with_test + (f" {_sentence(evidence.size)}" if evidence.size else "")
        yield from _wrapped(text, first=f"  {evidence.assumption:<{width}}", rest=" " * (width + 2))
    yield ""
    nothing_left = check.fit.nothing_left()
    if not nothing_left:
        for use in uses(check.evidence):
            yield from _wrapped(use.sentence, first=f"  {use.title}: ", rest="    ")
    for prediction in done.predictions:
        yield from _wrapped(_prediction(prediction, check.settings.response), first="  ", rest="    ")
    for step in next_steps(check.evidence, nothing_left=nothing_left):
        yield from _wrapped(step, first="  Next: ", rest="    ")
    for remark in check.remarks:
        yield from _wrapped(remark, first="  Note: ", rest="    ")
    if done.out is not None:
        yield ""
        yield f'{"Replaced" if done.replaced else "Wrote"} the sheet "{done.sheet}" in {done.out}'


def _what(done: Done) -> str:
    check = done.check
    settings, ledger = check.settings, check.observations.ledger
    where = f"{settings.sheet}!{settings.area}" if settings.sheet and settings.area else "the data"
    rows = f"{counted(len(ledger.used), 'row')} used"
    if ledger.excluded:
        rows += f", {len(ledger.excluded):,} left out"
    if ledger.hidden:
        rows += f", {ledger.hidden:,} of the used ones hidden"
    origin = "" if settings.intercept else ", through the origin"
    return f"{settings.response} from {listed(settings.predictors)}{origin} ({where}: {rows})."


def _prediction(prediction: dict, response: str) -> str:
    at = ", ".join(f"{name} {value}" for name, value in prediction["at"].items())
    text = f"At {at}: {response} {number(prediction['value'], 4)}"
    if prediction["new_low"] is not None:
        text += (
            f"; average between {number(prediction['average_low'], 4)} and {number(prediction['average_high'], 4)}, "
            f"one new value between {number(prediction['new_low'], 4)} and {number(prediction['new_high'], 4)} "
            f"({prediction['level']:.4g} level, if the assumptions hold)"
        )
    return text + (". This place lies outside the data." if prediction["outside"] else ".")


def _sentence(text: str) -> str:
    return text[:1].upper() + text[1:] + ("" if text.endswith(".") else ".")


def _wrapped(text: str, first: str = "", rest: str = "") -> Iterator[str]:
    width = min(max(shutil.get_terminal_size((100, 24)).columns, 60), 110)
    yield from textwrap.wrap(text, width, initial_indent=first, subsequent_indent=rest) or [first.rstrip()]
