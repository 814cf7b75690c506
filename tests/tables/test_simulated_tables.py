"""The simulated tables: simulated again in part, their distributions smooth and falling, limits from theory."""

from __future__ import annotations

import math

import numpy as np
import pytest

from sheetfuncs.core.simulated_tables import LOWEST_P, simulated_table
from tests.tables.make_normality_tables import FOLDER, LEVELS, modified, quantiles, samples_of, simulated, smooth

NAMES = ("lilliefors", "jarque_bera")
# Standard errors; of some 700 comparisons, strongly related within a row, none should be beyond by chance.
FAR = 4.5


@pytest.mark.parametrize("n", [5, 10, 20, 30, 100, 450, 3000])
def test_shares_beyond_the_quantiles_when_simulated_again(n):
    """Another seed, n in the table and between its rows: as many samples beyond each quantile as its p says."""
    samples = min(200_000, 12_000_000 // n)
    d, jb = simulated(n, samples, seed=1)
    for name, values in (("lilliefors", modified(d, n)), ("jarque_bera", jb)):
        table = simulated_table(name)
        own, behind = table._quantiles(n)
        p = np.exp(table.log_p)
        share = (values[:, None] > own).mean(axis=0)
        error = np.sqrt(p * (1 - p) * (1 / samples + 1 / behind))
        assert np.abs((share - p) / error).max() < FAR


def test_the_shares_would_show_a_wrong_table():
    """5 % points that are 3 % off are found."""
    table, samples = simulated_table("lilliefors"), 200_000
    values = modified(simulated(10, samples, seed=1)[0], 10)
    own = table._quantiles(10)[0][np.argmin(np.abs(np.exp(table.log_p) - 0.05))]
    error = math.sqrt(0.05 * 0.95 / samples)
    assert abs((values > 1.03 * own).mean() - 0.05) > 2 * FAR * error


@pytest.mark.slow
def test_a_row_of_the_tables_is_made_again_from_its_seed():
    d, jb = simulated(5, samples_of(5))
    for name, values in (("lilliefors", modified(d, 5)), ("jarque_bera", jb)):
        np.testing.assert_allclose(quantiles(values)[0], simulated_table(name)._quantiles(5)[0][::-1], rtol=1e-5)


@pytest.mark.parametrize("name", NAMES)
def test_p_falls_and_is_smooth_for_every_number_of_rows(name):
    table = simulated_table(name)
    for n in (*range(5, 32), 90, 777, 3000, 12_345, 99_999, 1_000_000, 10**9):
        own, _ = table._quantiles(n)
        assert (np.diff(own) > 0).all(), n
        values = np.concatenate([[0.0], np.linspace(own[0] / 2, own[-1] * 1.1, 200)])
        p = np.array([table.p(float(value), n)[0] for value in values])
        assert p[0] == 1.0
        assert p[-1] == LOWEST_P
        assert (np.diff(p) <= 0).all(), n


@pytest.mark.parametrize("name", NAMES)
def test_p_at_the_quantiles_is_their_level(name):
    table = simulated_table(name)
    for row, closeness in enumerate(table.closeness[:-1]):
        n = round(1 / closeness**2)
        for log_p, log_quantile in zip(table.log_p[:-1], table.log_quantiles[row], strict=False):
            p, error = table.p(math.exp(log_quantile), n)
            assert p == pytest.approx(math.exp(log_p), rel=1e-9)
            assert error == pytest.approx(math.sqrt(p * (1 - p) / samples_of(n)), rel=1e-9)


@pytest.mark.parametrize("name", NAMES)
def test_quantiles_change_little_from_one_number_of_rows_to_the_next(name):
    """From where the table is smoothed, third differences show no noise and no joint."""
    table = simulated_table(name)
    middle = int(np.argmin(np.abs(table.log_p - math.log(0.05))))
    logs = np.array([math.log(table._quantiles(n)[0][middle]) for n in range(21, 400)])
    assert np.abs(np.diff(logs, 3)).max() < 3e-4


def test_limit_of_Jarque_Bera_is_chi_square():
    table = simulated_table("jarque_bera")
    np.testing.assert_allclose(np.exp(table.log_quantiles[-1]), -2 * table.log_p, rtol=1e-5)
    assert table.closeness[-1] == 0.0


def test_smoothing_returns_a_polynomial():
    rows = np.array([25, 36, 49, 64, 100, 144, 400, 2500])
    s = 1 / np.sqrt(rows)
    values = np.exp(np.column_stack([0.3 - s + 2 * s**2, 1.1 + 0.5 * s]))
    smoothed = smooth(rows, values, np.full(values.shape, 1e-3), 3)
    np.testing.assert_allclose(smoothed[:-1], values, rtol=1e-9)
    np.testing.assert_allclose(smoothed[-1], np.exp([0.3, 1.1]), rtol=1e-9)


def test_quantiles_of_known_values():
    """Exponential values: the quantile at p is -log p; errors are those of order statistics."""
    count = 1_000_000
    values = -np.log((np.arange(count) + 0.5) / count)
    found, errors = quantiles(values)
    np.testing.assert_allclose(found, -np.log(LEVELS), rtol=1e-3)
    p = np.array(LEVELS)
    np.testing.assert_allclose(errors, np.sqrt((1 - p) / p / count) / -np.log(p), rtol=0.02)


@pytest.mark.parametrize("name", NAMES)
def test_files_say_where_they_come_from(name):
    head = (FOLDER / f"{name}.csv").read_text(encoding="ascii").splitlines()[:3]
    assert all(line.startswith("#") for line in head)
    assert "tests/tables/make_normality_tables.py" in head[1]
    assert "Standard error" in head[2]
