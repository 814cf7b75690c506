"""Packed blocks of the protocol to and from the blocks and values that the rest of sheetfuncs works with."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.hosts.calc import protocol


def to_block(packed: protocol.Block) -> Block:
    """The block of cells; its arrays are read-only, so that what was computed from them stays true."""
    shape = packed.rows, packed.columns
    numbers = np.frombuffer(packed.numbers, "=f8").reshape(shape)
    kinds = _kinds(packed, shape)
    odd = (kinds == Kind.TEXT) | (kinds == Kind.ERROR)
    if np.count_nonzero(odd) != len(packed.texts):
        raise protocol.ProtocolError("A block has another number of texts than of cells with text.")
    return Block(
        _by_column(np.where(odd | (kinds == Kind.BLANK), np.nan, numbers)), _by_column(kinds),
        _texts_by_column(odd, packed.texts), packed.sheet, packed.first_row, packed.first_column,
        _hidden(packed), None, packed.date1904,
    )


def _kinds(packed: protocol.Block, shape: tuple[int, int]) -> np.ndarray:
    if packed.kinds is None:
        return np.full(shape, Kind.NUMBER, np.uint8)
    kinds = np.frombuffer(packed.kinds, np.uint8).reshape(shape)
    if kinds.size and kinds.max() > max(Kind):
        raise protocol.ProtocolError("A block has a cell of an unknown kind.")
    return kinds


def _hidden(packed: protocol.Block) -> np.ndarray | None:
    return None if packed.hidden is None else np.frombuffer(packed.hidden, np.uint8).astype(bool)


def _by_column(cells: np.ndarray) -> np.ndarray:
    array = np.asfortranarray(cells)
    array.flags.writeable = False
    return array


def _texts_by_column(odd: np.ndarray, texts: Sequence[str]) -> dict[int, np.ndarray]:
    if not texts:
        return {}
    cells = np.full(odd.shape, None, object)
    cells[odd] = np.array(texts, object)  # both go row after row
    return {int(column): cells[:, column] for column in np.flatnonzero(odd.any(axis=0))}
