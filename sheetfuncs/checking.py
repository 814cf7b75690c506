"""Design -> Fit -> Check: everything known about one regression."""

from __future__ import annotations

import math
import platform
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from sheetfuncs import __version__
from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.observations import CategoryColumn, Observations, read_observations
from sheetfuncs.core.catalogue import all_statistics
from sheetfuncs.core.collinearity import Inflation, variance_inflation
from sheetfuncs.core.design import Category, Design, Numeric, build_design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.influence import RowMeasures, row_measures
from sheetfuncs.core.results import Result
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError
from sheetfuncs.judgement.evidence import Evidence, all_evidence
from sheetfuncs.judgement.rows import FlaggedRow, rows_to_look_at

SCHEMA = "sheetfuncs-check-1"


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
    """Everything known about one regression. `to_dict()` is JSON-ready."""

    settings: Settings
    observations: Observations
    design: Design
    fit: Fit
    statistics: tuple[Result, ...]
    inflation: tuple[Inflation, ...]
    by_row: RowMeasures
    flagged: tuple[FlaggedRow, ...]
    evidence: tuple[Evidence, ...]
    remarks: tuple[str, ...]

    def statistic(self, method: str, **args: Any) -> Result:
        """The entry of this method whose args include these; KeyError where there is none."""
        for result in self.statistics:
            if result.method == method and all(result.args.get(key) == value for key, value in args.items()):
                return result
        raise KeyError(method)

    def to_dict(self) -> dict[str, Any]:
        """The whole check as plain dicts and lists, without NaN or Infinity (None, plus a reason)."""
        ledger = self.observations.ledger
        return _plain({
            "schema": SCHEMA,
            "settings": self.settings.to_dict(),
            "versions": versions(),
            "fit": self._fit_dict(),
            "statistics": [_statistic_dict(s) for s in self.statistics] + [self._inflation_dict()],
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
            "cooks_distance": rows.cooks_distance, "dffits": rows.dffits,
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
    y_name, y_column = _named_columns(y, ["response"])[0]
    x_columns = _named_columns(x, None if names is None else list(names))
    order_columns = [] if order is None else _named_columns(order, ["order"])
    observations = read_observations(
        _block([y_column]), _block([c for _, c in x_columns]),
        _block([order_columns[0][1]]) if order_columns else None,
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
    return Check(
        settings, observations, design, fit, statistics, inflation, measures, flagged,
        all_evidence(fit, statistics, inflation, flagged),
        (*remarks, *observations.remarks, *_order_remarks(observations)),
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


def _named_columns(data: Any, names: list[str] | None) -> list[tuple[str, np.ndarray]]:
    """(name, column) pairs of an array, a Series, a DataFrame or a list of columns."""
    if hasattr(data, "iloc") and hasattr(data, "columns"):
        columns = [data.iloc[:, j].to_numpy() for j in range(data.shape[1])]
        names = names or [str(c) for c in data.columns]
    elif hasattr(data, "iloc"):
        columns = [data.to_numpy()]
        names = [str(data.name)] if data.name is not None else names
    else:
        array = np.asarray(data) if not isinstance(data, np.ndarray) else data
        if isinstance(data, list | tuple) and data and isinstance(data[0], list | tuple | np.ndarray):
            columns = [np.asarray(c) for c in data]
        elif array.ndim == 2:
            columns = list(array.T)
        else:
            columns = [np.atleast_1d(array)]
    names = names or [f"predictor {j + 1}" for j in range(len(columns))]
    if len(names) != len(columns):
        raise ArgumentError(f"{len(names)} names for {len(columns)} columns: give one name a column.")
    return list(zip(names, columns, strict=True))


def _block(columns: Sequence[np.ndarray]) -> Block:
    """Columns of numbers, dates, booleans or text as a block of cells; missing values are blanks."""
    height = len(columns[0])
    if any(np.ndim(c) != 1 or len(c) != height for c in columns):
        raise ArgumentError("Every column needs the same number of rows, in one dimension.")
    numbers = np.full((height, len(columns)), np.nan)
    kinds = np.zeros((height, len(columns)), np.uint8)
    texts: dict[int, np.ndarray] = {}
    for j, column in enumerate(columns):
        column = np.asarray(column)
        if column.dtype.kind in "fiu":
            values = column.astype(np.float64)
            finite = np.isfinite(values)
            numbers[finite, j] = values[finite]
            kinds[finite, j] = Kind.NUMBER
        elif column.dtype.kind == "M":
            present = ~np.isnat(column)
            days = (column - np.datetime64("1899-12-30")) / np.timedelta64(1, "D")
            numbers[present, j] = days[present]
            kinds[present, j] = Kind.DATE
        else:
            cells = [None if v is None or v != v else v for v in column.tolist()]
            one = Block.from_rows([[v] for v in cells])
            numbers[:, j], kinds[:, j] = one.numbers[:, 0], one.kinds[:, 0]
            if 0 in one.texts:
                texts[j] = one.texts[0]
    return Block(numbers, kinds, texts)
