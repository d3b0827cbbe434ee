"""Multiple allocation: true costs, valid cuts, valid bounds, the optimum, against enumeration."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest

from hubdesign.solve.control import Control
from hubdesign.solve.hub_location.ascent import make_cuts
from hubdesign.solve.hub_location.evaluate import multiple_stops, multiple_unit_costs, total_cost
from hubdesign.solve.hub_location.instance import HubStatus, plain_instance
from hubdesign.solve.hub_location.master import Domain, bound_over
from hubdesign.solve.hub_location.multiple import solve_multiple
from hubdesign.solve.hub_location.relaxation import build_relaxation

from . import oracle


def exact() -> Control:
    return Control(time_limit_s=60.0, gap=0.0)


@pytest.mark.parametrize("seed", range(20))
def test_unit_costs_are_those_of_the_cheapest_enumerated_itinerary(seed: int) -> None:
    instance = oracle.random_instance(seed, 6, rough=True)
    for hubs in oracle.hub_sets(instance)[::3]:
        if not hubs:
            continue
        unit = multiple_unit_costs(instance, hubs)
        stops = multiple_stops(instance, hubs)
        for i, j in itertools.product(range(6), repeat=2):
            assert unit[i, j] == pytest.approx(oracle.cheapest_unit(instance, i, j, frozenset(hubs)))
            if math.isfinite(unit[i, j]) and not (i == j and i in hubs):
                inner = tuple(int(stop) for stop in stops[i, j] if stop >= 0)
                route = oracle.itinerary_cost(instance, (i, *inner, j), frozenset(hubs))
                assert route == pytest.approx(unit[i, j])


@pytest.mark.parametrize("rough", [False, True])
def test_no_cut_is_above_the_true_cost_of_any_hub_set(rough: bool) -> None:
    for seed in range(200):
        instance = oracle.random_instance(seed, 5, rough=rough)
        relaxation = build_relaxation(instance, closure=True)
        rng = np.random.default_rng(seed)
        point = rng.random(len(relaxation.hubs)) ** 2
        careful = rng.random(len(point)) < 0.5
        if seed % 2:
            point[~careful] = 0.0
        cuts = make_cuts(relaxation, point, rng.random(len(point)), careful=careful)
        moved = instance.volume > 0
        for hubs in oracle.hub_sets(instance):
            if not hubs:
                continue
            open_ = np.isin(relaxation.hubs, hubs).astype(float)
            unit = multiple_unit_costs(instance, hubs)
            cost = np.where(moved, instance.volume, 0.0) * np.where(moved, unit, 0.0)
            true = np.where(np.isfinite(cost).all(axis=1), cost.sum(axis=1), np.inf)
            assert (cuts.const - cuts.slope @ open_ <= true + 1e-9 * (1 + cuts.const)).all()


def test_cuts_are_exact_at_whole_points_of_metric_instances() -> None:
    for seed in range(50):
        instance = oracle.random_instance(seed, 6)
        relaxation = build_relaxation(instance, closure=True)
        for hubs in oracle.hub_sets(instance)[::4]:
            if not hubs:
                continue
            point = np.isin(relaxation.hubs, hubs).astype(float)
            cuts = make_cuts(relaxation, point, point)
            value = (cuts.const - cuts.slope @ point).sum() + instance.fixed_cost[list(hubs)].sum()
            true = total_cost(instance, hubs, multiple_unit_costs(instance, hubs)) - instance.constant
            if instance.transfer[0, 1] <= min(instance.collect[0, 1], instance.distribute[0, 1]):
                assert value == pytest.approx(true)


def test_bound_over_a_domain_is_the_enumerated_minimum() -> None:
    for seed in range(200):
        rng = np.random.default_rng(seed)
        k = int(rng.integers(1, 6))
        reduced = rng.normal(0.0, 1.0, k)
        lower = (rng.random(k) < 0.2).astype(float)
        upper = np.maximum(lower, (rng.random(k) < 0.8).astype(float))
        fewest = int(rng.integers(0, k + 1))
        most = int(rng.integers(fewest, k + 1))
        result = bound_over(1.5, reduced, Domain(lower, upper, fewest, most))
        values = {
            z: 1.5 + float(reduced @ np.array(z))
            for z in itertools.product((0.0, 1.0), repeat=k)
            if (np.array(z) >= lower).all() and (np.array(z) <= upper).all() and fewest <= sum(z) <= most
        }
        assert result.value == pytest.approx(min(values.values(), default=math.inf))
        for hub in range(k):
            opened = min((v for z, v in values.items() if z[hub] == 1.0), default=math.inf)
            closed = min((v for z, v in values.items() if z[hub] == 0.0), default=math.inf)
            assert result.if_open[hub] == pytest.approx(opened) or not values
            assert result.if_closed[hub] == pytest.approx(closed) or not values


@pytest.mark.parametrize("rough", [False, True])
def test_the_enumerated_optimum_is_found_and_proven(rough: bool) -> None:
    for seed in range(200):
        instance = oracle.random_instance(seed, 4 + seed % 4, rough=rough)
        answer = solve_multiple(instance, exact())
        best = oracle.best_multiple(instance)
        if math.isinf(best):
            assert answer.status is HubStatus.INFEASIBLE
            continue
        assert answer.status is HubStatus.PROVEN
        assert answer.objective == pytest.approx(best, rel=1e-9)
        assert answer.bound <= best + 1e-12 * abs(best)
        assert answer.bound >= best - 1e-8 * abs(best)


def test_a_loose_gap_gives_a_bound_that_holds() -> None:
    for seed in range(60):
        instance = oracle.random_instance(seed, 7)
        answer = solve_multiple(instance, Control(time_limit_s=60.0, gap=0.05))
        best = oracle.best_multiple(instance)
        if math.isinf(best):
            continue
        assert answer.bound <= best + 1e-9 * abs(best) <= answer.objective + 2e-9 * abs(best)
        assert answer.objective - answer.bound <= 0.0501 * abs(answer.objective)


def test_a_solve_without_time_gives_a_bound_that_holds() -> None:
    for seed in range(40):
        instance = oracle.random_instance(seed, 6)
        best = oracle.best_multiple(instance)
        answer = solve_multiple(instance, Control(time_limit_s=0.0, gap=0.0))
        assert answer.bound <= best + 1e-9 * abs(best)
        assert answer.objective >= best - 1e-9 * abs(best)


def test_threads_change_nothing() -> None:
    rng = np.random.default_rng(1)
    xy = rng.uniform(0.0, 60.0, (120, 2))
    distance = np.hypot(*(xy[:, None] - xy[None]).transpose(2, 0, 1))
    instance = plain_instance(rng.random((120, 120)), 3 * distance, distance, 2 * distance, hubs=2)
    relaxation = build_relaxation(instance, closure=True).restrict(np.arange(40))
    point = rng.random(40) ** 4
    one, two = (make_cuts(relaxation, point, point, threads) for threads in (1, 2))
    assert (one.slope == two.slope).all()
    assert (one.const == two.const).all()


def test_collection_capacities_are_refused() -> None:
    with pytest.raises(ValueError, match="capacities"):
        solve_multiple(oracle.random_instance(1, 5, capacity=True), exact())
