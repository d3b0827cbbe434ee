"""Where a record came from, and how a rule says so."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

from hubdesign.errors import Fault
from hubdesign.problem import CurrentLink, Demand, ListedLink, Problem, Station, Vehicle
from hubdesign.schema import SETTINGS

#: A row number, and the column where a matrix cell gave the record.
Place = tuple[int, str]

_SECTION = {setting.name: setting.section for setting in SETTINGS}


@dataclass(frozen=True)
class Places:
    """Where each record of a Problem stands in the files.

    Attributes
    ----------
    labels
        Table -> ``stations.csv`` or ``sheet stations``.
    rows
        Table -> place of each record, in the order of the Problem; empty for a Problem made in Python.
    bad
        (table, index, column) of cells already at fault: rules keep silent on them.
    stray
        Table -> texts of rows already at fault: references to them are not reported again.
    unread
        Tables that could not be read (whole): references into them are not judged.
    given
        Names of settings that were written rather than left to their default.
    setting_lines
        Setting -> ``line 5,`` of the file or ``row 5,`` of the sheet.
    """

    labels: Mapping[str, str] = field(default_factory=dict)
    rows: Mapping[str, Sequence[Place]] = field(default_factory=dict)
    bad: frozenset[tuple[str, int, str]] = frozenset()
    stray: Mapping[str, frozenset[str]] = field(default_factory=dict)
    unread: frozenset[str] = frozenset()
    given: frozenset[str] = frozenset()
    setting_lines: Mapping[str, str] = field(default_factory=dict)

    def label(self, table: str) -> str:
        """Return how people find a table."""
        return self.labels.get(table, table)

    def at(self, table: str, index: int, column: str = "", who: str = "") -> str:
        """Return ``stations.csv row 7, lat (station KLO)``."""
        text = self.label(table)
        places = self.rows.get(table, ())
        if index < len(places):
            row, matrix_column = places[index]
            text += f" row {row}"
            column = f"column {matrix_column}" if matrix_column else column
        if column:
            text += f", {column}"
        return f"{text} ({who})" if who else text

    def setting(self, name: str) -> str:
        """Return ``settings.toml line 5, [network] hubs``; without the line where it has its default."""
        start = f"{self.label('settings')} {self.setting_lines.get(name, '')}".rstrip()
        return f"{start} [{_SECTION[name]}] {name}"


def who_is(record: Station | Demand | Vehicle | ListedLink | CurrentLink) -> str:
    """Return the words that tell a record from the others of its table."""
    if isinstance(record, Station):
        return f"station {record.station}"
    if isinstance(record, Demand):
        return f"{record.origin}-{record.destination}"
    if isinstance(record, Vehicle):
        return f"vehicle {record.vehicle}"
    if isinstance(record, ListedLink):
        return f"{record.from_}-{record.to} {record.mode}"
    return f"{record.from_}-{record.to}" + (f" {record.vehicle}" if record.vehicle else "")


@dataclass(frozen=True)
class Case:
    """A Problem with its places: what a rule looks at."""

    problem: Problem
    places: Places

    def records(self, table: str) -> Sequence[Station | Demand | Vehicle | ListedLink | CurrentLink]:
        """Return the records of a table."""
        problem = self.problem
        tables: dict[str, Sequence[Station | Demand | Vehicle | ListedLink | CurrentLink]] = {
            "stations": problem.stations,
            "demand": problem.demands,
            "fleet": problem.vehicles,
            "links": problem.links,
            "current": problem.current,
        }
        return tables[table]

    def row(self, table: str, index: int, columns: str, what: str, cure: str = "") -> tuple[Fault, ...]:
        """Return the fault of a row, none where one of its blank-separated `columns` is at fault already."""
        names = columns.split()
        if any((table, index, name) in self.places.bad for name in names):
            return ()
        who = who_is(self.records(table)[index])
        return (Fault(self.places.at(table, index, names[0] if names else "", who), what, cure),)

    def setting(self, names: str, what: str, cure: str = "") -> tuple[Fault, ...]:
        """Return the fault of one or more settings, none where one of them is already at fault."""
        listed = names.split()
        if any(("settings", 0, name) in self.places.bad for name in listed):
            return ()
        return (Fault(self.places.setting(listed[0]), what, cure),)

    def table(self, table: str, what: str, cure: str = "") -> tuple[Fault, ...]:
        """Return a fault of a table as a whole."""
        return (Fault(self.places.label(table), what, cure),)

    @cached_property
    def station_codes(self) -> frozenset[str]:
        """The codes of the stations table."""
        return frozenset(row.station for row in self.problem.stations)

    @cached_property
    def vehicle_codes(self) -> frozenset[str]:
        """The codes of the fleet table."""
        return frozenset(row.vehicle for row in self.problem.vehicles)

    @cached_property
    def suggestions(self) -> dict[tuple[str, str], str]:
        """Cures already looked up, (table, code) -> words: likeness is slow to measure."""
        return {}

    @property
    def no_fleet(self) -> bool:
        """Whether there is no fleet at all; a fleet table that is at fault counts as one."""
        return not self.problem.vehicles and "fleet" not in self.places.labels

    def sure(self, table: str, columns: str = "") -> bool:
        """Return whether a table was read whole, and these columns of it without a fault."""
        if table in self.places.unread or self.places.stray.get(table):
            return False
        names = columns.split()
        return not any(bad[0] == table and bad[2] in names for bad in self.places.bad)

    def where(self, table: str, index: int) -> str:
        """Return ``row 7`` for naming another row in a sentence."""
        places = self.places.rows.get(table, ())
        return f"row {places[index][0]}" if index < len(places) else f"entry {index + 1}"
