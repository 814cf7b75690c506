"""Tails of a quadratic form in normal variables, by inverting its cumulant generating function K.

P(form > 0) is (1/2 pi i) times the integral of exp(K(s))/s along a vertical line. On the line through the saddlepoint
the integrand does not oscillate, and tails keep their relative precision (Helstrom 1996, IEEE Trans. Aerosp. Electron.
Syst. 32:1465-1470; Daniels 1954, Ann. Math. Stat. 25:631). No normal approximation.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import exp, sqrt
from typing import Protocol

import numpy as np

# The trapezoid's error is at least squared when its step is halved: agreement to this leaves less than 1e-13.
_AGREE = 3e-7
_FIRST_STEP = 0.3
_FIRST_NODES = 24
_FIRST_NODES_OF_FEW, _FEW = 32, 150  # the integrand of few squares has longer tails
_MORE_NODES = 8
_HALVINGS = 8
# The integrand is followed until it is this small beside its start, or to this x.
_NEGLIGIBLE = 1e-16
_FARTHEST = 80.0
# exp of less than this is 0.
UNDERFLOW = -746.0
# Beyond this share of the way to an end, the saddlepoint of a form that is passable may lie beyond the end.
BORDER = 0.96


@dataclass(frozen=True)
class Tails:
    """P(statistic < d) and P(statistic > d), each right to its own leading digits."""

    lower: float
    upper: float


class Form(Protocol):
    """A quadratic form whose K exists for real s between lowest < 0 and highest > 0; beyond too where it is passable.
    size: of how many squares it is the sum.
    """

    lowest: float
    highest: float
    passable: bool
    size: int

    def at(self, s: float) -> tuple[float, float]:
        """The first two derivatives of K at a real s, the second roughly."""

    def across(self, place: float, t: np.ndarray) -> tuple[float, np.ndarray, np.ndarray]:
        """K(place); size and phase of exp(K(place + it) - K(place)), the phase continuous from 0 at t = 0."""


@dataclass(frozen=True)
class Saddle:
    """A place near the saddlepoint, the integrand's width across it, and the share of the way to the end."""

    place: float
    width: float
    share: float


class EigenvalueForm:
    """The sum of eigenvalue z^2, from eigenvalues (m,) of both signs."""

    passable = False

    def __init__(self, eigenvalues: np.ndarray):
        self.eigenvalues, self.size = eigenvalues, eigenvalues.shape[0]
        self.lowest, self.highest = 0.5 / float(eigenvalues.min()), 0.5 / float(eigenvalues.max())

    def at(self, s: float) -> tuple[float, float]:
        steep = self.eigenvalues / (1.0 - 2.0 * s * self.eigenvalues)
        return float(np.add.reduce(steep)), 2.0 * float(steep @ steep)

    def across(self, place: float, t: np.ndarray) -> tuple[float, np.ndarray, np.ndarray]:
        factors = 1.0 - 2.0 * place * self.eigenvalues
        ratio = t[:, None] * (2.0 * self.eigenvalues / factors)
        phase = 0.5 * np.arctan(ratio).sum(axis=1)
        np.square(ratio, out=ratio)
        size = np.exp(-0.25 * np.log1p(ratio, out=ratio).sum(axis=1))
        return -0.5 * float(np.log(factors).sum()), size, phase


def tails_at_zero(form: Form, saddle: Saddle | None = None) -> Tails:
    """P(form < 0) and P(form > 0)."""
    saddle = saddle or saddlepoint(form)
    p = min(_integral(form, saddle), 1.0)
    return Tails(p, 1.0 - p) if saddle.place < 0.0 else Tails(1.0 - p, p)


def saddlepoint(form: Form, at: Callable[[float], tuple[float, float]] | None = None) -> Saddle:
    """Where K(s) - log|s| is least on the thinner tail's side. at: what to take for the derivatives of K.

    Newton's method, kept inside. The place need not be exact, since any point between gives the same integral.
    """
    at = at or form.at
    slope, curvature = at(0.0)
    end = form.lowest if slope > 0.0 else form.highest
    root = sqrt(slope * slope + 4.0 * curvature)
    s = (-slope - root if slope > 0.0 else -slope + root) / (2.0 * curvature)
    s = s if abs(s) < 0.9 * abs(end) else 0.9 * end
    for _ in range(60):
        slope, curvature = at(s)
        steep, bend = slope - 1.0 / s, curvature + 1.0 / (s * s)
        if steep * steep < 1e-2 * bend or (form.passable and abs(s) > BORDER * abs(end)):
            break
        step = -steep / bend
        bound = end if step * end > 0.0 else 0.0
        s = s + step if abs(step) < 0.9 * abs(bound - s) else s + 0.9 * (bound - s)
    return Saddle(s, 1.0 / sqrt(bend), s / end)


def _integral(form: Form, saddle: Saddle) -> float:
    """|(1/pi) Re of the integral of exp(K(s))/s along place + it|: trapezoid in t = width sinh(x)."""
    place, width = saddle.place, saddle.width

    def integrand(x: np.ndarray) -> tuple[float, np.ndarray, np.ndarray]:
        t = width * np.sinh(x)
        height, size, phase = form.across(place, t)
        size *= width * np.cosh(x) / (place * place + t * t)
        return height, size * (place * np.cos(phase) + t * np.sin(phase)), size * np.hypot(place, t)

    # Two sums at once: every other node, and all of them.
    step = 0.5 * _FIRST_STEP
    height, values, sizes = integrand(
        step * np.arange(_FIRST_NODES_OF_FEW if form.size <= _FEW else _FIRST_NODES)
    )
    if height <= UNDERFLOW:
        return 0.0
    while sizes[-1] > _NEGLIGIBLE * sizes[0] and step * sizes.shape[0] < _FARTHEST:
        _, *more = integrand(step * np.arange(sizes.shape[0], sizes.shape[0] + _MORE_NODES))
        values, sizes = np.concatenate([values, more[0]]), np.concatenate([sizes, more[1]])
    count, half = values.shape[0], 0.5 * float(values[0])
    before, found = 2.0 * step * (float(values[::2].sum()) - half), step * (float(values.sum()) - half)
    for _ in range(_HALVINGS):
        if abs(found - before) <= _AGREE * abs(found):
            break
        _, values, _ = integrand(step * (np.arange(count) + 0.5))
        before, found = found, 0.5 * (found + step * float(values.sum()))
        step, count = 0.5 * step, 2 * count
    return exp(height) * abs(found) / np.pi
