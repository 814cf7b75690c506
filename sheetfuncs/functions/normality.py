"""Normality of the errors."""

from __future__ import annotations

from sheetfuncs.core.normality import jarque_bera, normal_scores, shapiro_wilk
from sheetfuncs.core.normality_tests import anderson_darling, dagostino_k2, lilliefors
from sheetfuncs.functions.answers import by_row, p_value
from sheetfuncs.functions.arguments import choice, on_rows
from sheetfuncs.functions.declaration import AS_HIGH_AS_RESPONSE, ONE_NUMBER, Call, CellResult, WorksheetFunction

GROUP = "normality"
TESTS = {
    "shapiro-wilk": shapiro_wilk, "jarque-bera": jarque_bera, "anderson-darling": anderson_darling,
    "lilliefors": lilliefors, "dagostino-pearson": dagostino_k2,
}


def _normality(call: Call) -> CellResult:
    return p_value(TESTS[str(call.options["test"])](call.fit))


def _normal_scores(call: Call) -> CellResult:
    call.fit.require_variation()
    return by_row(call.regression.observations, normal_scores(call.fit.residuals), "normal score")


FUNCTIONS = (
    WorksheetFunction(
        "FIT_NORMALITY_P", GROUP,
        "p of a test of the residuals for normality, Shapiro-Wilk unless asked otherwise. A small p is evidence that "
        "the errors are not normal.",
        on_rows(choice(
            "test", '"shapiro-wilk" (default; #N/A above 5,000 rows), "jarque-bera" (chi-square, for many rows), '
            '"anderson-darling" (8 rows or more), "lilliefors" (5 or more; 0.0001 stands for that or less) or '
            '"dagostino-pearson" (8 or more).', tuple(TESTS),
        )),
        "number", ONE_NUMBER, _normality,
    ),
    WorksheetFunction(
        "FIT_NORMAL_SCORES", GROUP,
        "Normal score of each row: where its plain residual would lie if the residuals were normal, in standard "
        "deviations. Against the residuals, a straight line speaks for normality.",
        on_rows(), "column", AS_HIGH_AS_RESPONSE, _normal_scores,
    ),
)
