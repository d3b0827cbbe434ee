"""The carrier engine against the plain engine, on cases that use every rule."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from hubdesign.answer import Status
from hubdesign.network import build_network
from hubdesign.solve import carrier
from hubdesign.solve.carrier.bounding import Bounder, NodeEnd
from hubdesign.solve.control import Control
from hubdesign.solve.direct import solve_direct
from hubdesign.solve.relaxation import LpStatus
from hubdesign.verification import verify
from tests.solve.carrier.cases import random_carrier


def _solve(seed: int, threads: int = 1):  # type: ignore[no-untyped-def]
    problem = random_carrier(seed)
    network = build_network(problem)
    control = Control(60.0, 1e-6, threads, maximise=problem.settings.goal != "least-cost")
    return problem, network, carrier.solve(problem, network, control)


@pytest.mark.parametrize("block", range(6))
def test_same_optimum_as_the_plain_engine(block: int) -> None:
    for seed in range(1000 + 10 * block, 1010 + 10 * block):
        problem, network, ours = _solve(seed)
        maximise = problem.settings.goal != "least-cost"
        plain = solve_direct(network, Control(60.0, 1e-6, maximise=maximise))
        assert ours.status is plain.status, seed
        if ours.objective is None or plain.objective is None:
            continue
        size = max(1.0, abs(plain.objective))
        assert abs(ours.objective - plain.objective) <= 3e-6 * size, seed
        assert not verify(problem, ours, network).breaches, seed


def test_two_threads_prove_the_same_optimum() -> None:
    for seed in range(2000, 2012):
        _, _, one = _solve(seed)
        _, _, two = _solve(seed, threads=2)
        assert one.status is two.status
        if one.objective is not None and two.objective is not None:
            assert abs(one.objective - two.objective) <= 3e-6 * max(1.0, abs(one.objective))


def test_one_thread_repeats_to_the_byte() -> None:
    for seed in (1001, 1005, 1013):
        _, _, first = _solve(seed)
        _, _, again = _solve(seed)
        assert first.replace(progress=()) == again.replace(progress=())


def test_bound_is_on_the_right_side() -> None:
    for seed in range(3000, 3020):
        problem, _, ours = _solve(seed)
        if ours.objective is None or ours.bound is None:
            continue
        if problem.settings.goal == "least-cost":
            assert ours.bound <= ours.objective
        else:
            assert ours.bound >= ours.objective


def test_a_cancelled_solve_keeps_its_honesty() -> None:
    problem = random_carrier(1001)
    control = Control(60.0, 1e-6, maximise=problem.settings.goal != "least-cost")
    control.cancel()
    design = carrier.solve(problem, build_network(problem), control)
    assert design.status in (Status.UNKNOWN, Status.FEASIBLE, Status.PROVEN)


def test_fits_fleets_with_listed_itineraries_only() -> None:
    problem = random_carrier(1001)
    assert carrier.fits(problem)
    assert not carrier.fits(problem.replace(vehicles=()))
    assert not carrier.fits(problem.with_settings(max_transfers=-1))
    assert not carrier.fits(problem.with_settings(allocation="single", max_transfers=2))
    assert not carrier.fits(problem.with_settings(structure="current"))


def test_a_node_whose_lp_cannot_be_solved_goes_to_scip_and_is_never_taken_up_forever(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """Every LP in which a free hub is fixed fails; the optimum must still be proven before the limit."""
    rounds, failed, proven = Bounder.rounds, 0, 0

    def failing(self: Bounder, *arguments: Any, **named: Any) -> NodeEnd:
        nonlocal failed
        hub, program = self.setting.of.hub, self.setting.program
        free = program.upper[hub] > program.lower[hub]
        if (self.lower[hub] == self.upper[hub])[free].any():
            failed += 1
            return NodeEnd(LpStatus.LIMIT, -np.inf)
        return rounds(self, *arguments, **named)

    monkeypatch.setattr(Bounder, "rounds", failing)
    for seed in range(12):
        problem = random_carrier(seed)
        network = build_network(problem)
        maximise = problem.settings.goal != "least-cost"
        control = Control(20.0, gap=0.0, maximise=maximise)
        answer = carrier.solve(problem, network, control)
        plain = solve_direct(network, Control(20.0, gap=0.0, maximise=maximise))
        assert answer.status is plain.status, seed
        assert not control.stop_requested(), seed
        if plain.objective is not None:
            size = verify(problem, plain, network).bill.total_cost
            assert answer.objective == pytest.approx(plain.objective, rel=1e-6, abs=1e-6 * max(1.0, size)), (
                seed
            )
            proven += 1
    assert failed > 0
    assert proven > 3
