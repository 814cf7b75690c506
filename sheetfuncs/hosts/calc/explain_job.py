"""Why a function in a cell gives what it gives, in sentences."""

from __future__ import annotations

from sheetfuncs.cells.block import Block
from sheetfuncs.functions.explain_call import gives, stopped
from sheetfuncs.hosts.calc.worker import Head, Progress, arguments


def explain(head: Head, blocks: list[Block], progress: Progress) -> tuple[Head, bytes | None]:
    """The sentence on one call; the head is that of the job "evaluate"."""
    name, given = head["name"], arguments(head, blocks)
    return {"sentence": stopped(name, given) or gives(name, given)}, None
