"""The ledger of rows: used, left out and why, hidden; and every remark about how the cells were read."""

from __future__ import annotations

from collections.abc import Sequence

from sheetfuncs.checking import Check
from sheetfuncs.judgement.words import counted
from sheetfuncs.report import style as looks
from sheetfuncs.report.first_screen import sentence
from sheetfuncs.report.layout import COUNT, FIRST, Head, Page
from sheetfuncs.report.links import to_row

ONE_BY_ONE = 50
MOST_RANGES = 60
MOST_REASONS = 50


def write_ledger(page: Page, check: Check, data_sheet: str, data_area: str) -> None:
    """The section: rows used, hidden, remarks, and the rows left out, one by one or by reason."""
    ledger = check.observations.ledger
    page.section("ledger", "Rows used and left out")
    used = counted(len(ledger.used), "row")
    page.labelled("Used", f"{used} of {data_sheet}!{data_area}: {ranges_text(ledger.used.tolist())}.")
    hidden = (
        f"{counted(ledger.hidden, 'used row is', 'used rows are')} hidden or filtered out, and counted like the others."
        if ledger.hidden else "None of the used rows."
    )
    page.labelled("Hidden", hidden)
    for remark in check.remarks:
        page.labelled("Note", remark)
    excluded = [(int(e.row), str(e.reason)) for e in ledger.excluded]
    if not excluded:
        page.labelled("Left out", "None.")
        return
    page.labelled("Left out", f"{counted(len(excluded), 'row')}, as listed. No row was changed or deleted.")
    page.gap(4.0)
    _write_excluded(page, data_sheet, data_area, excluded)


def _write_excluded(page: Page, data_sheet: str, data_area: str, excluded: Sequence[tuple[int, str]]) -> None:
    page.table_head([Head(FIRST, 3, "Row left out"), Head(FIRST + 3, COUNT - 3, "Why")])
    if len(excluded) <= ONE_BY_ONE:
        for row, reason in excluded:
            page.put(FIRST, row, looks.LINK, span=3, link=to_row(data_sheet, data_area, row))
            page.put(FIRST + 3, sentence(reason), looks.BESIDE, span=COUNT - 3)
            page.next()
        return
    groups = by_reason(excluded)
    for reason, rows in groups[:MOST_REASONS]:
        page.put(FIRST, counted(len(rows), "row"), looks.TEXT, span=3)
        page.put(FIRST + 3, sentence(f"{reason}: {ranges_text(rows)}"), looks.BESIDE, span=COUNT - 3)
        page.next()
    if len(groups) > MOST_REASONS:
        rest = [row for _, rows in groups[MOST_REASONS:] for row in rows]
        page.put(FIRST, counted(len(rest), "row"), looks.TEXT, span=3)
        page.put(FIRST + 3, f"Other reasons: {ranges_text(rest)}", looks.BESIDE, span=COUNT - 3)
        page.next()


def by_reason(excluded: Sequence[tuple[int, str]]) -> list[tuple[str, list[int]]]:
    """Rows under each reason, the most frequent first."""
    groups: dict[str, list[int]] = {}
    for row, reason in excluded:
        groups.setdefault(reason, []).append(row)
    return sorted(groups.items(), key=lambda group: -len(group[1]))


def ranges_text(rows: Sequence[int]) -> str:
    """"4 to 17, 19, 21 to 64"; beyond MOST_RANGES stretches the rest is counted."""
    stretches: list[list[int]] = []
    for row in sorted(int(r) for r in rows):
        if stretches and row == stretches[-1][1] + 1:
            stretches[-1][1] = row
        else:
            stretches.append([row, row])
    texts = [str(a) if a == b else f"{a}, {b}" if b == a + 1 else f"{a} to {b}" for a, b in stretches[:MOST_RANGES]]
    more = sum(b - a + 1 for a, b in stretches[MOST_RANGES:])
    return ("rows " if len(rows) != 1 else "row ") + ", ".join(texts) + (f" and {more:,} more" if more else "")
