"""The hub location question and answer as plain arrays, apart from files, links and settings."""

from __future__ import annotations

import enum
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


class HubStatus(enum.Enum):
    """How a solve of a :class:`HubInstance` ended."""

    PROVEN = "proven"  #: a plan, proven within the gap asked
    FEASIBLE = "feasible"  #: a plan, a limit was reached before the proof
    INFEASIBLE = "infeasible"  #: proven: no set of hubs serves every volume within the limits
    UNKNOWN = "unknown"  #: a limit was reached without a plan


@dataclass(frozen=True, slots=True)
class HubInstance:
    """A hub location instance; n is the number of stations.

    A volume from o to d travels o, k, m, d through open hubs k and m, repeats dropped. An end that is itself
    an open hub acts as a hub: its leg costs `transfer`, and it is no interior stop. Volume from i to i
    travels i, h, i from a non-hub and costs nothing at an open hub.

    Attributes
    ----------
    volume
        (n, n), volume from row to column per period, >= 0; the diagonal is local volume.
    collect, transfer, distribute
        (n, n), money per unit of volume on a leg from row to column: from non-hub to hub, between hubs,
        from hub to non-hub. >= 0, inf where there is no link, diagonal 0.
    transfer_cost
        (n,), money per unit of volume for which the station is an interior stop, >= 0.
    candidate, forced
        (n,), whether the station may be, and must be, a hub.
    fixed_cost
        (n,), money for an open hub, any sign.
    hubs_min, hubs_max
        Fewest and most open hubs.
    collection_capacity
        (n,), the most volume whose first hub is this station (local volume included), inf for none.
    constant
        Money that no decision changes, added to objective and bound.
    """

    volume: Floats
    collect: Floats
    transfer: Floats
    distribute: Floats
    transfer_cost: Floats
    candidate: Bools
    forced: Bools
    fixed_cost: Floats
    hubs_min: int
    hubs_max: int
    collection_capacity: Floats
    constant: float = 0.0

    @property
    def station_count(self) -> int:
        """Number of stations."""
        return len(self.volume)

    @property
    def hub_candidates(self) -> Ints:
        """Stations that may be hubs, ascending."""
        return np.flatnonzero(self.candidate | self.forced)

    @property
    def has_capacity(self) -> bool:
        """Whether some candidate limits the volume it collects."""
        return bool(np.isfinite(self.collection_capacity[self.hub_candidates]).any())


@dataclass(frozen=True, slots=True)
class HubAnswer:
    """The answer to a :class:`HubInstance`.

    Attributes
    ----------
    hubs
        Open hubs, ascending; empty without a plan.
    allocation
        (n,), the hub of each station under single allocation (its own for a hub), else None.
    objective
        Cost of the plan, money, recomputed from the plan alone; inf without one.
    bound
        No plan is cheaper than this, money; inf where none exists.
    status
        How the solve ended.
    """

    hubs: tuple[int, ...]
    allocation: Ints | None
    objective: float
    bound: float
    status: HubStatus


def plain_instance(
    volume: Floats,
    collect: Floats,
    transfer: Floats,
    distribute: Floats,
    *,
    hubs: int | None = None,
    fixed_cost: Floats | None = None,
    collection_capacity: Floats | None = None,
) -> HubInstance:
    """Return an instance where every station is a candidate; exactly `hubs` hubs if given."""
    n = len(volume)
    return HubInstance(
        volume=volume,
        collect=collect,
        transfer=transfer,
        distribute=distribute,
        transfer_cost=np.zeros(n),
        candidate=np.ones(n, dtype=bool),
        forced=np.zeros(n, dtype=bool),
        fixed_cost=np.zeros(n) if fixed_cost is None else fixed_cost,
        hubs_min=0 if hubs is None else hubs,
        hubs_max=n if hubs is None else hubs,
        collection_capacity=np.full(n, np.inf) if collection_capacity is None else collection_capacity,
    )
