"""Why a call of a worksheet function gives what it gives, for the button beside the cell."""

from __future__ import annotations

from collections.abc import Sequence

from sheetfuncs.functions.evaluate import evaluate, find_function, why


def stopped(name: str, given: Sequence[object]) -> str:
    """The error value that the call gives and the sentence behind it; "" where nothing stops it."""
    sentence = why(name, *given)
    return "" if sentence == "ok" else f"{name} gives {evaluate(name, *given)}. {sentence}"


def gives(name: str, given: Sequence[object]) -> str:
    """That a call which nothing stops gives its value or values, and what is worth knowing of the rows behind them."""
    function = find_function(name)
    if name == "FIT_WHY":
        return f"FIT_WHY says: {evaluate(name, *given)}"
    rows = rows_behind(name, given)
    if function.returns in ("number", "text"):
        return f"{name} gives a value." + (f" {rows}" if rows else "")
    shown = " Those show #N/A." if "left out" in rows and "high as the response" in function.shape else ""
    return f"{name} gives its values." + (f" {rows}{shown}" if rows else "")


def rows_behind(name: str, given: Sequence[object]) -> str:
    """What FIT_WHY says of the rows behind a call on a response and predictors; "" where there is nothing to say."""
    known = {argument.name: value for argument, value in zip(find_function(name).arguments, given, strict=False)}
    if known.get("response") is None or known.get("predictors") is None:
        return ""
    options = {option: known[option] for option in ("intercept", "order") if known.get(option) is not None}
    said = str(evaluate("FIT_WHY", known["response"], known["predictors"], **options))
    rest = said.removeprefix("ok").removeprefix("; ")
    return rest[:1].upper() + rest[1:]
