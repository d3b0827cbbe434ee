"""Rows that play no part."""

from __future__ import annotations

from collections.abc import Iterator

from hubdesign.checks.findings import nearest, some
from hubdesign.checks.places import Case
from hubdesign.errors import Fault
from hubdesign.network import Network, modes_in_force


def suspect_zero_volumes(case: Case, network: Network) -> Iterator[Fault]:
    """O-D rows without volume."""
    rows = [i for i, row in enumerate(case.problem.demands) if row.volume == 0]
    if rows:
        count = "1 row has" if len(rows) == 1 else f"{len(rows):,} rows have"
        places = some((case.where("demand", i) for i in rows), 3)
        what = f"{count} a volume of 0 and no part in the design ({places})"
        yield from case.table("demand", what)


def suspect_idle_stations(case: Case, network: Network) -> Iterator[Fault]:
    """Stations with neither demand nor a chance to be a hub."""
    some_volume = network.demand.volume > 0
    busy = set(network.demand.origin[some_volume].tolist()) | set(
        network.demand.destination[some_volume].tolist()
    )
    served = set(network.link.tail.tolist()) | set(network.link.head.tolist())
    must = {code for row in case.problem.links if row.decision == "must" for code in (row.from_, row.to)}
    for i, row in enumerate(case.problem.stations):
        if i in busy or row.station in must or (row.may_be_hub and i in served):
            continue
        what = "has no demand and " + (
            "no link" if row.may_be_hub else "may not be a hub: it has no part in the design"
        )
        yield from case.row("stations", i, "station", what)


def suspect_idle_vehicles(case: Case, network: Network) -> Iterator[Fault]:
    """Vehicle types that can serve no candidate link."""
    serving = set(network.service.vehicle.tolist())
    for i, row in enumerate(case.problem.vehicles):
        if row.available == 0:
            yield from case.row("fleet", i, "available", "0: the type has no part in the design")
        elif i not in serving:
            welcome = [s for s in case.problem.stations if s.modes is None or row.mode in s.modes]
            why = (
                f"fewer than two stations have its mode {row.mode}"
                if len(welcome) < 2
                else "check mode and range_km"
            )
            yield from case.row("fleet", i, "vehicle", "can serve no link that may be operated", why)


def suspect_idle_links(case: Case, network: Network) -> Iterator[Fault]:
    """Rows of links.csv that cannot be operated though they may."""
    codes, modes = [row.station for row in case.problem.stations], network.modes
    candidates = {
        (frozenset((codes[tail], codes[head])), modes[mode])
        for tail, head, mode in zip(
            network.link.tail.tolist(), network.link.head.tolist(), network.link.mode.tolist()
        )
    }
    for i, row in enumerate(case.problem.links):
        if row.decision != "never" and (frozenset((row.from_, row.to)), row.mode) not in candidates:
            cure = "check its mode, the modes of its stations, the ranges and types"
            yield from case.row(
                "links", i, "from", "cannot be operated by any vehicle: the row has no part", cure
            )


def suspect_unknown_modes(case: Case, network: Network) -> Iterator[Fault]:
    """Modes of a station that nothing else knows."""
    modes = modes_in_force(case.problem)
    for i, row in enumerate(case.problem.stations):
        for mode in row.modes or ():
            if mode not in modes:
                what = f"no vehicle type has the mode {mode}"
                yield from case.row("stations", i, "modes", what, nearest(mode, modes))


def suspect_idle_today(case: Case, network: Network) -> Iterator[Fault]:
    """Rows of current.csv without departures."""
    for i, row in enumerate(case.problem.current):
        if row.frequency == 0:
            yield from case.row(
                "current", i, "frequency", "0: the link is not operated today", "remove the row"
            )


SUSPICIONS = (
    suspect_zero_volumes,
    suspect_idle_stations,
    suspect_idle_vehicles,
    suspect_idle_links,
    suspect_unknown_modes,
    suspect_idle_today,
)
