"""FIT_WHY: what stops a fit, or what is worth knowing about the rows behind it."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

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
    nothing_left = fit.nothing_left()
    parts = [nothing_left or "ok", _left_out(regression)]
    alone = np.flatnonzero(fit.fits_itself)
    if alone.size and not nothing_left:
        rows = _listed([f"row {row}" for row in fit.design.rows[alone].tolist()])
        parts.append(f"Leverage 1, so that nothing can be tested there: {rows}.")
    return " ".join(_joined(parts))


def _joined(parts: Sequence[str]) -> list[str]:
    kept = [part for part in parts if part]
    return [kept[0] + ";", *kept[1:]] if kept[0] == "ok" and len(kept) > 1 else kept


def _left_out(regression: Regression) -> str:
    ledger = regression.observations.ledger
    if not ledger.excluded:
        return ""
    count, total = len(ledger.excluded), len(ledger.excluded) + len(ledger.used)
    rows = _listed([f"row {row.row} ({row.reason})" for row in ledger.excluded[: SHOWN_ROWS + 1]], count)
    return f"{count} of {total} rows left out: {rows}."


def _listed(items: Sequence[str], count: int | None = None) -> str:
    """The first few items, and how many more there are."""
    count = len(items) if count is None else count
    more = f", and {count - SHOWN_ROWS} more" if count > SHOWN_ROWS else ""
    return ", ".join(items[:SHOWN_ROWS]) + more
