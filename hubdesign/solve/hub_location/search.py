"""First plans: greedy opening, then the best of add, drop and swap until none helps.

Works on relaxed costs (equal to the true ones wherever transfers obey the triangle inequality); whoever uses
the hub sets prices them truly.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from hubdesign.solve.hub_location.instance import Floats, Ints
from hubdesign.solve.hub_location.relaxation import Relaxation

#: Relative improvement below which a move is no improvement.
LEAST_GAIN = 1e-9


def cost_with_added(relaxation: Relaxation, chosen: Ints) -> Floats:
    """Return the relaxed cost with each single further hub opened beside `chosen`, (K,)."""
    n, k = relaxation.entry.shape
    volume, between = relaxation.volume, relaxation.between
    base = relaxation.unit_costs(chosen) if len(chosen) else np.full((n, n), np.inf)
    reach, onward = relaxation.entry, relaxation.exit
    reach = (
        reach + np.diag(between)
        if not len(chosen)
        else np.minimum(
            reach + np.diag(between), (relaxation.entry[:, chosen, None] + between[chosen][None]).min(axis=1)
        )
    )
    first = relaxation.entry
    onward = (
        (between[:, chosen, None] + relaxation.exit[chosen][None]).min(axis=1)
        if len(chosen)
        else np.full((k, n), np.inf)
    )
    at_home = relaxation.local[:, chosen].min(axis=1) if len(chosen) else np.full(n, np.inf)
    result = np.empty(k)
    work, other = np.empty((n, n)), np.empty((n, n))
    for hub in range(k):
        np.add(reach[:, hub, None], relaxation.exit[hub], out=work)
        np.add(first[:, hub, None], onward[hub], out=other)
        np.minimum(work, other, out=work)
        np.minimum(work, base, out=work)
        np.einsum("ii->i", work)[:] = np.minimum(at_home, relaxation.local[:, hub])
        result[hub] = np.vdot(volume, work)
    result += relaxation.fixed + relaxation.fixed[chosen].sum()
    result[chosen] = np.inf
    return result


def greedy(relaxation: Relaxation, count: int) -> list[int]:
    """Return the forced hubs and the best further ones: `count` of them, more while the cost falls."""
    chosen = np.flatnonzero(relaxation.forced).tolist()
    best = relaxation.cost(np.array(chosen)) if chosen else np.inf
    while len(chosen) < min(relaxation.hubs_max, len(relaxation.hubs)):
        values = cost_with_added(relaxation, np.array(chosen, dtype=np.int64))
        hub = int(values.argmin())
        if len(chosen) >= count and values[hub] >= best:
            break
        best = float(values[hub])
        chosen.append(hub)
    return chosen


def improve(
    relaxation: Relaxation, chosen: list[int], stop: Callable[[], bool]
) -> tuple[float, list[int], Floats]:
    """Return the cost and hubs of a local optimum, and the best cost seen with each hub open (K,)."""
    best = relaxation.cost(np.array(chosen))
    while True:
        seen = np.full(len(relaxation.hubs), np.inf)
        seen[chosen] = best
        moves: list[tuple[float, list[int]]] = []
        for place, hub in enumerate(chosen):
            if relaxation.forced[hub]:
                continue
            rest = chosen[:place] + chosen[place + 1 :]
            values = cost_with_added(relaxation, np.array(rest, dtype=np.int64))
            np.minimum(seen, values, out=seen)
            moves.append((float(values.min()), rest + [int(values.argmin())]))
            if len(rest) >= max(1, relaxation.hubs_min):
                moves.append((relaxation.cost(np.array(rest)), rest))
        if len(chosen) < relaxation.hubs_max:
            values = cost_with_added(relaxation, np.array(chosen))
            np.minimum(seen, values, out=seen)
            moves.append((float(values.min()), chosen + [int(values.argmin())]))
        seen[chosen] = best
        if not moves or stop():
            return best, sorted(chosen), seen
        value, hubs = min(moves)
        if value >= best - LEAST_GAIN * abs(best):
            return best, sorted(chosen), seen
        best, chosen = value, hubs


def round_point(relaxation: Relaxation, z: Floats) -> list[int]:
    """Return a hub set near the fractional point `z`."""
    count = int(np.clip(round(float(z.sum())), max(1, relaxation.hubs_min), relaxation.hubs_max))
    weight = np.where(relaxation.forced, 2.0, z)
    return sorted(np.argsort(-weight, kind="stable")[:count].tolist())
