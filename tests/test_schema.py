"""The one table of columns and settings agrees with the records and with the reference."""

from __future__ import annotations

import dataclasses
from typing import Any

import pytest

from hubdesign.inputs.records import field_names
from hubdesign.inputs.reference import reference_markdown
from hubdesign.problem import CurrentLink, Demand, ListedLink, Settings, Station, Vehicle
from hubdesign.schema import MODE_SETTINGS, SETTINGS, TABLES

RECORDS: dict[str, type[Any]] = {
    "stations": Station,
    "demand": Demand,
    "fleet": Vehicle,
    "links": ListedLink,
    "current": CurrentLink,
}


@pytest.mark.parametrize("table", list(TABLES))
def test_columns_are_the_fields_of_the_record(table: str) -> None:
    assert {column.name for column in TABLES[table].columns} == set(field_names(RECORDS[table]))


@pytest.mark.parametrize("table", list(TABLES))
def test_defaults_of_columns_are_those_of_the_record(table: str) -> None:
    fields = dict(zip(field_names(RECORDS[table]), dataclasses.fields(RECORDS[table])))
    for column in TABLES[table].columns:
        field = fields[column.name]
        assert column.required == (field.default is dataclasses.MISSING), column.name
        if not column.required and column.name != "name":  # a blank name is the code
            assert field.default == column.default, column.name


def test_settings_are_the_fields_of_the_record_with_their_defaults() -> None:
    defaults = dataclasses.asdict(Settings())
    del defaults["mode_distance_factor"]
    assert {setting.name: setting.default for setting in SETTINGS} == defaults


def test_names_of_settings_are_one_of_a_kind() -> None:
    names = [setting.name for setting in (*SETTINGS, *MODE_SETTINGS)]
    assert len(names) == len(set(names))


def test_every_figure_has_a_range_and_every_entry_a_meaning() -> None:
    for spec in (
        *SETTINGS,
        *MODE_SETTINGS,
        *(column for table in TABLES.values() for column in table.columns),
    ):
        assert spec.meaning
        if spec.kind in ("number", "integer"):
            assert spec.low is not None, spec.name
        if spec.kind == "number":
            assert spec.unit, spec.name
        assert (spec.kind == "choice") == bool(spec.choices)


def test_the_reference_names_every_column_and_setting_with_unit_and_default() -> None:
    lines = reference_markdown().splitlines()
    for spec in (
        *SETTINGS,
        *MODE_SETTINGS,
        *(column for table in TABLES.values() for column in table.columns),
    ):
        assert any(line.startswith(f"| `{spec.name}` | {spec.meaning} | {spec.unit} |") for line in lines), (
            spec.name
        )
    assert all(line.count("|") == 6 for line in lines if line.startswith("|"))
