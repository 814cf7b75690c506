"""The reference cases: data as CSV, results of other programs and exact results as JSON. See README.md beside this."""

from __future__ import annotations

import csv
import json
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

from sheetfuncs.core.design import Category, Design, Numeric, build_design

FOLDER = Path(__file__).parent
NAMES = tuple(sorted(path.stem for path in FOLDER.glob("*.json")))
ROUNDING_NOISE = ("syn_perfect_a", "syn_saturated_a")


@dataclass(frozen=True)
class Case:
    """A reference case. response and predictors are column names of the CSV."""

    name: str
    facts: dict[str, Any]
    header: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]

    @property
    def response(self) -> str:
        return self.facts["formula"].split("~")[0].strip()

    @property
    def predictors(self) -> tuple[str, ...]:
        right = self.facts["formula"].split("~")[1].replace("- 1", "")
        return tuple(term.strip() for term in right.split("+") if term.strip())

    @property
    def intercept(self) -> bool:
        return self.facts["intercept"]

    @property
    def base_levels(self) -> dict[str, str]:
        return {name: category["reference"] for name, category in self.facts["categorical"].items()}

    @property
    def used(self) -> list[int]:
        """Places from 0 of the rows that list-wise deletion keeps."""
        dropped = set(self.facts["rows_dropped_1based"])
        return [i for i in range(len(self.rows)) if i + 1 not in dropped]

    @property
    def results(self) -> list[dict[str, Any]]:
        return self.facts["results"]

    @property
    def exact(self) -> dict[str, Any]:
        return self.facts.get("exact_mpmath", {})

    def numbers(self, column: str) -> np.ndarray:
        place = self.header.index(column)
        return np.array([float(self.rows[i][place]) for i in self.used])

    def design(self, predictors: tuple[str, ...] | None = None) -> Design:
        """The design of the used rows, categories with the reference's base level first."""
        columns = [self._predictor(name) for name in (predictors or self.predictors)]
        return build_design(
            self.numbers(self.response), columns, response_name=self.response, intercept=self.intercept
        )

    def _predictor(self, name: str) -> Numeric | Category:
        category = self.facts["categorical"].get(name)
        if category is None:
            return Numeric(name, self.numbers(name))
        place, levels = self.header.index(name), category["levels"]
        return Category(name, tuple(levels), np.array([levels.index(self.rows[i][place]) for i in self.used]))

    def cells(self) -> list[list[object]]:
        """Header and all rows as a spreadsheet would hold them: response first, then the predictors."""
        columns = [self.header.index(name) for name in (self.response, *self.predictors)]
        header: list[object] = [self.header[c] for c in columns]
        return [header, *([_cell(row[c]) for c in columns] for row in self.rows)]

    def term(self, reference_term: str) -> str:
        """Our name of a coefficient that the reference calls "(Intercept)", "income" or "typeprof"."""
        if reference_term == "(Intercept)":
            return "intercept"
        for name, category in self.facts["categorical"].items():
            for level in category["levels"]:
                if reference_term == name + level:
                    return f"{name}: {level}"
        return reference_term


@cache
def load_case(name: str) -> Case:
    facts = json.loads((FOLDER / f"{name}.json").read_text(encoding="utf-8"))
    with open(FOLDER / f"{name}.csv", newline="", encoding="utf-8") as file:
        header, *rows = csv.reader(file)
    return Case(name, facts, tuple(header), tuple(tuple(row) for row in rows))


def as_number(value: Any) -> float:
    """A figure of the JSON: a number, a decimal string, or one of "NaN", "Inf", "-Inf", "NA"."""
    return float({"Inf": "inf", "-Inf": "-inf", "NA": "nan"}.get(value, value))


def _cell(text: str) -> object:
    if text in ("", "NA"):
        return None
    try:
        return float(text)
    except ValueError:
        return text
