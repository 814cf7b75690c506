"""Simulates the tables from which sheetfuncs reads p-values: sheetfuncs/core/tables/lilliefors.csv, jarque_bera.csv.

    python tests/tables/make_normality_tables.py

A few minutes on one core. Each row of a table is a number of rows n; its figures are the values that the statistic of
n independent normal draws exceeds with the probability at the head of the column. Every n has a seed of its own, so
that one row can be made again without the others.

Rows of SMOOTH_FROM and more are smoothed over n: the logarithm of each quantile is a polynomial in 1/sqrt(n), fitted by
weighted least squares to what was simulated (as response surfaces are: MacKinnon 2010, "Critical values for
cointegration tests", Queen's Economics Department Working Paper 1227, section 3). Its constant gives the row "inf" of
the Lilliefors table; that of Jarque-Bera is the exact chi-square quantile, -2 log p, and the polynomial is held to it.
The script prints how well the polynomials fit, as chi-square per degree of freedom, which is near 1 where they do.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator
from pathlib import Path

import numpy as np
from scipy.special import ndtr

FOLDER = Path(__file__).parents[2] / "sheetfuncs" / "core" / "tables"
SEED = 19670601
LEVELS = (
    0.0001, 0.00015, 0.0002, 0.0003, 0.0005, 0.0007, 0.001, 0.0015, 0.002, 0.003, 0.005, 0.007, 0.01, 0.015, 0.02,
    0.025, 0.03, 0.04, 0.05, 0.06, 0.08, 0.1, 0.12, 0.15, 0.2, 0.25, 0.3, 0.35, 0.4, 0.45, 0.5, 0.55, 0.6, 0.65, 0.7,
    0.75, 0.8, 0.85, 0.9, 0.93, 0.95, 0.97, 0.98, 0.99, 0.995, 0.999,
)
ROWS = (
    *range(5, 21), 22, 25, 28, 32, 36, 40, 50, 60, 80, 100, 130, 160, 200, 300, 400, 500, 700, 1000, 2000, 5000,
)
MANY_ROWS = (20000,)  # Jarque-Bera only, which comes near its limit late
SMOOTH_FROM = 19  # so that no value between rows of the table (the first is 21) rests on one that is not smoothed
BLOCK = 2**18  # draws at a time, which stay in the processor's cache


def samples_of(n: int) -> int:
    """How many samples of n draws are simulated."""
    return 4_000_000 if n <= 20 else min(2_000_000, 400_000_000 // n)


def simulated(n: int, samples: int, seed: int = SEED, *, sorting: bool = True) -> tuple[np.ndarray, np.ndarray]:
    """Lilliefors D and Jarque-Bera of samples of n independent normal draws, (samples,) each.

    Single precision: D and the moments are then right to about 1e-6, far within the noise of any simulation. Without
    sorting, D is not computed and comes back empty.
    """
    random = np.random.Generator(np.random.SFC64([seed, n]))
    parts = list(_blocks(random, n, samples, sorting))
    return np.concatenate([d for d, _ in parts]), np.concatenate([jb for _, jb in parts])


def _blocks(
    random: np.random.Generator, n: int, samples: int, sorting: bool
) -> Iterator[tuple[np.ndarray, np.ndarray]]:
    at_a_time = max(1, BLOCK // n)
    place = np.arange(1, n + 1, dtype=np.float32) / np.float32(n)
    for start in range(0, samples, at_a_time):
        z = random.standard_normal((min(at_a_time, samples - start), n), dtype=np.float32)
        z -= z.mean(axis=1, keepdims=True)
        square = z * z
        second, third = square.mean(axis=1), np.einsum("ij,ij->i", square, z) / n
        fourth = np.einsum("ij,ij->i", square, square) / n
        jb = n / 6 * (third**2 / second**3 + (fourth / second**2 - 3) ** 2 / 4)
        d = np.empty(0, dtype=np.float32)
        if sorting:
            z /= np.sqrt(second * (n / (n - 1)))[:, None]  # divisor n - 1
            z.sort(axis=1)
            below = place - ndtr(z)
            d = np.maximum(below.max(axis=1), np.float32(1 / n) - below.min(axis=1))
        yield d, jb


def modified(d: np.ndarray, n: int) -> np.ndarray:
    """D times sqrt(n) - 0.01 + 0.85/sqrt(n), whose quantiles hardly depend on n (Stephens 1974, JASA 69:730-737)."""
    return d * (np.sqrt(n) - 0.01 + 0.85 / np.sqrt(n))


def quantiles(values: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The values exceeded with probability LEVELS, and the standard errors of their logarithms, (levels,) each.

    The errors come from the order statistics one binomial standard error of the count to either side.
    """
    values = np.sort(values)
    p = np.array(LEVELS)
    count = values.shape[0]
    place = (1 - p) * count
    side = np.sqrt(p * (1 - p) * count)

    def at(where: np.ndarray) -> np.ndarray:
        return np.interp(where, np.arange(count) + 0.5, values).astype(float)

    return at(place), (np.log(at(place + side)) - np.log(at(place - side))) / 2


def smooth(
    rows: np.ndarray, values: np.ndarray, errors: np.ndarray, degree: int, limit: np.ndarray | None = None
) -> np.ndarray:
    """Quantiles (rows + 1, levels), the last row for n = inf: polynomials of log quantiles in 1/sqrt(n).

    errors: standard errors of the values' logarithms. limit (levels,): quantiles at n = inf where they are known, to
    which the polynomials are then held.
    """
    s = 1 / np.sqrt(rows)
    powers = s[:, None] ** np.arange(degree + 1)
    smoothed = np.empty((rows.shape[0] + 1, values.shape[1]))
    fits = []
    for j in range(values.shape[1]):
        held = 0.0 if limit is None else np.log(limit[j])
        design = powers if limit is None else powers[:, 1:]
        weight = 1 / errors[:, j]
        target = np.log(values[:, j]) - held
        found = np.linalg.lstsq(design * weight[:, None], target * weight, rcond=None)[0]
        left = (target - design @ found) * weight
        fits.append(left @ left / (rows.shape[0] - design.shape[1]))
        smoothed[:-1, j] = np.exp(held + design @ found)
        smoothed[-1, j] = np.exp(held if limit is not None else found[0])
    print("chi-square per df by level:", np.round(fits, 2), "mean", np.mean(fits))
    return smoothed


def write(name: str, title: str, rows: tuple[int, ...], values: np.ndarray) -> None:
    lines = [
        f"# {title}",
        "# Simulated by tests/tables/make_normality_tables.py; "
        "the heads of the columns are upper tail probabilities p.",
        f"# Standard error of p: sqrt(p (1 - p) / samples); less from n = {SMOOTH_FROM} on, which is smoothed over n.",
        ",".join(["n", "samples", *map(repr, LEVELS)]),
    ]
    for n, row in zip((*rows, "inf"), values, strict=True):
        samples = samples_of(n) if n != "inf" else samples_of(rows[-1])
        lines.append(",".join([str(n), str(samples), *(f"{value:.6g}" for value in row)]))
    (FOLDER / name).write_text("\n".join(lines) + "\n", encoding="ascii")


def main() -> None:
    d_found, jb_found = [], []
    for n in (*ROWS, *MANY_ROWS):
        d, jb = simulated(n, samples_of(n), sorting=n in ROWS)
        if n in ROWS:
            d_found.append(quantiles(modified(d, n)))
        jb_found.append(quantiles(jb))
        print(n, end=" ", flush=True, file=sys.stderr)
    make_table(
        "lilliefors.csv", "Quantiles of D (sqrt(n) - 0.01 + 0.85/sqrt(n)), D that of Lilliefors.", ROWS, d_found, 3
    )
    make_table(
        "jarque_bera.csv", "Quantiles of the Jarque-Bera statistic.", (*ROWS, *MANY_ROWS), jb_found, 7,
        limit=-2 * np.log(LEVELS),
    )


def make_table(
    name: str, title: str, rows: tuple[int, ...], found: list[tuple[np.ndarray, np.ndarray]], degree: int,
    limit: np.ndarray | None = None,
) -> None:
    """Smooth what was found from SMOOTH_FROM rows on, and write the table."""
    values, errors = (np.array(part) for part in zip(*found, strict=True))
    few = sum(n < SMOOTH_FROM for n in rows)
    smoothed = smooth(np.array(rows[few:]), values[few:], errors[few:], degree, limit)
    write(name, title, rows, np.vstack([values[:few], smoothed]))


if __name__ == "__main__":
    main()
