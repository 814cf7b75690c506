"""A planned chart as a native chart of XlsxWriter."""

from __future__ import annotations

import re
from typing import Any

from xlsxwriter.chart import Chart as NativeChart
from xlsxwriter.workbook import Workbook
from xlsxwriter.worksheet import Worksheet

from sheetfuncs.report import style as looks
from sheetfuncs.report.elements import Area, Axis, Chart, Series
from sheetfuncs.report.layout import COLUMN_PIXELS

_TYPES = {
    "scatter": {"type": "scatter"}, "columns": {"type": "column"}, "bars": {"type": "bar"},
}
_LINES: dict[str, dict[str, Any]] = {
    "smooth": {"color": looks.SMOOTH, "width": 2.25},
    "line": {"color": looks.QUIET, "width": 1.0},
    "course": {"color": looks.POINTS, "width": 0.75},
    "limit": {"color": looks.INK, "width": 1.25, "dash_type": "dash"},
}
_LIKE_REFERENCE = re.compile(r"^(=?[^!]+)!(?=\$?[A-Z]+\$?\d)")
_SMALL = {"name": looks.FONT, "size": 8, "color": looks.QUIET, "bold": False}


def insert_chart(workbook: Workbook, sheet: Worksheet, title: str, chart: Chart) -> None:
    """Draw a chart over its place; every range it shows stands on the same sheet."""
    native = workbook.add_chart(dict(_TYPES[chart.kind]))
    over = [series for series in chart.series if chart.kind == "columns" and series.look in _LINES]
    for series in chart.series:
        if series not in over:
            native.add_series(_series(title, series, chart.kind))
    if over:
        lines = workbook.add_chart({"type": "line"})
        for series in over:
            lines.add_series(_series(title, series, "line"))
        native.combine(lines)
    _dress(native, chart)
    place = chart.place
    native.set_size({
        "width": int((place.last_column - place.first_column + 1) * COLUMN_PIXELS) - 8, "height": chart.height,
    })
    sheet.insert_chart(place.first_row - 1, place.first_column - 1, native, {
        "object_position": 1, "description": chart.description, "x_offset": 2, "y_offset": 2,
    })


def _series(title: str, series: Series, kind: str) -> dict[str, Any]:
    options: dict[str, Any] = {
        "name": _cells(title, series.name)[:3],
        "categories": _cells(title, series.x), "values": _cells(title, series.y),
        **_look(series.look, kind),
    }
    if series.labels:
        # Written out: hosts disagree about what the category of a scattered point is.
        options["data_labels"] = {
            "value": True, "position": "above" if kind == "scatter" else "outside_end",
            "font": {"name": looks.FONT, "size": 8, "color": looks.INK},
            "custom": [{"value": label} if label else {"delete": True} for label in series.labels],
        }
    return options


def _cells(title: str, area: Area) -> list[str | int]:
    """An area as a list: as a text, a sheet's name that holds an exclamation mark would be cut at it."""
    return [title, area.first_row - 1, area.first_column - 1, area.last_row - 1, area.last_column - 1]


def _as_text(text: str) -> str:
    """A title that cannot be taken for a reference: a text like "x!A1 ..." would be made a formula."""
    return _LIKE_REFERENCE.sub(r"\1! ", text)


def _look(look: str, kind: str) -> dict[str, Any]:
    if look in ("columns", "flagged columns"):
        colour = looks.SMOOTH if look.startswith("flagged") else looks.POINTS
        gap = 150 if kind == "bars" else 60
        return {"fill": {"color": colour}, "border": {"none": True}, "gap": gap, "overlap": 100}
    if look in ("points", "many points"):
        return {"marker": _marker("circle", 5 if look == "points" else 3, looks.POINTS, 30), "line": {"none": True}}
    if look == "flagged":
        return {"marker": _marker("diamond", 8, looks.SMOOTH, 0), "line": {"none": True}}
    if look == "joined points":
        return {"marker": _marker("circle", 4, looks.POINTS, 0), "line": {"color": looks.POINTS, "width": 0.75}}
    return {"marker": {"type": "none"}, "line": dict(_LINES[look])}


def _marker(shape: str, size: int, colour: str, transparency: int) -> dict[str, Any]:
    return {
        "type": shape, "size": size, "border": {"color": "#FFFFFF", "width": 0.5},
        "fill": {"color": colour, "transparency": transparency},
    }


def _dress(native: NativeChart, chart: Chart) -> None:
    native.set_title({
        "name": _as_text(chart.title), "overlay": False,
        "name_font": {"name": looks.FONT, "size": 10, "bold": True, "color": looks.INK},
    })
    # With bars the names run down the side: the axis of names is the vertical one.
    across, upright = (chart.y, chart.x) if chart.kind == "bars" else (chart.x, chart.y)
    native.set_x_axis(_axis(across, gridlines=chart.kind == "bars"))
    native.set_y_axis(_axis(upright, gridlines=chart.kind != "bars"))
    if len(chart.series) > 1:
        # Two limits of one kind are one thing to a reader, and get one entry.
        limits = [place for place, series in enumerate(chart.series) if series.look == "limit"]
        native.set_legend({"position": "bottom", "font": dict(_SMALL), "delete_series": limits[1:]})
    else:
        native.set_legend({"none": True})
    native.set_chartarea({"border": {"color": looks.HAIRLINE}, "fill": {"color": "#FFFFFF"}})
    native.set_plotarea({"fill": {"none": True}, "layout": _plot_place(chart)})
    native.show_blanks_as("gap")


def _plot_place(chart: Chart) -> dict[str, float]:
    """The plot's place in shares of the chart: without one, programs leave half of a low chart to its texts."""
    left = 0.2 if chart.kind == "bars" else 0.1
    height = 0.54 if len(chart.series) > 1 else 0.62
    return {"x": left, "y": 0.15, "width": 0.96 - left, "height": height}


def _axis(axis: Axis, *, gridlines: bool) -> dict[str, Any]:
    options: dict[str, Any] = {
        "name": _as_text(axis.title), "name_font": dict(_SMALL), "num_font": dict(_SMALL), "label_position": "low",
        "num_format": axis.number_format, "line": {"color": looks.HAIRLINE},
        "major_gridlines": {"visible": gridlines, "line": {"color": looks.HAIRLINE, "width": 0.5}},
        "major_tick_mark": "none", "minor_tick_mark": "none",
    }
    for key, value in (("min", axis.low), ("max", axis.high), ("major_unit", axis.step)):
        if value is not None:
            options[key] = value
    if axis.text:
        options["text_axis"] = True
    if axis.every_label:
        options["interval_unit"] = 1
    return options
