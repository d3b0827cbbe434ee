"""Which demand has no itinerary at all under the rules.

The existence of one itinerary is asked demand by demand, over all hubs at once; nothing is enumerated, so
hundreds of hub candidates cost no memory.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from hubdesign.network import Network
from hubdesign.problem import UNLIMITED

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: As in the enumeration: an itinerary this little beyond a limit still keeps it.
LIMIT_TOLERANCE = 1e-9


@dataclass(frozen=True)
class _Grid:
    """Length (km) and time (h) of legs by mode, from station, to station, shape (M, n, n); inf: no leg."""

    km: Floats
    hours: Floats
    hubs: Ints
    waiting: Floats  # time at each hub, h


def demands_without_itinerary(network: Network) -> list[int]:
    """Return the demands with volume that no itinerary within transfers, circuity and hours can carry."""
    settings = network.problem.settings
    wanted = np.flatnonzero(network.demand.volume > 0).tolist()
    if settings.transfers_at_most == UNLIMITED:
        return _cut_off(network, wanted)
    grid = _grid(network)
    circuity = np.inf if settings.max_circuity is None else settings.max_circuity
    return [k for k in wanted if not _has_itinerary(network, grid, k, settings.transfers_at_most, circuity)]


def _grid(network: Network) -> _Grid:
    n, leg = network.station_count, network.leg
    shape = (len(network.modes), n, n)
    km, hours = np.full(shape, np.inf), np.full(shape, np.inf)
    place = (network.link.mode[leg.link], leg.tail, leg.head)
    km[place], hours[place] = network.link.distance_km[leg.link], leg.hours
    hubs = np.flatnonzero(network.station.may_be_hub)
    return _Grid(km, hours, hubs, network.station.transfer_h[hubs])


def _has_itinerary(network: Network, grid: _Grid, k: int, transfers: int, circuity: float) -> bool:
    data = network.demand
    o, d = int(data.origin[k]), int(data.destination[k])
    most_h = float(data.max_hours[k]) * (1 + LIMIT_TOLERANCE)
    most_km = np.inf
    if o != d and not np.isnan(data.od_km[k]):
        most_km = circuity * float(data.od_km[k]) * (1 + LIMIT_TOLERANCE)
    if o == d and network.station.may_be_hub[o]:
        return True  # it stays at its own hub

    def fits(km: Floats, hours: Floats) -> bool:
        return bool((np.isfinite(km) & (km <= most_km) & (hours <= most_h)).any())

    touches = network.problem.settings.structure != "hub-and-spoke" or bool({o, d} & set(grid.hubs.tolist()))
    if o != d and touches and fits(grid.km[:, o, d], grid.hours[:, o, d]):
        return True
    inside = (grid.hubs != o) & (grid.hubs != d)
    hubs, waiting = grid.hubs[inside], grid.waiting[inside]
    if transfers < 1 or not len(hubs):
        return False
    into, out = grid.km[:, o, hubs], grid.km[:, hubs, d]
    into_h, out_h = grid.hours[:, o, hubs], grid.hours[:, hubs, d]
    if fits(into[:, None] + out[None, :], into_h[:, None] + out_h[None, :] + waiting):
        return True
    if transfers < 2 or o == d:
        return False
    pairs = np.ix_(np.arange(len(grid.km)), hubs, hubs)
    km = into[:, None, None, :, None] + grid.km[pairs][None, :, None] + out[None, None, :, None, :]
    hours = into_h[:, None, None, :, None] + grid.hours[pairs][None, :, None] + out_h[None, None, :, None, :]
    return fits(km, hours + waiting[:, None] + waiting)


def _cut_off(network: Network, wanted: list[int]) -> list[int]:
    """Return the demands whose destination no chain of legs over possible hubs reaches."""
    data, may_be_hub = network.demand, network.station.may_be_hub
    heads = [[int(network.leg.head[leg]) for leg in legs] for legs in network.legs_from]
    reached: dict[int, set[int]] = {}
    result: list[int] = []
    for k in wanted:
        o, d = int(data.origin[k]), int(data.destination[k])
        if o not in reached:
            reached[o] = _reached_from(o, heads, may_be_hub)
        if d not in reached[o] and not (o == d and may_be_hub[o]):
            result.append(k)
    return result


def _reached_from(origin: int, heads: list[list[int]], may_be_hub: NDArray[np.bool_]) -> set[int]:
    found: set[int] = set()
    front = [origin]
    while front:
        at = front.pop()
        for head in heads[at]:
            if head not in found:
                found.add(head)
                if may_be_hub[head] and head != origin:
                    front.append(head)
    return found
