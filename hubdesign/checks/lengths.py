"""Where a length is needed, and whether it can be known: from coordinates or from links.csv."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from hubdesign.checks.findings import some
from hubdesign.checks.places import Case
from hubdesign.distances import distances_km
from hubdesign.errors import Fault
from hubdesign.network import modes_in_force
from hubdesign.problem import ListedLink, Problem, Station

Pair = frozenset[str]


def link_km(problem: Problem, row: ListedLink) -> float | None:
    """Return the length of a listed link, km: its own, else computed; None where coordinates are blank."""
    if row.distance_km is not None:
        return row.distance_km
    straight = straight_km(problem, row.from_, row.to)
    if straight is None:
        return None
    settings = problem.settings
    factor = dict(settings.mode_distance_factor).get(row.mode, 1.0)
    return straight * factor * (1.0 + settings.uplift_percent / 100.0)


def straight_km(problem: Problem, from_: str, to: str) -> float | None:
    """Return the distance between two stations, km, without uplift; None where coordinates are blank."""
    ends = [station for code in (from_, to) for station in problem.stations if station.station == code][:2]
    if len(ends) < 2 or any(end.lat is None or end.lon is None for end in ends):
        return None
    lat1, lon1, lat2, lon2 = (
        np.array([value], dtype=np.float64) for end in ends for value in (end.lat, end.lon)
    )
    return float(distances_km(problem.settings.method, lat1, lon1, lat2, lon2)[0])


def check_lengths_known(case: Case) -> Iterator[Fault]:
    """A station without coordinates needs every length that is used in links.csv."""
    problem = case.problem
    blank = {row.station for row in problem.stations if row.lat is None and row.lon is None}
    if not blank or "links" in case.places.unread or not case.sure("links", "distance_km mode"):
        return
    needs = _links_needed(problem, blank)
    for code, others in _demand_needed(problem, blank).items():
        needs[code].update(others)
    for i, row in enumerate(problem.stations):
        others = needs.get(row.station, {})
        if not others:
            continue
        count = "length" if len(others) == 1 else "lengths"
        what = f"blank, and the {count} to {some(others)} {'is' if len(others) == 1 else 'are'} needed"
        if problem.settings.fill_coordinates:
            what += f" ({row.station} is no IATA code of the airport table)"
        cure = 'give lat and lon, or distance_km in the links table (and links = "listed" for no other pairs)'
        yield from case.row("stations", i, "lat lon", what, cure)


def _links_needed(problem: Problem, blank: set[str]) -> dict[str, dict[str, None]]:
    """Return blank station -> stations to which a candidate link's length is needed."""
    needs: dict[str, dict[str, None]] = {code: {} for code in blank}
    modes = modes_in_force(problem)
    stations = {row.station: row for row in problem.stations}
    listed: set[tuple[Pair, str]] = set()

    def need(one: str, other: str) -> None:
        for code, partner in ((one, other), (other, one)):
            if code in blank:
                needs[code][partner] = None

    for link in problem.links:
        listed.add((frozenset((link.from_, link.to)), link.mode))
        ends = [stations[code] for code in (link.from_, link.to) if code in stations]
        used = link.decision != "never" and link.distance_km is None and len(ends) == 2
        if used and link.mode in modes and all(_serves(end, link.mode) for end in ends):
            need(link.from_, link.to)
    for today in problem.current:
        pair = frozenset((today.from_, today.to))
        if not any(frozenset((x.from_, x.to)) == pair and x.distance_km is not None for x in problem.links):
            need(today.from_, today.to)
    if problem.settings.links == "listed" and problem.links:
        return needs
    for mode in modes:
        served = [row.station for row in problem.stations if _serves(row, mode)]
        for code in served:
            if code in blank:
                for other in served:
                    if other != code and (frozenset((code, other)), mode) not in listed:
                        need(code, other)
    return needs


def _serves(station: Station, mode: str) -> bool:
    return station.modes is None or mode in station.modes


def _demand_needed(problem: Problem, blank: set[str]) -> dict[str, dict[str, None]]:
    """Return blank station -> stations to which an O-D distance is needed."""
    settings = problem.settings
    needs: dict[str, dict[str, None]] = {code: {} for code in blank}
    if settings.max_circuity is None and settings.revenue_per_km == 0:
        return needs
    known = {frozenset((row.from_, row.to)) for row in problem.links if row.distance_km is not None}
    for row in problem.demands:
        by_distance = settings.revenue_per_km > 0 and row.revenue is None
        if row.origin == row.destination or not (by_distance or settings.max_circuity is not None):
            continue
        if frozenset((row.origin, row.destination)) not in known:
            for code, other in ((row.origin, row.destination), (row.destination, row.origin)):
                if code in blank:
                    needs[code][other] = None
    return needs


CHECKS = (check_lengths_known,)
