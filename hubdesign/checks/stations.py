"""Rules of the stations table."""

from __future__ import annotations

from collections.abc import Iterator

from hubdesign.checks.places import Case
from hubdesign.errors import Fault


def check_station_codes_unique(case: Case) -> Iterator[Fault]:
    """A station stands once."""
    first: dict[str, int] = {}
    for i, row in enumerate(case.problem.stations):
        if row.station in first:
            what = f"{row.station} repeats {case.where('stations', first[row.station])}"
            yield from case.row("stations", i, "station", what, "keep one, or give it another code")
        else:
            first[row.station] = i


def check_two_stations(case: Case) -> Iterator[Fault]:
    """A network needs two stations."""
    if len({row.station for row in case.problem.stations}) == 1 and case.sure("stations"):
        yield from case.table("stations", "holds one station", "a network needs two at least")


def check_coordinates_paired(case: Case) -> Iterator[Fault]:
    """lat and lon are given together or not at all."""
    for i, row in enumerate(case.problem.stations):
        if (row.lat is None) != (row.lon is None):
            given, blank = ("lat", "lon") if row.lon is None else ("lon", "lat")
            what = f"blank while {given} = {getattr(row, given):g}"
            yield from case.row("stations", i, f"{blank} {given}", what, "give both, or neither")


def check_departure_limits(case: Case) -> Iterator[Fault]:
    """min_departures is at most max_departures; both need a fleet."""
    for i, row in enumerate(case.problem.stations):
        for name in ("min_departures", "max_departures"):
            value = getattr(row, name)
            if value is not None and case.no_fleet:
                what = f"{value:g} needs a fleet, and there is no fleet table"
                yield from case.row("stations", i, name, what, "add the fleet table, or clear the cell")
        if row.min_departures is None or row.max_departures is None or case.no_fleet:
            continue
        if row.min_departures > row.max_departures:
            what = f"{row.min_departures:g} is above max_departures = {row.max_departures:g}"
            yield from case.row("stations", i, "min_departures max_departures", what, "lower it")


def check_must_links_fit(case: Case) -> Iterator[Fault]:
    """No more links must be operated at a station than max_links allows."""
    must: dict[str, int] = {}
    for link in case.problem.links:
        if link.decision == "must":
            for end in (link.from_, link.to):
                must[end] = must.get(end, 0) + 1
    for i, row in enumerate(case.problem.stations):
        count = must.get(row.station, 0)
        if row.max_links is not None and count > row.max_links:
            what = f"at most {row.max_links} open here, but {count} links must be operated"
            yield from case.row("stations", i, "max_links", what, "raise it, or decide fewer links as must")


CHECKS = (
    check_station_codes_unique,
    check_two_stations,
    check_coordinates_paired,
    check_departure_limits,
    check_must_links_fit,
)
