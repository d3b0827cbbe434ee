"""Figures and structures that can be meant, but rarely are."""

from __future__ import annotations

from collections.abc import Iterator

from hubdesign.checks.findings import some
from hubdesign.checks.places import Case
from hubdesign.errors import Fault
from hubdesign.network import Network

#: Slower or faster block speeds than these are rare (common practice), km/h by mode.
USUAL_SPEEDS_KMH = {"air": (120.0, 1100.0), "road": (15.0, 130.0)}

#: Hours of the periods whose names are known.
HOURS_OF = {"day": 24.0, "night": 24.0, "week": 168.0, "month": 744.0, "year": 8784.0}

#: From this many O-D rows on it is odd that none has a way back.
_ROWS_FOR_DIRECTIONS = 10


def suspect_speeds(case: Case, network: Network) -> Iterator[Fault]:
    """Knots or miles an hour pass for km/h easily."""
    for i, row in enumerate(case.problem.vehicles):
        low, high = USUAL_SPEEDS_KMH.get(row.mode, (0.0, float("inf")))
        if not low <= row.speed_kmh <= high:
            what = f"{row.speed_kmh:g} km/h is rare for {row.mode} ({low:g} to {high:g} is usual)"
            yield from case.row("fleet", i, "speed_kmh", what, "check the figure and its unit")


def suspect_vehicle_hours(case: Case, network: Network) -> Iterator[Fault]:
    """A vehicle has no more hours than the period, and needs enough for one departure."""
    period = case.problem.settings.period.strip().lower()
    most = HOURS_OF.get(period)
    for i, row in enumerate(case.problem.vehicles):
        hours = row.hours_per_vehicle
        if hours is None:
            continue
        if most is not None and hours > most:
            what = f"{hours:g} hours are more than a {period} has ({most:g})"
            yield from case.row("fleet", i, "hours_per_vehicle", what, "give the hours of one vehicle")
        needed = network.service.vehicle_h[network.service.vehicle == i]
        if len(needed) and hours < needed.min():
            what = f"{hours:g} hours are less than its shortest departure takes ({needed.min():.3g} h)"
            yield from case.row(
                "fleet", i, "hours_per_vehicle", what, "check the hours, the speed and the turn"
            )


def suspect_one_direction(case: Case, network: Network) -> Iterator[Fault]:
    """Demand is read one row per direction; volumes both ways in one row lose half of the work."""
    pairs = {(row.origin, row.destination) for row in case.problem.demands if row.origin != row.destination}
    if len(pairs) >= _ROWS_FOR_DIRECTIONS and not any((d, o) in pairs for o, d in pairs):
        what = f"none of {len(pairs):,} O-D pairs has its way back"
        yield from case.table("demand", what, "each row is one direction; add the others if they travel too")


def suspect_no_candidates(case: Case, network: Network) -> Iterator[Fault]:
    """Without hub candidates a mixed design is point-to-point."""
    problem = case.problem
    if problem.settings.structure != "mixed" or any(row.may_be_hub for row in problem.stations):
        return
    given = [row.station for row in problem.stations if row.hub_fixed_cost or row.hub_capacity is not None]
    what = "no station may be a hub (may_be_hub), so that nobody transfers: mixed is point-to-point then"
    if given:
        what += f"; yet hub columns are filled ({some(given, 3)})"
    yield from case.table("stations", what)


def suspect_no_way_back(case: Case, network: Network) -> Iterator[Fault]:
    """A type departs as often as it arrives at each station: a one-way link needs a way back."""
    if case.problem.settings.structure == "current" or not case.problem.has_fleet:
        return
    link, service = network.link, network.service
    one_way = [e for e in range(network.link_count) if not link.both[e]]
    codes = [row.station for row in case.problem.stations]
    for e in one_way:
        types = service.vehicle[service.link == e].tolist()
        if any(_reaches(network, int(link.head[e]), int(link.tail[e]), v) for v in types):
            continue
        ends = (codes[int(link.tail[e])], codes[int(link.head[e])])
        for i, row in enumerate(case.problem.links):
            if (row.from_, row.to) == ends and row.mode == network.modes[int(link.mode[e])]:
                what = "one-way, and no vehicle type that serves it has a way back: it cannot be operated"
                yield from case.row("links", i, "direction", what, "list its way back, or remove it")


def _reaches(network: Network, start: int, goal: int, vehicle: int) -> bool:
    """Return whether legs of links that a type serves lead from `start` to `goal`."""
    service = network.service
    served = set(service.link[service.vehicle == vehicle].tolist())
    seen, front = {start}, [start]
    while front:
        at = front.pop()
        if at == goal:
            return True
        for leg in network.legs_from[at]:
            head = int(network.leg.head[leg])
            if int(network.leg.link[leg]) in served and head not in seen:
                seen.add(head)
                front.append(head)
    return False


SUSPICIONS = (
    suspect_speeds,
    suspect_vehicle_hours,
    suspect_one_direction,
    suspect_no_candidates,
    suspect_no_way_back,
)
