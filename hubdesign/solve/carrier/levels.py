"""Levels: the exact hull of links that only nonstops use, by listing the mixes of departures on them.

On such a link at most one demand travels each way. With a binary z_l for each useful mix l (departures n_sl
by type), ``sum_l z_l = y``, ``n_s = sum_l n_sl z_l`` and ``x_k <= sum_l min(1, a_l / d_k) z_l`` with a_l the
usable capacity of the mix describe the convex hull of (y, n, x): given z the two shares are boxes with whole
corners (multiple choice formulation: Croxton, Gendron and Magnanti 2003, Management Science 49:1268-1273).

A mix is useful unless one departure of it can be left out while the larger of the two demands still fits
(and min_frequency still holds): leaving it out keeps all rules, which limit departures from above only, and
never costs more. So listing the useful mixes loses no best plan.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.itineraries import LIMIT_TOLERANCE
from hubdesign.model.layout import Model
from hubdesign.model.variables import needs_empty_trips
from hubdesign.network import Network

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

#: A link with more useful mixes than this is left to the cuts.
_MOST_MIXES = 60


def nonstop_links(model: Model) -> Bools:
    """Return which links only nonstops use, both ways open and at most one demand a direction, shape (E,)."""
    network, flows = model.network, model.flows
    count = network.link_count
    legs_used = np.bincount(flows.on_leg.column, minlength=len(flows))
    link = network.leg.link[flows.on_leg.item]
    result = network.link.both.copy()
    result[link[legs_used[flows.on_leg.column] > 1]] = False
    pairs = np.unique(flows.on_leg.item * len(network.demand.volume) + flows.demand[flows.on_leg.column])
    demands = np.bincount(pairs // len(network.demand.volume), minlength=len(network.leg.link))
    result[network.leg.link[demands > 1]] = False
    used = np.zeros(count, dtype=bool)
    used[link] = True
    return result & used


def add_levels(model: Model, closed: Bools) -> int:
    """Add level columns and rows for the nonstop links that are not `closed`; return how many links got them.

    The link and departure columns stay as they are, so everything written for them still holds.
    """
    network = model.network
    if needs_empty_trips(network) or not len(network.service.link):
        return 0
    on = np.full(len(network.leg.link), -1, dtype=np.int64)
    on[model.flows.on_leg.item] = model.flows.demand[model.flows.on_leg.column]
    links, owner, mixes = [], [], []
    for link in np.flatnonzero(nonstop_links(model) & ~closed).tolist():
        legs = [int(network.forward_leg[link]), int(network.backward_leg[link])]
        volumes = [float(network.demand.volume[on[leg]]) for leg in legs if on[leg] >= 0]
        found = useful_mixes(network, link, max(volumes, default=0.0))
        if found is not None and len(found):
            owner += [len(links)] * len(found)
            mixes += found
            links.append(link)
    if links:
        _add_rows(model, np.array(links), np.array(owner), mixes, on)
    return len(links)


def useful_mixes(network: Network, link: int, volume: float) -> list[tuple[int, ...]] | None:
    """Return the useful mixes (departures by service of `link`), None where there are too many."""
    services = list(network.services_of[link])
    usable = network.problem.settings.max_load_factor * network.service.capacity[services]
    least = max(1.0, float(np.ceil(network.link.min_frequency[link] - LIMIT_TOLERANCE)))
    most = float(np.floor(network.link.max_frequency[link] + LIMIT_TOLERANCE))
    result: list[tuple[int, ...]] = []
    waiting = [(0,) * len(services)]
    seen = set(waiting)
    while waiting:
        mix = waiting.pop()
        offer, total = float(np.dot(mix, usable)), sum(mix)
        if total >= least:
            result.append(mix)
        if len(seen) > 8 * _MOST_MIXES or len(result) > _MOST_MIXES:
            return None
        for place in range(len(services)):
            larger = (*mix[:place], mix[place] + 1, *mix[place + 1 :])
            if larger in seen or total + 1 > most:
                continue
            # One departure less must not do: neither for the volume nor for the frequency.
            reach = offer + usable[place]
            spare = min(usable[k] for k in range(len(services)) if larger[k])
            if total + 1 <= least or reach - spare < volume:
                seen.add(larger)
                waiting.append(larger)
    return sorted(result)


def _add_rows(
    model: Model, links: Ints, owner: Ints, mixes: list[tuple[int, ...]], on: Ints
) -> None:
    network, program = model.network, model.program
    count = len(owner)

    def label(member: int) -> str:
        counts = "+".join(str(n) for n in mixes[member])
        return f"{model.link_label(int(links[owner[member]]))}:{counts}"

    level = program.add_columns(
        "level", np.zeros(count), np.ones(count), integer=True, label=label
    )
    number = np.arange(len(links))
    zero = np.zeros(len(links))
    program.rows.add(
        "level_link",
        np.concatenate((owner, number)),
        np.concatenate((level.indices, links + model.family("link").first)),
        np.concatenate((np.ones(count), -np.ones(len(links)))),
        zero,
        zero,
        lambda member: model.link_label(int(links[member])),
    )
    _add_departures(model, links, owner, mixes, level.first)
    _add_shares(model, links, owner, mixes, on, level.first)


def _add_departures(model: Model, links: Ints, owner: Ints, mixes: list[tuple[int, ...]], first: int) -> None:
    """n_s = sum of departures of the levels."""
    network = model.network
    services = [s for link in links.tolist() for s in network.services_of[link]]
    start = np.cumsum([0, *(len(network.services_of[link]) for link in links.tolist())])
    rows, columns, values = [], [], []
    for member, mix in enumerate(mixes):
        for place, departures in enumerate(mix):
            if departures:
                rows.append(int(start[owner[member]]) + place)
                columns.append(first + member)
                values.append(float(departures))
    zero = np.zeros(len(services))
    model.program.rows.add(
        "level_departures",
        np.concatenate((np.array(rows, dtype=np.int64), np.arange(len(services)))),
        np.concatenate((np.array(columns, dtype=np.int64), np.array(services) + model.family("frequency").first)),
        np.concatenate((np.array(values), -np.ones(len(services)))),
        zero,
        zero,
        lambda member: model.service_label(services[member]),
    )


def _add_shares(
    model: Model, links: Ints, owner: Ints, mixes: list[tuple[int, ...]], on: Ints, first: int
) -> None:
    """Share travelling each way <= what the levels have room for."""
    network, flows = model.network, model.flows
    load = network.problem.settings.max_load_factor
    place = np.full(len(network.leg.link), -1, dtype=np.int64)
    legs = [leg for link in links.tolist() for leg in (network.forward_leg[link], network.backward_leg[link])]
    legs = [int(leg) for leg in legs if on[leg] >= 0]
    place[legs] = np.arange(len(legs))
    inside = place[flows.on_leg.item] >= 0
    rows = [place[flows.on_leg.item[inside]]]
    columns = [flows.on_leg.column[inside] + model.family("flow").first]
    values = [np.ones(int(inside.sum()))]
    offer = np.array(
        [
            load * float(np.dot(mix, network.service.capacity[list(network.services_of[links[owner[member]]])]))
            for member, mix in enumerate(mixes)
        ]
    )
    for legs_of in (network.forward_leg[links], network.backward_leg[links]):
        leg = legs_of[owner]
        there = np.flatnonzero(place[leg] >= 0)
        volume = network.demand.volume[on[leg[there]]]
        rows.append(place[leg[there]])
        columns.append(first + there)
        values.append(-np.minimum(1.0, offer[there] / np.maximum(volume, 1e-300)))
    model.program.rows.add(
        "level_room",
        np.concatenate(rows),
        np.concatenate(columns),
        np.concatenate(values),
        np.full(len(legs), -np.inf),
        np.zeros(len(legs)),
        lambda member: model.leg_label(legs[member]),
    )
