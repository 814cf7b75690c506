"""One call of a worksheet function: its arguments as LibreOffice hands them over, its value as a cell shows it."""

from __future__ import annotations

import struct

from sheetfuncs_bridge import protocol
from sheetfuncs_bridge.client import CELLS, Packed, WorkerTrouble
from sheetfuncs_bridge.ranges import common_last_row, cut_to_row, read_block

ERROR_CODES = {
    "#NULL!": 521, "#DIV/0!": 532, "#VALUE!": 519, "#REF!": 524, "#NAME?": 525, "#NUM!": 503, "#N/A": 32767,
}
NO_ANSWER = "#VALUE!"
# A quiet NaN whose low word is an error's code: LibreOffice shows it as that error, also inside a matrix.
ERRORS = {
    text: struct.unpack("<d", struct.pack("<Q", 0x7FF8_0000_0000_0000 | code))[0] for text, code in ERROR_CODES.items()
}


def call(recalculation, document, name: str, given):
    """The value of a function: a float, a text, or a list of rows of None, float, bool, str and error texts.

    given: its arguments; ranges as XCellRange, options as None, float, str, or rows of cells.
    """
    options = tuple(value for value in given if not hasattr(value, "getDataArray"))
    with recalculation.call():
        if recalculation.trouble is not None:
            return NO_ANSWER
        try:
            head, blocks = gather(
                name, given, lambda ranges: recalculation.packed(document, ranges, (name, options))
            )
            return value_of(CELLS.request("evaluate", head, blocks))
        except WorkerTrouble as trouble:
            recalculation.trouble = str(trouble)
            return NO_ANSWER


def value_of(answer):
    """What a worker's answer to "evaluate" holds."""
    if answer.status != "ok":
        return answer.head.get("cell_error", NO_ANSWER)
    if answer.head.get("rows"):
        return protocol.rows_of_block(protocol.unpack(answer.part))
    return answer.head.get("value")


def pack_afresh(ranges) -> list:
    """A Packed block for each range, read now."""
    last_row = common_last_row(ranges, [cells.getRangeAddress() for cells in ranges])
    parts = [cells if last_row is None else cut_to_row(cells, last_row) for cells in ranges]
    return [Packed(protocol.pack(read_block(part))) for part in parts]


def gather(name: str, given, pack_ranges):
    """(head, blocks) of the request: ranges become packed blocks, the rest stays in the head."""
    ranges = [value for value in given if hasattr(value, "getDataArray")]
    blocks = pack_ranges(ranges)
    places = iter(range(len(blocks)))
    arguments = []
    for value in given:
        if hasattr(value, "getDataArray"):
            arguments.append({"block": next(places)})
        elif isinstance(value, tuple):  # cells that stand for an optional argument
            arguments.append({"block": len(blocks)})
            blocks.append(Packed(protocol.pack(protocol.block_of_rows(value))))
        else:
            arguments.append({"value": value})
    return {"name": name, "arguments": arguments}, blocks


def as_scalar(value):
    """The value for a function that gives one cell."""
    if isinstance(value, list):
        value = value[0][0] if value and value[0] else None
    return _cell(value)


def as_matrix(value):
    """The value for a function that gives rows of cells."""
    if not isinstance(value, list):
        return ((_cell(value),),)
    return tuple(tuple(map(_cell, row)) for row in value)


def _cell(value):
    if type(value) is float:
        return value
    if value is None:
        return ""
    if isinstance(value, (bool, int)):
        return float(value)
    return ERRORS.get(value, value)
