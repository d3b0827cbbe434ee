"""Recompute a design: every cost and every rule, from Problem and Design alone, without a solver."""

from __future__ import annotations

from dataclasses import dataclass

from hubdesign.answer import Design, Status, is_proven, relative_gap
from hubdesign.network import Network, build_network
from hubdesign.pricing import Bill, price
from hubdesign.problem import Problem
from hubdesign.rules import CURRENT_RULES, CURRENT_WARNINGS, DESIGN_RULES, broken
from hubdesign.units import COST_TOLERANCE


@dataclass(frozen=True, slots=True)
class Verification:
    """What the recomputation found.

    Attributes
    ----------
    bill
        The plan, priced.
    breaches
        Broken rules and figures that do not come out; empty for a sound design.
    warnings
        What is broken but allowed: limits that today's network exceeds.
    """

    bill: Bill
    breaches: tuple[str, ...]
    warnings: tuple[str, ...] = ()


def verify(problem: Problem, design: Design, network: Network | None = None) -> Verification:
    """Return what a recomputation of `design` finds.

    The bound itself is not rechecked (that would take the solve again), only that it stands on the right
    side of the objective and that the status honours the gap asked.
    """
    network = build_network(problem) if network is None else network
    bill = price(network, design)
    today = problem.settings.structure == "current"
    rules = CURRENT_RULES if today else DESIGN_RULES
    breaches = broken(rules, network, design, bill)
    warnings = broken(CURRENT_WARNINGS, network, design, bill) if today else ()
    return Verification(bill, (*breaches, *_figure_faults(problem, design, bill)), warnings)


def _figure_faults(problem: Problem, design: Design, bill: Bill) -> list[str]:
    """Check the objective against the bill, the bound's side and the status."""
    phase = problem.settings.objective_phase
    value = {"cost": bill.total_cost, "profit": bill.profit, "volume": bill.volume_carried}[phase]
    size = bill.volume_carried if phase == "volume" else bill.total_cost
    slack = COST_TOLERANCE * max(abs(size), abs(value))
    objective, bound = design.objective, design.bound
    if objective is None or bound is None:
        return ["objective or bound is missing"]
    told = []
    if abs(objective - value) > slack:
        told.append(f"objective {objective:.12g} does not come out: recomputed {value:.12g}")
    beyond = objective - bound if phase != "cost" else bound - objective
    if beyond > slack:
        told.append(f"bound {bound:.12g} is on the wrong side of the objective {objective:.12g}")
    gap = relative_gap(objective, bound, size)
    proven = is_proven(gap, problem.settings.gap) or objective == bound
    if (design.status is Status.PROVEN) != proven:
        told.append(
            f"status {design.status.value} does not fit the gap {gap} (asked: {problem.settings.gap})"
        )
    return told
