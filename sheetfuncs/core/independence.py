"""Independence: does an error tell something about the next one? Rows stand in time order."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from scipy.special import fdtrc

from sheetfuncs.core.auxiliary import Addition, add_columns, refused
from sheetfuncs.core.basis import ROUNDINGS, factorize
from sheetfuncs.core.cross_products import FAR_APART, coordinates, leading
from sheetfuncs.core.fit import Fit, once_per_fit
from sheetfuncs.core.quadratic_forms import durbin_watson_tails
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.tails import chi_square_tail
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError, NumbersError

NO_CORRELATION = "errors are not correlated with earlier ones"
# Tests of up to so many lags share their cross products.
TOGETHER = 4
_FILLS = {"zeros": "0", "omitted": "drop first rows"}
_TYPES = {"chi-square": "Chisq", "F": "F"}
_ALTERNATIVES = {"positive": "greater", "negative": "less", "two-sided": "two.sided"}
_EXACT_NOTE = "Exact for normal errors and predictors that hold no earlier value of the response."


@once_per_fit
def durbin_watson(fit: Fit) -> Result:
    """Durbin-Watson statistic: sum of squared differences of neighbouring residuals over their sum of squares.

    Between 0 and 4: near 2 without correlation, below 2 with positive, above 2 with negative correlation of
    neighbours (Durbin and Watson 1950, Biometrika 37:409-428). Computed from its definition; 2(1 - r) differs from it.
    """
    variant = "neighbouring rows, in time order"
    refusal = refused(fit, "durbin_watson", {}, variant, NO_CORRELATION)
    if refusal:
        return refusal
    e = fit.design.in_order(fit.residuals)
    steps = e[1:] - e[:-1]
    return Statistic(
        method="durbin_watson", args={}, variant=variant, statistic=float(steps @ steps) / fit.rss,
        null=NO_CORRELATION, note="2 is no correlation; below 2 it is positive, above 2 negative.",
    )


def durbin_watson_tests(fit: Fit) -> tuple[Result, ...]:
    """The exact test against each alternative, "positive", "negative" and "two-sided", from one computation."""
    refusal = _durbin_watson_refusal(fit)
    if refusal is not None:
        return tuple(replace(refusal, **_named(alternative)) for alternative in _ALTERNATIVES)
    d = float(durbin_watson(fit).statistic or 0.0)
    tails = durbin_watson_tails(fit.basis, d, fit.design.order)
    both = min(1.0, 2.0 * min(tails.lower, tails.upper))
    return tuple(
        Statistic(
            method="durbin_watson_test", statistic=d, p=float(p), null=NO_CORRELATION, note=_EXACT_NOTE,
            **_named(alternative),
        )
        for alternative, p in zip(_ALTERNATIVES, (tails.lower, tails.upper, both), strict=True)
    )


def durbin_watson_test(fit: Fit, alternative: str = "positive") -> Result:
    """Exact p of the Durbin-Watson statistic for normal errors, at any n; see `quadratic_forms`.

    alternative: "positive" correlation (small statistic), "negative" or "two-sided" (twice the smaller tail).
    Does not apply where a predictor is the response of the row before: the p-value does not hold there
    (Durbin 1970, Econometrica 38:410-421).
    """
    if alternative not in _ALTERNATIVES:
        raise ArgumentError(f'"{alternative}" is not an alternative: use positive, negative or two-sided.')
    return durbin_watson_tests(fit)[list(_ALTERNATIVES).index(alternative)]


def _named(alternative: str) -> dict[str, Any]:
    against = "two-sided" if alternative == "two-sided" else f"against {alternative} correlation"
    return {
        "args": {"alternative": _ALTERNATIVES[alternative], "exact": True}, "variant": f"exact, {against}",
    }


def _durbin_watson_refusal(fit: Fit) -> DoesNotApply | None:
    refusal = refused(fit, "durbin_watson_test", {}, "", NO_CORRELATION)
    if refusal:
        return refusal
    if fit.df == 1:
        return DoesNotApply(
            method="durbin_watson_test", args={}, variant="", null=NO_CORRELATION, cell_error="#NUM!",
            reason="With one degree of freedom the predictors alone fix the statistic, whatever the errors are.",
        )
    lagged = lagged_response(fit)
    if lagged is None:
        return None
    return DoesNotApply(
        method="durbin_watson_test", args={}, variant="", null=NO_CORRELATION,
        reason=f"{lagged} is the response of the row before, and with that among the predictors the p-value does not "
               "hold. Use Breusch-Godfrey.",
    )


def lagged_response(fit: Fit) -> str | None:
    """The predictor that is the response of the row before, in time order; None where there is none."""
    response = fit.design.in_order(fit.design.response)
    if fit.n < 4:
        return None
    second = 1 if fit.design.order is None else int(fit.design.order[1])
    for name, column in zip(fit.design.column_names, fit.design.columns.T, strict=True):
        # As a rule the first pair tells.
        if (
            column[second] == response[0] and np.array_equal(fit.design.in_order(column)[1:], response[:-1])
            and np.ptp(response) > 0
        ):
            return name
    return None


def breusch_godfrey(
    fit: Fit, lags: int = 1, *, distribution: str = "chi-square", before_first: str = "zeros"
) -> Result:
    """Breusch-Godfrey test of correlation with the `lags` errors before (Breusch 1978; Godfrey 1978, Econometrica 46).

    Regress the residuals on the design and their own lags. distribution "chi-square": n R2 with `lags` degrees of
    freedom; "F": the lags' F with (lags, n - p - lags). before_first: lagged values before the first row are "zeros",
    or the first `lags` rows are "omitted" and n counts the rest. Without an intercept the auxiliary regression has
    none either.
    """
    if distribution not in _TYPES:
        raise ArgumentError(f'"{distribution}" is not a distribution of this test: use chi-square or F.')
    return breusch_godfrey_both(fit, lags, before_first=before_first)[list(_TYPES).index(distribution)]


def breusch_godfrey_both(fit: Fit, lags: int = 1, *, before_first: str = "zeros") -> tuple[Result, Result]:
    """The chi-square and the F form of `breusch_godfrey`, from one auxiliary regression."""
    if before_first not in _FILLS:
        raise ArgumentError(f'"{before_first}" is not possible before the first row: use zeros or omitted.')
    if not float(lags).is_integer() or lags < 1:
        raise ArgumentError(f"{lags} is not a number of lags: use a whole number from 1 up.")
    lags = int(lags)
    refusal = refused(fit, "breusch_godfrey", {}, "", NO_CORRELATION) or _too_few_rows(fit, lags, before_first)
    sums = None
    if refusal is None:
        sums = _lagged_sums(fit, lags, zeros=before_first == "zeros")
        refusal = sums if isinstance(sums, DoesNotApply) else None
    chi_square, f = (_called(distribution, lags, before_first) for distribution in _TYPES)
    if refusal is not None or sums is None or isinstance(sums, DoesNotApply):
        assert refusal is not None
        return replace(refusal, **chi_square), replace(refusal, **f)
    n = fit.n if before_first == "zeros" else fit.n - lags
    part, rest = sums
    statistic = n * part / (part + rest)
    first = Statistic(
        method="breusch_godfrey", statistic=statistic, df=lags, p=chi_square_tail(lags, statistic), null=NO_CORRELATION,
        **chi_square,
    )
    if rest == 0.0:
        return first, replace(_cannot(
            "The lagged residuals determine the residuals exactly, so that F has no denominator.", "#NUM!"), **f)
    left = n - fit.p - lags
    statistic = part / lags / (rest / left)
    return first, Statistic(
        method="breusch_godfrey", statistic=statistic, df=(lags, left), p=float(fdtrc(lags, left, statistic)),
        null=NO_CORRELATION, **f,
    )


def _called(distribution: str, lags: int, before_first: str) -> dict[str, Any]:
    start = "zeros before the first row" if before_first == "zeros" else "first rows omitted"
    return {
        "args": {"order": lags, "type": _TYPES[distribution], "fill": _FILLS[before_first]},
        "variant": f"{lags} lag{'s' if lags > 1 else ''}, {distribution}, {start}",
    }


def _cannot(reason: str, cell_error: str = "#N/A") -> DoesNotApply:
    return DoesNotApply(
        method="breusch_godfrey", args={}, variant="", null=NO_CORRELATION, reason=reason, cell_error=cell_error
    )


def _too_few_rows(fit: Fit, lags: int, before_first: str) -> DoesNotApply | None:
    n = fit.n if before_first == "zeros" else fit.n - lags
    if n - fit.p - lags >= 1:
        return None
    rows = f"{fit.n} rows" if n == fit.n else f"{max(n, 0)} of {fit.n} rows"
    return _cannot(
        f"{rows} are too few for {fit.p} coefficients and {lags} lag{'s' if lags > 1 else ''}: the auxiliary "
        "regression would fit perfectly, whatever the data.", "#NUM!",
    )


def _lagged_sums(fit: Fit, lags: int, *, zeros: bool) -> tuple[float, float] | DoesNotApply:
    """Sums of squares of the residuals that design and lags explain, and leave (0 if rounding); or why none."""
    quick = _sums_by_products(fit, lags, zeros=zeros)
    if quick is not None:
        return quick
    e = fit.design.in_order(fit.residuals)
    lagged = np.zeros((fit.n, lags), order="F")
    for lag in range(1, lags + 1):
        lagged[lag:, lag - 1] = e[:-lag]
    if zeros:
        order = fit.design.order
        added = add_columns(fit.basis, fit.residuals, lagged if order is None else lagged[np.argsort(order)])
        part = added.part
    else:
        if np.linalg.norm(e[lags:]) <= ROUNDINGS * fit.noise:
            return _cannot("Without the first rows the fit is perfect, so that nothing can be tested on it.", "#NUM!")
        try:
            part, added = _omitted_by_factors(fit, e, lagged, lags)
        except NumbersError:
            return _cannot("Without the first rows the predictors can no longer be told apart.")
    if added.rank < lags:
        return _cannot("The lagged residuals cannot be told apart from the predictors.")
    return part, 0.0 if added.fits_perfectly(fit.noise) else added.rest


def _sums_by_products(fit: Fit, lags: int, *, zeros: bool) -> tuple[float, float] | None:
    """The same from cross products; None where that could cost digits."""
    if lags > TOGETHER or fit.told_apart_to > FAR_APART:
        return None
    found = _all_lags(fit) if zeros else _without_first_rows(fit, lags)
    if found is None and zeros:
        found = coordinates(leading(_lagged_products(fit)[0], fit.p + lags))
    if found is None:
        return None
    squares = fit.rss * found**2
    rest = float(np.add.reduce(squares[fit.p + lags :]))
    # The residuals of all rows are orthogonal to the design, those without the first rows are not.
    part = float(np.add.reduce(squares[fit.p if zeros else 0 : fit.p + lags]))
    return (part, rest) if rest > (ROUNDINGS * fit.noise) ** 2 else None


@once_per_fit
def _all_lags(fit: Fit) -> np.ndarray | None:
    """Coordinates of the residuals along the design and one lag after the other: those of fewer lags come first."""
    return coordinates(_lagged_products(fit)[0])


def _without_first_rows(fit: Fit, lags: int) -> np.ndarray | None:
    whole, first = _lagged_products(fit)
    gram = whole - first[:, :lags] @ first[:, :lags].T
    if (gram.diagonal() < FAR_APART * whole.diagonal()).any():
        return None
    return coordinates(leading(gram, fit.p + lags))


@once_per_fit
def _lagged_products(fit: Fit) -> tuple[np.ndarray, np.ndarray]:
    """Cross products of basis, residuals of 1 to TOGETHER rows before (zeros before the first), and residuals; and the
    first TOGETHER rows of these columns, a line a column. Rows in time order, columns of about length 1."""
    order = fit.design.order
    known = fit.orthonormal if order is None else fit.orthonormal[:, order]
    lines = np.zeros((fit.p + TOGETHER + 1, fit.n))
    lines[: fit.p], lines[-1] = known[:-1], known[-1]
    for lag in range(1, TOGETHER + 1):
        lines[fit.p + lag - 1, lag:] = known[-1, :-lag]
    with few_threads(lines.size):
        return lines @ lines.T, lines[:, :TOGETHER].copy()


def _omitted_by_factors(fit: Fit, e: np.ndarray, lagged: np.ndarray, lags: int) -> tuple[float, Addition]:
    columns = fit.design.columns if fit.design.order is None else fit.design.columns[fit.design.order]
    basis = factorize(columns[lags:], fit.design.column_names, intercept=fit.design.intercept)
    unexplained = basis.project_out(e[lags:])
    by_design = e[lags:] - unexplained
    added = add_columns(basis, unexplained, lagged[lags:])
    return float(by_design @ by_design) + added.part, added
