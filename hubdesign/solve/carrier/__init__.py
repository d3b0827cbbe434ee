"""Carrier networks: frequencies, fleets, hubs and unserved volume on listed itineraries."""

from __future__ import annotations

from hubdesign.answer import Design
from hubdesign.network import Network
from hubdesign.problem import UNLIMITED, Problem
from hubdesign.solve.control import Control


def fits(problem: Problem) -> bool:
    """Whether this engine serves `problem`: a fleet, itineraries that can be listed, multiple allocation."""
    settings = problem.settings
    return (
        problem.has_fleet
        and settings.structure != "current"
        and not settings.single_allocation
        and settings.transfers_at_most != UNLIMITED
    )


def solve(problem: Problem, network: Network, control: Control, starts: tuple[Design, ...] = ()) -> Design:
    """Return the best Design found within the control's limits.

    Parameters
    ----------
    problem
        One that :func:`fits`.
    network
        Its candidates.
    control
        Limits and the record.
    starts
        Plans on the same candidates to start from.
    """
    from hubdesign.solve.carrier.engine import solve_carrier

    control.maximise = problem.settings.goal != "least-cost"
    return solve_carrier(network, control, starts)
