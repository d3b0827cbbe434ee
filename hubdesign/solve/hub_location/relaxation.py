"""The path costs both allocations are bounded with: o, k, m, d priced as entry + transfer + exit.

For an open set H the cost of a unit from i to j is relaxed to ``min over k, m in H of F_ijkm`` with
``F_ijkm = entry_ik + between_km + exit_mj``. Interior stops are folded in: `entry` and `exit` carry the stop
at the hub unless it is the end itself, and ``between_kk`` gives one of the two back.

Why this is a relaxation. Every itinerary of the rules is such a path at no lower cost: one whose end i is an
open hub starts with ``entry_ii = 0``. For multiple allocation `between` is the shortest-path closure over all
candidates (open or not), which covers itineraries of a hub end through two further hubs; where transfers
obey the triangle inequality the closure changes nothing. An end may also use its non-hub legs although it is
a hub, which the rules forbid but which only lowers the cost. Missing links are priced at a finite ceiling
above every path, again no higher than the truth. Plans are priced by :mod:`evaluate`, never by this.
"""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import Self

import numpy as np

from hubdesign.solve.hub_location.instance import Bools, Floats, HubInstance, Ints


@dataclass(frozen=True, slots=True)
class Relaxation:
    """Relaxed costs over a list of K hub candidates, in units of ``scale`` times money.

    Attributes
    ----------
    hubs
        (K,), the candidates' stations.
    volume
        (n, n), scaled volume.
    entry, between, exit, local
        (n, K), (K, K), (K, n), (n, K): cost per unit; `local` is what i to i costs through a hub.
    fixed, forced
        (K,), scaled hub cost; whether the hub must be open.
    hubs_min, hubs_max
        Fewest and most open hubs.
    constant
        Scaled cost that no decision changes.
    scale
        Scaled cost / money.
    """

    hubs: Ints
    volume: Floats
    entry: Floats
    between: Floats
    exit: Floats
    local: Floats
    fixed: Floats
    forced: Bools
    hubs_min: int
    hubs_max: int
    constant: float
    scale: float

    def restrict(self, keep: Ints) -> Self:
        """Return the relaxation over the candidates at the positions `keep`."""
        return dataclasses.replace(
            self,
            hubs=self.hubs[keep],
            entry=self.entry[:, keep],
            between=self.between[np.ix_(keep, keep)],
            exit=self.exit[keep],
            local=self.local[:, keep],
            fixed=self.fixed[keep],
            forced=self.forced[keep],
        )

    def rescale(self, factor: float) -> Self:
        """Return the relaxation with every scaled figure times `factor`."""
        return dataclasses.replace(
            self,
            volume=self.volume * factor,
            fixed=self.fixed * factor,
            constant=self.constant * factor,
            scale=self.scale * factor,
        )

    def unit_costs(self, chosen: Ints) -> Floats:
        """Return the relaxed cost of a unit between every two stations, (n, n), with `chosen` hubs open."""
        reach = (self.entry[:, chosen, None] + self.between[np.ix_(chosen, chosen)][None]).min(axis=1)
        result = np.full(self.volume.shape, np.inf)
        for m, hub in enumerate(chosen):
            np.minimum(result, reach[:, m, None] + self.exit[hub], out=result)
        np.fill_diagonal(result, self.local[:, chosen].min(axis=1))
        return result

    def trivial_bound(self) -> float:
        """Return the scaled cost with every hub open but no more hub cost than must be, no constant."""
        n, k = self.entry.shape
        reach = np.array([(self.entry + self.between[:, hub]).min(axis=1) for hub in range(k)])
        unit = np.full((n, n), np.inf)
        for hub in range(k):
            np.minimum(unit, reach[hub][:, None] + self.exit[hub], out=unit)
        np.fill_diagonal(unit, self.local.min(axis=1))
        least = np.sort(self.fixed)
        hub_cost = float(least[: self.hubs_min].sum() + np.minimum(least[self.hubs_min :], 0.0).sum())
        return float(np.vdot(self.volume, unit)) + hub_cost

    def cost(self, chosen: Ints) -> float:
        """Return the relaxed cost with the hubs at positions `chosen` open, without the constant."""
        return float(np.vdot(self.volume, self.unit_costs(chosen)) + self.fixed[chosen].sum())


def build_relaxation(instance: HubInstance, closure: bool) -> Relaxation:
    """Return the relaxation over all candidates at scale 1; `closure` for multiple allocation."""
    hubs = instance.hub_candidates
    stop = instance.transfer_cost[hubs]
    collect, distribute = instance.collect[:, hubs], instance.distribute[hubs]
    between = instance.transfer[np.ix_(hubs, hubs)].copy()
    if closure:
        between = _closure(between, stop)
    own = (hubs, np.arange(len(hubs)))
    local = collect + stop + distribute.T
    local[own] = 0.0
    entry = collect + stop
    leave = distribute + stop[:, None]
    entry[own] = 0.0
    leave[own[::-1]] = 0.0
    np.fill_diagonal(between, -stop)
    ceiling = 3.0 * _largest(entry) + 3.0 * _largest(leave) + 3.0 * _largest(between) + 1.0
    needed = instance.hubs_min
    if instance.volume.any():
        needed = max(needed, 1)
    return Relaxation(
        hubs=hubs,
        volume=np.ascontiguousarray(instance.volume, dtype=np.float64),
        entry=np.minimum(entry, ceiling),
        between=np.minimum(between, ceiling),
        exit=np.minimum(leave, ceiling),
        local=np.minimum(local, 2.0 * ceiling),
        fixed=instance.fixed_cost[hubs].astype(np.float64),
        forced=instance.forced[hubs],
        hubs_min=max(needed, int(instance.forced.sum())),
        hubs_max=min(instance.hubs_max, len(hubs)),
        constant=instance.constant,
        scale=1.0,
    )


def _largest(values: Floats) -> float:
    finite = values[np.isfinite(values)]
    return float(finite.max()) if finite.size else 0.0


def _closure(between: Floats, stop: Floats) -> Floats:
    """Return the cheapest cost between candidates through any others, each a stop (Floyd, Warshall)."""
    work = between + stop  # arriving at m costs its stop; taken back at the end
    np.fill_diagonal(work, 0.0)
    for a in range(len(work)):
        np.minimum(work, work[:, a, None] + work[a], out=work)
    return np.minimum(between, work - stop)
