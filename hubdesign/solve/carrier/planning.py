"""The plan side: dives in the cut-rich LP and restricted models around the best plan."""

from __future__ import annotations

import threading

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.carrier.bounding import Bounder
from hubdesign.solve.carrier.linear import LinearModel
from hubdesign.solve.carrier.restricted import Restricted
from hubdesign.solve.carrier.setting import Setting
from hubdesign.solve.relaxation import LpStatus

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

_WHOLE = 1e-6

#: Share of the fractional departures that a step of a dive fixes.
_STEP_SHARE = 0.2

#: Fractions from here on are rounded up in a dive.
_ROUND_UP = 0.5

_DIVE_STEPS = 60

#: Restricted searches by how often the last ones failed: width of departures, reopening of links, SCIP
#: nodes, hubs free.
_WIDTHS = ((1, 0.3, 300, False), (2, 0.1, 600, False), (3, 0.02, 1500, False), (2, 0.1, 1000, True))


def likely_hubs(setting: Setting, values: Floats, threshold: float = 0.5) -> Bools:
    """Return which stations to open, shape (n,): relaxed values over `threshold`, within the count."""
    fewest, most = setting.model.network.problem.settings.hub_count
    station = setting.model.network.station
    relaxed = values[setting.of.hub]
    may = np.flatnonzero(setting.upper[setting.of.hub] > 0.0)
    order = sorted(may.tolist(), key=lambda i: (not station.must_be_hub[i], -round(float(relaxed[i]), 9), i))
    count = sum(1 for i in order if relaxed[i] > threshold or station.must_be_hub[i])
    count = max(count, fewest)
    count = count if most is None else min(count, most)
    result = np.zeros(len(relaxed), dtype=bool)
    result[order[:count]] = True
    return result


def dive(setting: Setting, lp: LinearModel, hubs: Bools, *, cut_rounds: int = 2) -> Floats | None:
    """Return the values of an LP with hubs as given and departures whole, None where the dive fails.

    Departures nearest to a whole number are fixed first; where that leaves no solution, those just fixed
    are raised instead, which only offers more room.
    """
    lp.set_bounds(setting.integer, setting.lower[setting.integer], setting.upper[setting.integer])
    bounder = Bounder(setting, lp)
    bounds: dict[int, tuple[float, float]] = {}
    for i in np.flatnonzero(setting.upper[setting.of.hub] > 0.0).tolist():
        bounds[int(setting.of.hub[i])] = (float(hubs[i]), float(hubs[i]))
    bounder.fix(bounds)
    end = bounder.rounds(cut_rounds, least_gain=1e-4)
    if end.status is not LpStatus.OPTIMAL:
        return None
    frequency = setting.of.frequency
    fixed = np.zeros(len(frequency), dtype=bool)
    for _ in range(_DIVE_STEPS):
        if setting.control.stop_requested() or setting.done.is_set():
            return None
        n = lp.values[frequency]
        away = np.abs(n - np.round(n))
        broken = np.flatnonzero(~fixed & (away > _WHOLE))
        if not len(broken):
            return lp.values.copy()
        whole = np.flatnonzero(~fixed & (away <= _WHOLE) & (n > 0.5))
        for s in whole.tolist():
            low = min(float(np.round(n[s])), float(setting.upper[frequency[s]]))
            bounds[int(frequency[s])] = (low, float(setting.upper[frequency[s]]))
        target = np.where(n - np.floor(n) >= _ROUND_UP, np.ceil(n), np.floor(n))
        order = broken[np.argsort(np.abs(target - n)[broken], kind="stable")]
        batch = order[: max(1, int(np.ceil(len(order) * _STEP_SHARE)))]
        for s in batch.tolist():
            at = min(float(target[s]), float(setting.upper[frequency[s]]))
            bounds[int(frequency[s])] = (at, at)
        fixed[batch] = True
        bounder.fix(bounds)
        if lp.solve(setting.control.remaining_s()) is LpStatus.OPTIMAL:
            continue
        for s in batch.tolist():
            high = float(setting.upper[frequency[s]])
            bounds[int(frequency[s])] = (min(float(np.ceil(n[s])), high), high)
        fixed[batch] = False
        for s in np.flatnonzero(fixed).tolist():
            low = bounds[int(frequency[s])][0]
            bounds[int(frequency[s])] = (low, float(setting.upper[frequency[s]]))
        fixed[:] = False
        bounder.fix(bounds)
        if lp.solve(setting.control.remaining_s()) is not LpStatus.OPTIMAL:
            return None
    return None


def neighbourhood(
    setting: Setting,
    lp: LinearModel,
    point: Floats,
    relaxed: Floats,
    *,
    width: int,
    reopen: float,
    node_limit: int | None,
    free_hubs: bool = False,
) -> bool:
    """Search around `point` in SCIP; whether a better plan was found.

    Hubs stay, departures move within `width`, links closed in the plan come back where the relaxation
    opens them more than `reopen`.
    """
    lower, upper = setting.lower.copy(), setting.upper.copy()
    hub = setting.of.hub
    if not free_hubs:
        lower[hub] = upper[hub] = np.round(point[hub])
    service_link = setting.model.network.service.link
    opened = (np.round(point[setting.of.link]) > 0) | (relaxed[setting.of.link] > reopen)
    must = lower[setting.of.link] > 0
    upper[setting.of.link[~opened & ~must]] = 0.0
    n = np.round(point[setting.of.frequency])
    near = (
        np.floor(np.minimum(n, relaxed[setting.of.frequency])),
        np.ceil(np.maximum(n, relaxed[setting.of.frequency])),
    )
    high = np.minimum(upper[setting.of.frequency], np.maximum(n, near[1] if width > 1 else n) + width)
    low = np.maximum(lower[setting.of.frequency], n - width)
    upper[setting.of.frequency] = np.where(opened[service_link], high, 0.0)
    lower[setting.of.frequency] = np.where(opened[service_link], np.minimum(low, high), 0.0)
    best = setting.cutoff
    model = Restricted(setting, lower, upper, lp)
    model.add_start(point)
    control = setting.control
    model.set_priorities(branching_priorities(setting))
    setting.interrupts.append(model.scip.scip.interruptSolve)
    if setting.done.is_set():
        return False
    model.run(
        control,
        gap=1e-5,
        node_limit=node_limit,
        on_plan=lambda values: _offer(setting, values),
        settings={"separating/maxrounds": 1, "separating/maxroundsroot": 5, "heuristics/rins/freq": 10},
    )
    setting.interrupts.clear()
    model.free()
    return setting.cutoff < best - 1e-9 * abs(best)


def _offer(setting: Setting, values: Floats) -> None:
    setting.offer(values)


def branching_priorities(setting: Setting) -> Floats:
    """Return SCIP's priorities: fleet before hubs before links before departures, shape (columns,)."""
    result = np.zeros(setting.program.column_count)
    result[setting.of.vehicles] = 1000
    result[setting.of.hub] = 500
    result[setting.of.link] = 10
    return result


class PlanSide:
    """Dives and restricted searches, one step at a time; may live on a thread of its own."""

    def __init__(self, setting: Setting) -> None:
        self.setting = setting
        self._lock = threading.Lock()
        self._lp: LinearModel | None = None
        self._relaxed: Floats | None = None
        self._waiting: list[tuple[float, tuple[int, ...]]] = []
        self._tried: set[tuple[int, ...]] = set()
        self._round = 0
        self._searched: Floats | None = None
        self._started = False

    # -- news from the bound side ----------------------------------------------------------------------

    def wants_lp(self) -> bool:
        """Whether a copy of the bound side's LP is of use."""
        return self._lp is None

    def hand_lp(self, lp: LinearModel, values: Floats) -> None:
        """Take over an LP (a copy that nobody else uses) and its relaxed values."""
        with self._lock:
            self._lp, self._relaxed = lp, values
            self._started = True

    def propose(self, bound: float, values: Floats) -> None:
        """Take note of a hub set with the bound of its LP."""
        hubs = tuple(np.flatnonzero(values[self.setting.of.hub] > 0.5).tolist())
        with self._lock:
            if hubs not in self._tried and all(other != hubs for _, other in self._waiting):
                self._waiting.append((bound, hubs))
                self._waiting.sort()

    # -- work ------------------------------------------------------------------------------------------

    def step(self) -> bool:
        """Do the most promising piece of work; whether there was one."""
        setting = self.setting
        with self._lock:
            lp, relaxed = self._lp, self._relaxed
        if lp is None or relaxed is None:
            return False
        if not self._tried:
            for threshold in (0.5, 0.25, 0.75):
                self.propose(-np.inf, self._rounded(relaxed, threshold))
        with self._lock:
            while self._waiting and self._waiting[0][0] >= setting.target:
                self._waiting.pop(0)
            entry = self._waiting.pop(0) if self._waiting else None
        if setting.plan is not None and self._searched is not setting.point:
            if entry is not None:
                with self._lock:
                    self._waiting.insert(0, entry)
            self._search(lp, relaxed)
            return True
        if entry is not None:
            self._dive(lp, entry[1])
            return True
        if self._round < len(_WIDTHS) and setting.plan is not None:
            self._search(lp, relaxed)
            return True
        return False

    def _rounded(self, relaxed: Floats, threshold: float) -> Floats:
        values = np.zeros(len(relaxed))
        values[self.setting.of.hub] = likely_hubs(self.setting, relaxed, threshold)
        return values

    def _dive(self, lp: LinearModel, hubs: tuple[int, ...]) -> None:
        setting = self.setting
        self._tried.add(hubs)
        chosen = np.zeros(len(setting.of.hub), dtype=bool)
        chosen[list(hubs)] = True
        values = dive(setting, lp, chosen)
        if values is not None:
            setting.offer(values)

    def _search(self, lp: LinearModel, relaxed: Floats) -> None:
        """Search around the best plan; wider when the last search brought nothing."""
        setting = self.setting
        point = setting.point
        if point is None:
            return
        if self._searched is not point:
            self._round = 0
        width, reopen, nodes, free_hubs = _WIDTHS[self._round]
        hubs = np.round(point[setting.of.hub]) > 0
        local = self._local(lp, hubs)
        neighbourhood(
            setting,
            lp,
            point,
            relaxed if local is None else local,
            width=width,
            reopen=reopen,
            node_limit=nodes,
            free_hubs=free_hubs,
        )
        better = setting.point is not point
        self._searched = setting.point
        self._round = 0 if better else self._round + 1

    def _local(self, lp: LinearModel, hubs: Bools) -> Floats | None:
        """Return the relaxed values with the plan's own hubs."""
        setting = self.setting
        bounder = Bounder(setting, lp)
        bounds = {
            int(setting.of.hub[i]): (float(hubs[i]), float(hubs[i]))
            for i in np.flatnonzero(setting.upper[setting.of.hub] > 0.0).tolist()
        }
        # The dive before has left its own bounds: all whole columns are set back.
        lp.set_bounds(setting.integer, setting.lower[setting.integer], setting.upper[setting.integer])
        bounder.fix(bounds)
        if bounder.rounds(2, least_gain=1e-4).status is not LpStatus.OPTIMAL:
            return None
        values = lp.values.copy()
        return values
