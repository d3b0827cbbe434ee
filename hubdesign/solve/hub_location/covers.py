"""What a collection capacity implies beyond its row: fewest hubs, loads that no longer fit, cover cuts.

Hub k collects its own load first, so ``sum over i of load_i x_ik <= room_k x_kk`` with
``room_k = capacity_k - load of k``, i over the other stations. For a cover C, stations whose loads exceed the
room together, ``sum over E(C) of x_ik <= (|C| - 1) x_kk`` where E(C) adds every station with at least the
largest load of C: any |C| of them exceed the room too (Balas 1975, Mathematical Programming 8:146-164).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from hubdesign.solve.hub_location.allocation import CAPACITY_SLACK, Choice
from hubdesign.solve.hub_location.instance import Bools, Floats, Ints

#: A cover cut must be violated by this much.
VIOLATION = 1e-3


@dataclass(frozen=True, slots=True)
class Cover:
    """``sum of x_ik over members <= most * x_kk`` for the hub at position `hub`; `members` (n,) bool."""

    hub: int
    members: Bools
    most: int


def fewest_hubs(capacity: Floats, opened: Bools, possible: Bools, total: float) -> int | None:
    """Return how many hubs the total load needs, those `opened` among them; None where all do not do."""
    limits = np.minimum(capacity, total)
    have = float(limits[opened].sum())
    count = int(opened.sum())
    wanted = total * (1.0 - CAPACITY_SLACK)
    for limit in np.sort(limits[possible & ~opened])[::-1]:
        if have >= wanted:
            break
        have += float(limit)
        count += 1
    return count if have >= wanted else None


def drop_what_overflows(choice: Choice, allowed: Bools) -> bool:
    """Rule out in place the allocations that no longer fit beside what is settled; False if one must."""
    only = allowed.sum(axis=1) == 1
    settled = choice.load[only] @ allowed[only]
    limit = choice.capacity * (1.0 + CAPACITY_SLACK)
    if (settled > limit).any():
        return False
    beside = choice.load[:, None] + settled
    allowed[(beside > limit) & ~only[:, None]] = False
    return True


def find_covers(choice: Choice, x: Floats) -> list[Cover]:
    """Return the covers that the point x (n, K) violates, one a hub at most."""
    found = []
    for hub in np.flatnonzero(np.isfinite(choice.capacity)):
        own = int(choice.hubs[hub])
        opened = float(x[own, hub])
        room = float((choice.capacity[hub] - choice.load[own]) * (1.0 + CAPACITY_SLACK))
        inside = np.flatnonzero((x[:, hub] > 1e-6) & (choice.load > 0.0))
        inside = inside[inside != own]
        if opened < 1e-3 or room < 0.0 or choice.load[inside].sum() <= room:
            continue
        cover = _cheapest_cover(choice.load[inside], opened - x[inside, hub], room)
        if cover is None:
            continue
        members = np.zeros(len(x), dtype=bool)
        members[inside[cover]] = True
        members |= choice.load >= choice.load[inside[cover]].max()
        members[own] = False
        most = len(cover) - 1
        if x[members, hub].sum() - most * opened > VIOLATION:
            found.append(Cover(int(hub), members, most))
    return found


def _cheapest_cover(load: Floats, loss: Floats, room: float) -> Ints | None:
    """Return a minimal set with more load than `room`, greedily of least `loss` per load."""
    order = np.argsort(np.maximum(loss, 0.0) / load, kind="stable")
    reach = load[order].cumsum()
    if reach[-1] <= room:
        return None
    chosen = order[: int((reach <= room).sum()) + 1].tolist()
    for item in sorted(chosen, key=lambda a: -loss[a]):
        if load[chosen].sum() - load[item] > room:
            chosen.remove(item)
    return np.array(chosen, dtype=np.int64)
