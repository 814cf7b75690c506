"""What a worksheet function is: a frozen declaration, and the call that its compute gets."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

from sheetfuncs.cells.block import Block
from sheetfuncs.core.fit import Fit
from sheetfuncs.errors import CellKindError
from sheetfuncs.functions.arguments import Argument, Option
from sheetfuncs.functions.regressions import Regression, find_regression

Cell = float | bool | str | None
CellResult = Cell | list[list[Cell]]


@dataclass(frozen=True, eq=False)
class Call:
    """One call: the ranges as they were handed over, and every option with its value or default."""

    ranges: Mapping[str, object]
    options: Mapping[str, Option]

    def block(self, name: str) -> Block:
        """The range of this argument as a Block. Raises CellKindError for what is no range of cells."""
        return as_block(self.ranges.get(name))

    @cached_property
    def regression(self) -> Regression:
        """The regression that the call is about. Raises a SheetfuncsError where there is none."""
        order = self.ranges.get("order")
        return find_regression(
            self.block("response"), self.block("predictors"), None if order is None else as_block(order),
            intercept=bool(self.options["intercept"]),
        )

    @property
    def fit(self) -> Fit:
        return self.regression.fit


@dataclass(frozen=True)
class WorksheetFunction:
    """A worksheet function, declared once; hosts and lists are made from it.

    summary: help of at most 255 characters, which names the variant. returns: what comes back; shape: its size in
    words; columns: names of a table's columns. term_columns: what further columns hold, one a coefficient. compute
    raises a SheetfuncsError where a value cannot be given.
    """

    name: str
    group: str
    summary: str
    arguments: tuple[Argument, ...]
    returns: Literal["number", "column", "table", "text"]
    shape: str
    compute: Callable[[Call], CellResult]
    columns: tuple[str, ...] = ()
    term_columns: str = ""

    @property
    def signature(self) -> str:
        """ "FIT_VIF(predictors, [predictor], [intercept])"."""
        names = [f"[{a.name}]" if a.optional else a.name for a in self.arguments]
        return f"{self.name}({', '.join(names)})"


ONE_NUMBER = "one number"
AS_HIGH_AS_RESPONSE = "one column, as high as the response"


def as_block(given: object) -> Block:
    """A Block as it is; a list of rows, or a single cell, as a Block."""
    if isinstance(given, Block):
        return given
    if isinstance(given, list | tuple):
        if not all(issubclass(kind, list | tuple) for kind in set(map(type, given))):
            raise CellKindError("A range is handed over as a list of rows, each a list of cells.")
        return Block.from_rows(given)
    return Block.from_rows([[given]])
