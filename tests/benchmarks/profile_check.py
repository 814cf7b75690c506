"""What each method takes of a whole check, and how little a check of so many results could take at all.

    python tests/benchmarks/profile_check.py [60x3 1000x5 5000x10]

The methods run one after the other on one fit, as in a check, many times over; the least time of each counts, since a
busy machine only ever adds. The floor is what stays when methods need no arithmetic of their own: the fit; for each
method one step of numpy over the rows (its refusal, one elementwise operation, one product with the basis, one sum);
for each result its names, one p-value, and the object. What lies between the floor and the check are the methods at the
head of the list, which need many steps: a maximum that is searched, an integral, a row after the other.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any

sys.path.insert(0, str(Path(__file__).parents[2]))

from made_data import design_of
from scipy.special import fdtrc

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.box_cox import box_cox
from sheetfuncs.core.catalogue import all_statistics
from sheetfuncs.core.collinearity import variance_inflation
from sheetfuncs.core.condition import condition_indices
from sheetfuncs.core.covariance import covariance
from sheetfuncs.core.design import Design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.form import reset
from sheetfuncs.core.goldfeld_quandt import goldfeld_quandt_tests
from sheetfuncs.core.harvey_collier import harvey_collier
from sheetfuncs.core.independence import breusch_godfrey_both, durbin_watson, durbin_watson_tests
from sheetfuncs.core.influence import outlier_test, press, row_measures
from sheetfuncs.core.mean import residual_mean
from sheetfuncs.core.normality import jarque_bera, shapiro_wilk
from sheetfuncs.core.normality_tests import (
    anderson_darling,
    dagostino_k2,
    jarque_bera_small_sample,
    lilliefors,
)
from sheetfuncs.core.portmanteau import default_lags, portmanteau_tests
from sheetfuncs.core.rainbow import rainbow
from sheetfuncs.core.results import Statistic
from sheetfuncs.core.shifts import dfbetas
from sheetfuncs.core.threads import few_threads
from sheetfuncs.core.variance import breusch_pagan, breusch_pagan_fitted
from sheetfuncs.core.white import white, white_fitted

KINDS = ("HC0", "HC1", "HC2", "HC3", "HC4", "Newey-West")
OTHER_THAN_TESTS = (
    "row table", "DFBETAS", "coefficients", "variance inflation", "condition indices", "robust error bars",
)
# Methods by name, and how many results each gives.
Parts = dict[str, tuple[int, Callable[[Fit], object]]]


def parts(n: int) -> Parts:
    """The whole check: all statistics, then what belongs to columns and rows."""
    lags = default_lags(n)
    tried = [lags, *(lag for lag in (1, 2, 4, 8) if lag != lags and lag < n)]
    return {
        "mean of the residuals": (1, residual_mean),
        "RESET": (4, lambda fit: [reset(fit, p, of=of) for of in ("fitted", "predictors") for p in ((2, 3), (2,))]),
        "rainbow": (2, lambda fit: (rainbow(fit), rainbow(fit, by="mahalanobis"))),
        "Harvey-Collier": (1, harvey_collier),
        "Box-Cox": (1, box_cox),
        "Breusch-Pagan": (3, lambda fit: (
            breusch_pagan(fit), breusch_pagan(fit, studentize=False), breusch_pagan_fitted(fit))),
        "White": (2, lambda fit: (white(fit), white_fitted(fit))),
        "Goldfeld-Quandt": (6, lambda fit: (goldfeld_quandt_tests(fit), goldfeld_quandt_tests(fit, fraction=0.2))),
        "Durbin-Watson, exact p": (4, lambda fit: (durbin_watson(fit), durbin_watson_tests(fit))),
        "Breusch-Godfrey": (12, lambda fit: [
            breusch_godfrey_both(fit, lag, before_first=fill) for lag in (1, 2, 4) for fill in ("zeros", "omitted")]),
        "Ljung-Box, Box-Pierce": (2 * len(tried), lambda fit: portmanteau_tests(fit, tried)),
        "Shapiro-Wilk": (1, shapiro_wilk),
        "Anderson-Darling": (1, anderson_darling),
        "Lilliefors": (1, lilliefors),
        "Jarque-Bera": (2, lambda fit: (jarque_bera(fit), jarque_bera_small_sample(fit))),
        "D'Agostino-Pearson": (1, dagostino_k2),
        "row table": (1, row_measures),
        "outlier test, PRESS": (2, lambda fit: (outlier_test(fit), press(fit))),
        "DFBETAS": (1, lambda fit: dfbetas(fit, row_measures(fit))),
        "coefficients": (1, lambda fit: (fit.standard_errors, fit.p_values, fit.interval(), fit.r_squared)),
        "variance inflation": (1, lambda fit: variance_inflation(fit.basis, fit.design.groups)),
        "condition indices": (1, lambda fit: condition_indices(fit.basis, fit.design.column_names)),
        "robust error bars": (len(KINDS), lambda fit: [covariance(fit, kind) for kind in KINDS]),
    }


def least_step(fit: Fit) -> float:
    """What every method does at least."""
    refusal = refused(fit, "least", {}, "as little as can be", "nothing")
    assert refusal is None
    squares = fit.residuals * fit.residuals
    along = fit.orthonormal[:-1] @ squares
    return float(along @ along) / float(squares.sum())


def least_result(fit: Fit, statistic: float) -> Statistic:
    """What every result is at least."""
    return Statistic(
        method="least", args={"form": "least"}, variant=f"of {fit.n}", statistic=statistic, df=(fit.p, fit.df),
        p=float(fdtrc(fit.p, fit.df, statistic)), null="nothing",
    )


def clocked(design: Design, seconds: float = 3.0) -> tuple[dict[str, float], float, float]:
    """Milliseconds of each part, the least of many checks, and of the least step and result."""
    made = parts(design.n)
    best = dict.fromkeys(["fit", *made, "step", "result"], float("inf"))

    def clock(name: str, job: Callable[[], Any]) -> Any:
        start = time.perf_counter()
        found = job()
        best[name] = min(best[name], time.perf_counter() - start)
        return found

    end = time.perf_counter() + seconds
    with few_threads(design.columns.size):
        while time.perf_counter() < end:
            fit = clock("fit", lambda: fit_design(design))
            for name, (_, method) in made.items():
                clock(name, partial(method, fit))
            statistic = clock("step", partial(least_step, fit))
            clock("result", partial(least_result, fit, statistic))
    times = {name: 1e3 * value for name, value in best.items()}
    return times, times.pop("step"), times.pop("result")


def profile(size: str, peer: float | None = None) -> None:
    """Print the profile of a size; with a peer's milliseconds, how they compare with the floor."""
    design = design_of(size)
    counts = {name: count for name, (count, _) in parts(design.n).items()}
    tests = sum(count for name, count in counts.items() if name not in OTHER_THAN_TESTS)
    assert tests == len(all_statistics(fit_design(design))), "the parts are not the whole check any more"
    times, step, result = clocked(design)
    whole, results = sum(times.values()), sum(counts.values())
    print(f"{size}: {whole:.2f} ms hot, {results} results of {len(counts)} kinds")
    reached = 0.0
    for name, value in sorted(times.items(), key=lambda item: -item[1]):
        reached += value / whole
        print(f"    {name:28s}{value:8.3f} ms {value / whole:6.1%}, so far {reached:6.1%}")
    floor = times["fit"] + len(counts) * step + results * result
    print(f"    floor: fit, {len(counts)} steps of {1e3 * step:.1f} us, {results} results of {1e3 * result:.1f} us: "
          f"{floor:.2f} ms" + (f", {peer / floor:.1f} times as fast as the peer" if peer else ""))


def main(sizes: list[str]) -> None:
    for size in sizes:
        profile(size)
        sys.stdout.flush()


if __name__ == "__main__":
    main(sys.argv[1:] or ["60x3", "1000x5", "5000x10"])
