"""The decision record, which the analyst fills and a re-run keeps; and the settings and versions behind the sheet."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime

from sheetfuncs.checking import Check, versions
from sheetfuncs.core.fingerprint import data_fingerprint
from sheetfuncs.report import style as looks
from sheetfuncs.report.elements import Area, Choice, Value
from sheetfuncs.report.entries import LABELS, NOTES, YES_OR_NO, shown_entries
from sheetfuncs.report.layout import FIRST, LAST, Page
from sheetfuncs.report.names import DECISION, ENTRY

# The places of the record, in order; the hidden name _sheetfuncs_decision_1 points at the cell of the first, and so on.
# "data" is filled by us: the fingerprint of the data that the record was first kept for.
DECISION_FIELDS = ("decision", "reason", "by", "date", "reviewed by", "data")
_DECISION_LABELS = {
    "decision": "Decision", "reason": "Reason, and limits of use", "by": "Decided by", "date": "Date",
    "reviewed by": "Reviewed by", "data": "Fingerprint of the data decided on",
}
_OPTIONS = ("Use it", "Use it within the limits given as reason", "Do not use it yet")
_LABEL, _ENTRY, _SETTING = 3, 11, 6
CHANGED = (
    "The used data have changed since this record was filled in. Decide again; then clear the last cell of the record, "
    "and the next run puts the present fingerprint there."
)
_DATE_FORMAT = "yyyy-mm-dd"


def write_decision(page: Page, decision: Mapping[str, Value] | None, fingerprint: str) -> None:
    """The record; what was filled in before is written back unchanged, and a change of the data since is said."""
    page.section(
        "decision", "Decision record",
        "Fill in the pale cells. They are kept when the check is run again on the same range.",
    )
    first = page.kept.pop()[0]
    kept = _with_data(decision or {}, fingerprint)
    if kept["data"] != fingerprint:
        page.put(FIRST, CHANGED, looks.WRAPPED.but(bold=True, colour=looks.SMOOTH), span=_LABEL + _ENTRY)
        page.next()
    for place, field in enumerate(DECISION_FIELDS):
        value = kept.get(field)
        number = isinstance(value, int | float) and not isinstance(value, bool)
        look = looks.ENTRY.but(number_format=_DATE_FORMAT if field == "date" else "General", align="left")
        if field == "data":
            look = look.but(colour=looks.QUIET)
        page.put(FIRST, _DECISION_LABELS[field], looks.TEXT.but(upright="vcenter"), span=_LABEL)
        column = FIRST + _LABEL
        page.put(column, value if number or value is None else str(value), look, span=_ENTRY)
        page.ask_height(44.0 if field == "reason" else 19.0)
        if field == "decision":
            page.choices.append(Choice(page.row, column, _OPTIONS))
        page.names[f"{DECISION}{place + 1}"] = "=" + Area(page.row, column, page.row, column).on(page.title)
        page.next()
    page.kept.append((first, page.row - 1))  # a record that is signed stands on one page


def _with_data(decision: Mapping[str, Value], fingerprint: str) -> dict[str, Value]:
    """The record with the fingerprint it is about: the one kept so far, or this one's while nothing is filled in."""
    filled = any(decision.get(field) not in (None, "") for field in DECISION_FIELDS if field != "data")
    data = decision.get("data") if filled else None
    return {**decision, "data": str(data) if data not in (None, "") else fingerprint}


def write_settings(
    page: Page, check: Check, data_sheet: str, data_area: str, checked_at: datetime | None, fingerprint: str
) -> None:
    """The section: what the sheet was made with, in cells that can be changed, and the fingerprint of the data."""
    page.section(
        "settings", "Settings and versions",
        "What this sheet was made with. Change a pale cell, and run the check again with this sheet in front: it is "
        "written anew with the change, and the decision record stays.",
    )
    first = page.kept.pop()[0]
    page.labelled("Data", f"{data_sheet}!{data_area}", label_span=_LABEL)
    _write_entries(page, check)
    page.kept.append((first, page.row - 1))  # what can be changed stands on one page
    lines = [
        ("Workbook", check.settings.book),
        ("Checked", checked_at.strftime("%Y-%m-%d %H:%M") if checked_at else None),
        ("Computed with", ", ".join(f"{name} {version}" for name, version in versions().items())),
        ("Fingerprint of the data", f"SHA-256 {fingerprint}"),
    ]
    for label, text in lines:
        if text:
            page.labelled(label, text, label_span=_LABEL)
    page.put(
        FIRST, "The fingerprint is taken over the names and the used values of response and predictors, as 8-byte "
        "numbers, row by row: it changes if any of them does.", looks.QUIET_WRAPPED, span=LAST - FIRST + 1,
    )
    page.next()


def entries_of(check: Check) -> dict[str, Value]:
    """What the cells of the settings show for this check."""
    return shown_entries(check.settings.to_dict(), check.design.base_levels)


def _write_entries(page: Page, check: Check) -> None:
    for place, (field, value) in enumerate(entries_of(check).items(), 1):
        page.put(FIRST, LABELS[field], looks.TEXT.but(upright="vcenter"), span=_LABEL)
        column = FIRST + _LABEL
        look = looks.ENTRY.but(number_format=_format_of(value), align="left")
        page.put(column, value, look, span=_SETTING)
        page.put(column + _SETTING, NOTES[field], looks.QUIET_BESIDE.but(upright="vcenter"), span=_ENTRY - _SETTING)
        page.ask_height(19.0)
        if field == "intercept":
            page.choices.append(Choice(page.row, column, YES_OR_NO))
        page.names[f"{ENTRY}{place}"] = "=" + Area(page.row, column, page.row, column).on(page.title)
        page.next()


def _format_of(value: Value) -> str:
    """Of an entry: the level, the only number among them, as a percentage with the digits it needs."""
    if not isinstance(value, float):
        return "General"
    return "0%" if round(100.0 * value, 9).is_integer() else "0.00%"


def fingerprint_of(check: Check) -> str:
    """The fingerprint of the used data of a check."""
    return data_fingerprint(check.design)
