"""Collinearity: a line a predictor, how much wider its interval is, and which others it moves with."""

from __future__ import annotations

import numpy as np

from sheetfuncs.checking import Check
from sheetfuncs.core.design import Group
from sheetfuncs.judgement.words import listed, times
from sheetfuncs.report import style as looks
from sheetfuncs.report.formats import digits_format
from sheetfuncs.report.layout import COUNT, FIRST, Head, Page
from sheetfuncs.report.near_dependencies import write_near_dependencies

# Below this a partial correlation widens an interval by less than a sixth; naming the predictor would mislead.
_NAMED_FROM = 0.5
_MOST_NAMED = 3
_WIDER = 1.05
_NAME = 5


def write_separation(page: Page, check: Check) -> None:
    """The section: a line a predictor, then a line a group of columns."""
    page.section("separation", "Predictors that move together")
    if len(check.inflation) < 2:
        page.put(FIRST, "There is one predictor: nothing to confuse it with.", looks.WRAPPED, span=COUNT)
        page.next()
    else:
        _write_inflation(page, check)
    write_near_dependencies(page, check)


def _write_inflation(page: Page, check: Check) -> None:
    page.table_head([
        Head(FIRST, _NAME, "Predictor"), Head(FIRST + _NAME, 1, "VIF", right=True),
        Head(FIRST + _NAME + 1, 1, "Columns", right=True), Head(FIRST + _NAME + 2, COUNT - _NAME - 2, "What it means"),
    ])
    partners = moving_together(check)
    for inflation in check.inflation:
        page.put(FIRST, inflation.predictor, looks.WRAPPED, span=_NAME)
        page.number(FIRST + _NAME, inflation.vif, digits_format(inflation.vif, 3))
        page.number(FIRST + _NAME + 1, inflation.df, "0")
        wider = inflation.vif_per_df
        text = (
            f"Its interval is {times(wider)} as wide as it would be if the predictors were unrelated" if wider >= _WIDER
            else "Its interval is hardly wider than it would be if the predictors were unrelated"
        )
        named = partners.get(inflation.predictor, [])
        page.put(
            FIRST + _NAME + 2, text + (f"; it moves with {listed(named)}." if named else "."),
            looks.BESIDE, span=COUNT - _NAME - 2,
        )
        page.next()


def moving_together(check: Check) -> dict[str, list[str]]:
    """Under each predictor the others that it moves with most, the others held fixed; the strongest first.

    The measure is the largest partial correlation between any of their columns, from the inverse of the columns'
    cross products (Whittaker 1990, Graphical Models in Applied Multivariate Statistics, section 5.7, from memory).
    """
    inverse = check.fit.basis.r_inverse
    precision = inverse @ inverse.T
    scale = np.sqrt(np.diag(precision))
    partial = np.abs(precision / np.outer(scale, scale))
    groups = check.design.groups
    found = {}
    for group in groups:
        strengths = [(_strongest(partial, group, other), other.name) for other in groups if other is not group]
        named = sorted([s for s in strengths if s[0] >= _NAMED_FROM], key=lambda s: -s[0])
        found[group.name] = [name for _, name in named[:_MOST_NAMED]]
    return found


def _strongest(partial: np.ndarray, one: Group, other: Group) -> float:
    block = partial[one.start:one.stop, other.start:other.stop]
    return float(block.max()) if block.size else 0.0
