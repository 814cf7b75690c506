"""FIT_WHY: what stops a fit, or what is worth knowing about the rows behind it."""

from __future__ import annotations

from collections.abc import Sequence

from sheetfuncs.core.fit import Fit
from sheetfuncs.errors import SheetfuncsError
from sheetfuncs.functions.declaration import Call, CellResult
from sheetfuncs.functions.regressions import Regression

SHOWN_ROWS = 5
LONGEST = 1_000


def explain_regression(call: Call) -> CellResult:
    """ "ok", or the sentence that stops the fit; then the rows left out and those of leverage 1."""
    try:
        text = _explain(call.regression)
    except SheetfuncsError as refusal:
        text = str(refusal)
    return text if len(text) <= LONGEST else text[: LONGEST - 3] + "..."


def _explain(regression: Regression) -> str:
    fit = regression.fit
    if fit.nothing_left():
        left_out = _left_out(regression)
        return fit.nothing_left() + (f" {left_out}." if left_out else "")
    remarks = [part for part in (_left_out(regression), _alone(fit)) if part]
    return "; ".join(["ok", *remarks]) + ("." if remarks else "")


def _alone(fit: Fit) -> str:
    rows = fit.design.rows[fit.fits_itself].tolist()
    if not rows:
        return ""
    return f"nothing can be tested where a row alone decides its fitted value (leverage 1): {_listed(_rows(rows))}"


def _left_out(regression: Regression) -> str:
    ledger = regression.observations.ledger
    if not ledger.excluded:
        return ""
    count, total = len(ledger.excluded), len(ledger.excluded) + len(ledger.used)
    rows = _listed([f"row {row.row} ({row.reason})" for row in ledger.excluded[:SHOWN_ROWS]], count)
    return f"{count} of {total} rows left out: {rows}"


def _rows(rows: Sequence[int]) -> list[str]:
    return [f"row {row}" for row in rows]


def _listed(items: Sequence[str], count: int | None = None) -> str:
    """The first few items, and how many more there are."""
    count = len(items) if count is None else count
    more = f", and {count - SHOWN_ROWS} more" if count > SHOWN_ROWS else ""
    return ", ".join(items[:SHOWN_ROWS]) + more
