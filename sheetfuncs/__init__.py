"""sheetfuncs: regression diagnostics inside the workbook.

    sheetfuncs.evaluate("FIT_DURBIN_WATSON", response_rows, predictor_rows)   one worksheet function
    sheetfuncs.check(y, x)                                                    everything known about one regression

Both are imported on first use, so that `import sheetfuncs` costs next to nothing.
"""

from __future__ import annotations

from typing import Any

__version__ = "0.1.0"
__all__ = ["__version__", "check", "evaluate"]


def evaluate(name: str, *args: Any, **options: Any) -> Any:
    """Evaluate a worksheet function by its worksheet name; see `sheetfuncs.functions.evaluate`."""
    from sheetfuncs.functions.evaluate import evaluate as compute

    return compute(name, *args, **options)


def check(*args: Any, **options: Any) -> Any:
    """Check one regression on arrays, Series or DataFrames; see `sheetfuncs.checking.check`."""
    from sheetfuncs.checking import check as compute

    return compute(*args, **options)
