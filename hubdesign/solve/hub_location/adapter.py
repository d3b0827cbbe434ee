"""From a Problem to a hub location instance and back: which inputs this engine serves, and the Design.

Served: hub-and-spoke at least cost, all volume carried, at most two transfers, no fleet, no link cost or
must, no limit on money, circuity or hours, none that can bind on links or hubs' volume; collection capacities
with single allocation only. Unlimited transfers are the same as two under single allocation, and where no
detour over a third hub is cheaper than the leg it replaces. Everything else is the direct engine's. Where
several modes join two stations each direction takes the cheapest: nothing else tells them apart here.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from hubdesign.answer import Design, Flow, Status, is_proven, relative_gap
from hubdesign.network import Network
from hubdesign.pricing import price
from hubdesign.problem import UNLIMITED
from hubdesign.solve.control import Control
from hubdesign.solve.hub_location.evaluate import multiple_stops, multiple_unit_costs, total_cost
from hubdesign.solve.hub_location.instance import (
    Floats,
    HubAnswer,
    HubInstance,
    HubStatus,
    Ints,
)
from hubdesign.solve.hub_location.multiple import solve_multiple
from hubdesign.solve.hub_location.relaxation import build_relaxation
from hubdesign.solve.hub_location.single import solve_single

#: A detour cheaper by less than this share is rounding; the bound gives more away.
DETOUR_TOLERANCE = 1e-12

_STATUS = {HubStatus.INFEASIBLE: Status.INFEASIBLE, HubStatus.UNKNOWN: Status.UNKNOWN}


def fits(network: Network) -> bool:
    """Whether this engine serves the problem behind `network`, exactly."""
    return _rules_fit(network) and _limits_fit(network) and _links_fit(network)


def _rules_fit(network: Network) -> bool:
    settings = network.problem.settings
    return (
        settings.structure == "hub-and-spoke"
        and settings.goal == "least-cost"
        and not settings.unserved_allowed
        and settings.transfers_at_most in (2, UNLIMITED)
        and not network.problem.has_fleet
        and settings.max_circuity is None
        and settings.cost_limit is None
        and settings.investment_limit is None
        and settings.co2_limit_tonnes is None
        and bool(network.station.may_be_hub.any())
        and bool((network.demand.volume > 0.0).any())
    )


def _limits_fit(network: Network) -> bool:
    station = network.station
    hubs = station.may_be_hub
    total = network.demand.volume.sum()
    single = network.problem.settings.single_allocation
    departures_free = not station.min_departures.any() and bool(np.isinf(station.max_departures).all())
    return (
        departures_free
        and bool((station.max_links >= len(network.link.tail)).all())
        and bool((station.hub_capacity[hubs] >= total).all())
        and (single or bool((station.collection_capacity[hubs] >= total).all()))
        and bool(np.isinf(network.demand.max_hours).all())
    )


def _links_fit(network: Network) -> bool:
    """Whether links carry freely, and none is missing where the instance could not tell."""
    link, data = network.link, network.demand
    if link.fixed_cost.any() or link.must.any() or (link.capacity < data.volume.sum()).any():
        return False
    if network.problem.settings.transfers_at_most == UNLIMITED and not _two_transfers_suffice(network):
        return False
    local = (data.origin == data.destination) & (data.volume > 0.0)
    if network.station.volume_fee[data.origin[local]].any():
        return False  # only local volume that leaves its station pays the fee
    hubs = np.flatnonzero(network.station.may_be_hub)
    legs = cheapest_legs(network)
    np.fill_diagonal(legs, 0)
    complete = bool((legs[:, hubs] >= 0).all() and (legs[hubs] >= 0).all())
    moved = data.volume > 0.0
    busy = np.zeros(network.station_count, dtype=bool)
    busy[data.origin[moved]] = busy[data.destination[moved]] = True
    return complete or (bool(moved.all()) and bool(busy.all()))


def _two_transfers_suffice(network: Network) -> bool:
    """Whether more transfers never help: single allocation, or no transfer leg dearer than a detour."""
    if network.problem.settings.single_allocation:
        return True
    instance = to_instance(network)
    hubs = instance.hub_candidates
    direct = instance.transfer[np.ix_(hubs, hubs)]
    detour = build_relaxation(instance, closure=True).between.copy()
    np.fill_diagonal(detour, 0.0)
    return bool((direct <= detour * (1.0 + DETOUR_TOLERANCE)).all())


def cheapest_legs(network: Network) -> Ints:
    """Return the leg of least unit cost from row to column, (n, n); -1 where there is none."""
    n = network.station_count
    cost = network.link.unit_cost[network.leg.link]
    legs = np.full((n, n), -1, dtype=np.int64)
    order = np.argsort(-cost, kind="stable")  # the cheapest is written last
    legs[network.leg.tail[order], network.leg.head[order]] = order
    return legs


def to_instance(network: Network) -> HubInstance:
    """Return the instance behind `network`; volume fees are its constant."""
    settings, station, data = network.problem.settings, network.station, network.demand
    n = network.station_count
    legs = cheapest_legs(network)
    unit = np.where(legs >= 0, network.link.unit_cost[network.leg.link[np.maximum(legs, 0)]], np.inf)
    np.fill_diagonal(unit, 0.0)
    volume = np.zeros((n, n))
    np.add.at(volume, (data.origin, data.destination), data.volume)
    away = data.origin != data.destination
    fees = station.volume_fee[data.origin] + station.volume_fee[data.destination]
    fewest, most = settings.hub_count
    return HubInstance(
        volume=volume,
        collect=_factored(unit, settings.collection_factor),
        transfer=_factored(unit, settings.transfer_factor),
        distribute=_factored(unit, settings.distribution_factor),
        transfer_cost=station.transfer_cost,
        candidate=station.may_be_hub,
        forced=station.must_be_hub,
        fixed_cost=station.hub_fixed_cost,
        hubs_min=fewest,
        hubs_max=n if most is None else most,
        collection_capacity=np.where(
            station.collection_capacity < data.volume.sum(), station.collection_capacity, np.inf
        ),
        constant=float((data.volume * fees)[away].sum()),
    )


def _factored(unit: Floats, factor: float) -> Floats:
    """Return ``factor * unit``, inf where there is no link (also at factor 0)."""
    return np.where(np.isfinite(unit), factor * np.where(np.isfinite(unit), unit, 0.0), np.inf)


def solve_hub_location(network: Network, control: Control, starts: tuple[Design, ...] = ()) -> Design:
    """Return the Design of the cheapest plan; `network` must fit.

    Parameters
    ----------
    network
        The candidates.
    control
        Limits and the record.
    starts
        Plans on the same candidates to start from.
    """
    instance = to_instance(network)
    single = network.problem.settings.single_allocation
    method = f"hub location, {'single' if single else 'multiple'} allocation: cuts in closed form, small tree"
    control.announce(method)
    if single:
        plans = [np.array(plan.allocation) for plan in starts if plan.allocation is not None]
        answer = solve_single(instance, control, tuple(plans))
    else:
        answer = solve_multiple(instance, control, tuple(plan.hubs for plan in starts if plan.hubs))
    if not answer.hubs:
        return Design(_STATUS[answer.status], progress=control.record, method=method)
    return to_design(network, instance, answer, control, method)


def to_design(
    network: Network, instance: HubInstance, answer: HubAnswer, control: Control, method: str
) -> Design:
    """Return `answer` as a Design, priced by its flows."""
    legs = cheapest_legs(network)
    if answer.allocation is None:
        hubs = _without_idle_hubs(instance, answer.hubs)
        routes = _multiple_routes(network, instance, hubs)
    else:
        hubs = answer.hubs
        routes = _single_routes(network, answer.allocation)
    flows = []
    for demand, route in enumerate(routes):
        travelled = tuple(int(legs[a, b]) for a, b in pairwise(route))
        if min(travelled, default=0) >= 0:  # only a demand of no volume may lack a way
            flows.append(Flow(demand, travelled, 1.0))
    used = {int(network.leg.link[leg]) for flow in flows for leg in flow.legs}
    allocation = None
    if answer.allocation is not None:
        allocation = tuple(int(a) for a in answer.allocation)
        for i, h in enumerate(allocation):
            joined = max(int(legs[i, h]), int(legs[h, i])) if i != h else -1
            if joined >= 0:
                used.add(int(network.leg.link[legs[i, h] if legs[i, h] >= 0 else legs[h, i]]))
    plan = Design(
        Status.FEASIBLE, hubs=hubs, links=tuple(sorted(used)), flows=tuple(flows), allocation=allocation
    )
    value = price(network, plan).total_cost
    bound = min(answer.bound, value)  # rounded outward by the engine already
    gap = relative_gap(value, bound, value)
    proven = is_proven(gap, control.gap) or value == bound
    return plan.replace(
        status=Status.PROVEN if proven else Status.FEASIBLE,
        objective=value,
        bound=bound,
        method=method,
        progress=control.record,
    )


def _without_idle_hubs(instance: HubInstance, hubs: tuple[int, ...]) -> tuple[int, ...]:
    """Return the hubs without those whose closing costs nothing, last station first."""
    cost = total_cost(instance, hubs, multiple_unit_costs(instance, hubs))
    for hub in reversed(hubs):
        if len(hubs) <= max(1, instance.hubs_min):
            break
        rest = tuple(h for h in hubs if h != hub)
        if not instance.forced[hub]:
            without = total_cost(instance, rest, multiple_unit_costs(instance, rest))
            if without <= cost:
                hubs, cost = rest, without
    return hubs


def _multiple_routes(network: Network, instance: HubInstance, hubs: tuple[int, ...]) -> list[list[int]]:
    """Return the stations of each demand's cheapest itinerary; one station where volume stays."""
    stops = multiple_stops(instance, hubs).tolist()
    routes = []
    for o, d in zip(network.demand.origin.tolist(), network.demand.destination.tolist()):
        inner = [stop for stop in stops[o][d] if stop >= 0]
        routes.append([o] if o == d and not inner else [o, *inner, d])
    return routes


def _single_routes(network: Network, allocation: Ints) -> list[list[int]]:
    """Return o, a(o), a(d), d of each demand with repeats dropped; i, a(i), i for local volume."""
    own = allocation.tolist()
    routes = []
    for o, d in zip(network.demand.origin.tolist(), network.demand.destination.tolist()):
        route = [o]
        for stop in (own[o], own[d], d):
            if stop != route[-1]:
                route.append(stop)
        routes.append(route)
    return routes
