"""Single allocation as costs of a choice per station: the pieces every part of the engine shares.

With x_ik = 1 where station i belongs to hub k (a hub to itself), the cost of a plan is

    sum_k fixed_k x_kk + sum_ik own_ik x_ik + sum_{i<j} sum_km pair_ij(k, m) x_ik x_jm
    pair_ij(k, m) = w_ij between_km + w_ji between_mk

(O'Kelly 1987, EJOR 32:393-404). `own` holds entry, exit and local volume. This is exact, not a relaxation.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Self

import numpy as np

from hubdesign.solve.hub_location.instance import Bools, Floats, HubInstance, Ints
from hubdesign.solve.hub_location.relaxation import Relaxation

#: A capacity may be exceeded by this share: the arithmetic of sums, not a concession.
CAPACITY_SLACK = 1e-9


@dataclass(frozen=True, slots=True)
class Choice:
    """Costs and loads of allocating n stations to K hubs, scaled as the relaxation they come from.

    Attributes
    ----------
    hubs
        (K,), stations of the hubs.
    own, between, fixed, forced
        (n, K), (K, K), (K,), (K,).
    volume
        (n, n), scaled, diagonal 0.
    load, capacity
        (n,) and (K,): origin volume and collection capacity, unscaled.
    hubs_min, hubs_max
        Fewest and most hubs.
    """

    hubs: Ints
    own: Floats
    between: Floats
    fixed: Floats
    forced: Bools
    volume: Floats
    load: Floats
    capacity: Floats
    hubs_min: int
    hubs_max: int

    @classmethod
    def of(cls, relaxation: Relaxation, instance: HubInstance) -> Self:
        """Return the costs over the hubs of `relaxation` (built without closure)."""
        volume = relaxation.volume.copy()
        np.fill_diagonal(volume, 0.0)
        own = (
            volume.sum(axis=1)[:, None] * relaxation.entry
            + volume.sum(axis=0)[:, None] * relaxation.exit.T
            + np.diag(relaxation.volume)[:, None] * relaxation.local
        )
        return cls(
            hubs=relaxation.hubs,
            own=own,
            between=relaxation.between,
            fixed=relaxation.fixed,
            forced=relaxation.forced,
            volume=volume,
            load=instance.volume.sum(axis=1),
            capacity=instance.collection_capacity[relaxation.hubs],
            hubs_min=relaxation.hubs_min,
            hubs_max=relaxation.hubs_max,
        )

    def cost(self, allocation: Ints) -> float:
        """Return the scaled cost of `allocation` (n,), positions among the hubs."""
        opened = np.unique(allocation)
        between = self.between[np.ix_(allocation, allocation)]
        own = self.own[np.arange(len(allocation)), allocation]
        return float(self.fixed[opened].sum() + own.sum() + np.vdot(self.volume, between))

    def move_costs(self, allocation: Ints, opened: Ints) -> Floats:
        """Return the cost of each station at each hub of `opened`, the others staying, (n, p)."""
        count = len(self.hubs)
        sent = np.zeros((len(allocation), count))
        received = np.zeros((len(allocation), count))
        for hub in np.unique(allocation):
            members = allocation == hub
            sent[:, hub] = self.volume[:, members].sum(axis=1)
            received[:, hub] = self.volume[members].sum(axis=0)
        onward = sent @ self.between[opened].T + received @ self.between[:, opened]
        return np.asarray(self.own[:, opened] + onward)

    def fits(self, allocation: Ints) -> bool:
        """Whether no collection capacity is exceeded."""
        used = np.bincount(allocation, self.load, len(self.hubs))
        return bool((used <= self.capacity * (1.0 + CAPACITY_SLACK)).all())

    def home(self, opened: Ints) -> tuple[Bools, Ints]:
        """Return which stations are open hubs, and the position of that hub (0 elsewhere)."""
        is_hub = np.zeros(len(self.own), dtype=bool)
        is_hub[self.hubs[opened]] = True
        place = np.zeros(len(self.own), dtype=np.int64)
        place[self.hubs[opened]] = opened
        return is_hub, place


def allocate(choice: Choice, opened: Ints, guess: Floats | None = None) -> tuple[float, Ints] | None:
    """Return a locally best allocation to the hubs `opened` and its cost; None where none fits is found.

    Parameters
    ----------
    guess
        (n, K), larger where a station more likely belongs; by default the cheapest hub of each station.
    """
    is_hub, place = choice.home(opened)
    preference = -choice.own if guess is None else guess - 1e-6 * choice.own
    allocation = opened[preference[:, opened].argmax(axis=1)]
    allocation[is_hub] = place[is_hub]
    if np.isfinite(choice.capacity[opened]).any():
        repaired = _repair(choice, allocation, opened, is_hub)
        if repaired is None:
            return None
        allocation = _improve_within_capacity(choice, repaired, opened, is_hub)
    else:
        allocation = _improve(choice, allocation, opened, is_hub)
    return choice.cost(allocation), allocation


def _improve(choice: Choice, allocation: Ints, opened: Ints, is_hub: Bools) -> Ints:
    """Move the station that gains most, one at a time after a first joint step, until none gains."""
    allocation = allocation.copy()
    stations = np.arange(len(allocation))
    position = np.zeros(len(choice.hubs), dtype=np.int64)
    position[opened] = np.arange(len(opened))
    for _ in range(4 * len(allocation)):
        costs = choice.move_costs(allocation, opened)
        gain = costs[stations, position[allocation]] - costs.min(axis=1)
        gain[is_hub] = 0.0
        station = int(gain.argmax())
        if gain[station] <= 1e-10:
            break
        allocation[station] = opened[costs[station].argmin()]
    return allocation


def _repair(choice: Choice, allocation: Ints, opened: Ints, is_hub: Bools) -> Ints | None:
    """Return an allocation within capacity, moving out of full hubs what costs least per volume."""
    allocation = allocation.copy()
    for _ in range(4 * len(allocation)):
        room = choice.capacity[opened] - np.bincount(allocation, choice.load, len(choice.hubs))[opened]
        over = np.flatnonzero(room < -CAPACITY_SLACK * choice.capacity[opened])
        if not len(over):
            return allocation
        full = opened[over[room[over].argmin()]]
        members = np.flatnonzero((allocation == full) & ~is_hub)
        costs = choice.move_costs(allocation, opened)
        allowed = choice.load[members, None] <= room[None, :]
        extra = costs[members] - costs[members][:, opened == full]
        ratio = np.where(allowed, extra / np.maximum(choice.load[members, None], 1e-12), np.inf)
        if not len(members) or not np.isfinite(ratio).any():
            return None
        member, hub = np.unravel_index(int(ratio.argmin()), ratio.shape)
        allocation[members[member]] = opened[hub]
    return None


def _improve_within_capacity(choice: Choice, allocation: Ints, opened: Ints, is_hub: Bools) -> Ints:
    """Take the best single move or exchange of two stations that keeps every capacity, until none gains."""
    best = choice.cost(allocation)
    free = np.flatnonzero(~is_hub)
    for _ in range(4 * len(allocation)):
        room = choice.capacity - np.bincount(allocation, choice.load, len(choice.hubs))
        costs = choice.move_costs(allocation, opened)
        position = np.searchsorted(opened, allocation)
        extra = costs - costs[np.arange(len(allocation)), position][:, None]
        extra[is_hub] = 0.0
        extra[choice.load[:, None] > room[opened][None, :]] = 0.0
        trials: list[Ints] = []
        if extra.min() < -1e-10:
            station, hub = np.unravel_index(int(extra.argmin()), extra.shape)
            trials.append(_moved(allocation, [(int(station), int(opened[hub]))]))
        trials += _exchanges(choice, allocation, costs, position, room, free)
        values = [choice.cost(trial) for trial in trials]
        if not values or min(values) >= best - 1e-10:
            return allocation
        best, allocation = min(values), trials[int(np.argmin(values))]
    return allocation


def _exchanges(
    choice: Choice, allocation: Ints, costs: Floats, position: Ints, room: Floats, free: Ints
) -> list[Ints]:
    """Return the eight most promising exchanges of two stations between their hubs."""
    here = costs[np.arange(len(allocation)), position]
    change = costs[free][:, position[free]] - here[free][:, None]
    change = change + change.T
    load = choice.load[free]
    change_a = load[None, :] - load[:, None] <= room[allocation[free]][:, None]
    change = np.where(change_a & change_a.T & (allocation[free][:, None] != allocation[free]), change, np.inf)
    order = np.argsort(change, axis=None, kind="stable")[:16:2]
    result = []
    for flat in order:
        a, b = np.unravel_index(int(flat), change.shape)
        if np.isfinite(change[a, b]):
            i, j = int(free[a]), int(free[b])
            result.append(_moved(allocation, [(i, int(allocation[j])), (j, int(allocation[i]))]))
    return result


def _moved(allocation: Ints, moves: list[tuple[int, int]]) -> Ints:
    result = allocation.copy()
    for station, hub in moves:
        result[station] = hub
    return result


def improve_hubs(
    choice: Choice, opened: list[int], shortlist: Ints, stop: Callable[[], bool]
) -> tuple[float, Ints] | None:
    """Return the allocation after the best swaps, openings and closings of hubs among `shortlist`."""
    current = sorted(opened)
    best = allocate(choice, np.array(current))
    for hub in np.argsort(-choice.capacity, kind="stable"):
        if best is not None or len(current) >= choice.hubs_max:
            break
        if hub not in current:
            current = sorted([*current, int(hub)])
            best = allocate(choice, np.array(current))
    while not stop():
        trials = [
            sorted([*(h for h in current if h != out), int(into)])
            for out in current
            if not choice.forced[out]
            for into in shortlist
            if into not in current
        ]
        if len(current) < choice.hubs_max:
            trials += [sorted([*current, int(into)]) for into in shortlist if into not in current]
        if len(current) > max(1, choice.hubs_min):
            trials += [[h for h in current if h != out] for out in current if not choice.forced[out]]
        found = [(allocate(choice, np.array(trial)), trial) for trial in trials]
        options = [(result[0], place) for place, (result, _) in enumerate(found) if result is not None]
        if not options or (best is not None and min(options)[0] >= best[0] - 1e-9 * abs(best[0])):
            return best
        best, current = found[min(options)[1]]
    return best
