"""Every statistic with its variant, df, p and what p speaks against, or the reason why it does not apply."""

from __future__ import annotations

from collections.abc import Sequence

from sheetfuncs.checking import Check
from sheetfuncs.core.results import Degrees, Result
from sheetfuncs.report import style as looks
from sheetfuncs.report.formats import PVALUE, digits_format
from sheetfuncs.report.layout import FIRST, LAST, Head, Page

NOTE = (
    "p is the chance of a statistic at least this extreme if what stands under \"p speaks against\" were true. "
    "Variants and options never change with the number of rows."
)
# (assumption, method, name); the order is the sheet's. The first entry of a method is the one the first screen reads.
METHODS = (
    ("Mean of the errors", "residual_mean", "Residual mean"),
    ("Form", "reset", "RESET"),
    ("Form", "rainbow", "Rainbow"),
    ("Form", "harvey_collier", "Harvey-Collier"),
    ("Form", "box_cox", "Box-Cox"),
    ("Constant variance", "breusch_pagan", "Breusch-Pagan"),
    ("Constant variance", "ncv_test_fitted", "Breusch-Pagan"),
    ("Constant variance", "white", "White"),
    ("Constant variance", "white_special_fitted", "White"),
    ("Constant variance", "goldfeld_quandt", "Goldfeld-Quandt"),
    ("Independence", "durbin_watson", "Durbin-Watson"),
    ("Independence", "durbin_watson_test", "Durbin-Watson"),
    ("Independence", "breusch_godfrey", "Breusch-Godfrey"),
    ("Independence", "ljung_box", "Ljung-Box"),
    ("Independence", "box_pierce", "Box-Pierce"),
    ("Normality", "shapiro_wilk", "Shapiro-Wilk"),
    ("Normality", "jarque_bera", "Jarque-Bera"),
    ("Normality", "anderson_darling", "Anderson-Darling"),
    ("Normality", "lilliefors", "Lilliefors"),
    ("Normality", "dagostino_k2", "D'Agostino-Pearson"),
    ("Rows", "outlier_test", "Outlier test"),
    ("Rows", "press", "PRESS"),
)
OTHER = "Others"
AS_ABOVE = "As above."
# The assumption's name may wrap: the tests' names need the room.
_TEST, _STATISTIC = FIRST + 1, FIRST + 6
# Methods that come in many variants show the first here and the rest in a block of their own.
_MANY = {"breusch_godfrey", "reset", "rainbow", "goldfeld_quandt", "ljung_box", "box_pierce"}


def write_statistics(page: Page, check: Check) -> None:
    """The section: the statistics that the first screen reads, then the same tests in other variants."""
    page.section("statistics", "Every statistic", NOTE)
    shown, others = _split(check.statistics)
    _write_table(page, shown)
    if others:
        page.subheading("The same tests in other variants")
        _write_table(page, others)


def place_of(result: Result) -> tuple[int, str, str]:
    """Rank, assumption and name of a method; methods without a place come last under their own name."""
    for rank, (assumption, method, name) in enumerate(METHODS):
        if method == result.method:
            return rank, assumption, name
    return len(METHODS), OTHER, result.method.replace("_", " ").capitalize()


def _split(statistics: Sequence[Result]) -> tuple[list[Result], list[Result]]:
    ranked = sorted(statistics, key=lambda result: place_of(result)[0])
    seen: set[str] = set()
    shown: list[Result] = []
    others: list[Result] = []
    for result in ranked:
        (others if result.method in seen and result.method in _MANY else shown).append(result)
        seen.add(result.method)
    return shown, others


def _write_table(page: Page, results: Sequence[Result]) -> None:
    page.table_head([
        Head(FIRST, 1, "Assumption"), Head(_TEST, _STATISTIC - _TEST, "Test and variant"),
        Head(_STATISTIC, 1, "Statistic", right=True), Head(_STATISTIC + 1, 1, "df", right=True),
        Head(_STATISTIC + 2, 1, "p", right=True),
        Head(_STATISTIC + 3, LAST - _STATISTIC - 2, "p speaks against; notes"),
    ])
    before = said = ""
    for result in results:
        _, assumption, name = place_of(result)
        look = looks.WRAPPED if " " in assumption else looks.TEXT  # a single word is not to be broken
        page.put(FIRST, assumption if assumption != before else None, look)
        before = assumption
        text = _against(result)
        page.put(
            _TEST, f"{name}, {result.variant}" if result.variant else name, looks.BESIDE, span=_STATISTIC - _TEST,
        )
        if result.applies:
            _write_figures(page, result)
            page.put(_STATISTIC + 3, AS_ABOVE if said == text != "" else text, looks.QUIET_BESIDE,
                     span=LAST - _STATISTIC - 2)
            said = text
        else:
            page.put(_STATISTIC, f"Does not apply: {result.reason}", looks.QUIET_BESIDE,
                     span=LAST - _STATISTIC + 1)
            said = ""
        page.next()


def _against(result: Result) -> str:
    """What p speaks against, and the note, in sentences."""
    return " ".join(_sentence(text) for text in (result.null if result.p is not None else "", result.note) if text)


def _write_figures(page: Page, result: Result) -> None:
    if result.statistic is not None:
        page.number(_STATISTIC, result.statistic, digits_format(result.statistic, 4))
    degrees = degrees_text(result.df)
    if isinstance(degrees, str):
        page.put(_STATISTIC + 1, degrees, looks.NUMBER.but(wrap=True))  # of many rows, a pair takes two lines
    elif degrees is not None:
        page.number(_STATISTIC + 1, degrees, "#,##0" if degrees == int(degrees) else "#,##0.0")
    if result.p is not None:
        page.number(_STATISTIC + 2, result.p, PVALUE)


def degrees_text(df: Degrees) -> float | str | None:
    """A number, or "2 and 57" for a pair."""
    if isinstance(df, tuple):
        return " and ".join(f"{value:,.0f}" if value == int(value) else f"{value:,.1f}" for value in df)
    return None if df is None else float(df)


def _sentence(text: str) -> str:
    return text[:1].upper() + text[1:] + ("" if text.endswith((".", "?", "!")) else ".")
