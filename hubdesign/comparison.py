"""Structures side by side on the same demand and rules, with the proven interval of each difference."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace
from itertools import combinations

from hubdesign import run
from hubdesign.answer import Design, Progress, Status, is_proven
from hubdesign.errors import InfeasibleError, NoPlanError, UnsolvedError
from hubdesign.problem import Problem, Structure
from hubdesign.run import Result
from hubdesign.solve.control import Control

#: Transfers allowed in every structure where the settings are silent: enough for hub-and-spoke.
COMMON_TRANSFERS = 2

#: A structure that leaves no more than this share of the volume unserved serves all of it.
_ALL_SERVED = 1e-6

Listener = Callable[[str, Progress], None]


@dataclass(frozen=True, slots=True)
class Entry:
    """One structure of a comparison.

    Attributes
    ----------
    structure
        point-to-point, hub-and-spoke, mixed or current.
    status
        proven or feasible with a result; infeasible or unknown without.
    result
        The verified design; where not everything can be served, that of least unserved volume.
    comparable
        Whether objective and bound answer the question asked of every structure.
    note
        What a planner must know: why it is not comparable, or why there is no design.
    """

    structure: Structure
    status: Status
    result: Result | None
    comparable: bool
    note: str = ""

    @property
    def interval(self) -> tuple[float, float] | None:
        """The proven interval of the optimum, lower end first; None where nothing is proven."""
        if self.result is None or not self.comparable:
            return None
        design = self.result.design
        if design.objective is None or design.bound is None:
            return None
        return min(design.objective, design.bound), max(design.objective, design.bound)


@dataclass(frozen=True, slots=True)
class Difference:
    """The optimum of `first` minus that of `second`, in the goal's unit, lies in [low, high]."""

    first: Structure
    second: Structure
    low: float
    high: float

    @property
    def decided(self) -> bool:
        """Whether the sign is proven: the interval does not span zero."""
        return self.low > 0.0 or self.high < 0.0

    def better(self, maximise: bool) -> Structure | None:
        """Return the structure proven better, None where that is not decided at this gap."""
        if not self.decided:
            return None
        return self.first if (self.low > 0.0) == maximise else self.second


@dataclass(frozen=True, slots=True)
class Comparison:
    """All entries in the order asked, and every pairwise difference that can be told."""

    problem: Problem
    entries: tuple[Entry, ...]

    @property
    def differences(self) -> tuple[Difference, ...]:
        """Differences of the optima, one per pair of comparable entries."""
        result = []
        for first, second in combinations(self.entries, 2):
            if first.interval is not None and second.interval is not None:
                (a, above_a), (b, above_b) = first.interval, second.interval
                result.append(Difference(first.structure, second.structure, a - above_b, above_a - b))
        return tuple(result)

    @property
    def maximise(self) -> bool:
        """Whether a larger objective is better."""
        return self.problem.settings.goal != "least-cost"

    @property
    def any_design(self) -> bool:
        """Whether at least one structure has a design."""
        return any(entry.result is not None for entry in self.entries)

    @property
    def all_proven(self) -> bool:
        """Whether every structure is settled: proven within the gap asked, or proven infeasible."""
        return all(entry.status in (Status.PROVEN, Status.INFEASIBLE) for entry in self.entries)


def compared_structures(problem: Problem) -> tuple[Structure, ...]:
    """Return the structures that `compare` works out, today's network first where it is given."""
    designed: tuple[Structure, ...] = ("point-to-point", "hub-and-spoke", "mixed")
    return ("current", *designed) if problem.current else designed


def compare(
    problem: Problem,
    *,
    listener: Listener | None = None,
    on_control: Callable[[Control], None] | None = None,
) -> Comparison:
    """Work out every structure on the same inputs.

    Parameters
    ----------
    problem
        Its own structure is ignored; transfers are limited alike in every structure.
    listener
        Called with the structure and each progress line.
    on_control
        Called with the Control of each solve as it begins, so that a caller can cancel it.

    Raises
    ------
    VerificationError
        A fault of this program.
    """
    if problem.settings.max_transfers is None:
        problem = problem.with_settings(max_transfers=COMMON_TRANSFERS)
    work = _Work(problem, listener, on_control)
    entries: dict[Structure, Entry] = {}
    if problem.current:
        entries["current"] = work.entry("current", work.threads)
    pair: tuple[Structure, ...] = ("point-to-point", "hub-and-spoke")
    if work.threads > 1:
        with ThreadPoolExecutor(2) as pool:
            entries.update(zip(pair, pool.map(lambda s: work.entry(s, work.threads // 2), pair)))
    else:
        entries.update((structure, work.entry(structure, 1)) for structure in pair)
    plans = [_start(problem, entries[structure]) for structure in pair]
    starts = tuple(plan for plan in plans if plan is not None)
    entries["mixed"] = work.entry("mixed", work.threads, starts)
    for structure in pair:
        entries[structure] = _bounded_by_mixed(problem, entries[structure], entries["mixed"])
    return Comparison(problem, tuple(entries[structure] for structure in compared_structures(problem)))


def nothing_feasible(comparison: Comparison) -> UnsolvedError:
    """Return the error that says why no structure has a design."""
    reasons = [f"{entry.structure}: {entry.note}" for entry in comparison.entries]
    unknown = any(entry.status is Status.UNKNOWN for entry in comparison.entries)
    return NoPlanError(reasons) if unknown else InfeasibleError(reasons)


@dataclass(frozen=True, slots=True)
class _Work:
    """Solves one structure after another with what the caller wants to hear."""

    problem: Problem
    listener: Listener | None
    on_control: Callable[[Control], None] | None

    @property
    def threads(self) -> int:
        return self.problem.settings.threads or run.available_cores()

    def entry(self, structure: Structure, threads: int, starts: tuple[Design, ...] = ()) -> Entry:
        """Return the entry of a structure: its design, else that of least unserved volume, else why not."""
        problem = self.problem.with_settings(structure=structure, threads=threads)
        if structure == "hub-and-spoke" and not any(s.may_be_hub or s.must_be_hub for s in problem.stations):
            return Entry(structure, Status.INFEASIBLE, None, False, "no station may be a hub")
        try:
            result = self._design(problem, structure, starts)
            return _served_or_not(problem, Entry(structure, result.design.status, result, True))
        except NoPlanError as error:
            return Entry(structure, Status.UNKNOWN, None, False, "; ".join(error.reasons))
        except InfeasibleError as error:
            reasons = "; ".join(error.reasons)
        if problem.settings.unserved_allowed:
            return Entry(structure, Status.INFEASIBLE, None, False, reasons)
        relaxed = problem.with_settings(goal="most-volume", unserved="allowed")
        try:
            result = self._design(relaxed, structure, ())
        except (NoPlanError, InfeasibleError):
            return Entry(structure, Status.INFEASIBLE, None, False, reasons)
        return _served_or_not(relaxed, Entry(structure, Status.INFEASIBLE, result, False, reasons))

    def _design(self, problem: Problem, structure: Structure, starts: tuple[Design, ...]) -> Result:
        def hear(progress: Progress) -> None:
            if self.listener is not None:
                self.listener(structure, progress)

        control = run.make_control(problem.settings, hear)
        if self.on_control is not None:
            self.on_control(control)
        return run.design(problem, control=control, starts=starts)


def _served_or_not(problem: Problem, entry: Entry) -> Entry:
    """Say so where a structure leaves volume unserved that every structure was asked to serve."""
    assert entry.result is not None
    left = entry.result.bill.volume_unserved
    total = float(entry.result.network.demand.volume.sum())
    asked = entry.comparable and problem.settings.unserved_allowed
    if asked or left <= _ALL_SERVED * total:
        return entry
    note = f"not comparable: leaves {left:,.6g} {problem.settings.volume_unit} unserved"
    return replace(entry, comparable=False, note=note)


def _mixed_covers(problem: Problem) -> dict[str, bool]:
    """Return for which structures every plan is also a plan of mixed.

    A hub-and-spoke plan always is; a point-to-point plan is where no hub is forced (by a must, a count or
    single allocation) and there is no local volume.
    """
    settings = problem.settings
    mixed = settings.replace(structure="mixed")
    forced = any(s.must_be_hub for s in problem.stations) or mixed.hub_count[0] > 0 or mixed.single_allocation
    local = any(row.origin == row.destination for row in problem.demands)
    return {"hub-and-spoke": True, "point-to-point": not forced and not local}


def _start(problem: Problem, entry: Entry) -> Design | None:
    """Return a plan that mixed may start from."""
    usable = entry.result is not None and entry.comparable and _mixed_covers(problem)[entry.structure]
    return entry.result.design if usable and entry.result is not None else None


def _bounded_by_mixed(problem: Problem, entry: Entry, mixed: Entry) -> Entry:
    """Return `entry` with mixed's bound where that is tighter: no plan of either is better than it."""
    if not _mixed_covers(problem)[entry.structure] or not entry.comparable or not mixed.comparable:
        return entry
    if entry.result is None or mixed.result is None:
        return entry
    own, other = entry.result.design, mixed.result.design
    if own.bound is None or other.bound is None or own.objective is None:
        return entry
    maximise = problem.settings.goal != "least-cost"
    tighter = other.bound < own.bound if maximise else other.bound > own.bound
    if not tighter:
        return entry
    bound = max(other.bound, own.objective) if maximise else min(other.bound, own.objective)
    result = replace(entry.result, design=own.replace(bound=bound))
    status = Status.PROVEN if is_proven(result.gap, problem.settings.gap) else own.status
    result = replace(result, design=result.design.replace(status=status))
    return replace(entry, result=result, status=status)
