"""Settings that stand in cells: unchanged cells mean the recorded setting, changed ones what they say."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.errors import ArgumentError
from sheetfuncs.report.entries import ENTRY_FIELDS, changed_entries, settings_from_entries, shown_entries

SETTINGS = {
    "response": "Work time (h)", "predictors": ["Area", "Site", "Start"], "intercept": True, "order": None,
    "level": 0.95, "date_predictors": ["Start"], "base_levels": {}, "book": "b.xlsx", "sheet": "Orders",
    "area": "A1:D9",
}
SHOWN = shown_entries(SETTINGS, [("Site", "north")])
OTHER = {"level": {"level": 0.8}}  # so that 0.95 is a change
RECORDED = SETTINGS | {"shown": SHOWN, "fingerprint": "ab12"}


def test_every_field_is_shown_in_the_order_of_its_cell() -> None:
    assert tuple(SHOWN) == ENTRY_FIELDS
    assert SHOWN["predictors"] == "Area; Site; Start"
    assert SHOWN["base_levels"] == "Site = north"


def test_unchanged_cells_give_the_recorded_settings() -> None:
    found = settings_from_entries(RECORDED, SHOWN)
    assert found == SETTINGS  # base levels too: the first level stays the base by rule, not by name
    assert changed_entries(RECORDED, found) == []
    assert settings_from_entries(RECORDED, {}) == SETTINGS
    assert settings_from_entries(SETTINGS, SHOWN) == SETTINGS  # a sheet of an earlier version, which had no such cells


@pytest.mark.parametrize(("field", "entry", "setting"), [
    ("response", " Area ", "Area"),
    ("response", None, None),
    ("predictors", "Area", ["Area"]),
    ("predictors", "C; E ;", ["C", "E"]),
    ("predictors", "Area, Site", ["Area", "Site"]),
    ("predictors", "Weight, dry; Site", ["Weight, dry", "Site"]),
    ("predictors", "Weight, dry;", ["Weight, dry"]),
    ("predictors", None, []),
    ("date_predictors", None, []),
    ("base_levels", "Site = south; Kind=b", {"Site": "south", "Kind": "b"}),
    ("base_levels", "x = y = south", {"x = y": "south"}),
    ("intercept", "No", False),
    ("intercept", False, False),
    ("intercept", 0.0, False),
    ("intercept", None, True),
    ("order", "Day", "Day"),
    ("level", 0.9, 0.9),
    ("level", 90.0, 0.9),
    ("level", "99 %", 0.99),
    ("level", "97,5%", 0.975),
    ("level", "90%%", 0.9),  # a program that adds the sign to what was typed with one
    ("level", None, 0.95),
])
def test_a_changed_cell_changes_its_setting_alone(field: str, entry: object, setting: object) -> None:
    recorded = RECORDED | OTHER.get(field, {})
    recorded["shown"] = shown_entries(recorded, [("Site", "north")])
    found = settings_from_entries(recorded, recorded["shown"] | {field: entry})
    assert found.pop(field) == setting
    assert found == {name: recorded[name] for name in found}
    assert len(found) == len(SETTINGS) - 1


@pytest.mark.parametrize(("field", "entry", "sentence"), [
    ("intercept", "perhaps", "Under Settings, Intercept says “perhaps”: write yes or no."),
    ("level", "high", "Under Settings, Interval level says “high”: write a level between 50 % and 99.99 %."),
    ("level", 0.2, "Under Settings, Interval level says “0.2”: write a level between 50 % and 99.99 %."),
    ("level", float("inf"), "Under Settings, Interval level says “inf”: write a level between 50 % and 99.99 %."),
    ("base_levels", "north", "Under Settings, Base levels says “north”: write the category, = and the level, such as "
                             "Site = north."),
])
def test_an_entry_that_is_not_understood_is_refused_in_a_sentence(field: str, entry: object, sentence: str) -> None:
    with pytest.raises(ArgumentError) as refused:
        settings_from_entries(RECORDED, SHOWN | {field: entry})
    assert str(refused.value) == sentence


@given(st.lists(st.text(st.characters(categories=["L", "N"]), min_size=1), min_size=1, max_size=6),
       st.floats(0.5, 0.9999), st.booleans())
def test_what_is_shown_is_read_back(names: list[str], level: float, intercept: bool) -> None:
    settings = SETTINGS | {"predictors": names, "level": level, "intercept": intercept}
    other = {"predictors": "other", "level": 0.51, "intercept": "no" if intercept else "yes"}
    found = settings_from_entries(settings | {"shown": SHOWN | other}, shown_entries(settings))
    assert (found["predictors"], found["intercept"]) == (names, intercept)
    assert found["level"] == pytest.approx(level, rel=1e-12) or level == pytest.approx(0.51)
