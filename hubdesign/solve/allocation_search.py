"""A first plan under single allocation with a fleet: local search over hubs, allocations and modes.

Under single allocation the way of every demand follows from the allocation, so the volume on each pair of
stations is known and the cheapest mix of departures that carries it can be looked up. The search moves one
station to another hub, or opens, shuts or swaps a hub. What it prices is a guide only (vehicles count by
their hours, limits by penalties): the caller turns the result into a plan that is checked and priced.
"""

from __future__ import annotations

import random
from dataclasses import dataclass
from itertools import combinations, product
from math import comb

import numpy as np
from numpy.typing import NDArray

from hubdesign.model.layout import Model
from hubdesign.network import Network
from hubdesign.solve.control import Control
from hubdesign.solve.finish import set_fleet

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Mixes tried per link at the most; beyond that only one type at a time is used.
_MOST_MIXES = 20_000

#: Up to this many hub sets of a size are all tried.
_FEW_SETS = 40

#: Price of breaking a limit, as a multiple of the cost of a first plan.
_PENALTY = 10.0


@dataclass(frozen=True, slots=True)
class _Link:
    """The cheapest ways to carry a volume on a link: `offer` ascending, `cost` and `mix` to match."""

    link: int
    hours: float
    fixed: float
    unit_cost: float
    services: tuple[int, ...]
    offer: Floats
    cost: Floats
    mix: Ints  # (steps, services)


@dataclass(frozen=True, slots=True)
class _Choice:
    """A link for a pair of stations, the step of its mixes that carries the volume, and what that costs."""

    link: _Link
    step: int
    cost: float


@dataclass(frozen=True, slots=True)
class _State:
    hubs: tuple[int, ...]
    allocation: tuple[int, ...]


def search_allocation(model: Model, control: Control, *, time_share: float = 0.15) -> list[Floats]:
    """Return points (integers only) of the best states found, best first.

    Empty where the search does not apply: no single allocation, no fleet, one-way links, or no pair of
    stations joined. Moves are counted, so that a finished search is repeatable; the limit cuts it short.
    """
    network = model.network
    settings = network.problem.settings
    if not (settings.single_allocation and network.problem.vehicles and network.link.both.all()):
        return []
    search = _Search(network, control, control.elapsed_s() + time_share * control.remaining_s())
    found: list[tuple[float, _State]] = []
    for size in search.sizes():
        state = search.best_of_size(size)
        if state is not None:
            found.append(state)
        if search.out_of_time():
            break
    found.sort(key=lambda entry: (entry[0], entry[1].hubs))
    return [search.point(model, state) for _, state in found[:3]]


class _Search:
    def __init__(self, network: Network, control: Control, deadline_s: float) -> None:
        self.network = network
        self.control = control
        self.deadline_s = deadline_s
        self.rng = random.Random(control.seed)
        n = network.station_count
        data = network.demand
        self.volume = np.zeros((n, n))
        np.add.at(self.volume, (data.origin, data.destination), data.volume)
        self.hours = np.full((n, n), np.inf)
        np.minimum.at(self.hours, (data.origin, data.destination), data.max_hours)
        self.links: dict[tuple[int, int], list[_Link]] = {}
        for link in range(network.link_count):
            entry = _priced_link(network, link)
            ends = (int(network.link.tail[link]), int(network.link.head[link]))
            self.links.setdefault(ends, []).append(entry)
            self.links.setdefault(ends[::-1], []).append(entry)
        self.hubs = np.flatnonzero(network.station.may_be_hub).tolist()
        self.must = np.flatnonzero(network.station.must_be_hub).tolist()
        self._known: dict[_State, float] = {}
        self.penalty = _PENALTY

    def out_of_time(self) -> bool:
        return self.control.stop_requested() or self.control.elapsed_s() > self.deadline_s

    def sizes(self) -> list[int]:
        fewest, most = self.network.problem.settings.hub_count
        least = max(1, fewest, len(self.must))
        return list(range(least, (len(self.hubs) if most is None else min(most, len(self.hubs))) + 1))

    def best_of_size(self, size: int) -> tuple[float, _State] | None:
        """Return the best hub set of a size: of all where there are few, else a local optimum."""
        free = [h for h in self.hubs if h not in self.must]
        if comb(len(free), size - len(self.must)) <= _FEW_SETS:
            sets = [(*self.must, *extra) for extra in combinations(free, size - len(self.must))]
            settled = [self._settled(hubs) for hubs in sets if not self.out_of_time()]
            best = min(settled, key=lambda entry: (entry[0], entry[1].hubs), default=None)
            return best if best is not None and np.isfinite(best[0]) else None
        return self._exchanged(size)

    def _exchanged(self, size: int) -> tuple[float, _State] | None:
        """Return the local optimum over exchanges of one hub, from a greedy start."""
        chosen = list(self.must)
        while len(chosen) < size:
            options = [self._settled((*chosen, h)) for h in self.hubs if h not in chosen]
            if not options:
                return None
            chosen = list(min(options, key=lambda entry: (entry[0], entry[1].hubs))[1].hubs)
            if self.out_of_time():
                break
        best = self._settled(tuple(chosen))
        improved = True
        while improved and not self.out_of_time():
            improved = False
            for out, into in product(list(best[1].hubs), self.hubs):
                if into in best[1].hubs or out in self.must or out not in best[1].hubs:
                    continue
                rival = self._settled((*(h for h in best[1].hubs if h != out), into))
                if rival[0] < best[0] * (1 - 1e-9):
                    best, improved = rival, True
                if self.out_of_time():
                    break
        return best if np.isfinite(best[0]) else None

    def _settled(self, hubs: tuple[int, ...]) -> tuple[float, _State]:
        """Return the best allocation to `hubs` that moving one station at a time reaches."""
        state = self._nearest(tuple(sorted(hubs)))
        value = self.value(state)
        improved = True
        while improved and not self.out_of_time():
            improved = False
            for station in range(self.network.station_count):
                if station in state.hubs:
                    continue
                for hub in state.hubs:
                    moved = (*state.allocation[:station], hub, *state.allocation[station + 1 :])
                    rival = _State(state.hubs, moved)
                    if hub != state.allocation[station] and (cost := self.value(rival)) < value * (1 - 1e-9):
                        state, value, improved = rival, cost, True
        return value, state

    def _nearest(self, hubs: tuple[int, ...]) -> _State:
        """Return every station at the hub it reaches in the least time."""

        def reach(station: int, hub: int) -> tuple[float, int]:
            links = self.links.get((station, hub), [])
            return (min((entry.hours for entry in links), default=np.inf), hub)

        allocation = tuple(
            i if i in hubs else min(hubs, key=lambda h, i=i: reach(i, h))  # type: ignore[misc]
            for i in range(self.network.station_count)
        )
        return _State(hubs, allocation)

    def value(self, state: _State) -> float:
        """Return the guide price of a state; infinite where two stations it needs are not joined."""
        if state not in self._known:
            self._known[state] = self._value(state)
        return self._known[state]

    def _value(self, state: _State) -> float:
        station = self.network.station
        flows, passing, collected = self._flows(state)
        total = float(station.hub_fixed_cost[list(state.hubs)].sum()) + float(
            (passing * station.transfer_cost).sum()
        )
        over = 0.0
        for capacity, load in ((station.hub_capacity, passing), (station.collection_capacity, collected)):
            limited = np.isfinite(capacity)
            excess = np.maximum(0.0, load[limited] - capacity[limited]) / np.maximum(capacity[limited], 1e-9)
            over += float(excess.sum())
        chosen = self._choices(state, flows)
        if chosen is None:
            return np.inf
        total += sum(choice.cost for choice in chosen.values())
        over += self._late(state, chosen)
        return total * (1.0 + self.penalty * over) if over > 0.0 else total

    def _choices(
        self, state: _State, flows: dict[tuple[int, int], tuple[float, float]]
    ) -> dict[tuple[int, int], _Choice] | None:
        """Return the link and mix of each pair: the cheapest, then faster ones where itineraries are late.

        None where a pair is not joined or nothing there carries its volume.
        """
        options = {pair: self._options(*pair, *volumes) for pair, volumes in flows.items()}
        if not all(options.values()):
            return None
        chosen = {pair: choices[0] for pair, choices in options.items()}
        late = self._late(state, chosen)
        while late > 0.0:
            best: tuple[float, tuple[int, int], _Choice, float] | None = None
            for pair, choices in options.items():
                for choice in choices:
                    if choice.link.hours < chosen[pair].link.hours:
                        rest = self._late(state, {**chosen, pair: choice})
                        rate = (late - rest) / max(choice.cost - chosen[pair].cost, 1e-9)
                        if rest < late and (best is None or rate > best[0]):
                            best = (rate, pair, choice, rest)
            if best is None:
                break
            chosen[best[1]], late = best[2], best[3]
        return chosen

    def _flows(self, state: _State) -> tuple[dict[tuple[int, int], tuple[float, float]], Floats, Floats]:
        """Return volume each way per pair of stations, volume passing and volume collected per station."""
        own = np.array(state.allocation)
        n = len(own)
        onto = np.zeros((n, n))
        onto[np.arange(n), own] = 1.0
        moving = self.volume.copy()
        is_hub = own == np.arange(n)
        between = onto.T @ moving @ onto
        leaving, reaching = moving.sum(axis=1), moving.sum(axis=0)
        flows: dict[tuple[int, int], tuple[float, float]] = {}
        for i in range(n):
            if not is_hub[i]:
                flows[i, int(own[i])] = (float(leaving[i]), float(reaching[i]))
        for a, b in product(state.hubs, state.hubs):
            if a < b and (between[a, b] > 0.0 or between[b, a] > 0.0):
                flows[a, b] = (float(between[a, b]), float(between[b, a]))
        collected = onto.T @ leaving
        spoke_out = np.where(is_hub, 0.0, leaving)
        spoke_in = np.where(is_hub, 0.0, reaching)
        within = np.zeros(n)
        same = own[:, None] == own[None, :]
        both_spokes = ~is_hub[:, None] & ~is_hub[None, :]
        np.add.at(within, own, (moving * (same & both_spokes)).sum(axis=1))
        to_own_hub = np.array([moving[i, own[i]] if not is_hub[i] else 0.0 for i in range(n)])
        from_own_hub = np.array([moving[own[i], i] if not is_hub[i] else 0.0 for i in range(n)])
        passing = onto.T @ (spoke_out - to_own_hub) + onto.T @ (spoke_in - from_own_hub) - within
        return flows, passing, collected

    def _options(self, i: int, j: int, there: float, back: float) -> list[_Choice]:
        """Return what carries these volumes between two stations, cheapest first."""
        result = []
        for entry in self.links.get((i, j), []):
            step = int(np.searchsorted(entry.offer, max(there, back) * (1 - 1e-9)))
            if step < len(entry.offer):
                cost = entry.fixed + float(entry.cost[step]) + entry.unit_cost * (there + back)
                result.append(_Choice(entry, step, cost))
        return sorted(result, key=lambda choice: (choice.cost, choice.link.link))

    def _late(self, state: _State, chosen: dict[tuple[int, int], _Choice]) -> float:
        """Return by how much itineraries exceed their hours, as a share summed over demands."""
        if not np.isfinite(self.hours).any():
            return 0.0
        hours: dict[tuple[int, int], float] = {}
        for (i, j), choice in chosen.items():
            hours[i, j] = hours[j, i] = choice.link.hours
        own = np.array(state.allocation)
        n = len(own)
        wait = self.network.station.transfer_h
        to_hub = np.array([0.0 if own[i] == i else hours[i, int(own[i])] + wait[own[i]] for i in range(n)])
        across = np.zeros((n, n))
        for a, b in product(state.hubs, state.hubs):
            if a != b:
                across[a, b] = hours.get((a, b), np.inf)
        times = to_hub[:, None] + across[own][:, own] + to_hub[None, :]
        once = (
            (own[:, None] == own[None, :]) & (own != np.arange(n))[:, None] & (own != np.arange(n))[None, :]
        )
        times -= np.where(once, wait[own][:, None], 0.0)
        ends_at_hub = own[:, None] == np.arange(n)[None, :]
        times -= np.where(ends_at_hub & (own != np.arange(n))[:, None], wait[own][:, None], 0.0)
        starts_at_hub = np.arange(n)[:, None] == own[None, :]
        times -= np.where(starts_at_hub & (own != np.arange(n))[None, :], wait[own][None, :], 0.0)
        late = np.where(self.volume > 0, np.maximum(0.0, times / self.hours - 1.0), 0.0)
        return float(np.minimum(np.nan_to_num(late, posinf=10.0), 10.0).sum())

    def point(self, model: Model, state: _State) -> Floats:
        """Return the integers of a state: hubs, allocation, links, departures, fleet."""
        values = np.zeros(model.program.column_count)
        values[model.family("hub").first + np.array(state.hubs)] = 1.0
        station, hub = model.pairs
        values[model.family("allocation").members] = np.array(state.allocation)[station] == hub
        flows, _, _ = self._flows(state)
        for choice in (self._choices(state, flows) or {}).values():
            values[model.family("link").first + choice.link.link] = 1.0
            services = model.family("frequency").first + np.array(choice.link.services)
            values[services] = choice.link.mix[choice.step]
        set_fleet(model, values)
        return values


def _priced_link(network: Network, link: int) -> _Link:
    """Return the Pareto steps (offer, cost) of mixes of departures on a link."""
    services = network.services_of[link]
    settings, service = network.problem.settings, network.service
    usable = settings.max_load_factor * service.capacity[list(services)]
    price = np.array([_departure_cost(network, s) for s in services])
    most = network.demand.volume.sum()
    ranges = [np.arange(min(int(np.ceil(most / c)), 60) + 1) for c in usable.tolist()]
    if np.prod([len(r) for r in ranges]) > _MOST_MIXES:
        rows = [
            np.eye(len(services), dtype=np.int64)[k] * count
            for k, r in enumerate(ranges)
            for count in r.tolist()
        ]
        mixes = np.array(rows, dtype=np.int64)
    else:
        mixes = np.stack(np.meshgrid(*ranges, indexing="ij"), axis=-1).reshape(-1, len(services))
    total = mixes.sum(axis=1)
    least = max(1.0, float(network.link.min_frequency[link]))
    allowed = (total >= least) & (total <= network.link.max_frequency[link])
    mixes = mixes[allowed]
    offer, cost = mixes @ usable, mixes @ price
    order = np.lexsort((-offer, cost))
    front = np.maximum.accumulate(offer[order])
    first = np.concatenate(([True], front[1:] > front[:-1])) if len(order) else np.zeros(0, dtype=bool)
    kept = order[first]
    leg = int(network.forward_leg[link])
    return _Link(
        link,
        float(network.leg.hours[leg]),
        float(network.link.fixed_cost[link]),
        float(network.link.unit_cost[link]),
        services,
        offer[kept],
        cost[kept],
        mixes[kept],
    )


def _departure_cost(network: Network, service: int) -> float:
    """Return the cost of a departure each way, the vehicle's share by its hours included."""
    data, link = network.service, int(network.service.link[service])
    vehicle = network.problem.vehicles[int(data.vehicle[service])]
    settings = network.problem.settings
    once = (
        float(data.trip_cost[service]) + float(data.co2_kg[service]) * settings.co2_price_per_tonne / 1000.0
    )
    if vehicle.hours_per_vehicle is not None:
        once += vehicle.cost_per_vehicle * float(data.vehicle_h[service]) / vehicle.hours_per_vehicle
    fees = network.station.departure_fee[[network.link.tail[link], network.link.head[link]]].sum()
    return 2.0 * once + float(fees)
