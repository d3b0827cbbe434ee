"""From a solver's numbers to a Design: integers fixed, flows re-optimised, the plan tidied and priced."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from hubdesign.answer import Design, Frequency, Status, is_proven, relative_gap, round_bound_outward
from hubdesign.model.layout import Model
from hubdesign.model.objective import Objective
from hubdesign.model.variables import vehicles_for
from hubdesign.pricing import Bill, price
from hubdesign.problem import Phase
from hubdesign.solve.control import Control
from hubdesign.solve.relaxation import LpStatus, Relaxation

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Plan:
    """A design without its proof, and its recomputed value in the goal's unit."""

    design: Design
    bill: Bill
    value: float


def plan_value(bill: Bill, phase: Phase) -> float:
    """Return what a phase counts of a bill."""
    if phase == "volume":
        return bill.volume_carried
    return bill.profit if phase == "profit" else bill.total_cost


class Finisher:
    """Turns integer points of one model into plans of one objective; keeps a warm LP over the flows."""

    def __init__(self, model: Model, objective: Objective) -> None:
        self.model = model
        self.objective = objective
        self.lp = Relaxation(model.program, objective.coefficients)
        self.integer = np.flatnonzero(model.program.integer)
        self.point: Floats = np.zeros(model.program.column_count)

    def plan(self, values: Floats) -> Plan | None:
        """Return the best plan with the integers of `values`, None where flows cannot follow them.

        `point` then holds the full solution.
        """
        program = self.model.program
        fixed = np.clip(
            np.round(values[self.integer]), program.lower[self.integer], program.upper[self.integer]
        )
        self.lp.set_bounds(self.integer, fixed, fixed)
        if self.lp.separate() is not LpStatus.OPTIMAL:
            return None
        self.point = self.lp.values.copy()
        self.point[self.integer] = fixed
        return self.from_point(self.point)

    def from_point(self, point: Floats) -> Plan:
        """Return the plan of a point whose integers are integer and whose flows obey them."""
        design = tidy(self.model, read_design(self.model, point))
        bill = price(self.model.network, design)
        return Plan(design, bill, plan_value(bill, self.objective.phase))


def read_design(model: Model, values: Floats) -> Design:
    """Return the decisions of `values` as they stand."""
    departures = np.round(values[model.family("frequency").members]).astype(np.int64)
    hubs = np.flatnonzero(np.round(values[model.family("hub").members]) > 0)
    links = np.flatnonzero(np.round(values[model.family("link").members]) > 0)
    return Design(
        status=Status.FEASIBLE,
        hubs=tuple(hubs.tolist()),
        links=tuple(links.tolist()),
        frequencies=tuple(
            Frequency(service, int(departures[service]))
            for service in np.flatnonzero(departures > 0).tolist()
        ),
        flows=model.read_flows(values),
        allocation=_read_allocation(model, values),
    )


def _read_allocation(model: Model, values: Floats) -> tuple[int, ...] | None:
    if not model.network.problem.settings.single_allocation:
        return None
    own = values[model.family("allocation").members]
    station, hub = model.pairs
    result = list(range(model.network.station_count))
    for pair in np.flatnonzero(own > 0.5).tolist():
        result[int(station[pair])] = int(hub[pair])
    return tuple(result)


def integers_of(model: Model, design: Design) -> Floats:
    """Return a point with the integers of `design`, a plan on the same candidates; flows are left 0."""
    values = np.zeros(model.program.column_count)
    values[model.family("hub").first + np.array(design.hubs, dtype=np.int64)] = 1.0
    values[model.family("link").first + np.array(design.links, dtype=np.int64)] = 1.0
    for entry in design.frequencies:
        values[model.family("frequency").first + entry.service] = entry.departures
    if design.allocation is not None and model.network.problem.settings.single_allocation:
        station, hub = model.pairs
        own = np.array(design.allocation)[station] == hub
        values[model.family("allocation").members] = own
    set_fleet(model, values)
    return values


def set_fleet(model: Model, values: Floats) -> None:
    """Set vehicles and purchases to what the frequencies of `values` need."""
    used = vehicles_for(model, values[model.family("frequency").members])
    values[model.family("vehicles").members] = used
    owned = np.array([float(row.owned) for row in model.network.problem.vehicles])
    values[model.family("purchases").members] = np.maximum(0.0, used - owned)


def tidy(model: Model, design: Design) -> Design:
    """Close what the plan does not use: links without volume and frequency, hubs nobody needs.

    A link stays where it is a must, has departures, carries volume or joins a station to its hub; a hub
    stays where it must, where fewer would break the count, where volume transfers, where a link needs it
    (hub-and-spoke), where a station belongs to it, or where it makes a leg cheaper.
    """
    network = model.network
    if network.problem.settings.structure == "current":
        return design
    used = {int(network.leg.link[leg]) for flow in design.flows for leg in flow.legs}
    used |= {int(network.service.link[entry.service]) for entry in design.frequencies}
    used |= set(np.flatnonzero(network.link.must).tolist())
    if design.allocation is not None:
        used |= _allocated_links(model, design, used)
    links = tuple(link for link in design.links if link in used)
    return design.replace(links=links, hubs=_needed_hubs(model, design, links))


def _allocated_links(model: Model, design: Design, used: set[int]) -> set[int]:
    """Return one open link for each station and its hub where none is used already."""
    network = model.network
    joined = {frozenset((int(network.link.tail[e]), int(network.link.head[e]))) for e in used}
    extra: set[int] = set()
    for station, hub in enumerate(design.allocation or ()):
        ends = frozenset((station, hub))
        if station == hub or ends in joined:
            continue
        for link in design.links:
            if frozenset((int(network.link.tail[link]), int(network.link.head[link]))) == ends:
                extra.add(link)
                joined.add(ends)
                break
    return extra


def _needed_hubs(model: Model, design: Design, links: tuple[int, ...]) -> tuple[int, ...]:
    """Return the hubs without those whose closing changes nothing but saves their cost."""
    network, settings = model.network, model.network.problem.settings
    if design.allocation is not None:
        return design.hubs
    needed = set(np.flatnonzero(network.station.must_be_hub).tolist())
    for flow in design.flows:
        needed |= {int(network.leg.tail[leg]) for leg in flow.legs[1:]}
        if not flow.legs:
            needed.add(int(network.demand.origin[flow.demand]))
    if model.flows.roles_matter:
        ends = {
            int(station)
            for flow in design.flows
            for station in (network.demand.origin[flow.demand], network.demand.destination[flow.demand])
        }
        needed |= {hub for hub in design.hubs if hub in ends}
    open_hubs = list(design.hubs)
    fewest = settings.hub_count[0]
    for hub in sorted(set(open_hubs) - needed, reverse=True):
        if len(open_hubs) <= fewest:
            break
        left = set(open_hubs) - {hub}
        orphaned = settings.structure == "hub-and-spoke" and any(
            int(network.link.tail[e]) not in left and int(network.link.head[e]) not in left for e in links
        )
        if not orphaned:
            open_hubs.remove(hub)
    return tuple(open_hubs)


def conclude(plan: Plan, bound: float, objective: Objective, control: Control, method: str) -> Design:
    """Return the plan as a Design with its outward-rounded bound and honest status.

    Parameters
    ----------
    bound
        Proven bound in the goal's unit, before rounding.
    """
    size = plan.bill.volume_carried if objective.phase == "volume" else plan.bill.total_cost
    rounded = round_bound_outward(bound, objective.maximise, size)
    rounded = max(rounded, plan.value) if objective.maximise else min(rounded, plan.value)
    gap = relative_gap(plan.value, rounded, size)
    proven = is_proven(gap, control.gap) or (plan.value == 0.0 and rounded == 0.0)
    return plan.design.replace(
        status=Status.PROVEN if proven else Status.FEASIBLE,
        objective=plan.value,
        bound=rounded,
        method=method,
        progress=control.record,
    )
