"""Single allocation: true costs, valid cuts, valid bounds, the optimum, against enumeration."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest

from hubdesign.solve.control import Control
from hubdesign.solve.hub_location.allocation import Choice
from hubdesign.solve.hub_location.choosing import AllocationMaster, Left, settle
from hubdesign.solve.hub_location.evaluate import single_unit_costs, total_cost
from hubdesign.solve.hub_location.instance import HubInstance, HubStatus
from hubdesign.solve.hub_location.master import Domain
from hubdesign.solve.hub_location.pairing import Pairs, pair_cuts
from hubdesign.solve.hub_location.relaxation import build_relaxation
from hubdesign.solve.hub_location.single import solve_single

from . import oracle


def allocations(instance: HubInstance, hubs: tuple[int, ...]) -> itertools.product[tuple[int, ...]]:
    choices = [[i] if i in hubs else list(hubs) for i in range(instance.station_count)]
    return itertools.product(*choices)


def chosen(choice: Choice, allocation: tuple[int, ...]) -> np.ndarray:
    return (np.array(allocation)[:, None] == choice.hubs[None, :]).astype(float)


@pytest.mark.parametrize("seed", range(20))
def test_unit_costs_and_choice_costs_are_those_of_the_enumerated_itineraries(seed: int) -> None:
    instance = oracle.random_instance(seed, 5, rough=seed % 2 == 1)
    choice = Choice.of(build_relaxation(instance, closure=False), instance)
    place = {int(h): k for k, h in enumerate(choice.hubs)}
    for hubs in oracle.hub_sets(instance)[::3]:
        for allocation in itertools.islice(allocations(instance, hubs), 40) if hubs else ():
            unit = single_unit_costs(instance, np.array(allocation))
            for i, j in itertools.product(range(5), repeat=2):
                true = oracle.allocated_unit(instance, i, j, allocation, frozenset(hubs))
                if instance.volume[i, j] > 0:
                    assert unit[i, j] == pytest.approx(true)
            if set(allocation) == set(hubs) and np.isfinite(cost := total_cost(instance, hubs, unit)):
                positions = np.array([place[a] for a in allocation])
                assert choice.cost(positions) + instance.constant == pytest.approx(cost)


def test_no_pair_cut_is_above_the_cost_of_any_allocation() -> None:
    for seed in range(200):
        instance = oracle.random_instance(seed, 4, rough=seed % 2 == 1)
        choice = Choice.of(build_relaxation(instance, closure=False), instance)
        rng = np.random.default_rng(seed)
        pairs = Pairs.of(choice)
        shape = choice.own.shape
        cuts = pair_cuts(choice, pairs, rng.random(shape) ** 3, np.ones(shape, dtype=bool))
        for hubs in oracle.hub_sets(instance):
            for allocation in allocations(instance, hubs) if hubs else ():
                x = chosen(choice, allocation)
                flow = choice.volume * (x @ choice.between @ x.T)
                both = flow + flow.T
                true = np.bincount(pairs.first, both[pairs.first, pairs.second], len(x))
                assert ((cuts * x).sum(axis=(1, 2)) <= true + 1e-9 * (1 + np.abs(true))).all()


def test_pair_cuts_are_exact_at_whole_points() -> None:
    for seed in range(30):
        instance = oracle.random_instance(seed, 5)
        choice = Choice.of(build_relaxation(instance, closure=False), instance)
        pairs = Pairs.of(choice)
        for hubs in oracle.hub_sets(instance)[:3]:
            for allocation in itertools.islice(allocations(instance, hubs), 5) if hubs else ():
                x = chosen(choice, allocation)
                cuts = pair_cuts(choice, pairs, x, np.ones(x.shape, dtype=bool))
                true = float((choice.volume * (x @ choice.between @ x.T)).sum())
                assert float((cuts * x).sum()) == pytest.approx(true, abs=1e-6)


@pytest.mark.parametrize("capacity", [False, True])
def test_no_bound_or_fixing_cuts_off_an_allocation(capacity: bool) -> None:
    for seed in range(100):
        instance = oracle.random_instance(seed, 5, capacity=capacity)
        choice = Choice.of(build_relaxation(instance, closure=False), instance)
        n, k = choice.own.shape
        rng = np.random.default_rng(seed)
        domain = Domain(choice.forced.astype(float), np.ones(k), choice.hubs_min, choice.hubs_max)
        left = settle(choice, Left(domain, np.ones((n, k), dtype=bool)))
        if left is None:
            assert math.isinf(oracle.best_single(instance))
            continue
        master = AllocationMaster(choice, np.full(n, -1e4), left)
        pairs = Pairs.of(choice)
        for _ in range(3):
            cuts = pair_cuts(choice, pairs, rng.random((n, k)), left.allowed)
            master.add(cuts, np.zeros((n, k)), np.full(n, -np.inf), 0.0)
        x, _ = master.solve(left)
        bound = master.bound(left, x)
        for hubs in oracle.hub_sets(instance):
            for allocation in allocations(instance, hubs) if hubs else ():
                cost = oracle.single_cost(instance, hubs, allocation) - instance.constant
                if math.isinf(cost):
                    continue
                slack = 1e-7 * (1 + abs(cost))
                y = chosen(choice, allocation)
                assert bound.value <= cost + slack
                assert (bound.if_allocated[y > 0.5] <= cost + slack).all()
                closed = y[choice.hubs, np.arange(k)] < 0.5
                assert (bound.hubs.if_closed[closed] <= cost + slack).all()


@pytest.mark.parametrize(("rough", "capacity"), [(False, False), (True, False), (False, True), (True, True)])
def test_the_enumerated_optimum_is_found_and_proven(rough: bool, capacity: bool) -> None:
    for seed in range(200 if not rough or capacity else 120):
        instance = oracle.random_instance(seed, 3 + seed % 3, rough=rough, capacity=capacity)
        answer = solve_single(instance, Control(time_limit_s=60.0, gap=0.0))
        best = oracle.best_single(instance)
        if math.isinf(best):
            assert answer.status is HubStatus.INFEASIBLE
            continue
        assert answer.status is HubStatus.PROVEN
        assert answer.objective == pytest.approx(best, rel=1e-9, abs=1e-9)
        assert answer.bound <= best + 1e-12 * abs(best)
        assert answer.bound >= best - 1e-8 * abs(best)
        assert answer.allocation is not None
        plan = tuple(int(a) for a in answer.allocation)
        assert oracle.single_cost(instance, answer.hubs, plan) == pytest.approx(answer.objective)


def test_a_solve_without_time_gives_a_bound_that_holds() -> None:
    for seed in range(40):
        instance = oracle.random_instance(seed, 5, capacity=seed % 2 == 1)
        best = oracle.best_single(instance)
        answer = solve_single(instance, Control(time_limit_s=0.0, gap=0.0))
        assert answer.bound <= best + 1e-9 * abs(best)
        assert answer.objective >= best - 1e-9 * abs(best)
