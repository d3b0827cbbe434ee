"""Rows 1 to 3 of the formulation: demand, capacity, strong linking."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.model.flows import Incidence
from hubdesign.model.layout import Model, keyed
from hubdesign.model.program import Label
from hubdesign.network import Network

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


def add_demand_rows(model: Model) -> None:
    """Row 1: sum_p x_p + s_k = 1; with leg columns conservation at every other station instead."""
    program, flows = model.program, model.flows
    unserved = model.family("unserved")
    first = model.family("flow").first
    counted = np.flatnonzero(flows.of_itinerary >= 0)
    leaving = np.flatnonzero(_starts(model))
    column = np.concatenate((counted, leaving)) + first
    row = np.concatenate((flows.demand[counted], flows.demand[leaving]))
    count = unserved.count
    program.rows.add(
        "demand",
        np.concatenate((row, np.arange(count))),
        np.concatenate((column, unserved.indices)),
        np.ones(len(column) + count),
        np.ones(count),
        np.ones(count),
        model.demand_label,
    )
    if (flows.of_itinerary < 0).any():
        _add_conservation_rows(model)


def _starts(model: Model) -> NDArray[np.bool_]:
    """Return which flow columns are leg columns out of the demand's origin."""
    flows, leg = model.flows, model.network.leg
    result = np.zeros(len(flows), dtype=bool)
    is_leg = flows.of_itinerary[flows.on_leg.column] < 0
    column, item = flows.on_leg.column[is_leg], flows.on_leg.item[is_leg]
    result[column] = leg.tail[item] == model.network.demand.origin[flows.demand[column]]
    return result


def _add_conservation_rows(model: Model) -> None:
    """Row 1 for leg columns: per demand and interior station, what arrives leaves."""
    flows, leg, n = model.flows, model.network.leg, model.network.station_count
    first = model.family("flow").first
    is_leg = flows.of_itinerary[flows.on_leg.column] < 0
    column, item = flows.on_leg.column[is_leg], flows.on_leg.item[is_leg]
    demand = flows.demand[column]
    station = np.concatenate((leg.head[item], leg.tail[item]))
    sign = np.concatenate((np.ones(len(item)), -np.ones(len(item))))
    demand, column = np.concatenate((demand, demand)), np.concatenate((column, column))
    inner = (station != model.network.demand.origin[demand]) & (
        station != model.network.demand.destination[demand]
    )
    keys, row = np.unique(demand[inner] * n + station[inner], return_inverse=True)

    def label(member: int) -> str:
        key = int(keys[member])
        return f"{model.demand_label(key // n)}:{model.station_label(key % n)}"

    zeros = np.zeros(len(keys))
    model.program.rows.add("conservation", row, column[inner] + first, sign[inner], zeros, zeros, label)


def add_capacity_rows(model: Model) -> None:
    """Row 2: volume on each leg within what is offered, scaled by the capacity: entries stay near 1."""
    network = model.network
    if network.problem.vehicles:
        _add_fleet_capacity_rows(model)
    else:
        _add_link_capacity_rows(model)


def _add_fleet_capacity_rows(model: Model) -> None:
    network, flows = model.network, model.flows
    service, leg = network.service, network.leg
    load = network.problem.settings.max_load_factor
    largest = np.zeros(network.link_count)
    np.maximum.at(largest, service.link, load * service.capacity)
    legs = np.unique(flows.on_leg.item)
    place = np.full(len(leg.link), -1)
    place[legs] = np.arange(len(legs))
    scale = largest[leg.link]
    volume = network.demand.volume[flows.demand[flows.on_leg.column]] / scale[flows.on_leg.item]
    offered_leg, offered_service = _services_on(network, legs)
    offered = load * service.capacity[offered_service] / scale[offered_leg]
    model.program.rows.add(
        "capacity",
        np.concatenate((place[flows.on_leg.item], place[offered_leg])),
        np.concatenate(
            (
                flows.on_leg.column + model.family("flow").first,
                offered_service + model.family("frequency").first,
            )
        ),
        np.concatenate((volume, -offered)),
        np.full(len(legs), -np.inf),
        np.zeros(len(legs)),
        keyed(model.leg_label, legs),
    )


def _services_on(network: Network, legs: Ints) -> tuple[Ints, Ints]:
    """Return the pairs (leg, service) of `legs`."""
    pairs = [(leg, s) for leg in legs.tolist() for s in network.services_of[int(network.leg.link[leg])]]
    return (
        np.array([pair[0] for pair in pairs], dtype=np.int64),
        np.array([pair[1] for pair in pairs], dtype=np.int64),
    )


def _add_link_capacity_rows(model: Model) -> None:
    network, flows = model.network, model.flows
    capacity = network.link.capacity[network.leg.link]
    legs = np.unique(flows.on_leg.item)
    legs = legs[np.isfinite(capacity[legs])]
    place = np.full(len(network.leg.link), -1)
    place[legs] = np.arange(len(legs))
    bounded = place[flows.on_leg.item] >= 0
    item, column = flows.on_leg.item[bounded], flows.on_leg.column[bounded]
    volume = network.demand.volume[flows.demand[column]]
    scale = np.maximum(capacity, 1e-300)
    zero = capacity[item] <= 0.0
    model.program.rows.add(
        "capacity",
        np.concatenate((place[item], np.arange(len(legs)))),
        np.concatenate(
            (column + model.family("flow").first, network.leg.link[legs] + model.family("link").first)
        ),
        np.concatenate(
            (np.where(zero, 1.0, volume / scale[item]), -np.where(capacity[legs] <= 0.0, 0.0, 1.0))
        ),
        np.full(len(legs), -np.inf),
        np.zeros(len(legs)),
        keyed(model.leg_label, legs),
    )


def add_link_linking_rows(model: Model) -> None:
    """Row 3a: the share of demand k on link e at most y_e, on a leg also at most capacity_e / d_k y_e.

    The sum over demands stands in the model where nothing else ties volume to y: without a fleet and
    without a capacity. A way that uses a link both ways (local volume) counts once.
    """
    network, flows = model.network, model.flows
    legs = flows.on_leg.item
    keys = np.unique(flows.on_leg.column * max(1, network.link_count) + network.leg.link[legs])
    on_link = Incidence(keys // max(1, network.link_count), keys % max(1, network.link_count))
    opened = model.family("link").indices
    _add_pooled(model, "link_linking", on_link, opened, np.ones(len(keys)), model.link_label)
    if network.problem.vehicles:
        return
    volume = network.demand.volume[flows.demand[flows.on_leg.column]]
    capacity = network.link.capacity[network.leg.link]
    narrow = capacity[legs] < volume
    on_leg = Incidence(flows.on_leg.column[narrow], legs[narrow])
    fit = capacity[on_leg.item] / volume[narrow]
    _add_pooled(model, "leg_linking", on_leg, opened[network.leg.link], fit, model.leg_label)
    loose = ~np.isfinite(network.link.capacity[on_link.item])
    chosen = Incidence(on_link.column[loose], on_link.item[loose])
    _add_summed(model, "link_use", chosen, opened, model.link_label)


def add_hub_linking_rows(model: Model) -> None:
    """Rows 3b and 3c: ways where a station acts as a hub (as a spoke end) need it open (shut)."""
    flows, hub = model.flows, model.family("hub")
    fixed = model.network.station.must_be_hub
    free = ~fixed[flows.hub_at.item]
    as_hub = Incidence(flows.hub_at.column[free], flows.hub_at.item[free])
    _add_pooled(model, "hub_linking", as_hub, hub.indices, np.ones(len(as_hub.item)), model.station_label)
    _add_summed(model, "hub_use", as_hub, hub.indices, model.station_label)
    may = model.network.station.may_be_hub[flows.spoke_at.item]
    as_spoke = Incidence(flows.spoke_at.column[may], flows.spoke_at.item[may])
    _add_pooled(
        model,
        "spoke_linking",
        as_spoke,
        hub.indices,
        np.ones(len(as_spoke.item)),
        model.station_label,
        shut=True,
    )
    _add_summed(model, "spoke_use", as_spoke, hub.indices, model.station_label, shut=True)


def _add_pooled(
    model: Model,
    family: str,
    incidence: Incidence,
    switches: Ints,
    fit: Floats,
    label: Label,
    *,
    shut: bool = False,
) -> None:
    """Pool, for each demand and item, ``sum x <= fit * switch`` (``<= 1 - switch`` where `shut`).

    `switches` is the binary column of each item, `fit` belongs to each pair of the incidence.
    """
    width = int(incidence.item.max(initial=0)) + 1
    demand = model.flows.demand[incidence.column]
    keys, first, row = np.unique(demand * width + incidence.item, return_index=True, return_inverse=True)
    count = len(keys)
    item = keys % width
    sign = 1.0 if shut else -1.0
    model.program.pool.add(
        family,
        np.concatenate((row, np.arange(count))),
        np.concatenate((incidence.column + model.family("flow").first, switches[item])),
        np.concatenate((np.ones(len(row)), sign * fit[first])),
        np.full(count, -np.inf),
        np.full(count, 1.0 if shut else 0.0),
        lambda member: f"{model.demand_label(int(keys[member]) // width)},{label(int(keys[member]) % width)}",
    )


def _add_summed(
    model: Model, family: str, incidence: Incidence, switches: Ints, label: Label, *, shut: bool = False
) -> None:
    """Add, for each item, the sum over demands of the pooled rows: ``sum x <= K * switch``.

    Divided by K, the number of demands concerned, so that entries stay at most 1.
    """
    item, row = np.unique(incidence.item, return_inverse=True)
    count = len(item)
    width = int(item.max(initial=0)) + 1
    pairs = np.unique(model.flows.demand[incidence.column] * width + incidence.item)
    demands = np.bincount(pairs % width, minlength=width)[item].astype(np.float64)
    sign = 1.0 if shut else -1.0
    model.program.rows.add(
        family,
        np.concatenate((row, np.arange(count))),
        np.concatenate((incidence.column + model.family("flow").first, switches[item])),
        np.concatenate((1.0 / demands[row], np.full(count, sign))),
        np.full(count, -np.inf),
        np.full(count, 1.0 if shut else 0.0),
        keyed(label, item),
    )
