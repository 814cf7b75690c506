"""Recent regressions by the content of their cells: forty formulas on one range fit it once."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Sequence
from copy import copy
from dataclasses import dataclass
from functools import cached_property
from hashlib import sha256
from threading import Lock
from weakref import WeakKeyDictionary

import numpy as np

from sheetfuncs.cells.block import Block
from sheetfuncs.cells.observations import CategoryColumn, Observations, read_observations, read_predictors
from sheetfuncs.checking import design_of
from sheetfuncs.core.basis import Basis, factorize
from sheetfuncs.core.design import Category, Group, Numeric, build_design
from sheetfuncs.core.fit import Fit, fit_design
from sheetfuncs.core.influence import RowMeasures, row_measures
from sheetfuncs.errors import SheetfuncsError

MAX_BYTES = 200_000_000


@dataclass(frozen=True, eq=False)
class Regression:
    """What was read from the cells, and its fit."""

    observations: Observations
    fit: Fit

    @cached_property
    def measures(self) -> RowMeasures:
        return row_measures(self.fit)

    @property
    def size(self) -> int:
        """Bytes, roughly: columns, their basis, and some twenty figures a row."""
        return 8 * self.fit.n * (2 * self.fit.p + 20) + 50_000


@dataclass(frozen=True, eq=False)
class Predictors:
    """The basis of predictors that were read without a response, and which columns belong to which predictor."""

    basis: Basis
    groups: tuple[Group, ...]
    column_names: tuple[str, ...]

    @property
    def size(self) -> int:
        return 8 * self.basis.n * (2 * self.basis.rank + 2) + 50_000


Found = Regression | Predictors | SheetfuncsError


class Recent:
    """A store of recent results by key, bounded in bytes, that several threads may use. Refusals are kept too."""

    def __init__(self, max_bytes: int = MAX_BYTES):
        self._limit = max_bytes
        self._found: OrderedDict[bytes, tuple[Found, int]] = OrderedDict()
        self._size = 0
        self._lock = Lock()

    @property
    def size(self) -> int:
        return self._size

    def __len__(self) -> int:
        return len(self._found)

    def get(self, key: bytes) -> Found | None:
        with self._lock:
            if key not in self._found:
                return None
            self._found.move_to_end(key)
            return self._found[key][0]

    def put(self, key: bytes, found: Found) -> None:
        size = 2_000 if isinstance(found, SheetfuncsError) else found.size
        if size > self._limit:
            return
        with self._lock:
            self._size += size - self._found.pop(key, (None, 0))[1]
            self._found[key] = found, size
            while self._size > self._limit:
                self._size -= self._found.popitem(last=False)[1][1]

    def clear(self) -> None:
        with self._lock:
            self._found.clear()
            self._size = 0


RECENT = Recent()


def find_regression(response: Block, predictors: Block, order: Block | None, *, intercept: bool) -> Regression:
    """The regression on these blocks, fitted now or lately. Raises what reading or fitting refuses."""
    key = content_key((response, predictors, order), intercept)

    def compute() -> Regression:
        observations = read_observations(response, predictors, order)
        return Regression(observations, fit_design(design_of(observations, intercept=intercept)))

    found = _recent_or(key, compute)
    assert isinstance(found, Regression)
    return found


def find_predictors(predictors: Block, *, intercept: bool) -> Predictors:
    """The basis of predictors alone, factorized now or lately."""

    def compute() -> Predictors:
        columns = read_predictors(predictors).predictors
        design = build_design(
            np.zeros(len(_values(columns[0]))),
            [Category(c.name, c.levels, c.codes) if isinstance(c, CategoryColumn) else Numeric(c.name, c.values)
             for c in columns],
            intercept=intercept,
        )
        basis = factorize(design.columns, design.column_names, intercept=intercept)
        return Predictors(basis, design.groups, design.column_names)

    found = _recent_or(content_key((predictors,), intercept), compute)
    assert isinstance(found, Predictors)
    return found


def content_key(blocks: Sequence[Block | None], *options: object) -> bytes:
    """A key that differs wherever cells, their place in the sheet, hidden rows or options differ."""
    digest = sha256(repr((len(blocks), options)).encode())
    for block in blocks:
        digest.update(b"none" if block is None else _block_digest(block))
    return digest.digest()


def _block_digest(block: Block) -> bytes:
    """The digest of one block; that of a block which nobody can write to is found once and kept."""
    kept: bytes | None = _DIGESTS.get(block)
    if kept is None:
        kept = _digest_now(block)
        if not (block.numbers.flags.writeable or block.kinds.flags.writeable):
            _DIGESTS[block] = kept
    return kept


_DIGESTS: WeakKeyDictionary[Block, bytes] = WeakKeyDictionary()


def _digest_now(block: Block) -> bytes:
    place = (block.kinds.shape, block.sheet, block.first_row, block.first_column, block.worksheet_columns,
             block.date1904, sorted(block.texts), block.hidden is not None)
    digest = sha256(repr(place).encode("utf-8", "surrogatepass"))  # most processors have a circuit for it
    digest.update(_bytes(block.numbers))
    digest.update(_bytes(block.kinds))
    for column in sorted(block.texts):
        digest.update(repr(block.texts[column].tolist()).encode("utf-8", "surrogatepass"))
    if block.hidden is not None:
        digest.update(_bytes(block.hidden))
    return digest.digest()


def _bytes(array: np.ndarray) -> memoryview:
    """The array's bytes, column after column, whatever its layout; without a copy for blocks read from rows."""
    return np.ascontiguousarray(array.T).data.cast("B") if array.size else memoryview(b"")


def _recent_or(key: bytes, compute: Callable[[], Found]) -> Found:
    found = RECENT.get(key)
    if found is None:
        try:
            found = compute()
        except SheetfuncsError as refusal:
            found = copy(refusal)
        RECENT.put(key, found)
    if isinstance(found, SheetfuncsError):
        raise copy(found)  # the kept one never gets a traceback, which would hold on to the blocks
    return found


def _values(column: object) -> np.ndarray:
    return column.codes if isinstance(column, CategoryColumn) else column.values  # type: ignore[attr-defined]
