"""Enumeration of itineraries: every way an O-D volume may travel within the rules.

An itinerary is a simple path of at most three legs whose interior stations may be hubs; circuity and hours
are applied here, so what is not allowed never becomes a variable. Work is done over whole arrays of demands,
one (pair of) hub(s) and mode combination at a time.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray

from hubdesign.errors import Fault, InputError
from hubdesign.network import Network
from hubdesign.problem import UNLIMITED

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

#: An itinerary this little longer than a limit still keeps it (float arithmetic).
LIMIT_TOLERANCE = 1e-9

#: More ways than this are refused in words: they would not fit a plain machine's memory.
MOST_WAYS = 8_000_000

_NONE = -1


def too_many_ways(what: str, most: int, hubs: int) -> InputError:
    """Return the refusal of a case whose ways to travel are too many to enumerate."""
    fault = Fault(
        "settings.toml [network] max_transfers",
        f"more than {most:,} {what} ({hubs} stations may be hubs)",
        "let fewer stations be hubs, allow fewer transfers, or set max_circuity or max_hours",
        "too many itineraries",
    )
    return InputError([fault])


@dataclass(frozen=True, slots=True)
class Itineraries:
    """Itineraries in order of demand, fewest transfers first; P rows.

    Attributes
    ----------
    demand
        Demand of each, shape (P,).
    legs
        Legs in order of travel, shape (P, 3); -1 beyond the last. All -1: local volume at its own hub.
    hubs
        Interior stations in order of travel, shape (P, 2); -1 where there is none.
    transfers
        Number of interior stations, shape (P,).
    length_km, hours
        Length and time (block times of the slowest types and transfer times), shape (P,).
    """

    demand: Ints
    legs: Ints
    hubs: Ints
    transfers: Ints
    length_km: Floats
    hours: Floats

    def __len__(self) -> int:
        return len(self.demand)

    def of(self, chosen: Bools | Ints) -> Itineraries:
        """Return the chosen rows."""
        return Itineraries(
            self.demand[chosen],
            self.legs[chosen],
            self.hubs[chosen],
            self.transfers[chosen],
            self.length_km[chosen],
            self.hours[chosen],
        )


def enumerate_itineraries(network: Network, max_transfers: int | None = None) -> Itineraries:
    """Return every itinerary within max_transfers, max_circuity and max_hours.

    Parameters
    ----------
    network
        The candidates.
    max_transfers
        0, 1 or 2; None takes the settings' own. "unlimited" is not enumerated: it counts as 2 here.
    """
    limit = network.problem.settings.transfers_at_most if max_transfers is None else max_transfers
    limit = 2 if limit == UNLIMITED else limit
    lookup = leg_lookup(network)
    hubs = np.flatnonzero(network.station.may_be_hub).tolist()
    local = network.demand.origin == network.demand.destination
    parts = [_nonstops(network, lookup, np.flatnonzero(~local))]
    if limit >= 1:
        parts += [_one_stop(network, lookup, hub) for hub in hubs]
    if limit >= 2:
        count = sum(len(part[0]) for part in parts)
        for first, second in product(hubs, hubs):
            parts.append(_two_stops(network, lookup, first, second, local))
            count += len(parts[-1][0])
            if count > MOST_WAYS:
                raise too_many_ways("itineraries", MOST_WAYS, len(hubs))
    parts.append(_stays(network, np.flatnonzero(local)))
    demand = np.concatenate([part[0] for part in parts])
    legs = np.concatenate([part[1] for part in parts])
    stops = np.concatenate([part[2] for part in parts])
    order = np.lexsort((legs[:, 2], legs[:, 1], legs[:, 0], (stops >= 0).sum(axis=1), demand))
    return _with_figures(network, demand[order], legs[order], stops[order])


_Part = tuple[Ints, Ints, Ints]


def leg_lookup(network: Network) -> Ints:
    """Return the leg from i to j by mode m, shape (M, n, n); -1 where there is none."""
    n = network.station_count
    lookup = np.full((len(network.modes), n, n), _NONE, dtype=np.int64)
    leg = network.leg
    lookup[network.link.mode[leg.link], leg.tail, leg.head] = np.arange(len(leg.link))
    return lookup


def _nonstops(network: Network, lookup: Ints, demand: Ints) -> _Part:
    origin, destination = network.demand.origin[demand], network.demand.destination[demand]
    parts = [_keep(network, demand, (lookup[m][origin, destination],), ()) for m in range(len(lookup))]
    return _join(parts)


def _one_stop(network: Network, lookup: Ints, hub: int) -> _Part:
    """Return o-hub-d for all demands; for local volume (o = d) this is i-hub-i."""
    origin, destination = network.demand.origin, network.demand.destination
    demand = np.flatnonzero((origin != hub) & (destination != hub))
    o, d = origin[demand], destination[demand]
    modes = range(len(lookup))
    return _join(
        [
            _keep(network, demand, (lookup[first][o, hub], lookup[second][hub, d]), (hub,))
            for first, second in product(modes, modes)
        ]
    )


def _two_stops(network: Network, lookup: Ints, first: int, second: int, local: Bools) -> _Part:
    """Return o-first-second-d for all demands but local ones."""
    origin, destination = network.demand.origin, network.demand.destination
    modes = range(len(lookup))
    if first == second or all(lookup[m][first, second] == _NONE for m in modes):
        return _join([])
    inside = (origin != first) & (origin != second) & (destination != first) & (destination != second)
    demand = np.flatnonzero(inside & ~local)
    o, d = origin[demand], destination[demand]
    parts = []
    for a, b, c in product(modes, modes, modes):
        middle = lookup[b][first, second]
        if middle != _NONE:
            legs = (lookup[a][o, first], np.full(len(demand), middle), lookup[c][second, d])
            parts.append(_keep(network, demand, legs, (first, second)))
    return _join(parts)


def _stays(network: Network, local: Ints) -> _Part:
    """Return local volume that stays at its own (possible) hub: no leg at all."""
    demand = local[network.station.may_be_hub[network.demand.origin[local]]]
    return demand, np.full((len(demand), 3), _NONE), np.full((len(demand), 2), _NONE)


def _keep(network: Network, demand: Ints, legs: tuple[Ints, ...], hubs: tuple[int, ...]) -> _Part:
    """Return those whose legs all exist and that keep circuity and hours."""
    found = np.logical_and.reduce([leg != _NONE for leg in legs])
    demand, legs = demand[found], tuple(leg[found] for leg in legs)
    length, hours = _figures(network, legs, hubs)
    fits = hours <= network.demand.max_hours[demand] * (1 + LIMIT_TOLERANCE)
    circuity = network.problem.settings.max_circuity
    if circuity is not None:
        od_km = network.demand.od_km[demand]
        local = network.demand.origin[demand] == network.demand.destination[demand]
        fits &= local | np.isnan(od_km) | (length <= circuity * od_km * (1 + LIMIT_TOLERANCE))
    demand = demand[fits]
    padded = np.full((len(demand), 3), _NONE, dtype=np.int64)
    for place, leg in enumerate(legs):
        padded[:, place] = leg[fits]
    stops = np.full((len(demand), 2), _NONE, dtype=np.int64)
    stops[:, : len(hubs)] = hubs
    return demand, padded, stops


def _figures(network: Network, legs: tuple[Ints, ...], hubs: tuple[int, ...]) -> tuple[Floats, Floats]:
    """Return length (km) and hours of paths with the same interior stations."""
    link = network.leg.link
    length = sum((network.link.distance_km[link[leg]] for leg in legs), start=np.zeros(len(legs[0])))
    waiting = sum(float(network.station.transfer_h[hub]) for hub in hubs)
    hours = sum((network.leg.hours[leg] for leg in legs), start=np.full(len(legs[0]), waiting))
    return length, hours


def _with_figures(network: Network, demand: Ints, legs: Ints, stops: Ints) -> Itineraries:
    # A padding entry of -1 reads the 0 appended at the end.
    leg_km = np.append(network.link.distance_km[network.leg.link], 0.0)
    leg_h = np.append(network.leg.hours, 0.0)
    transfer_h = np.append(network.station.transfer_h, 0.0)
    return Itineraries(
        demand=demand,
        legs=legs,
        hubs=stops,
        transfers=(stops != _NONE).sum(axis=1).astype(np.int64),
        length_km=leg_km[legs].sum(axis=1),
        hours=leg_h[legs].sum(axis=1) + transfer_h[stops].sum(axis=1),
    )


def _join(parts: list[_Part]) -> _Part:
    if not parts:
        return np.zeros(0, dtype=np.int64), np.zeros((0, 3), dtype=np.int64), np.zeros((0, 2), dtype=np.int64)
    return (
        np.concatenate([part[0] for part in parts]),
        np.concatenate([part[1] for part in parts]),
        np.concatenate([part[2] for part in parts]),
    )
