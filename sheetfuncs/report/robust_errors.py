"""The same coefficients with error bars that stand unequal spread, or related neighbours, beside the ordinary ones."""

from __future__ import annotations

import numpy as np

from sheetfuncs.checking import Check
from sheetfuncs.core.covariance import Covariance
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.report import style as looks
from sheetfuncs.report.formats import digits_format, estimate_format
from sheetfuncs.report.layout import COUNT, FIRST, Head, Page
from sheetfuncs.report.terms import term_label

TITLE = "The same coefficients with other error bars"
NOTE = (
    "Ordinary error bars assume errors that are equally wide everywhere and unrelated. HC3 is meant for errors of "
    "unequal spread, Newey-West for neighbours in time order that are related, whatever their spread. Neither moves a "
    "coefficient or mends a missed bend, and with few rows both are rough."
)
_TERM = 5
_KINDS: tuple[tuple[str, str, dict[str, str]], ...] = (
    ("HC3", "hc_se", {"type": "HC3"}), ("Newey-West", "newey_west", {}),
)


def write_other_error_bars(page: Page, check: Check) -> None:
    """A line a term: the ordinary standard error, then for each other kind standard error and limits."""
    top = page.row
    page.subheading(TITLE)
    page.put(FIRST, NOTE, looks.QUIET_WRAPPED, span=COUNT)
    page.next()
    first = FIRST + _TERM
    labels = ["Ordinary\nerror", *(label for name, _, _ in _KINDS for label in (f"{name}\nerror", "From", "To"))]
    page.table_head([
        Head(FIRST, _TERM, "Term"), *(Head(first + i, 1, label, right=True) for i, label in enumerate(labels)),
    ])
    kinds = [(name, check.covariance(method, **args)) for name, method, args in _KINDS]
    for j in range(check.fit.p):
        page.put(FIRST, term_label(check, j), looks.WRAPPED, span=_TERM)
        error = float(check.fit.standard_errors[j])
        page.number(first, error, digits_format(error, 3))
        for place, (_, result) in enumerate(kinds):
            _write_kind(page, first + 1 + 3 * place, check, result, j)
        page.next()
    page.put(FIRST, " ".join(_remark(name, result) for name, result in kinds), looks.QUIET_WRAPPED, span=COUNT)
    page.next()
    page.kept.append((top, page.row - 1))


def _write_kind(page: Page, column: int, check: Check, result: Covariance | DoesNotApply, j: int) -> None:
    error, low, high = (
        (np.nan, np.nan, np.nan) if isinstance(result, DoesNotApply) else
        (float(result.standard_errors[j]), float(result.low[j]), float(result.high[j]))
    )
    limits = estimate_format(float(check.fit.coefficients[j]), error)
    page.number(column, error, digits_format(error, 3))
    page.number(column + 1, low, limits)
    page.number(column + 2, high, limits)


def _remark(name: str, result: Covariance | DoesNotApply) -> str:
    """How this kind is computed, or why it does not apply."""
    return f"{name} does not apply: {result.reason}" if isinstance(result, DoesNotApply) else f"{name}: {result.note}."
