"""What a plan truly costs: the rules of travel, with no relaxation.

Both allocations follow the roles of the formulation: a station that is an open hub acts as one at the ends of
its itineraries. Nothing here assumes the triangle inequality or an order of the factors, so an end that is a
hub may travel through two further hubs where that is cheaper.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from hubdesign.solve.hub_location.instance import Floats, HubInstance, Ints


def multiple_unit_costs(instance: HubInstance, hubs: Sequence[int] | Ints) -> Floats:
    """Return the cheapest cost of a unit between every two stations given the open `hubs`, (n, n)."""
    return _multiple(instance, np.asarray(hubs, dtype=np.int64))[0]


def multiple_stops(instance: HubInstance, hubs: Sequence[int] | Ints) -> Ints:
    """Return the interior stops of the cheapest itineraries, (n, n, 2) in order of travel; -1 for none."""
    return _multiple(instance, np.asarray(hubs, dtype=np.int64))[1]


def total_cost(instance: HubInstance, hubs: Sequence[int] | Ints, unit_costs: Floats) -> float:
    """Return the cost of carrying every volume at `unit_costs`, (n, n), with the open `hubs`; may be inf."""
    moved = instance.volume > 0.0
    carried = float(instance.volume[moved] @ unit_costs[moved])
    return carried + float(instance.fixed_cost[np.asarray(hubs, dtype=np.int64)].sum()) + instance.constant


def single_unit_costs(instance: HubInstance, allocation: Ints) -> Floats:
    """Return the cost of a unit between every two stations under `allocation` (n,), (n, n)."""
    stations = np.arange(instance.station_count)
    own = allocation == stations
    entry = np.where(own, 0.0, instance.collect[stations, allocation] + instance.transfer_cost[allocation])
    leave = np.where(own, 0.0, instance.distribute[allocation, stations] + instance.transfer_cost[allocation])
    between = instance.transfer[np.ix_(allocation, allocation)].copy()
    same = allocation[:, None] == allocation[None, :]
    both_at_hub = own[:, None] & own[None, :]
    # one hub serves both ends: it is one interior stop, or none where it is an end itself
    between[same] = 0.0
    stop = np.where(same & ~both_at_hub, instance.transfer_cost[allocation][:, None], 0.0)
    return entry[:, None] + between + leave[None, :] - stop


def _multiple(instance: HubInstance, hubs: Ints) -> tuple[Floats, Ints]:
    n, p = instance.station_count, len(hubs)
    stations = np.arange(n)
    is_hub = np.zeros(n, dtype=bool)
    is_hub[hubs] = True
    stop = instance.transfer_cost[hubs]
    first = np.where(is_hub[:, None], instance.transfer[:, hubs], instance.collect[:, hubs]) + stop
    between = instance.transfer[np.ix_(hubs, hubs)] + stop
    np.fill_diagonal(between, np.inf)
    two = first[:, :, None] + between
    via = two.argmin(axis=1)
    reach = np.take_along_axis(two, via[:, None, :], axis=1)[:, 0, :]
    stops = np.full((n, p, 2), -1, dtype=np.int64)
    stops[:, :, 0] = hubs[via]
    stops[:, :, 1] = hubs
    direct = first <= reach
    reach = np.where(direct, first, reach)
    stops[direct] = np.stack([np.broadcast_to(hubs, (n, p)), np.full((n, p), -1)], axis=-1)[direct]
    reach[hubs, np.arange(p)] = 0.0
    stops[hubs, np.arange(p)] = -1
    last = np.where(is_hub[None, :], instance.transfer[hubs], instance.distribute[hubs])
    best = np.where(is_hub[None, :] & ~is_hub[:, None], instance.collect, np.inf)
    chosen = np.full((n, n, 2), -1, dtype=np.int64)
    for m in range(p):
        value = reach[:, m, None] + last[m]
        value[:, hubs[m]] = np.inf  # arriving at the end itself is no interior stop
        better = value < best
        best = np.where(better, value, best)
        chosen = np.where(better[:, :, None], stops[:, m, None, :], chosen)
    local = instance.collect[:, hubs] + stop + instance.distribute[hubs].T
    nearest = local.argmin(axis=1) if p else np.zeros(n, dtype=np.int64)
    best[stations, stations] = np.where(is_hub, 0.0, local.min(axis=1) if p else np.inf)
    chosen[stations, stations] = -1
    if p:
        chosen[stations, stations, 0] = np.where(is_hub, -1, hubs[nearest])
    return best, chosen
