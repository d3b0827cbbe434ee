"""Rows 4 of the formulation: hub capacities and counts, links at a station, structure, single allocation."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.model.flows import HUB, SPOKE, Incidence
from hubdesign.model.layout import Model, keyed
from hubdesign.model.program import Label

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


def add_hub_capacity_rows(model: Model) -> None:
    """Volume for which a station is an interior stop <= hub_capacity_i h_i."""
    _add_volume_at_hub(model, "hub_capacity", model.flows.passing, model.network.station.hub_capacity)


def add_collection_capacity_rows(model: Model) -> None:
    """Volume whose first hub is i <= collection_capacity_i h_i."""
    _add_volume_at_hub(
        model, "collection_capacity", model.flows.first_hub, model.network.station.collection_capacity
    )


def _add_volume_at_hub(model: Model, family: str, touching: Incidence, capacity: Floats) -> None:
    if model.network.problem.settings.structure == "current":
        return  # today's breaches are warned of, not forbidden
    bounded = np.isfinite(capacity[touching.item])
    column, item = touching.column[bounded], touching.item[bounded]
    stations, row = np.unique(item, return_inverse=True)
    volume = model.network.demand.volume[model.flows.demand[column]]
    limit = capacity[stations]
    zero = limit <= 0.0
    scale = np.where(zero, 1.0, limit)
    model.program.rows.add(
        family,
        np.concatenate((row, np.arange(len(stations)))),
        np.concatenate((column + model.family("flow").first, stations + model.family("hub").first)),
        np.concatenate((np.where(zero[row], 1.0, volume / scale[row]), np.where(zero, 0.0, -1.0))),
        np.full(len(stations), -np.inf),
        np.zeros(len(stations)),
        keyed(model.station_label, stations),
    )


def add_hub_count_row(model: Model) -> None:
    """hubs_min <= sum_i h_i <= hubs_max."""
    fewest, most = model.network.problem.settings.hub_count
    hub = model.family("hub")
    if fewest == 0 and most is None:
        return
    model.program.rows.add(
        "hub_count",
        np.zeros(hub.count, dtype=np.int64),
        hub.indices,
        np.ones(hub.count),
        np.array([float(fewest)]),
        np.array([np.inf if most is None else float(most)]),
        lambda member: "all",
    )


def add_link_count_rows(model: Model) -> None:
    """sum of y_e over the links at station i <= max_links_i."""
    if model.network.problem.settings.structure == "current":
        return
    link, most = model.network.link, model.network.station.max_links
    station = np.concatenate((link.tail, link.head))
    number = np.concatenate((np.arange(len(link.tail)), np.arange(len(link.head))))
    bounded = np.isfinite(most[station])
    stations, row = np.unique(station[bounded], return_inverse=True)
    model.program.rows.add(
        "max_links",
        row,
        number[bounded] + model.family("link").first,
        np.ones(len(row)),
        np.full(len(stations), -np.inf),
        most[stations],
        keyed(model.station_label, stations),
    )


def add_spoke_link_rows(model: Model) -> None:
    """Hub-and-spoke: y_ij <= h_i + h_j."""
    if model.network.problem.settings.structure != "hub-and-spoke":
        return
    link, hub = model.network.link, model.family("hub")
    count = len(link.tail)
    number = np.arange(count)
    model.program.rows.add(
        "spoke_link",
        np.tile(number, 3),
        np.concatenate((number + model.family("link").first, link.tail + hub.first, link.head + hub.first)),
        np.concatenate((np.ones(count), -np.ones(2 * count))),
        np.full(count, -np.inf),
        np.zeros(count),
        model.link_label,
    )


def add_allocation_rows(model: Model) -> None:
    """Single allocation: one hub each, an open hub, an open link to it, and ways that follow it."""
    if not model.network.problem.settings.single_allocation:
        return
    program, hub, own = model.program, model.family("hub"), model.family("allocation")
    station, to_hub = model.pairs
    n, count = model.network.station_count, own.count
    program.rows.add(
        "one_hub",
        np.concatenate((station, np.arange(n))),
        np.concatenate((own.indices, hub.indices)),
        np.ones(count + n),
        np.ones(n),
        np.ones(n),
        model.station_label,
    )
    number = np.arange(count)
    program.rows.add(
        "allocated_hub_open",
        np.tile(number, 2),
        np.concatenate((own.indices, to_hub + hub.first)),
        np.concatenate((np.ones(count), -np.ones(count))),
        np.full(count, -np.inf),
        np.zeros(count),
        _pair_label(model),
    )
    _add_allocated_link_rows(model)
    _restrict_ways(model)
    _add_way_rows(model)


def _pair_label(model: Model) -> Label:
    station, hub = model.pairs
    return lambda pair: f"{model.station_label(int(station[pair]))}>{model.station_label(int(hub[pair]))}"


def _add_allocated_link_rows(model: Model) -> None:
    """a_ih <= sum of y_e over the links that join i and h."""
    station, hub = model.pairs
    link, own = model.network.link, model.family("allocation")
    n, count = model.network.station_count, own.count
    place = np.full((n, n), -1)
    place[station, hub] = np.arange(count)
    number = np.arange(len(link.tail))
    row = np.concatenate((place[link.tail, link.head], place[link.head, link.tail]))
    column = np.concatenate((number, number)) + model.family("link").first
    found = row >= 0
    model.program.rows.add(
        "allocated_link_open",
        np.concatenate((np.arange(count), row[found])),
        np.concatenate((own.indices, column[found])),
        np.concatenate((np.ones(count), -np.ones(int(found.sum())))),
        np.full(count, -np.inf),
        np.zeros(count),
        _pair_label(model),
    )


def _attached(model: Model) -> tuple[Ints, Ints]:
    """Return, per flow column, the hub its origin and its destination belong to; -1 where a way says nothing.

    An end that acts as a hub belongs to itself; a nonstop between two spokes tells nothing.
    """
    flows = model.flows
    stops = flows.itineraries.hubs[flows.of_itinerary]
    data = model.network.demand
    origin, destination = data.origin[flows.demand], data.destination[flows.demand]
    last_stop = np.where(stops[:, 1] >= 0, stops[:, 1], stops[:, 0])
    other = np.where(flows.destination_role == HUB, destination, -1)
    from_hub = np.where(stops[:, 0] >= 0, stops[:, 0], other)
    back = np.where(flows.origin_role == HUB, origin, -1)
    to_hub = np.where(last_stop >= 0, last_stop, back)
    return np.where(flows.origin_role == HUB, origin, from_hub), np.where(
        flows.destination_role == HUB, destination, to_hub
    )


def _restrict_ways(model: Model) -> None:
    """Shut the ways that no allocation allows: more stops than the two ends' own hubs.

    From o to d the way is o, a(o), a(d), d with repeats dropped: two spokes make one or two stops (or none
    where mixed lets them), a spoke and a hub at most one, two hubs none.
    """
    flows = model.flows
    stops = (flows.itineraries.hubs[flows.of_itinerary] >= 0).sum(axis=1)
    hubs = (flows.origin_role == HUB).astype(np.int64) + (flows.destination_role == HUB)
    local = model.network.demand.origin[flows.demand] == model.network.demand.destination[flows.demand]
    allowed = stops <= 2 - np.minimum(hubs, 2)
    if model.network.problem.settings.structure != "mixed":
        allowed &= (stops > 0) | (hubs > 0)
    closed = np.flatnonzero(~allowed & ~local) + model.family("flow").first
    model.program.close(closed)


def _add_way_rows(model: Model) -> None:
    """Ways of k that attach its spoke end to h: sum x <= a_ih, pooled; summed over k in the model."""
    flows, own = model.flows, model.family("allocation")
    station, hub = model.pairs
    n = model.network.station_count
    place = np.full((n, n), -1)
    place[station, hub] = np.arange(own.count)
    from_hub, to_hub = _attached(model)
    data = model.network.demand
    origin, destination = data.origin[flows.demand], data.destination[flows.demand]
    for family, end, role, at_hub in (
        ("origin_way", origin, flows.origin_role, from_hub),
        ("destination_way", destination, flows.destination_role, to_hub),
    ):
        told = np.flatnonzero((role == SPOKE) & (at_hub >= 0))
        pair = place[end[told], at_hub[told]]
        _add_pair_rows(model, family, told, pair)


def _add_pair_rows(model: Model, family: str, column: Ints, pair: Ints) -> None:
    own, count = model.family("allocation"), model.family("allocation").count
    keys, row = np.unique(model.flows.demand[column] * count + pair, return_inverse=True)
    first = model.family("flow").first
    label = _pair_label(model)
    model.program.pool.add(
        family,
        np.concatenate((row, np.arange(len(keys)))),
        np.concatenate((column + first, keys % count + own.first)),
        np.concatenate((np.ones(len(row)), -np.ones(len(keys)))),
        np.full(len(keys), -np.inf),
        np.zeros(len(keys)),
        lambda member: f"{model.demand_label(int(keys[member]) // count)},{label(int(keys[member]) % count)}",
    )
    pairs, row = np.unique(pair, return_inverse=True)
    demands = np.bincount(keys % count, minlength=count)[pairs].astype(np.float64)
    model.program.rows.add(
        f"{family}_use",
        np.concatenate((row, np.arange(len(pairs)))),
        np.concatenate((column + first, pairs + own.first)),
        np.concatenate((1.0 / demands[row], -np.ones(len(pairs)))),
        np.full(len(pairs), -np.inf),
        np.zeros(len(pairs)),
        keyed(label, pairs),
    )


def add_allocated_volume_rows(model: Model) -> None:
    """Departures between a station and its hub carry all that must leave (reach) the station.

    Single allocation in hub-and-spoke sends all volume of a spoke i over its hub h, at least
    Q = sum_k d_k (1 - most unserved share) each way, so sum_s c_s n_s >= Q a_ih with c the usable capacities.
    For any C > 0 and r = frac(Q / C), mixed-integer rounding (Nemhauser and Wolsey 1990) gives
    sum_s G(c_s / C) n_s >= ceil(Q / C) a_ih with G(a) = floor(a) + min(1, frac(a) / r): valid at a_ih = 1,
    trivial at 0 since every G is >= 0. One row for each type's C; they only strengthen.
    """
    network, settings = model.network, model.network.problem.settings
    if not (
        settings.single_allocation and settings.structure == "hub-and-spoke" and network.problem.vehicles
    ):
        return
    station, hub = model.pairs
    data = network.demand
    due = data.volume * (1.0 - model.program.upper[model.family("unserved").members])
    leaving = np.bincount(data.origin, weights=due, minlength=network.station_count)
    reaching = np.bincount(data.destination, weights=due, minlength=network.station_count)
    rows: list[tuple[int, list[int], Floats, float]] = []
    for pair, (i, h) in enumerate(zip(station.tolist(), hub.tolist())):
        for tail, head, volume in ((i, h, leaving[i]), (h, i, reaching[i])):
            services = _services_between(model, tail, head)
            usable = settings.max_load_factor * network.service.capacity[services]
            rows += [
                (pair, services, *_rounded(usable, float(volume), c)) for c in np.unique(usable).tolist()
            ]
    rows = [row for row in rows if row[3] > 0.0]
    own, first = model.family("allocation").first, model.family("frequency").first
    label = _pair_label(model)
    model.program.rows.add(
        "allocated_volume",
        np.array([n for n, row in enumerate(rows) for _ in range(len(row[1]) + 1)], dtype=np.int64),
        np.array([c for row in rows for c in (own + row[0], *(first + s for s in row[1]))], dtype=np.int64),
        np.array([v for row in rows for v in (row[3], *(-row[2]))]),
        np.full(len(rows), -np.inf),
        np.zeros(len(rows)),
        lambda member: f"{label(rows[member][0])}:{member}",
    )


def _services_between(model: Model, tail: int, head: int) -> list[int]:
    """Return the services whose link has a leg from `tail` to `head`."""
    network = model.network
    legs = [leg for leg in network.legs_from[tail] if network.leg.head[leg] == head]
    return [s for leg in legs for s in network.services_of[int(network.leg.link[leg])]]


def _rounded(usable: Floats, volume: float, size: float) -> tuple[Floats, float]:
    """Return (G(c_s / C), ceil(Q / C)) of the rounding; nothing is rounded where Q is a multiple of C."""
    whole = np.floor(usable / size + 1e-9)
    part = np.maximum(0.0, usable / size - whole)
    rest = volume / size - np.floor(volume / size)
    if rest < 1e-6 or rest > 1.0 - 1e-6:
        return usable / size, volume / size
    return whole + np.minimum(1.0, part / rest), float(np.ceil(volume / size))
