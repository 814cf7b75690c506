"""What is said when a check is done: where its sheet is, what follows for each use, and what to see to."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sheetfuncs.checking import Check
from sheetfuncs.hosts.excel.native import ask
from sheetfuncs.hosts.excel.sheets import OurSheet
from sheetfuncs.judgement.uses import uses
from sheetfuncs.judgement.words import counted, listed
from sheetfuncs.report.entries import ENTRY_FIELDS, LABELS

if TYPE_CHECKING:
    import xlwings as xw


def message_of_check(
    book: xw.Book, check: Check, title: str, lost: tuple[str, ...], unasked: OurSheet | None
) -> str:
    """The message, in paragraphs.

    lost: where something pointed at the earlier sheet and could not be kept. unasked: the earlier sheet of the same
    range, where the check was made with settings of its own rather than with that sheet's.
    """
    parts = [_where(check, title), *_findings(check)]
    if unasked is not None and (others := _other_choices(check, unasked)):
        parts.append(
            f"The sheet before was made with another choice of {listed(others)}. To have that choice again, put it "
            "under Settings on the sheet, and check again."
        )
    if lost:
        parts.append(f"These pointed at the earlier sheet and have to be entered again: {', '.join(lost)}.")
    if ask(book, "ReadOnly", "read_only"):
        parts.append("This workbook is open for reading only: save it under another name to keep the sheet.")
    return "\n\n".join(parts)


def _where(check: Check, title: str) -> str:
    ledger = check.observations.ledger
    left_out = f", {len(ledger.excluded):,} left out" if ledger.excluded else ""
    return (
        f"The check of “{check.settings.sheet}” is in the sheet “{title}” "
        f"({counted(len(ledger.used), 'row')} used{left_out})."
    )


def _findings(check: Check) -> list[str]:
    """A sentence for each use; uses of which the same is true share it."""
    nothing_left = check.fit.nothing_left()
    if nothing_left:
        return [nothing_left]
    titles: dict[str, list[str]] = {}
    for use in uses(check.evidence):
        titles.setdefault(use.sentence, []).append(use.title)
    return [
        f"{listed([first, *(title[:1].lower() + title[1:] for title in others)])}: {sentence}"
        for sentence, (first, *others) in titles.items()
    ]


def _other_choices(check: Check, earlier: OurSheet) -> list[str]:
    """Labels of the settings in which the check differs from the sheet before."""
    now, before = check.settings.to_dict(), earlier.settings
    return [LABELS[name].lower() for name in ENTRY_FIELDS if name in before and before[name] != now[name]]
