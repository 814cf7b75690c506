"""Design -> Fit -> Check: everything known about one regression."""

from __future__ import annotations

import math
import platform
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from sheetfuncs import __version__
from sheetfuncs.cells.arrays import block_of_columns, named_columns
from sheetfuncs.cells.observations import CategoryColumn, Observations, read_observations
from sheetfuncs.core.catalogue import all_statistics
from sheetfuncs.core.collinearity import Inflation, variance_inflation
from sheetfuncs.core.condition import Condition, condition_indices
from sheetfuncs.core.covariance import KINDS, Covariance, covariance, newey_west_automatic
from sheetfuncs.core.design import Category, Design, Numeric, build_design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.influence import RowMeasures, row_measures
from sheetfuncs.core.results import DoesNotApply, Result
from sheetfuncs.core.shifts import dfbetas
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError, NoVariationError
from sheetfuncs.judgement.evidence import Evidence, all_evidence
from sheetfuncs.judgement.rows import FlaggedRow, rows_to_look_at

SCHEMA = "sheetfuncs-check-1"
_SCALINGS = {
    False: "columns to unit length, intercept included, not centred",
    True: "centred, intercept excluded, columns to unit length",
}


@dataclass(frozen=True)
class Settings:
    """What was asked for. book, sheet, area: where the data stand; None for bare arrays."""

    response: str
    predictors: tuple[str, ...]
    intercept: bool = True
    order: str | None = None
    level: float = 0.95
    date_predictors: tuple[str, ...] = ()
    base_levels: Mapping[str, str] = field(default_factory=dict)
    book: str | None = None
    sheet: str | None = None
    area: str | None = None

    def to_dict(self) -> dict[str, Any]:
        return {
            "response": self.response, "predictors": list(self.predictors), "intercept": self.intercept,
            "order": self.order, "level": self.level, "date_predictors": list(self.date_predictors),
            "base_levels": dict(self.base_levels), "book": self.book, "sheet": self.sheet, "area": self.area,
        }


@dataclass(frozen=True, eq=False)
class Check:
    """Everything known about one regression. `to_dict()` is JSON-ready.

    covariances: of the coefficients: ordinary, HC0 to HC4, Newey-West by rule and with the lag that the data choose.
    condition: condition indices of the columns, the constant among them; condition_centred: of the columns about their
    means, None without an intercept. dfbetas: (n, p), by row and coefficient.
    """

    settings: Settings
    observations: Observations
    design: Design
    fit: Fit
    statistics: tuple[Result, ...]
    inflation: tuple[Inflation, ...]
    covariances: tuple[Covariance | DoesNotApply, ...]
    condition: Condition | DoesNotApply
    condition_centred: Condition | DoesNotApply | None
    by_row: RowMeasures
    dfbetas: np.ndarray
    flagged: tuple[FlaggedRow, ...]
    evidence: tuple[Evidence, ...]
    remarks: tuple[str, ...]

    def statistic(self, method: str, **args: Any) -> Result:
        """The entry of this method whose args include these; KeyError where there is none."""
        return _first(self.statistics, method, args)

    def covariance(self, method: str, **args: Any) -> Covariance | DoesNotApply:
        """The same among the covariances: ("hc_se", type="HC3"), ("newey_west")."""
        return _first(self.covariances, method, args)

    def to_dict(self) -> dict[str, Any]:
        """The whole check as plain dicts and lists, without NaN or Infinity (None, plus a reason)."""
        ledger = self.observations.ledger
        return _plain({
            "schema": SCHEMA,
            "settings": self.settings.to_dict(),
            "versions": versions(),
            "fit": self._fit_dict(),
            "statistics": [
                *(_statistic_dict(s) for s in self.statistics), self._inflation_dict(),
                *(_condition_dict(c) for c in (self.condition, self.condition_centred) if c is not None),
                *(_covariance_dict(c, self.fit) for c in self.covariances),
            ],
            "by_row": self._row_dict(),
            "rows": {
                "used": len(ledger.used), "hidden": ledger.hidden,
                "excluded": [{"row": e.row, "reason": e.reason} for e in ledger.excluded],
            },
            "flagged": [{"row": f.row, "reason": f.reason} for f in self.flagged],
            "evidence": [
                {"assumption": e.assumption, "strength": e.strength, "finding": e.finding, "test": e.test,
                 "size": e.size, "p": e.p} for e in self.evidence
            ],
            "remarks": list(self.remarks),
        })

    def _fit_dict(self) -> dict[str, Any]:
        fit, design = self.fit, self.design
        low, high = fit.interval(self.settings.level)
        columns = (design.terms, fit.coefficients, fit.standard_errors, fit.t, fit.p_values, low, high)
        names = ("term", "estimate", "error", "t", "p", "low", "high")
        f, f_df, f_p = fit.f_test
        return {
            "terms": [dict(zip(names, row, strict=True)) for row in zip(*columns, strict=True)],
            "level": self.settings.level,
            "n": fit.n, "p": fit.p, "df": fit.df, "sigma": fit.sigma, "rss": fit.rss,
            "r_squared": fit.r_squared, "adjusted_r_squared": fit.adjusted_r_squared,
            "r_squared_centred": design.intercept,
            "f": {"statistic": f, "df": list(f_df), "p": f_p},
            "log_likelihood": fit.log_likelihood, "aic": fit.aic, "bic": fit.bic,
            "information_criteria_count_sigma": True,
            "base_levels": dict(design.base_levels),
            "reason": fit.nothing_left() or None,
        }

    def _inflation_dict(self) -> dict[str, Any]:
        return {
            "method": "vif", "args": {},
            "variant": "generalized for categories" if self.design.has_categories else "one column a predictor",
            "predictors": [
                {"predictor": i.predictor, "vif": i.vif, "df": i.df, "vif_per_df": i.vif_per_df} for i in self.inflation
            ],
            "statistic": None, "df": None, "p": None, "null": "", "note": "A measure of width, not a test.",
        }

    def _row_dict(self) -> dict[str, Any]:
        rows = self.by_row
        return {
            "row": self.design.rows, "fitted": self.fit.fitted, "residual": self.fit.residuals,
            "leverage": rows.leverage, "internally_studentized": rows.internally_studentized,
            "externally_studentized": rows.externally_studentized, "leave_one_out": rows.leave_one_out,
            "cooks_distance": rows.cooks_distance, "dffits": rows.dffits, "covratio": rows.covratio,
            "dfbetas": _by_term(self.design.terms, self.dfbetas.T),
        }


def check(
    y: Any, x: Any, *, names: Sequence[str] | None = None, intercept: bool = True, order: Any = None,
    level: float = 0.95, base_levels: Mapping[str, str] | None = None,
) -> Check:
    """Check the regression of y on x.

    y: (n,) numbers. x: (n,), (n, k), a DataFrame, or a list of k columns; text columns are categories.
    names: of the predictors, where x does not carry them. order: (n,) values that say the time order.
    level: of the intervals, 0.5 to 0.9999. base_levels: {"Site": "north"} makes that level the base.
    A row with a missing value anywhere is left out; `rows` of the result says which (positions from 1).
    Raises a SheetfuncsError with one sentence where there is nothing to fit.
    """
    y_name, y_column = named_columns(y, ["response"])[0]
    x_columns = named_columns(x, None if names is None else list(names))
    order_columns = [] if order is None else named_columns(order, ["order"])
    observations = read_observations(
        block_of_columns([y_column]), block_of_columns([c for _, c in x_columns]),
        block_of_columns([order_columns[0][1]]) if order_columns else None,
        names=[y_name, *(n for n, _ in x_columns), *(n for n, _ in order_columns)], base_levels=base_levels,
    )
    return check_observations(observations, intercept=intercept, level=level, base_levels=base_levels)


def check_observations(
    observations: Observations, *, intercept: bool = True, level: float = 0.95, remarks: Sequence[str] = (),
    date_predictors: Sequence[str] = (), base_levels: Mapping[str, str] | None = None, book: str | None = None,
    sheet: str | None = None, area: str | None = None,
) -> Check:
    """Check what was read from cells; book, sheet and area are recorded as the place it came from."""
    if not 0.5 <= level <= 0.9999:
        raise ArgumentError(f"The level {level:g} is not between 0.5 and 0.9999: 0.95 gives 95 % intervals.")
    order = observations.order
    settings = Settings(
        observations.response.name, tuple(c.name for c in observations.predictors), intercept,
        order.name if order else None, level, tuple(date_predictors), dict(base_levels or {}), book, sheet, area,
    )
    design = design_of(observations, intercept=intercept)
    with few_threads(design.columns.size):
        return _check(observations, design, settings, remarks)


def _check(observations: Observations, design: Design, settings: Settings, remarks: Sequence[str]) -> Check:
    fit = fit_design(design)
    measures = row_measures(fit)
    statistics = all_statistics(fit)
    inflation = variance_inflation(fit.basis, design.groups)
    flagged = rows_to_look_at(fit, measures)
    condition = _condition(fit, centred=False)
    centred = _condition(fit, centred=True) if design.intercept and design.columns.shape[1] else None
    return Check(
        settings=settings, observations=observations, design=design, fit=fit, statistics=statistics,
        inflation=inflation, covariances=_covariances(fit, settings.level), condition=condition,
        condition_centred=centred, by_row=measures, dfbetas=dfbetas(fit, measures), flagged=flagged,
        evidence=all_evidence(fit, statistics, inflation, flagged, centred or condition),
        remarks=(*remarks, *observations.remarks, *_order_remarks(observations)),
    )


def _covariances(fit: Fit, level: float) -> tuple[Covariance | DoesNotApply, ...]:
    return (*(covariance(fit, kind, level=level) for kind in KINDS), newey_west_automatic(fit, level=level))


def _condition(fit: Fit, *, centred: bool) -> Condition | DoesNotApply:
    try:
        return condition_indices(fit.basis, fit.design.column_names, centred=centred)
    except NoVariationError as error:
        return DoesNotApply(
            method="condition_indices", args={"scaling": _SCALINGS[centred]}, variant=_SCALINGS[centred],
            reason=str(error), cell_error="#NUM!",
        )


def design_of(observations: Observations, *, intercept: bool = True) -> Design:
    """The Design of what was read from cells."""
    predictors = [
        Category(c.name, c.levels, c.codes) if isinstance(c, CategoryColumn) else Numeric(c.name, c.values)
        for c in observations.predictors
    ]
    return build_design(
        observations.response.values, predictors, response_name=observations.response.name, intercept=intercept,
        order=observations.order.values if observations.order else None, rows=observations.ledger.used,
    )


def versions() -> dict[str, str]:
    """What computed the figures."""
    import scipy

    return {
        "sheetfuncs": __version__, "python": platform.python_version(), "numpy": np.__version__,
        "scipy": scipy.__version__,
    }


def _order_remarks(observations: Observations) -> list[str]:
    gaps = observations.ledger.gaps
    if not gaps:
        return []
    places = "one place" if gaps == 1 else f"{gaps} places"
    return [
        f"Rows are missing in {places} among the used rows; the tests of independence treat the rows on both sides "
        "as neighbours."
    ]


def _statistic_dict(result: Result) -> dict[str, Any]:
    entry: dict[str, Any] = {
        "method": result.method, "args": dict(result.args), "variant": result.variant, "statistic": result.statistic,
        "df": list(result.df) if isinstance(result.df, tuple) else result.df, "p": result.p, "null": result.null,
        "note": result.note, **result.details,
    }
    if result.reason:
        entry["reason"] = result.reason
    return entry


def _covariance_dict(result: Covariance | DoesNotApply, fit: Fit) -> dict[str, Any]:
    """An entry whose figures are by term, so that statistic and p of a test have none."""
    if isinstance(result, DoesNotApply):
        return _statistic_dict(result)
    terms = fit.design.terms
    return {
        "method": result.method, "args": dict(result.args), "variant": result.kind, "statistic": None, "df": fit.df,
        "p": None, "null": "", "note": result.note, "std_errors": _by_term(terms, result.standard_errors),
        "t": _by_term(terms, result.t), "p_values": _by_term(terms, result.p),
        "low": _by_term(terms, result.low), "high": _by_term(terms, result.high),
        **result.details,
    }


def _condition_dict(result: Condition | DoesNotApply) -> dict[str, Any]:
    """Indices from 1 up, and each one's share in every coefficient's variance. statistic: the largest index."""
    if isinstance(result, DoesNotApply):
        return _statistic_dict(result)
    scaling = _SCALINGS[result.centred]
    inverse_squares = result.indices**-2.0
    return {
        "method": "condition_indices", "args": {"scaling": scaling}, "variant": scaling, "statistic": result.number,
        "df": None, "p": None, "null": "", "note": "A measure of near-dependency, not a test.",
        # Columns of unit length: the squares of the singular values sum to their number.
        "eigenvalues": inverse_squares * (len(result.terms) / inverse_squares.sum()),
        "condition_indices": result.indices,
        "proportions_rows_are_condition_indices": [_by_term(result.terms, row) for row in result.proportions],
        "near_dependencies": [
            {"condition_index": one.index, "proportions": _by_term(one.terms, one.proportions)}
            for one in result.near_dependencies
        ],
    }


def _by_term(terms: Sequence[str], values: Sequence[Any] | np.ndarray) -> dict[str, Any]:
    """Values under their terms; a name that comes again, as of a predictor called "intercept", gets its place."""
    named: dict[str, Any] = {}
    for place, (term, value) in enumerate(zip(terms, values, strict=True), 1):
        named[f"{term} (term {place})" if term in named else term] = value
    return named


def _first(results: Sequence[Any], method: str, args: Mapping[str, Any]) -> Any:
    for result in results:
        if result.method == method and all(result.args.get(key) == value for key, value in args.items()):
            return result
    raise KeyError(method)


def _plain(value: Any) -> Any:
    """JSON-ready: numpy to Python, NaN and infinities to None."""
    if isinstance(value, Mapping):
        return {str(k): _plain(v) for k, v in value.items()}
    if isinstance(value, np.ndarray):
        return [_plain(v) for v in value.tolist()]
    if isinstance(value, list | tuple):
        return [_plain(v) for v in value]
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value
