"""From a Problem to a fixed-charge instance and back: which inputs this engine serves, and the Design.

Served: mixed structure at least cost, unlimited transfers at hubs that cost nothing, multiple allocation, no
fleet, factors of 1, no limit on money, circuity, hours or CO2, none that can bind on stations, no local
volume. Unserved volume may be allowed; a minimum share may then only be none or all.
"""

from __future__ import annotations

import numpy as np

from hubdesign.answer import Design, Flow, Status, is_proven, relative_gap, round_bound_outward
from hubdesign.network import Network
from hubdesign.pricing import price
from hubdesign.problem import UNLIMITED
from hubdesign.solve.control import Control
from hubdesign.solve.fixed_charge.engine import solve_fixed_charge
from hubdesign.solve.fixed_charge.instance import FixedChargeAnswer, FixedChargeInstance, FixedChargeStatus

_STATUS = {FixedChargeStatus.INFEASIBLE: Status.INFEASIBLE, FixedChargeStatus.UNKNOWN: Status.UNKNOWN}


def fits(network: Network) -> bool:
    """Whether this engine serves the problem behind `network`, exactly."""
    return _rules_fit(network) and _limits_fit(network) and _demands_fit(network)


def _rules_fit(network: Network) -> bool:
    settings = network.problem.settings
    factors = (settings.collection_factor, settings.transfer_factor, settings.distribution_factor)
    return (
        settings.structure == "mixed"
        and settings.goal == "least-cost"
        and settings.transfers_at_most == UNLIMITED
        and not settings.single_allocation
        and not network.problem.has_fleet
        and (all(factor == 1.0 for factor in factors) or not network.link.unit_cost.any())
        and settings.max_circuity is None
        and settings.cost_limit is None
        and settings.investment_limit is None
        and settings.co2_limit_tonnes is None
    )


def _limits_fit(network: Network) -> bool:
    station = network.station
    hubs = station.may_be_hub
    fewest, most = network.problem.settings.hub_count
    total = network.demand.volume.sum()
    return (
        not station.hub_fixed_cost[hubs].any()
        and fewest <= int(station.must_be_hub.sum())
        and (most is None or most >= int(hubs.sum()))
        and not station.min_departures.any()
        and bool(np.isinf(station.max_departures).all())
        and bool((station.max_links >= network.link_count).all())
        and bool((station.hub_capacity[hubs] >= total).all())
        and bool(np.isinf(station.collection_capacity).all())
    )


def _demands_fit(network: Network) -> bool:
    data = network.demand
    moved = data.volume > 0.0
    if not moved.any() or not network.link_count or (data.origin == data.destination)[moved].any():
        return False
    if not np.isinf(data.max_hours[moved]).all():
        return False
    allowed = network.problem.settings.unserved_allowed
    return not allowed or bool(np.isin(data.min_share[moved], (0.0, 1.0)).all())


def to_instance(network: Network) -> FixedChargeInstance:
    """Return the instance behind `network`: legs are arcs, demands of some volume commodities."""
    link, leg, data, station = network.link, network.leg, network.demand, network.station
    moved = np.flatnonzero(data.volume > 0.0)
    may_leave = network.problem.settings.unserved_allowed & (data.min_share[moved] < 1.0)
    fees = station.volume_fee[data.origin[moved]] + station.volume_fee[data.destination[moved]]
    return FixedChargeInstance(
        nodes=network.station_count,
        fixed_cost=link.fixed_cost,
        must_open=link.must,
        link=leg.link,
        tail=leg.tail,
        head=leg.head,
        unit_cost=link.unit_cost[leg.link],
        capacity=link.capacity[leg.link],
        through=station.may_be_hub,
        transfer_cost=station.transfer_cost,
        origin=data.origin[moved],
        destination=data.destination[moved],
        volume=data.volume[moved],
        unserved_cost=np.where(may_leave, data.unserved_cost[moved], np.inf),
        carried_cost=fees,
    )


def solve_fixed_charge_design(network: Network, control: Control, starts: tuple[Design, ...] = ()) -> Design:
    """Return the Design of the cheapest plan found; `network` must fit.

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
    method = (
        f"fixed-charge design, {instance.links} candidate links, {instance.commodities} demands:"
        " strong relaxation over paths, tree over links"
    )
    control.announce(method)
    given = []
    for plan in starts:
        opened = np.zeros(instance.links, dtype=bool)
        opened[list(plan.links)] = True
        given.append(opened)
    answer = solve_fixed_charge(instance, control, tuple(given))
    if answer.status in _STATUS:
        return Design(_STATUS[answer.status], progress=control.record, method=method)
    return to_design(network, answer, control, method)


def to_design(network: Network, answer: FixedChargeAnswer, control: Control, method: str) -> Design:
    """Return `answer` as a Design: hubs are the must-hubs and where paths transfer; priced by its flows."""
    moved = np.flatnonzero(network.demand.volume > 0.0)
    flows = tuple(Flow(int(moved[k]), arcs, share) for k, arcs, share in answer.paths)
    hubs = set(np.flatnonzero(network.station.must_be_hub).tolist())
    for flow in flows:
        hubs |= {int(network.leg.tail[leg]) for leg in flow.legs[1:]}
    plan = Design(
        Status.FEASIBLE,
        hubs=tuple(sorted(hubs)),
        links=tuple(np.flatnonzero(answer.open).tolist()),
        flows=flows,
    )
    value = price(network, plan).total_cost
    bound = min(round_bound_outward(answer.bound, False, value), value)
    gap = relative_gap(value, bound, value)
    proven = is_proven(gap, control.gap) or value == bound
    return plan.replace(
        status=Status.PROVEN if proven else Status.FEASIBLE,
        objective=value,
        bound=bound,
        method=method,
        progress=control.record,
    )
