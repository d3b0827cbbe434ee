"""An independent oracle: itineraries, hub sets and allocations enumerated one by one in plain Python."""

from __future__ import annotations

import itertools
import math

import numpy as np

from hubdesign.solve.hub_location.instance import HubInstance


def random_instance(seed: int, n: int, *, rough: bool = False, capacity: bool = False) -> HubInstance:
    """Return a small instance: metric and smooth, or `rough` (asymmetric, gaps, no triangle inequality)."""
    rng = np.random.default_rng(seed)
    xy = rng.uniform(0.0, 100.0, (n, 2))
    distance = np.hypot(*(xy[:, None] - xy[None]).transpose(2, 0, 1))
    volume = rng.uniform(0.0, 10.0, (n, n)) * (rng.random((n, n)) < 0.8)
    if seed % 3 == 0:
        np.fill_diagonal(volume, 0.0)
    factors = rng.choice([0.2, 0.5, 0.75, 1.0]), rng.choice([1.0, 2.0, 3.0]), rng.choice([1.0, 2.0])
    transfer, collect, distribute = (factor * distance for factor in factors)
    if rough:
        parts = [part * rng.uniform(0.3, 1.7, (n, n)) for part in (collect, transfer, distribute)]
        for part in parts:
            np.fill_diagonal(part, 0.0)
            gap = rng.random((n, n)) < 0.1
            np.fill_diagonal(gap, False)
            part[gap] = np.inf
        collect, transfer, distribute = parts
    candidate = rng.random(n) < 0.8
    candidate[int(rng.integers(n))] = True
    forced = candidate & (rng.random(n) < 0.1)
    most = int(candidate.sum())
    fewest = int(rng.integers(0, min(3, most) + 1))
    limit = rng.uniform(0.3, 1.2, n) * volume.sum() if capacity else np.full(n, np.inf)
    return HubInstance(
        volume=volume,
        collect=collect,
        transfer=transfer,
        distribute=distribute,
        transfer_cost=rng.uniform(0.0, 20.0, n) * (rng.random() < 0.5),
        candidate=candidate,
        forced=forced,
        fixed_cost=rng.uniform(0.0, 3000.0, n) * (rng.random() < 0.7),
        hubs_min=max(fewest, int(forced.sum())),
        hubs_max=int(rng.integers(max(fewest, int(forced.sum()), 1), most + 1)),
        collection_capacity=limit,
        constant=float(rng.choice([0.0, 123.0])),
    )


def itinerary_cost(instance: HubInstance, stops: tuple[int, ...], hubs: frozenset[int]) -> float:
    """Return the cost of a unit along `stops`, ends included; inf where an interior stop is no hub."""
    inner = stops[1:-1]
    if any(stop not in hubs for stop in inner):
        return math.inf
    acts = [stops[0] in hubs, *(True for _ in inner), stops[-1] in hubs]
    if len(stops) == 2 and not any(acts):
        return math.inf
    total = sum(float(instance.transfer_cost[stop]) for stop in inner)
    for (a, b), (tail, head) in zip(itertools.pairwise(stops), itertools.pairwise(acts)):
        table = instance.transfer if tail and head else instance.distribute if tail else instance.collect
        total += float(table[a, b])
    return total


def cheapest_unit(instance: HubInstance, i: int, j: int, hubs: frozenset[int]) -> float:
    """Return the cheapest itinerary of at most two interior stops."""
    if i == j:
        return (
            0.0
            if i in hubs
            else min((itinerary_cost(instance, (i, h, i), hubs) for h in hubs), default=math.inf)
        )
    others = [h for h in hubs if h not in (i, j)]
    routes = [
        (i, j),
        *((i, a, j) for a in others),
        *((i, a, b, j) for a, b in itertools.permutations(others, 2)),
    ]
    return min(itinerary_cost(instance, route, hubs) for route in routes)


def allocated_unit(
    instance: HubInstance, i: int, j: int, allocation: tuple[int, ...], hubs: frozenset[int]
) -> float:
    """Return the cost of a unit that travels i, a(i), a(j), j with repeats dropped."""
    if i == j:
        return 0.0 if i in hubs else itinerary_cost(instance, (i, allocation[i], i), hubs)
    route = [i]
    for stop in (allocation[i], allocation[j], j):
        if stop != route[-1]:
            route.append(stop)
    return itinerary_cost(instance, tuple(route), hubs)


def hub_sets(instance: HubInstance) -> list[tuple[int, ...]]:
    """Return every allowed set of open hubs."""
    candidates = instance.hub_candidates.tolist()
    forced = set(np.flatnonzero(instance.forced).tolist())
    return [
        chosen
        for size in range(instance.hubs_min, instance.hubs_max + 1)
        for chosen in itertools.combinations(candidates, size)
        if forced <= set(chosen)
    ]


def _sum(instance: HubInstance, hubs: tuple[int, ...], unit: dict[tuple[int, int], float]) -> float:
    total = instance.constant + sum(float(instance.fixed_cost[h]) for h in hubs)
    return total + sum(float(instance.volume[pair]) * cost for pair, cost in unit.items())


def multiple_cost(instance: HubInstance, hubs: tuple[int, ...]) -> float:
    """Return the cost of a hub set under multiple allocation."""
    pairs = list(zip(*np.nonzero(instance.volume)))
    if pairs and not hubs:
        return math.inf
    return _sum(instance, hubs, {(i, j): cheapest_unit(instance, i, j, frozenset(hubs)) for i, j in pairs})


def single_cost(instance: HubInstance, hubs: tuple[int, ...], allocation: tuple[int, ...]) -> float:
    """Return the cost of an allocation; inf where it breaks a capacity."""
    for h in hubs:
        load = sum(float(instance.volume[i].sum()) for i, a in enumerate(allocation) if a == h)
        if load > instance.collection_capacity[h] * (1 + 1e-12):
            return math.inf
    pairs = list(zip(*np.nonzero(instance.volume)))
    inside = frozenset(hubs)
    return _sum(
        instance, hubs, {(i, j): allocated_unit(instance, i, j, allocation, inside) for i, j in pairs}
    )


def best_multiple(instance: HubInstance) -> float:
    """Return the optimum under multiple allocation; inf where there is none."""
    return min((multiple_cost(instance, hubs) for hubs in hub_sets(instance)), default=math.inf)


def best_single(instance: HubInstance) -> float:
    """Return the optimum under single allocation; inf where there is none."""
    best = math.inf
    for hubs in hub_sets(instance):
        if not hubs:
            best = min(best, multiple_cost(instance, hubs))
            continue
        choices = [[i] if i in hubs else list(hubs) for i in range(instance.station_count)]
        for allocation in itertools.product(*choices):
            best = min(best, single_cost(instance, hubs, allocation))
    return best
