"""What a chart shows when there are more rows than it can carry. A chart of a million points stops a spreadsheet."""

from __future__ import annotations

import numpy as np

from sheetfuncs.checking import Check

MOST_POINTS = 5_000
SEED = 1
# A line through more points than a chart has pixels across is a smear: beyond this, stretches of rows or quantiles.
MOST_IN_LINE = 2_000
STRETCHES = 1_000


def is_thinned(check: Check) -> bool:
    """Whether point charts show a choice of the rows only."""
    return check.design.n > MOST_POINTS


def points_look(count: int) -> str:
    """Many points are drawn small, so that they do not run together."""
    return "points" if count <= 400 else "many points"


def shown_rows(check: Check) -> np.ndarray:
    """Indices of the used rows that point charts show: all of them, or a fixed random choice of MOST_POINTS.

    The choice always includes the rows to look at and the two rows with the extreme residuals.
    """
    n = check.design.n
    if not is_thinned(check):
        return np.arange(n)
    chosen = np.random.default_rng(SEED).choice(n, MOST_POINTS, replace=False)
    residuals = check.fit.residuals
    always = [flag.index for flag in check.flagged] + [int(residuals.argmin()), int(residuals.argmax())]
    return np.union1d(chosen, always)


def thinning_note(check: Check) -> str:
    """What a chart of shown_rows leaves out; empty where it shows every row."""
    if not is_thinned(check):
        return ""
    return (
        f" Shown: {len(shown_rows(check)):,} of {check.design.n:,} rows, a fixed random choice (seed {SEED}) with "
        "every row to look at and both extremes."
    )


def stretch_means(values: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Means of STRETCHES stretches of neighbouring values, and the place (from 1) of each one's middle."""
    parts = np.array_split(np.arange(values.shape[0]), STRETCHES)
    return np.array([part.mean() + 1 for part in parts]), np.array([values[part].mean() for part in parts])
