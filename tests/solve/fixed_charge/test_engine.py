"""The engine against enumeration and an independent arc-flow MILP; its bounds never cut an optimum off."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from hubdesign.solve.control import Control
from hubdesign.solve.fixed_charge.engine import solve_fixed_charge
from hubdesign.solve.fixed_charge.instance import FixedChargeAnswer, FixedChargeInstance, FixedChargeStatus
from hubdesign.solve.fixed_charge.plan import FlowSolver
from hubdesign.solve.fixed_charge.relaxation import Formulation, PathRelaxation
from tests.solve.fixed_charge.oracle import (
    cost_of_links,
    optimum_by_enumeration,
    optimum_by_milp,
    random_instance,
)


def recomputed_cost(inst: FixedChargeInstance, answer: FixedChargeAnswer) -> float:
    """Check the plan's rules and return its cost, by arithmetic alone."""
    load, carried = np.zeros(inst.arcs), np.zeros(inst.commodities)
    cost = float(inst.fixed_cost[answer.open].sum())
    for k, arcs, share in answer.paths:
        stops = [int(inst.tail[arcs[0]])] + [int(inst.head[a]) for a in arcs]
        assert stops[0] == inst.origin[k]
        assert stops[-1] == inst.destination[k]
        assert len(set(stops)) == len(stops)
        assert all(inst.tail[a] == stop for a, stop in zip(arcs, stops))
        assert inst.through[stops[1:-1]].all()
        assert answer.open[inst.link[list(arcs)]].all()
        volume = share * inst.volume[k]
        carried[k] += share
        load[list(arcs)] += volume
        cost += volume * (
            inst.unit_cost[list(arcs)].sum() + inst.transfer_cost[stops[1:-1]].sum() + inst.carried_cost[k]
        )
    assert (load <= inst.capacity * (1 + 1e-6) + 1e-6).all()
    assert (carried <= 1 + 1e-9).all()
    must = np.isinf(inst.unserved_cost)
    assert (carried[must] >= 1 - 1e-6).all()
    assert not (inst.must_open & ~answer.open).any()
    left = (1.0 - carried) * inst.volume * np.where(must, 0.0, inst.unserved_cost)
    return cost + float(left.sum())


@pytest.mark.parametrize("block", range(10))
def test_random_cases_end_at_the_optimum_of_an_arc_flow_milp(block: int) -> None:
    for seed in range(20 * block, 20 * block + 20):
        inst = random_instance(seed)
        answer = solve_fixed_charge(inst, Control(60.0, gap=0.0, threads=1 + (seed % 10 == 0)))
        best = optimum_by_milp(inst)
        if np.isinf(best):
            assert answer.status is FixedChargeStatus.INFEASIBLE, seed
            continue
        assert answer.status is FixedChargeStatus.PROVEN, seed
        assert answer.objective == pytest.approx(best, rel=2e-6, abs=1e-6), seed
        assert answer.bound <= best * (1 + 1e-9) + 1e-9, seed
        assert recomputed_cost(inst, answer) == pytest.approx(answer.objective, rel=1e-9), seed


@pytest.mark.parametrize("seed", range(300, 312))
def test_tiny_cases_end_at_the_best_of_all_link_sets(seed: int) -> None:
    inst = random_instance(seed, links=5)
    answer = solve_fixed_charge(inst, Control(60.0, gap=0.0))
    best = optimum_by_enumeration(inst)
    assert (answer.status is FixedChargeStatus.INFEASIBLE) == np.isinf(best)
    if np.isfinite(best):
        assert answer.objective == pytest.approx(best, rel=2e-6, abs=1e-6)


def test_the_bound_of_any_multipliers_holds_under_any_fixing_of_links() -> None:
    """Shortest paths plus openings bound every plan, also after few rounds and with links held."""
    checked = 0
    for seed in range(200):
        inst = random_instance(seed)
        rng = np.random.default_rng(seed)
        form = Formulation(inst)
        lp = PathRelaxation(form)
        opened = rng.random(inst.links) < 0.8
        opened |= inst.must_open
        cost = cost_of_links(inst, opened)
        held = rng.random(inst.links) < 0.4
        lower = np.where(held, opened, inst.must_open).astype(float)
        upper = np.where(held, opened, 1.0)
        lp.set_links(lower, upper)
        lp.solve(Control(60.0), rounds=int(rng.integers(1, 8)))
        assert lp.bound * form.scale <= cost * (1 + 1e-9) + 1e-9, seed
        checked += np.isfinite(cost)
    assert checked > 80


def test_links_are_called_too_few_only_where_they_are() -> None:
    few = 0
    for seed in range(200):
        inst = random_instance(seed)
        opened = (np.random.default_rng(seed).random(inst.links) < 0.7) | inst.must_open
        flows = FlowSolver(Formulation(inst), 1)
        if flows.cannot_carry(opened, Control(60.0)):
            assert np.isinf(cost_of_links(inst, opened)), seed
            few += 1
    assert 20 < few < 200


def test_two_runs_on_one_thread_give_the_same_answer() -> None:
    inst = random_instance(41, links=14)
    first = solve_fixed_charge(inst, Control(60.0, gap=0.0, threads=1))
    again = solve_fixed_charge(inst, Control(60.0, gap=0.0, threads=1))
    assert first.paths == again.paths
    assert first.bound == again.bound
    assert first.open.tobytes() == again.open.tobytes()


@pytest.mark.parametrize("scale", [1e-6, 1e6])
def test_scaling_all_money_or_all_volume_changes_no_plan(scale: float) -> None:
    import dataclasses

    inst = random_instance(22)
    plain = solve_fixed_charge(inst, Control(60.0, gap=0.0))
    money = dataclasses.replace(
        inst,
        fixed_cost=inst.fixed_cost * scale,
        unit_cost=inst.unit_cost * scale,
        transfer_cost=inst.transfer_cost * scale,
        carried_cost=inst.carried_cost * scale,
    )
    dear = solve_fixed_charge(money, Control(60.0, gap=0.0))
    assert dear.objective == pytest.approx(plain.objective * scale, rel=1e-6)
    bulk = dataclasses.replace(
        inst,
        volume=inst.volume * scale,
        capacity=inst.capacity * scale,
        unit_cost=inst.unit_cost / scale,
        transfer_cost=inst.transfer_cost / scale,
        carried_cost=inst.carried_cost / scale,
    )
    assert solve_fixed_charge(bulk, Control(60.0, gap=0.0)).objective == pytest.approx(
        plain.objective, rel=1e-6
    )


def test_a_node_whose_lp_cannot_be_solved_is_split_and_never_taken_up_forever(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """Every node with the first link shut fails; the search must still end by itself with a true bound."""
    solve_lp, failed, decided = PathRelaxation.solve, 0, 0

    def solve(self: PathRelaxation, *arguments: Any, **named: Any) -> bool:
        nonlocal failed
        if self.upper[0] == 0.0 and self.lower[1:].sum() < 3.0:
            failed += 1
            self.bound = -np.inf
            return False
        return solve_lp(self, *arguments, **named)

    monkeypatch.setattr(PathRelaxation, "solve", solve)
    for seed in range(400, 440):
        inst = random_instance(seed)
        best = optimum_by_milp(inst)
        if np.isinf(best):
            continue
        control = Control(20.0, gap=0.0)
        answer = solve_fixed_charge(inst, control)
        assert not control.stop_requested(), seed
        assert answer.bound <= best * (1 + 1e-9) + 1e-9, seed
        decided += 1
    assert failed > 10
    assert decided > 10
