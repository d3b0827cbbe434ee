"""The relaxation: pool rows come in as violated, the safe bound holds and is tight."""

from __future__ import annotations

import numpy as np
import pytest

from hubdesign.model.build import build_model
from hubdesign.model.objective import build_objective
from hubdesign.network import build_network
from hubdesign.problem import Demand
from hubdesign.solve.relaxation import LpStatus, Relaxation
from tests.model.cases import line_problem
from tests.test_itineraries import random_problem


def relaxation(seed: int) -> Relaxation:
    """Return the relaxation of a random five-station case with costs on links, hubs and ways."""
    problem = random_problem(
        seed,
        max_transfers=2,
        link_fixed_cost=30.0,
        unit_cost_per_km=0.02,
        unserved_cost=40.0,
        unserved="allowed",
    )
    model = build_model(build_network(problem))
    return Relaxation(model.program, build_objective(model, "cost").coefficients)


@pytest.mark.parametrize("seed", range(12))
def test_the_safe_bound_is_below_the_optimum_and_close_to_it(seed: int) -> None:
    lp = relaxation(seed)
    assert lp.separate() is LpStatus.OPTIMAL
    assert lp.safe_bound() <= lp.objective + 1e-9 * max(1.0, abs(lp.objective))
    assert lp.safe_bound() == pytest.approx(lp.objective, rel=1e-6, abs=1e-6)


@pytest.mark.parametrize("seed", range(6))
def test_the_safe_bound_holds_for_multipliers_of_any_quality(
    seed: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    lp = relaxation(seed)
    lp.separate()
    rng = np.random.default_rng(seed)
    duals = lp.row_duals() * rng.uniform(0.5, 1.5, len(lp.row_duals())) + rng.normal(
        0, 0.1, len(lp.row_duals())
    )
    monkeypatch.setattr(lp, "row_duals", lambda: duals)
    assert lp.safe_bound() <= lp.objective + 1e-9


@pytest.mark.parametrize("seed", range(12))
def test_separation_ends_with_every_pool_row_kept(seed: int) -> None:
    lp = relaxation(seed)
    weak = relaxation(seed)
    weak.solve()
    lp.separate()
    upper = lp.program.pool.upper
    assert (lp.pool @ lp.values <= upper + 2e-4).all()
    assert lp.objective >= weak.objective - 1e-9
    assert lp.pool_in.sum() <= len(upper)


def test_bounds_can_be_set_and_lifted_again() -> None:
    model = build_model(build_network(line_problem(demands=(Demand("A", "C", 10.0),), unit_cost_per_km=1.0)))
    lp = Relaxation(model.program, build_objective(model, "cost").coefficients)
    lp.solve()
    free = lp.objective
    link = model.family("link").indices
    lp.set_bounds(link, np.zeros(len(link)), np.zeros(len(link)))
    assert lp.separate() is LpStatus.INFEASIBLE
    lp.set_bounds(link, model.program.lower[link], model.program.upper[link])
    assert lp.separate() is LpStatus.OPTIMAL
    assert lp.objective == pytest.approx(free)
