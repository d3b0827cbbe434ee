"""Which engine serves which problem: the planner never picks one by name."""

from __future__ import annotations

from hubdesign.answer import Design
from hubdesign.network import Network, build_network
from hubdesign.problem import Problem
from hubdesign.solve.control import Control


def solve(
    problem: Problem, control: Control, network: Network | None = None, starts: tuple[Design, ...] = ()
) -> Design:
    """Return the best Design found within the control's limits.

    Parameters
    ----------
    problem
        Free of faults; its settings say what is asked.
    control
        Limits, progress, cancelling; `control.maximise` is set to fit the goal.
    network
        The candidates, where they are known already.
    starts
        Plans on the same candidates to start from; none better is ever left behind.
    """
    from hubdesign.solve import carrier
    from hubdesign.solve.direct import solve_direct
    from hubdesign.solve.fixed_charge import adapter as fixed_charge
    from hubdesign.solve.hub_location.adapter import fits, solve_hub_location

    network = build_network(problem) if network is None else network
    control.maximise = problem.settings.goal != "least-cost"
    if fits(network):
        return solve_hub_location(network, control, starts)
    if carrier.fits(problem):
        return carrier.solve(problem, network, control, starts)
    if fixed_charge.fits(network):
        return fixed_charge.solve_fixed_charge_design(network, control, starts)
    return solve_direct(network, control, starts)
