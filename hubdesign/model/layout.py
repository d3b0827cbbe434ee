"""The model under one roof: the network, the flow columns, the arrays, and how to read a solution."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from hubdesign.answer import Flow
from hubdesign.model.flows import FlowColumns
from hubdesign.model.program import Family, Program
from hubdesign.network import Network

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Shares below this are no flow.
SHARE_FLOOR = 1e-9


@dataclass(frozen=True)
class Model:
    """Families of `program.columns`: hub, link, allocation, frequency, vehicles, purchases, unserved, flow.

    Expressions of `program`: ``cost`` and ``revenue`` (money), ``unserved`` (volume), ``investment`` (money),
    ``co2`` (kg). hub, link, unserved, flow and frequency follow the order of stations, links, demands, flow
    columns and services; vehicles and purchases that of the types, allocation that of :attr:`pairs`.
    """

    network: Network
    flows: FlowColumns
    program: Program

    def family(self, name: str) -> Family:
        """Return a family of columns."""
        return self.program.columns[name]

    @cached_property
    def pairs(self) -> tuple[Ints, Ints]:
        """Station and hub of each allocation variable (station != hub)."""
        n = self.network.station_count
        may = self.network.station.may_be_hub
        station, hub = np.nonzero(np.broadcast_to(may, (n, n)) & ~np.eye(n, dtype=bool))
        return station.astype(np.int64), hub.astype(np.int64)

    def station_label(self, station: int) -> str:
        """Return the code of a station."""
        return self.network.problem.stations[station].station

    def link_label(self, link: int) -> str:
        """Return ``A-B:mode`` (``A>B:mode`` where one-way) of a link."""
        data = self.network.link
        joint = "-" if data.both[link] else ">"
        ends = f"{self.station_label(int(data.tail[link]))}{joint}{self.station_label(int(data.head[link]))}"
        return f"{ends}:{self.network.modes[int(data.mode[link])]}"

    def leg_label(self, leg: int) -> str:
        """Return ``A>B:mode`` of a leg."""
        data = self.network.leg
        ends = f"{self.station_label(int(data.tail[leg]))}>{self.station_label(int(data.head[leg]))}"
        return f"{ends}:{self.network.modes[int(self.network.link.mode[data.link[leg]])]}"

    def demand_label(self, demand: int) -> str:
        """Return ``A>B`` of an O-D demand."""
        row = self.network.problem.demands[demand]
        return f"{row.origin}>{row.destination}"

    def service_label(self, service: int) -> str:
        """Return ``A-B:mode:type`` of a service."""
        data = self.network.service
        vehicle = self.network.problem.vehicles[int(data.vehicle[service])].vehicle
        return f"{self.link_label(int(data.link[service]))}:{vehicle}"

    def flow_label(self, column: int) -> str:
        """Return ``demand:legs:roles`` of a flow column."""
        legs = self.legs_of_column[column]
        roles = f"{self.flows.origin_role[column]},{self.flows.destination_role[column]}"
        way = "+".join(self.leg_label(leg) for leg in legs) or "stays"
        return f"{self.demand_label(int(self.flows.demand[column]))}:{way}:{roles}"

    @cached_property
    def legs_of_column(self) -> list[tuple[int, ...]]:
        """Legs of each flow column, in order of travel."""
        legs: list[list[int]] = [[] for _ in range(len(self.flows))]
        for column, leg in zip(self.flows.on_leg.column.tolist(), self.flows.on_leg.item.tolist()):
            legs[column].append(leg)
        return [tuple(entry) for entry in legs]

    def read_flows(self, values: Floats) -> tuple[Flow, ...]:
        """Return the itineraries of a solution: paths as they are, leg flows decomposed into simple paths.

        Shares of a demand (with what is unserved) are scaled to sum to 1 exactly; what is below the floor
        is no flow.
        """
        share = np.clip(values[self.family("flow").members], 0.0, 1.0)
        unserved = np.clip(values[self.family("unserved").members], 0.0, 1.0)
        found: dict[int, dict[tuple[int, ...], float]] = {}
        by_leg: dict[int, dict[int, float]] = {}
        is_path = self.flows.of_itinerary >= 0
        for column in np.flatnonzero(share > SHARE_FLOOR).tolist():
            demand = int(self.flows.demand[column])
            legs = self.legs_of_column[column]
            if is_path[column]:
                ways = found.setdefault(demand, {})
                ways[legs] = ways.get(legs, 0.0) + float(share[column])
            else:
                rest = by_leg.setdefault(demand, {})
                rest[legs[0]] = rest.get(legs[0], 0.0) + float(share[column])
        for demand, rest in by_leg.items():
            found.setdefault(demand, {}).update(_decompose(self.network, demand, rest))
        return tuple(
            Flow(demand, legs, part)
            for demand in sorted(found)
            for legs, part in _normalised(found[demand], float(unserved[demand])).items()
        )


def _normalised(ways: dict[tuple[int, ...], float], unserved: float) -> dict[tuple[int, ...], float]:
    target = 1.0 - (unserved if unserved > SHARE_FLOOR else 0.0)
    total = sum(ways.values())
    if total <= 0.0 or target <= SHARE_FLOOR:
        return {}
    return {legs: part * (target / total) for legs, part in sorted(ways.items())}


def _decompose(network: Network, demand: int, flow: dict[int, float]) -> dict[tuple[int, ...], float]:
    """Return simple paths that carry the leg flow of a demand; cycles, which only cost, are dropped."""
    origin, destination = int(network.demand.origin[demand]), int(network.demand.destination[demand])
    rest = dict(flow)
    ways: dict[tuple[int, ...], float] = {}
    while True:
        path = _widest_walk(network, rest, origin, destination)
        if path is None:
            return ways
        width = min(rest[leg] for leg in path)
        for leg in path:
            rest[leg] -= width
            if rest[leg] <= SHARE_FLOOR:
                del rest[leg]
        ways[tuple(path)] = ways.get(tuple(path), 0.0) + width


def _widest_walk(network: Network, rest: dict[int, float], origin: int, destination: int) -> list[int] | None:
    """Return the simple path of greatest bottleneck through the remaining flow, None without one."""
    width: dict[int, float] = {origin: np.inf}
    via: dict[int, int] = {}
    done: set[int] = set()
    leaving: dict[int, list[int]] = {}
    for leg in sorted(rest):
        leaving.setdefault(int(network.leg.tail[leg]), []).append(leg)
    while True:
        waiting = [station for station in width if station not in done]
        if not waiting:
            return None
        here = max(waiting, key=lambda station: (width[station], -station))
        if here == destination:
            break
        done.add(here)
        for leg in leaving.get(here, []):
            there = int(network.leg.head[leg])
            reach = min(width[here], rest[leg])
            if there not in done and reach > width.get(there, 0.0):
                width[there], via[there] = reach, leg
    path: list[int] = []
    while here != origin:
        path.append(via[here])
        here = int(network.leg.tail[via[here]])
    return path[::-1]


def start_model(network: Network, flows: FlowColumns) -> Model:
    """Return a model without variables and rows."""
    program = Program()
    program.expressions = {name: np.zeros(0) for name in ("cost", "revenue", "unserved", "investment", "co2")}
    return Model(network, flows, program)


def keyed(label: Callable[[int], str], items: Ints) -> Callable[[int], str]:
    """Return a label for members that stand for `items` instead of 0, 1, 2 ..."""
    return lambda member: label(int(items[member]))
