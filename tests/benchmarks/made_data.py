"""The seeded data of the benchmarks, as the peers make them: errors whose spread grows with the first predictor."""

from __future__ import annotations

import numpy as np

from sheetfuncs.core.design import Design, Numeric, build_design


def data(n: int, k: int) -> tuple[np.ndarray, np.ndarray]:
    """Response (n,) and predictors (n, k)."""
    random = np.random.default_rng(0)
    x = random.normal(size=(n, k))
    return 1 + x @ np.arange(1, k + 1) + random.normal(size=n) * (1 + 0.3 * np.abs(x[:, 0])), x


def design_of(size: str) -> Design:
    """The design of a size such as "60x3"; the response made positive, as the peers do for Box-Cox."""
    n, k = map(int, size.split("x"))
    y, x = data(n, k)
    if y.min() <= 0:
        y = y - y.min() + 1
    return build_design(y, [Numeric(f"x{j + 1}", x[:, j]) for j in range(k)])
