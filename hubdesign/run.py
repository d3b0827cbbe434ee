"""One design from question to checked answer: solve, verify, else say why there is none.

No unverified plan leaves this room.
"""

from __future__ import annotations

import os
import time
from collections.abc import Callable
from dataclasses import dataclass

from hubdesign.answer import Design, Progress, Status, relative_gap
from hubdesign.diagnose import diagnose
from hubdesign.errors import InfeasibleError, NoPlanError, VerificationError
from hubdesign.network import Network, build_network
from hubdesign.pricing import Bill
from hubdesign.problem import Problem, Settings
from hubdesign.solve.control import Control
from hubdesign.solve.dispatch import solve
from hubdesign.verification import verify

#: Wall time given to finding out why nothing is feasible, s.
_DIAGNOSIS_S = 20.0


@dataclass(frozen=True, slots=True)
class Result:
    """A verified design with everything it was worked out from.

    Attributes
    ----------
    problem, network, design, bill
        The question, its arrays, the answer, the answer priced without a solver.
    warnings
        What a planner should know about the plan (breaches of today's network, say).
    solve_s, cpu_s
        Wall time and CPU time (all threads of this process) of the solve, s.
    """

    problem: Problem
    network: Network
    design: Design
    bill: Bill
    warnings: tuple[str, ...] = ()
    solve_s: float = 0.0
    cpu_s: float = 0.0

    @property
    def gap(self) -> float | None:
        """Relative gap of the design; None where the objective is 0 and the bound is not."""
        return relative_gap(self.design.objective, self.design.bound, self.objective_size)

    @property
    def objective_size(self) -> float:
        """What a difference between objective and bound is held against: total cost, or volume carried."""
        goal = self.problem.settings.goal
        return self.bill.volume_carried if goal == "most-volume" else self.bill.total_cost


def make_control(
    settings: Settings,
    listener: Callable[[Progress], None] | None = None,
    announcer: Callable[[str], None] | None = None,
) -> Control:
    """Return the Control that `settings` ask for; threads default to the machine's cores."""
    return Control(
        time_limit_s=settings.time_limit_s,
        gap=settings.gap,
        threads=settings.threads or available_cores(),
        seed=settings.seed,
        maximise=settings.goal != "least-cost",
        listener=listener,
        announcer=announcer,
    )


def available_cores() -> int:
    """Return the cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def design(
    problem: Problem,
    *,
    control: Control | None = None,
    listener: Callable[[Progress], None] | None = None,
    starts: tuple[Design, ...] = (),
) -> Result:
    """Design the network that `problem` asks for.

    Parameters
    ----------
    problem
        As :func:`hubdesign.read_case` returns it, or a variant of it.
    control
        Limits and cancelling; by default what the settings ask for.
    listener
        Called with each :class:`~hubdesign.answer.Progress`; ignored where `control` is given.
    starts
        Plans on the same candidates to start from.

    Returns
    -------
    Result
        The verified design, proven within the gap asked or with its honest gap.

    Raises
    ------
    InfeasibleError
        No design obeys every rule; the reasons are in planner's words.
    NoPlanError
        A limit was reached before any design was found.
    VerificationError
        A fault of this program: the plan failed its own recomputation.
    """
    control = make_control(problem.settings, listener) if control is None else control
    wall, cpu = time.perf_counter(), time.process_time()
    network = build_network(problem)
    answer = solve(problem, control, network, starts)
    solve_s, cpu_s = time.perf_counter() - wall, time.process_time() - cpu
    if answer.status is Status.INFEASIBLE:
        raise InfeasibleError(answer.reasons or diagnose(problem, _DIAGNOSIS_S))
    if answer.status is Status.UNKNOWN:
        raise NoPlanError(_no_plan_reasons(control))
    checked = verify(problem, answer, network)
    if checked.breaches:
        raise VerificationError(checked.breaches)
    return Result(problem, network, answer, checked.bill, checked.warnings, solve_s, cpu_s)


def _no_plan_reasons(control: Control) -> list[str]:
    if control.cancelled:
        return ["stopped before a first design was found"]
    return [
        f"no design was found within {control.time_limit_s:g} s; whether one exists is not known:"
        " raise time_limit_s, or let demand go unserved to see what is in the way"
    ]
