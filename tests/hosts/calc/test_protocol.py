"""The protocol between bridge and worker: what goes in comes out, and what is no message is refused."""

from __future__ import annotations

import io
import math
import struct
from contextlib import suppress

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.hosts.calc import protocol
from sheetfuncs.hosts.calc.blocks import to_block

cells = (
    st.none() | st.floats(allow_nan=False, allow_infinity=False) | st.booleans() | st.text(min_size=1)
    | st.sampled_from([*sorted(protocol.ERROR_TEXTS), " ", "\ud800", "=A1", "a\0b"])
)


@st.composite
def tables(draw):
    width = draw(st.integers(1, 4))
    return draw(st.lists(st.lists(cells, min_size=width, max_size=width), min_size=1, max_size=6))


@given(tables(), st.integers(1, 2**20), st.integers(1, 2**14), st.none() | st.text())
def test_a_block_goes_through(rows, first_row, first_column, sheet):
    place = {"first_row": first_row, "first_column": first_column, "sheet": sheet}
    packed = protocol.pack(protocol.block_of_rows(rows, hidden=bytes(len(rows)), **place))
    block = protocol.unpack(packed)
    assert protocol.rows_of_block(block) == rows
    assert (block.first_row, block.first_column, block.sheet) == (first_row, first_column, sheet)
    assert block.hidden == bytes(len(rows))
    assert protocol.pack(block) == packed


@given(tables())
def test_a_packed_block_becomes_the_block_that_hosts_hand_over(rows):
    block, expected = to_block(protocol.unpack(protocol.pack(protocol.block_of_rows(rows)))), Block.from_rows(rows)
    assert np.array_equal(block.kinds, expected.kinds)
    assert np.array_equal(block.numbers, expected.numbers, equal_nan=True)
    assert {key: list(texts) for key, texts in block.texts.items()} == {
        key: list(texts) for key, texts in expected.texts.items()
    }
    assert not block.numbers.flags.writeable


def test_kinds_are_those_of_a_block_of_cells():
    names = ("BLANK", "NUMBER", "BOOLEAN", "TEXT", "ERROR", "DATE")
    assert [getattr(protocol, name) for name in names] == [Kind[name] for name in names] == list(Kind)


def test_dates_and_hidden_rows_arrive():
    block = protocol.block_of_rows([[46000.0, 1.0], [46001.0, 2.0]], hidden=b"\0\1", date1904=True)
    block.kinds = bytes([protocol.DATE, protocol.NUMBER] * 2)
    found = to_block(protocol.unpack(protocol.pack(block)))
    assert found.kinds.tolist() == [[Kind.DATE, Kind.NUMBER]] * 2
    assert found.hidden is not None
    assert found.hidden.tolist() == [False, True]
    assert found.date1904
    assert found.numbers[0, 0] == 46000.0


def test_a_number_that_no_cell_can_hold_is_an_error_value():
    assert protocol.rows_of_block(protocol.block_of_rows([[math.nan, math.inf]])) == [["#NUM!", "#NUM!"]]


def written(kind: int = protocol.REQUEST, head: dict | None = None, parts: tuple[bytes, ...] = ()) -> bytes:
    stream = io.BytesIO()
    protocol.write_message(stream, kind, head or {}, parts)
    return stream.getvalue()


def test_messages_follow_each_other():
    stream = io.BytesIO(written(head={"a": "ü"}, parts=(b"", b"12")) + written(protocol.ANSWER))
    assert protocol.read_message(stream) == (protocol.REQUEST, {"a": "ü"}, [b"", b"12"])
    assert protocol.read_message(stream) == (protocol.ANSWER, {}, [])
    assert protocol.read_message(stream) is None


@pytest.mark.parametrize("length", range(1, len(written(head={"kind": "hello"}, parts=(b"123",)))))
def test_a_message_cut_short_is_refused(length):
    with pytest.raises(protocol.ProtocolError, match="ended within"):
        protocol.read_message(io.BytesIO(written(head={"kind": "hello"}, parts=(b"123",))[:length]))


@pytest.mark.parametrize(
    ("data", "sentence"),
    [
        (b"Traceback (most recent call last)", "no message"),
        (struct.pack("<4sBBHI", protocol.MAGIC, 2, 1, 0, 2) + b"{}", "version 2"),
        (struct.pack("<4sBBHI", protocol.MAGIC, 1, 9, 0, 2) + b"{}", "not allowed"),
        (struct.pack("<4sBBHI", protocol.MAGIC, 1, 1, 0, 2**31), "not allowed"),
        (struct.pack("<4sBBHI", protocol.MAGIC, 1, 1, 65535, 2), "not allowed"),
        (struct.pack("<4sBBHI", protocol.MAGIC, 1, 1, 0, 2) + b"[]", "no object"),
        (struct.pack("<4sBBHI", protocol.MAGIC, 1, 1, 0, 2) + b"{x", "cannot be read"),
        (struct.pack("<4sBBHI", protocol.MAGIC, 1, 1, 1, 2) + b"{}" + struct.pack("<Q", 2**62), "too long"),
    ],
)
def test_other_bytes_are_refused(data, sentence):
    with pytest.raises(protocol.ProtocolError, match=sentence):
        protocol.read_message(io.BytesIO(data))


@given(st.binary(max_size=80))
def test_any_bytes_are_a_block_or_refused(data):
    """Lengths come from outside: nothing is allocated by what they promise."""
    with suppress(protocol.ProtocolError):
        to_block(protocol.unpack(data))


@given(st.integers(0, 200), st.integers(0, 255))
def test_a_damaged_block_is_a_block_or_refused(place, value):
    packed = bytearray(protocol.pack(protocol.block_of_rows([[1.0, "word"], [None, "#N/A"]], sheet="Jobs")))
    packed[place % len(packed)] = value
    with suppress(protocol.ProtocolError):
        to_block(protocol.unpack(packed))


def test_an_answer_too_long_is_never_sent():
    with pytest.raises(protocol.ProtocolError, match="longer"):
        written(parts=(b"",) * 65)
