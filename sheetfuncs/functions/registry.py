"""All worksheet functions, by name, in the order in which they are listed."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from sheetfuncs.functions import collinearity, fit, form, independence, mean, normality, rows, variance
from sheetfuncs.functions.arguments import Argument
from sheetfuncs.functions.declaration import WorksheetFunction

__all__ = ["REGISTRY", "Argument", "WorksheetFunction"]

SUBJECTS = (fit, mean, independence, variance, normality, collinearity, form, rows)

REGISTRY: Mapping[str, WorksheetFunction] = MappingProxyType(
    {function.name: function for subject in SUBJECTS for function in subject.FUNCTIONS}
)
