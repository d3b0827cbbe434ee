"""Every cut family and closing rule against solved optima: none may be cut off."""

from __future__ import annotations

import numpy as np
import pytest

from hubdesign.model.build import build_model
from hubdesign.model.objective import build_objective, goal_phases
from hubdesign.network import build_network
from hubdesign.solve.carrier.bounding import Bounder, sub_lp
from hubdesign.solve.carrier.closing import hopeless_links
from hubdesign.solve.carrier.linear import CutRows, LinearModel
from hubdesign.solve.carrier.setting import Setting
from hubdesign.solve.control import Control
from hubdesign.solve.direct import solve_direct
from hubdesign.solve.finish import integers_of
from hubdesign.solve.relaxation import LpStatus
from tests.solve.carrier.cases import random_carrier


def _setting(seed: int) -> tuple[Setting, np.ndarray, float] | None:
    """Return the setting, a best plan's point and its value, found without any of the cuts."""
    problem = random_carrier(seed)
    network = build_network(problem)
    design = solve_direct(network, Control(20.0, 1e-9, maximise=problem.settings.goal != "least-cost"))
    if not design.has_plan:
        return None
    model = build_model(network)
    control = Control(20.0, 1e-9, maximise=problem.settings.goal != "least-cost")
    setting = Setting(model, build_objective(model, goal_phases(model)[0]), control, control)
    best = setting.settle(integers_of(model, design))
    assert best is not None
    assert design.objective is not None
    return setting, best, design.objective


def _cuts_met(setting: Setting) -> list[CutRows]:
    """Return the cuts separated at the root and under every way to fix one hub or one fleet count."""
    lp = setting.new_lp()
    bounder = Bounder(setting, lp)
    found: list[CutRows] = []
    fixings: list[dict[int, tuple[float, float]]] = [{}]
    for column in setting.of.hub.tolist():
        if setting.upper[column] > setting.lower[column]:
            fixings += [{column: (0.0, 0.0)}, {column: (1.0, 1.0)}]
    for fixing in fixings:
        bounder.fix(fixing)
        for _ in range(4):
            if lp.solve() is not LpStatus.OPTIMAL:
                break
            maker = setting.cuts
            for cuts in (maker.link_cuts(lp.values), maker.station_cuts(lp.values)):
                rows = maker.rows(cuts, 1000)
                found.append(rows)
                lp.add_cuts(rows)
            lp.add_pool_rows(lp.violated(lp.values, 1000))
    return found


@pytest.mark.parametrize("block", range(8))
def test_no_cut_removes_a_best_plan(block: int) -> None:
    checked = 0
    for seed in range(25 * block, 25 * block + 25):
        made = _setting(seed)
        if made is None:
            continue
        setting, best, _ = made
        for cuts in _cuts_met(setting):
            checked += len(cuts)
            if len(cuts):
                assert (cuts.matrix @ best >= cuts.lower - 1e-7).all(), seed
    assert checked > 200


def test_cuts_are_violated_where_they_were_found() -> None:
    made = _setting(3)
    for seed in range(4, 16):
        made = _setting(seed)
        if made is None:
            continue
        setting = made[0]
        lp = setting.new_lp()
        lp.solve()
        maker = setting.cuts
        rows = maker.rows(maker.link_cuts(lp.values) + maker.station_cuts(lp.values), 1000)
        if len(rows):
            assert (rows.matrix @ lp.values < rows.lower).all()


def test_bounds_from_duals_never_pass_the_optimum() -> None:
    seen = 0
    for seed in range(30):
        made = _setting(seed)
        if made is None:
            continue
        setting, _, value = made
        optimum = setting.objective.scaled(value)
        bounder = Bounder(setting, setting.new_lp())
        heard: list[float] = []
        bounder.rounds(10, least_gain=1e-6, on_round=heard.append)
        assert max(heard) <= optimum + 1e-6 * max(1.0, abs(optimum)), seed
        seen += 1
    assert seen > 10


def test_dual_bound_holds_for_any_multipliers() -> None:
    """Multipliers of a solve that was broken off, or made up, still bound the optimum."""
    rng = np.random.default_rng(5)
    seen = 0
    for seed in range(20):
        made = _setting(seed)
        if made is None:
            continue
        setting, _, value = made
        lp: LinearModel = setting.new_lp()
        lp.solve()
        lp.add_pool_rows(lp.violated(lp.values, 1000))
        lp.solve()
        lp._duals = lp._duals * rng.uniform(0.5, 1.5, len(lp._duals)) + rng.normal(0.0, 0.1, len(lp._duals))
        bound, _ = lp.dual_bound(setting.lower, setting.upper, setting.groups)
        assert bound <= setting.objective.scaled(value) + 1e-6, seed
        seen += 1
    assert seen > 6


def test_shut_links_leave_the_optimum_alone() -> None:
    shut = 0
    for seed in range(200):
        problem = random_carrier(seed)
        if problem.settings.goal == "most-volume":
            continue
        network = build_network(problem)
        model = build_model(network)
        objective = build_objective(model, goal_phases(model)[0])
        closed = hopeless_links(model, objective)
        if not closed.any():
            continue
        shut += int(closed.sum())
        maximise = problem.settings.goal != "least-cost"
        whole = solve_direct(network, Control(20.0, 1e-9, maximise=maximise))
        links = tuple(
            row
            for row in problem.links
            if not any(
                {row.from_, row.to}
                == {
                    model.station_label(int(network.link.tail[e])),
                    model.station_label(int(network.link.head[e])),
                }
                for e in np.flatnonzero(closed).tolist()
            )
        )
        less = solve_direct(
            build_network(problem.replace(links=links)), Control(20.0, 1e-9, maximise=maximise)
        )
        assert less.status is whole.status
        if whole.objective is not None and less.objective is not None:
            assert abs(less.objective - whole.objective) <= 1e-6 * max(1.0, abs(whole.objective)), seed
    assert shut > 10


def test_columns_left_out_come_back_when_they_price_in() -> None:
    """An LP that starts without most flows ends at the value of the whole LP."""
    for seed in (1, 2, 5, 8, 11):
        problem = random_carrier(seed)
        network = build_network(problem)
        model = build_model(network)
        control = Control(20.0, 1e-9, maximise=problem.settings.goal != "least-cost")
        setting = Setting(model, build_objective(model, goal_phases(model)[0]), control, control)
        whole = Bounder(setting, setting.new_lp())
        end = whole.rounds(20, least_gain=1e-9, patience=3)
        if end.status is not LpStatus.OPTIMAL:
            continue
        active = setting.start_columns()
        late = model.flows.itineraries.transfers[model.flows.of_itinerary] >= 1
        active[setting.of.flow[late]] = False
        few = LinearModel(
            setting.program, setting.objective.coefficients, active, setting.lower, setting.upper
        )
        part = Bounder(setting, few)
        other = part.rounds(20, least_gain=1e-9, patience=3)
        assert other.bound <= end.bound + 1e-4 * max(1.0, abs(end.bound))


def test_a_smaller_lp_bounds_like_the_common_one() -> None:
    for seed in (1, 2, 5, 8):
        made = _setting(seed)
        if made is None:
            continue
        setting, best, value = made
        lower, upper = setting.lower.copy(), setting.upper.copy()
        lower[setting.of.hub] = upper[setting.of.hub] = best[setting.of.hub]
        lp = setting.new_lp()
        Bounder(setting, lp).rounds(5, least_gain=1e-6)
        small = sub_lp(setting, lp.tight(), lower, upper)
        end = Bounder(setting, small).rounds(5, least_gain=1e-6)
        assert end.bound <= setting.objective.scaled(value) + 1e-6 * max(1.0, abs(value))
