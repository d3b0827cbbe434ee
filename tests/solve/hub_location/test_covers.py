"""Collection capacities: no implied count, ruling out or cover cuts off an allocation that fits."""

from __future__ import annotations

import itertools

import numpy as np

from hubdesign.solve.hub_location.allocation import Choice
from hubdesign.solve.hub_location.covers import drop_what_overflows, fewest_hubs, find_covers
from hubdesign.solve.hub_location.instance import HubInstance
from hubdesign.solve.hub_location.relaxation import build_relaxation

from . import oracle


def fitting(instance: HubInstance, choice: Choice) -> list[np.ndarray]:
    """Return every allocation within capacity, as a matrix of the stations' choices."""
    result = []
    for hubs in oracle.hub_sets(instance):
        if not hubs:
            continue
        choices = [[i] if i in hubs else list(hubs) for i in range(instance.station_count)]
        for allocation in itertools.product(*choices):
            x = np.array(allocation)[:, None] == choice.hubs[None, :]
            if (choice.load @ x <= choice.capacity * (1 + 1e-12)).all():
                result.append(x)
    return result


def test_nothing_cuts_off_an_allocation_that_fits() -> None:
    violated = 0
    for seed in range(200):
        instance = oracle.random_instance(seed, 5, capacity=True)
        choice = Choice.of(build_relaxation(instance, closure=False), instance)
        n, k = choice.own.shape
        plans = fitting(instance, choice)
        rng = np.random.default_rng(seed)
        needed = fewest_hubs(choice.capacity, choice.forced, np.ones(k, dtype=bool), float(choice.load.sum()))
        x = rng.random((n, k)) ** 2
        x[choice.hubs, np.arange(k)] = 0.9
        covers = find_covers(choice, x)
        violated += len(covers)
        for plan in plans:
            opened = plan[choice.hubs, np.arange(k)]
            assert needed is not None
            assert opened.sum() >= needed
            for cover in covers:
                assert plan[cover.members, cover.hub].sum() <= cover.most * opened[cover.hub]
            allowed = np.ones((n, k), dtype=bool)
            station = int(rng.integers(n))
            allowed[station] = plan[station]
            assert drop_what_overflows(choice, allowed)
            assert (allowed | ~plan).all()
    assert violated > 100


def test_the_fewest_hubs_are_enough_by_capacity() -> None:
    capacity = np.array([5.0, 4.0, 3.0, np.inf])
    nothing = np.zeros(4, dtype=bool)
    finite = np.array([True, True, True, False])
    assert fewest_hubs(capacity, nothing, finite, 9.0) == 2
    assert fewest_hubs(capacity, nothing, finite, 10.0) == 3
    assert fewest_hubs(capacity, nothing, finite, 13.0) is None
    assert fewest_hubs(capacity, nothing, ~nothing, 13.0) == 1
    assert fewest_hubs(capacity, np.array([False, False, True, False]), finite, 9.0) == 3
