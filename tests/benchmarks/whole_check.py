"""Our check beside the same job done by hand with general-purpose libraries, in one run on one machine.

    python tests/benchmarks/whole_check.py [--profile] [60x3 1000x5 5000x10 100000x10 1000000x10]

For each size: milliseconds of each peer (statsmodels and scipy, and R where Rscript is found), of ours on the methods
that this peer runs too, of ours in whole (every method, exact Durbin-Watson, Harvey-Collier and the row table
included), and the two ratios against the faster peer. All are the least of several runs. Only ratios of one run count:
figures differ from machine to machine and hour to hour. R packages: lmtest, car, sandwich, nortest, MASS.
With --profile each size is followed by what each method takes and by a bound (see profile_check.py). The table at the
end is the one that stands in DEVELOPERS.md.
"""

from __future__ import annotations

import json
import resource
import shutil
import subprocess
import sys
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path

from made_data import design_of
from profile_check import profile

from sheetfuncs.core.box_cox import box_cox
from sheetfuncs.core.catalogue import all_statistics
from sheetfuncs.core.collinearity import variance_inflation
from sheetfuncs.core.condition import condition_indices
from sheetfuncs.core.covariance import covariance, heteroscedasticity_consistent, newey_west
from sheetfuncs.core.design import Design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.form import reset
from sheetfuncs.core.goldfeld_quandt import goldfeld_quandt
from sheetfuncs.core.harvey_collier import harvey_collier
from sheetfuncs.core.independence import breusch_godfrey, durbin_watson, durbin_watson_test
from sheetfuncs.core.influence import row_measures
from sheetfuncs.core.normality import jarque_bera, shapiro_wilk
from sheetfuncs.core.normality_tests import anderson_darling, dagostino_k2, lilliefors
from sheetfuncs.core.portmanteau import ljung_box
from sheetfuncs.core.rainbow import rainbow
from sheetfuncs.core.shifts import dfbetas
from sheetfuncs.core.threads import few_threads
from sheetfuncs.core.variance import breusch_pagan, breusch_pagan_fitted
from sheetfuncs.core.white import white

HERE = Path(__file__).parent
# How many times as fast as the faster peer: on the methods that it runs too, and in whole.
WANTED = {"60x3": (10, 10), "1000x5": (10, 8), "5000x10": (10, 6), "100000x10": (10, 6), "1000000x10": (8, 5)}
ROUNDS = 5
Method = Callable[[Fit], object]
BOTH: tuple[Method, ...] = (
    lambda fit: (fit.standard_errors, fit.p_values, fit.interval(), fit.r_squared),
    lambda fit: breusch_pagan(fit), lambda fit: goldfeld_quandt(fit), lambda fit: breusch_godfrey(fit, 4),
    lambda fit: reset(fit), lambda fit: rainbow(fit), lambda fit: lilliefors(fit),
    lambda fit: anderson_darling(fit), lambda fit: variance_inflation(fit.basis, fit.design.groups),
    lambda fit: row_measures(fit), lambda fit: heteroscedasticity_consistent(fit, "HC3"),
    lambda fit: newey_west(fit, lag=4),
)
STATSMODELS: tuple[Method, ...] = (
    *BOTH, lambda fit: durbin_watson(fit), lambda fit: jarque_bera(fit), lambda fit: white(fit),
    lambda fit: dagostino_k2(fit), lambda fit: shapiro_wilk(fit),
)


WHOLE: tuple[Method, ...] = (
    BOTH[0], all_statistics, lambda fit: variance_inflation(fit.basis, fit.design.groups), row_measures,
    lambda fit: dfbetas(fit, row_measures(fit)), lambda fit: condition_indices(fit.basis, fit.design.column_names),
    *(lambda fit, kind=kind: covariance(fit, kind) for kind in ("HC0", "HC1", "HC2", "HC3", "HC4", "Newey-West")),
)


def shared_with(peer: str, n: int) -> tuple[Method, ...]:
    """The methods that this peer runs at this size."""
    extra: list[Method] = []
    if n <= 100_000:
        extra.append(lambda fit: box_cox(fit))
    if peer == "statsmodels":
        return (*STATSMODELS, *extra, *((lambda fit: ljung_box(fit, 10),) if n <= 100_000 else ()))
    extra += [lambda fit: durbin_watson_test(fit), lambda fit: breusch_pagan_fitted(fit), lambda f: ljung_box(f, 10)]
    if n <= 1000:
        extra.append(lambda fit: harvey_collier(fit))
    if n <= 5000:
        extra.append(lambda fit: shapiro_wilk(fit))
    return (*BOTH, *extra)


def milliseconds(job: Callable[[], object]) -> float:
    """The least of runs that together last long enough for the clock to mean something."""
    job()
    times: list[float] = []
    while len(times) < 3 or (sum(times) < 1.0 and len(times) < 400):
        start = time.perf_counter()
        job()
        times.append(time.perf_counter() - start)
    return 1e3 * min(times)


def run_methods(design: Design, methods: tuple[Method, ...]) -> None:
    with few_threads(design.columns.size):
        fit = fit_design(design)
        for method in methods:
            method(fit)


def peer_parts(command: list[str]) -> dict[str, float]:
    """Milliseconds of the parts of a peer's job, all of which start their clock warm."""
    done = subprocess.run(command, capture_output=True, text=True, check=True)
    found = json.loads(done.stdout.strip().splitlines()[-1])
    return {part: ms for part, ms in found.items() if part not in ("n", "k", "total_ms")}


def compare(size: str, peers: dict[str, list[str]]) -> tuple[str, float, float, float]:
    """The faster peer, its milliseconds, ours on its methods, and ours in whole; printed.

    In rounds, of which the least counts for each part of a peer and for ours: a machine that others use is slower at
    times, and neither side is to meet only these.
    """
    n, k = map(int, size.split("x"))
    design = design_of(size)
    parts: dict[str, list[dict[str, float]]] = {name: [] for name in peers}
    ours: list[dict[str, float]] = []
    for _ in range(ROUNDS if n < 100_000 else 1):
        for name, command in peers.items():
            parts[name].append(peer_parts([*command, str(n), str(k)]))
        jobs = {"whole": WHOLE, **{name: shared_with(name, n) for name in peers}}
        ours.append({name: milliseconds(partial(run_methods, design, methods)) for name, methods in jobs.items()})
    theirs = {name: sum(min(one[part] for one in found) for part in found[0]) for name, found in parts.items()}
    faster = min(theirs, key=theirs.__getitem__)
    shared, whole = (min(one[name] for one in ours) for name in (faster, "whole"))
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
    print(f"{size}: " + ", ".join(f"{name} {ms:,.1f} ms" for name, ms in theirs.items()))
    print(f"    ours, the methods of {faster}: {shared:,.2f} ms, {theirs[faster] / shared:.1f} times as fast")
    print(f"    ours, whole: {whole:,.2f} ms, {theirs[faster] / whole:.1f} times as fast; peak {peak:.2f} GB")
    return faster, theirs[faster], shared, whole


def main(arguments: list[str]) -> None:
    sizes = [one for one in arguments if one != "--profile"] or list(WANTED)
    peers = {"statsmodels": [sys.executable, str(HERE / "peer_statsmodels.py")]}
    if shutil.which("Rscript"):
        peers["R"] = ["Rscript", str(HERE / "peer.R")]
    table = ["| size | faster peer | its methods | wanted | whole check | wanted |", "|---|---|---|---|---|---|"]
    for size in sizes:
        name, peer, shared, whole = compare(size, peers)
        wanted = WANTED.get(size, ("", ""))
        table.append(
            f"| {size} | {name} {peer:,.1f} ms | {shared:,.2f} ms, {peer / shared:.1f} times | {wanted[0]} | "
            f"{whole:,.2f} ms, {peer / whole:.1f} times | {wanted[1]} |"
        )
        if "--profile" in arguments:
            profile(size, peer)
        sys.stdout.flush()
    print("\n".join(table))


if __name__ == "__main__":
    main(sys.argv[1:])
