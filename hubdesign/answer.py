"""The answer: what is opened, how often it runs, how every O-D volume travels, and how far that is proven."""

from __future__ import annotations

import dataclasses
import enum
from dataclasses import dataclass
from typing import Any, Self

from hubdesign.units import GAP_FLOOR


class Status(enum.Enum):
    """How a solve ended."""

    PROVEN = "proven"  #: a design, proven within the gap asked
    FEASIBLE = "feasible"  #: a design, its gap larger than asked
    INFEASIBLE = "infeasible"  #: proven: no design obeys every rule
    UNKNOWN = "unknown"  #: a limit was reached without a design


@dataclass(frozen=True, slots=True)
class Flow:
    """A share of an O-D demand on one itinerary.

    Attributes
    ----------
    demand
        Position in `Problem.demands`.
    legs
        Positions in `Network.leg`, in order of travel; empty for local volume that stays at its own hub.
    share
        Share of the demand's volume, 0..1.
    """

    demand: int
    legs: tuple[int, ...]
    share: float


@dataclass(frozen=True, slots=True)
class Frequency:
    """Departures each way per period of a service (position in `Network.service`)."""

    service: int
    departures: int


@dataclass(frozen=True, slots=True)
class Progress:
    """One line of the progress record.

    Attributes
    ----------
    seconds
        Wall time since the solve began, s.
    best
        Objective of the best plan so far, in the goal's unit; None where there is none yet.
    bound
        Proven bound on the objective of any plan; None where there is none yet.
    """

    seconds: float
    best: float | None
    bound: float | None

    @property
    def gap(self) -> float | None:
        """``|bound - best| / |best|``; None where either is missing or the best is 0."""
        if self.best is None or self.bound is None or self.best == 0.0:
            return None
        return abs(self.bound - self.best) / abs(self.best)


@dataclass(frozen=True, slots=True)
class Design:
    """An immutable answer to one Problem.

    Attributes
    ----------
    status
        How the solve ended; `hubs` to `flows` are empty unless there is a design.
    objective, bound
        In the goal's unit (money, or volume for most-volume); the bound is rounded outward: no plan is
        better than it. `objective` is recomputed from the plan, not taken from a solver.
    hubs, links
        Open stations and links, positions in `Problem.stations` and `Network.link`, ascending.
    frequencies
        Services with at least one departure, ascending.
    flows
        Every itinerary used, in order of demand.
    allocation
        Hub of each station (position, its own for a hub) under single allocation, else None.
    progress
        The record of best plan and bound over time.
    method
        One line: what kind of problem it was and how it was solved.
    reasons
        Why there is no design, in planner's words.
    second_objective, second_bound
        most-volume only: the cost with the volume held, and its bound.
    """

    status: Status
    objective: float | None = None
    bound: float | None = None
    hubs: tuple[int, ...] = ()
    links: tuple[int, ...] = ()
    frequencies: tuple[Frequency, ...] = ()
    flows: tuple[Flow, ...] = ()
    allocation: tuple[int, ...] | None = None
    progress: tuple[Progress, ...] = ()
    method: str = ""
    reasons: tuple[str, ...] = ()
    second_objective: float | None = None
    second_bound: float | None = None

    def replace(self, **changes: Any) -> Self:
        """Return a copy with `changes`."""
        return dataclasses.replace(self, **changes)

    @property
    def has_plan(self) -> bool:
        """Whether there is a design."""
        return self.status in (Status.PROVEN, Status.FEASIBLE)


def relative_gap(objective: float | None, bound: float | None, total_cost: float) -> float | None:
    """Return ``|bound - objective| / |objective|``.

    0 where they differ by at most 1e-9 of `total_cost`; None where either is missing or the objective is 0.
    """
    if objective is None or bound is None:
        return None
    if abs(bound - objective) <= 1e-9 * abs(total_cost):
        return 0.0
    return None if objective == 0.0 else abs(bound - objective) / abs(objective)


def is_proven(gap: float | None, asked: float) -> bool:
    """Whether `gap` honours the gap asked; nobody is promised less than 1e-6."""
    return gap is not None and gap <= max(asked, GAP_FLOOR)


def round_bound_outward(bound: float, maximise: bool, scale: float = 0.0) -> float:
    """Return `bound` weakened by the tolerance of float arithmetic and solvers.

    A bound is a promise: 5e-10 of itself or of `scale` (the size of the sums it came from) is given away.
    """
    slack = 0.5e-9 * max(abs(bound), abs(scale))
    return bound + slack if maximise else bound - slack
