"""The worker's part of saving: plain names of our functions in the workbook that Calc has just written."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from sheetfuncs.cells.block import Block
from sheetfuncs.errors import WorkbookBusyError
from sheetfuncs.workbook.formula_names import write_plain_names


def rename(
    head: dict[str, Any], blocks: list[Block], progress: Callable[[str], None]
) -> tuple[dict[str, Any], bytes | None]:
    """The file under `path` in the head gets plain names: {"names": how many changed, "busy": why not, or None}.

    Its time of last change stays, so that Calc, which has it open, takes it for the file that it wrote.
    """
    try:
        return {"names": write_plain_names(head["path"], keep_time=True), "busy": None}, None
    except WorkbookBusyError as busy:  # a program holds it; to be tried again when that lets go
        return {"names": 0, "busy": str(busy)}, None
