"""Invented numbers and exact sums, the same to the last bit on every platform and Python.

Only `random.Random.random` is drawn from, because Python promises its sequence for a seed and promises nothing for
the other methods; no logarithm or cosine is taken, because mathematical libraries differ in their last bit.
"""

import math
import random
from collections.abc import Sequence
from fractions import Fraction


class Draws:
    """Random values for one workbook."""

    def __init__(self, seed: int) -> None:
        self._random = random.Random(seed)

    def share(self) -> float:
        """A number from 0 up to, not including, 1."""
        return self._random.random()

    def between(self, low: float, high: float) -> float:
        return low + (high - low) * self.share()

    def whole(self, low: int, high: int) -> int:
        """A whole number from `low` to `high`, both included."""
        return low + math.floor((high - low + 1) * self.share())

    def pick(self, options: Sequence[str]) -> str:
        return options[self.whole(0, len(options) - 1)]

    def error(self, spread: float) -> float:
        """A nearly normal error with mean 0 and standard deviation `spread`: twelve uniform draws, summed."""
        return spread * (math.fsum(self.share() for _ in range(12)) - 6.0)

    def chain(self, count: int, memory: float, spread: float) -> list[float]:
        """Errors that follow one another: each keeps the share `memory` of the one before. Starts settled."""
        values = [self.error(spread / math.sqrt(1.0 - memory * memory))]
        while len(values) < count:
            values.append(memory * values[-1] + self.error(spread))
        return values


def least_squares(response: Sequence[float], predictors: Sequence[Sequence[float]]) -> list[float]:
    """Coefficients of a straight-line fit, constant first: the value that a spreadsheet shows for LINEST.

    `predictors` holds one row of numbers per response. The normal equations are solved in exact fractions of the
    decimals as printed, so that the stored values depend on no rounding at all but the last.
    """
    rows = [[Fraction(1), *(Fraction(repr(value)) for value in row)] for row in predictors]
    target = [Fraction(repr(value)) for value in response]
    size = len(rows[0])
    system = [
        [sum((row[i] * row[j] for row in rows), Fraction(0)) for j in range(size)]
        + [sum((row[i] * y for row, y in zip(rows, target, strict=True)), Fraction(0))]
        for i in range(size)
    ]
    for i in range(size):  # positive definite: every pivot is above zero
        system[i] = [value / system[i][i] for value in system[i]]
        for j in range(size):
            if j != i:
                factor = system[j][i]
                system[j] = [a - factor * b for a, b in zip(system[j], system[i], strict=True)]
    return [float(row[size]) for row in system]
