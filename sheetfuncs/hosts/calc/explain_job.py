"""Why a function in a cell gives what it gives, in sentences."""

from __future__ import annotations

from sheetfuncs.cells.block import Block
from sheetfuncs.functions.evaluate import evaluate, find_function, why
from sheetfuncs.hosts.calc.worker import Head, Progress, arguments


def explain(head: Head, blocks: list[Block], progress: Progress) -> tuple[Head, bytes | None]:
    """The sentence on one call; the head is that of the job "evaluate"."""
    name, given = head["name"], arguments(head, blocks)
    if name == "FIT_WHY":
        return {"sentence": f"FIT_WHY says: {evaluate(name, *given)}"}, None
    sentence = why(name, *given)
    if sentence != "ok":
        return {"sentence": f"{name} gives {evaluate(name, *given)}. {sentence}"}, None
    rows = _about_rows(name, given)
    return {"sentence": f"{name} gives a value; nothing stopped it." + (f" {rows}" if rows else "")}, None


def _about_rows(name: str, given: list[object]) -> str:
    """What is worth knowing of the rows behind a call on a response and predictors; "" where there is nothing."""
    known = {argument.name: value for argument, value in zip(find_function(name).arguments, given, strict=False)}
    if known.get("response") is None or known.get("predictors") is None:
        return ""
    options = {option: known[option] for option in ("intercept", "order") if known.get(option) is not None}
    said = str(evaluate("FIT_WHY", known["response"], known["predictors"], **options))
    rest = said.removeprefix("ok").removeprefix("; ")
    return rest[:1].upper() + rest[1:]
