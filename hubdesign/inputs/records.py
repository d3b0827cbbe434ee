"""Values by column -> the frozen records of a Problem."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from typing import Any

from hubdesign.checks.places import Places
from hubdesign.inputs.settings import ReadSettings
from hubdesign.inputs.tables import ReadTable
from hubdesign.problem import CurrentLink, Demand, ListedLink, Problem, Settings, Station, Vehicle

#: Columns whose names are words of the language.
_RENAMED = {"from": "from_"}


def build_problem(tables: Mapping[str, ReadTable], settings: ReadSettings) -> tuple[Problem, Places]:
    """Return the Problem and where its records stand; tables that are absent are empty."""

    def records(name: str) -> list[dict[str, Any]]:
        if name not in tables:
            return []
        return [{_RENAMED.get(key, key): value for key, value in row.items()} for row in tables[name].records]

    problem = Problem(
        stations=tuple(_station(row) for row in records("stations")),
        demands=tuple(Demand(**row) for row in records("demand")),
        vehicles=tuple(Vehicle(**row) for row in records("fleet")),
        links=tuple(ListedLink(**row) for row in records("links")),
        current=tuple(CurrentLink(**row) for row in records("current")),
        settings=Settings(**settings.values, mode_distance_factor=tuple(settings.modes.items())),
    )
    return problem, _places(tables, settings)


def _station(row: dict[str, Any]) -> Station:
    row = {**row, "name": row.get("name") or row["station"]}
    row["may_be_hub"] = row["may_be_hub"] or row["must_be_hub"]
    return Station(**row)


def _places(tables: Mapping[str, ReadTable], settings: ReadSettings) -> Places:
    bad = {(name, index, column) for name, table in tables.items() for index, column in table.bad}
    bad |= {("settings", 0, name) for name in settings.bad}
    return Places(
        labels={"settings": settings.label, **{name: table.label for name, table in tables.items()}},
        rows={name: table.places for name, table in tables.items()},
        bad=frozenset(bad),
        stray={name: frozenset(table.stray) for name, table in tables.items()},
        unread=frozenset(name for name, table in tables.items() if not table.whole)
        | ({"stations", "demand"} - set(tables)),
        given=frozenset(settings.values),
        setting_lines=dict(settings.lines),
    )


def field_names(record: type[Any]) -> tuple[str, ...]:
    """Return a record's fields as the columns are called."""
    back = {value: key for key, value in _RENAMED.items()}
    return tuple(back.get(field.name, field.name) for field in dataclasses.fields(record))
