"""Links that no best plan needs, found before anything is solved."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.model.layout import Model
from hubdesign.model.objective import Objective

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


def hopeless_links(model: Model, objective: Objective) -> Bools:
    """Return which links may be shut without losing any best plan, shape (E,).

    Taken are both-way links used by nonstops alone, whose demands may all stay unserved, that are no must
    and whose ends need no least departures. Shutting such a link and leaving its volume unserved keeps every
    rule (all limits are upper limits) and changes the objective by what the link costs less what its volume
    brings. An upper bound on that gain: a first whole departure of some type, further capacity at the
    cheapest rate of any type, all volume of either direction that fits, vehicles for nothing. A link
    whose bound is not positive is shut; the bound is piecewise linear in the capacity, so it is looked up
    at its corners. Own argument; only for money goals.
    """
    network, program = model.network, model.program
    count = network.link_count
    result = np.zeros(count, dtype=bool)
    if objective.phase == "volume" or not len(network.service.link):
        return result
    demand, worth, open_to_it = _nonstops(model, objective)
    if not open_to_it.any():
        return result
    price = objective.coefficients[model.family("frequency").members]
    usable = network.problem.settings.max_load_factor * network.service.capacity
    fixed = objective.coefficients[model.family("link").members]
    must = program.lower[model.family("link").members] > 0.0
    volume = np.append(network.demand.volume, 1.0)
    for link in np.flatnonzero(open_to_it & ~must).tolist():
        services = list(network.services_of[link])
        sizes, prices = usable[services], price[services]
        good = sizes > 0.0
        if not good.any():
            result[link] = True
            continue
        rate = float((prices[good] / sizes[good]).min())
        volumes, gains = volume[demand[link]], worth[link]
        best = -np.inf
        for size, cost in zip(sizes.tolist(), prices.tolist()):
            for offer in {size, *(v for v in volumes.tolist() if v > size)}:
                carried = float((gains * np.minimum(1.0, offer / np.maximum(volumes, 1e-300))).sum())
                best = max(best, carried - cost - rate * (offer - size))
        result[link] = best - fixed[link] <= 0.0
    return result


def _nonstops(model: Model, objective: Objective) -> tuple[Ints, Floats, Bools]:
    """Return, per link and direction, the nonstop's demand and worth, and which links qualify.

    Shapes (E, 2); demand -1 where no volume goes that way, its worth 0. The worth is what serving all of the
    demand nonstop takes off the minimised objective; the best role of its ends counts.
    """
    network, flows, program = model.network, model.flows, model.program
    count = network.link_count
    demand = np.full((count, 2), -1, dtype=np.int64)
    worth = np.zeros((count, 2))
    legs_used = np.bincount(flows.on_leg.column, minlength=len(flows))
    link = network.leg.link[flows.on_leg.item]
    single = legs_used[flows.on_leg.column] == 1
    shared = np.zeros(count, dtype=bool)
    shared[link[~single]] = True
    unserved = model.family("unserved")
    may_stay = program.upper[unserved.members] >= 1.0
    x = objective.coefficients[model.family("flow").members]
    s = objective.coefficients[unserved.members]
    column, leg = flows.on_leg.column[single], flows.on_leg.item[single]
    of_demand = flows.demand[column]
    way = (network.forward_leg[network.leg.link[leg]] != leg).astype(np.int64)
    gain = s[of_demand] - x[column]
    np.maximum.at(worth, (link[single], way), gain)
    clash = (demand[link[single], way] >= 0) & (demand[link[single], way] != of_demand)
    demand[link[single], way] = of_demand
    fits = network.link.both & ~shared
    # Two demands of one station pair and direction: left alone rather than added up.
    again = demand[link[single], way] != of_demand
    fits[link[single][clash | again]] = False
    fits[link[single][~may_stay[of_demand]]] = False
    for ends in (network.link.tail, network.link.head):
        fits &= ~(network.station.min_departures[ends] > 0.0)
    return demand, worth, fits
