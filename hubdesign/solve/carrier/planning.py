"""The plan side: dives in the cut-rich LP and restricted models around the best plan."""

from __future__ import annotations

import logging
import threading
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.carrier.bounding import Bounder, sub_lp
from hubdesign.solve.carrier.linear import LinearModel
from hubdesign.solve.carrier.restricted import Restricted
from hubdesign.solve.carrier.setting import RowSet, Setting, StepControl
from hubdesign.solve.relaxation import LpStatus

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

_LOG = logging.getLogger(__name__)

_WHOLE = 1e-6

#: Share of the fractional departures that a step of a dive fixes.
_STEP_SHARE = 0.2

#: Fractions from here on are rounded up in a dive.
_ROUND_UP = 0.5

_DIVE_STEPS = 300

#: Separation rounds before a dive: what the LP does not know yet, the dive pays for.
_DIVE_ROUNDS = 6

#: Hub sets bounded between two restricted searches, where both are wanted.
_RELAXED_BETWEEN = 6

#: Hub sets whose plan is within this share of the best are searched around too.
_NEAR = 0.01

#: LPs of hub sets kept at the most.
_MOST_LPS = 6

#: Width that leaves departures free.
_FREE = 10_000

#: Restricted searches by how often the last ones failed: width of departures, reopening of links, SCIP
#: nodes, hubs free.
_WIDTHS = ((1, 0.3, 300, False), (2, 0.05, 1000, False), (_FREE, 0.0, 3000, False), (2, 0.1, 1000, True))


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


def dive(setting: Setting, lp: LinearModel) -> Floats | None:
    """Return the values of `lp`, whose hubs are fixed, with departures whole; None where the dive fails.

    Departures nearest to a whole number are fixed first; where that leaves no solution, those just fixed
    are raised instead, which only offers more room.
    """
    bounder = Bounder(setting, lp)
    bounds: dict[int, tuple[float, float]] = {}
    if bounder.rounds(_DIVE_ROUNDS, least_gain=1e-4, patience=2).status is not LpStatus.OPTIMAL:
        return None
    if not _round_fleet(setting, bounder, bounds):
        return None
    frequency = setting.of.frequency
    for _ in range(_DIVE_STEPS):
        if setting.control.stop_requested() or setting.done.is_set():
            return None
        n = lp.values[frequency]
        away = np.abs(n - np.round(n))
        broken = np.flatnonzero(away > _WHOLE)
        if not len(broken):
            return lp.values.copy()
        target = np.where(n - np.floor(n) >= _ROUND_UP, np.ceil(n), np.floor(n))
        order = broken[np.argsort(np.abs(target - n)[broken], kind="stable")]
        size = max(1, int(np.ceil(len(order) * _STEP_SHARE)))
        while True:
            before = {int(frequency[s]): bounds.get(int(frequency[s])) for s in order[:size].tolist()}
            for s in order[:size].tolist():
                low, high = before[int(frequency[s])] or (0.0, float(setting.upper[frequency[s]]))
                up = target[s] > n[s] and target[s] <= high
                bounds[int(frequency[s])] = (float(target[s]), high) if up else (low, float(np.floor(n[s])))
            bounder.fix(bounds)
            if lp.solve(setting.control.remaining_s()) is LpStatus.OPTIMAL:
                break
            for column, old in before.items():
                if old is None:
                    del bounds[column]
                else:
                    bounds[column] = old
            if size > 1:
                size = max(1, size // 4)
            elif not _release_fleet(setting, bounds):
                # The last resort: this one at least rounded up, the others free to follow.
                s = int(order[0])
                high = float(setting.upper[frequency[s]])
                bounds[int(frequency[s])] = (min(float(np.ceil(n[s])), high), high)
                bounder.fix(bounds)
                if lp.solve(setting.control.remaining_s()) is not LpStatus.OPTIMAL:
                    return None
                break
    return None


def _round_fleet(setting: Setting, bounder: Bounder, bounds: dict[int, tuple[float, float]]) -> bool:
    """Limit the fleet to whole counts, the dearest type first, rounding to the nearest; False without a way.

    Rounded only at the end, counts would be rounded up, each a vehicle that hardly flies.
    """
    lp = bounder.lp
    fleet = setting.of.vehicles
    price = setting.objective.coefficients[fleet]
    for v in np.argsort(-price, kind="stable").tolist():
        column = int(fleet[v])
        count = float(lp.values[column])
        if setting.upper[column] <= 0.0 or price[v] <= 0.0:
            continue
        for most in dict.fromkeys((float(np.round(count)), float(np.ceil(count - _WHOLE)))):
            at = min(max(most, float(setting.lower[column])), float(setting.upper[column]))
            bounds[column] = (at, at)
            bounder.fix(bounds)
            if lp.solve(setting.control.remaining_s()) is LpStatus.OPTIMAL:
                break
        else:
            _release_fleet(setting, bounds)
            bounder.fix(bounds)
            return lp.solve(setting.control.remaining_s()) is LpStatus.OPTIMAL
    return True


def _release_fleet(setting: Setting, bounds: dict[int, tuple[float, float]]) -> bool:
    """Lift the limits that a dive put on the fleet; whether there were any."""
    limited = [c for c in setting.of.vehicles.tolist() if c in bounds]
    for column in limited:
        del bounds[column]
    return bool(limited)


def round_up(setting: Setting, values: Floats) -> Floats:
    """Return `values` with departures rounded up and every hub in use open: a plan nearly always.

    Poor, but there within a second: the first line of the record.
    """
    result = values.copy()
    of = setting.of
    result[of.frequency] = np.minimum(np.ceil(values[of.frequency] - _WHOLE), setting.upper[of.frequency])
    result[of.hub] = likely_hubs(setting, values, _WHOLE)
    return result


def neighbourhood(
    setting: Setting,
    rows: RowSet,
    point: Floats,
    relaxed: Floats,
    on_plan: Callable[[Floats], None],
    *,
    width: int,
    reopen: float,
    node_limit: int | None,
    free_hubs: bool = False,
) -> None:
    """Search around `point` in SCIP; `on_plan` hears of every better plan.

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
    model = Restricted(setting, lower, upper, rows)
    model.add_start(point)
    control = StepControl(setting.control, setting.done)
    model.set_priorities(branching_priorities(setting))
    model.run(
        control,
        gap=1e-5,
        node_limit=node_limit,
        on_plan=on_plan,
        settings={"separating/maxrounds": 1, "separating/maxroundsroot": 10},
    )
    model.free()


def branching_priorities(setting: Setting) -> Floats:
    """Return SCIP's priorities: fleet before hubs before links before departures, shape (columns,)."""
    result = np.zeros(setting.program.column_count)
    result[setting.of.vehicles] = 1000
    result[setting.of.hub] = 500
    result[setting.of.link] = 10
    return result


@dataclass
class HubSet:
    """What is known of a set of hubs.

    Attributes
    ----------
    bound, rows, values
        Of its LP (scaled).
    lp
        The LP itself, None once it has been dived into.
    point, value
        The best plan with these hubs and its scaled value.
    round
        Restricted searches that brought nothing since the last that did.
    """

    bound: float
    rows: RowSet
    values: Floats
    lp: LinearModel | None
    dived: bool = False
    point: Floats | None = None
    value: float = np.inf
    round: int = 0


class PlanSide:
    """Dives and restricted searches, one step at a time; may live on a thread of its own.

    Hub sets are first relaxed (bounded by their LP), then dived into in order of that bound; around the best
    one its neighbours (one hub more or less) are looked at too.
    """

    def __init__(self, setting: Setting) -> None:
        self.setting = setting
        self._lock = threading.Lock()
        self._rows: RowSet | None = None
        self._asked: list[tuple[float, tuple[int, ...]]] = []
        self._known: dict[tuple[int, ...], HubSet] = {}
        self._relaxed_since = 0
        self.wants_rows = True

    # -- news from the bound side ----------------------------------------------------------------------

    def hand_rows(self, rows: RowSet, values: Floats) -> None:
        """Take note of the rows and values of the root."""
        self._rows, self.wants_rows = rows, False
        most = float(values[self.setting.of.hub].max(initial=0.0))
        for threshold in (0.5, 0.25, 0.75):
            hubs = likely_hubs(self.setting, values, threshold * most)
            self._ask(tuple(np.flatnonzero(hubs).tolist()), -np.inf)

    def propose(self, bound: float, values: Floats) -> None:
        """Take note of a hub set that the tree found promising."""
        if bound < self.setting.target:
            self._ask(tuple(np.flatnonzero(values[self.setting.of.hub] > 0.5).tolist()), bound)

    def _ask(self, hubs: tuple[int, ...], hope: float) -> None:
        """Have a hub set bounded; the smallest `hope` (scaled) comes first."""
        with self._lock:
            unknown = hubs not in self._known or np.isneginf(self._known[hubs].bound)
            if unknown and all(other != hubs for _, other in self._asked):
                self._asked.append((hope, hubs))

    # -- work ------------------------------------------------------------------------------------------

    def step(self) -> bool:
        """Do the most promising piece of work; whether there was one."""
        if self._rows is None:
            return False
        best = self._most_promising()
        hopeful = self._hopeful()
        if hopeful is not None:
            self._dive(hopeful)
            return True
        if best is not None and self._known[best].round == 0 and self._relaxed_since >= _RELAXED_BETWEEN:
            self._relaxed_since = 0
            return self._search(best)
        with self._lock:
            self._asked.sort(key=lambda entry: entry[0])
            asked = self._asked.pop(0)[1] if self._asked else None
        if asked is not None:
            self._relaxed_since += 1
            self._relax(asked)
            return True
        waiting = self._waiting()
        if waiting:
            self._dive(min(waiting)[1])
            return True
        return best is not None and self._search(best)

    def _waiting(self) -> list[tuple[float, tuple[int, ...]]]:
        """Return hub sets bounded but not dived into that may still beat the best plan."""
        return [
            (known.bound, hubs)
            for hubs, known in self._known.items()
            if not known.dived and known.bound < self.setting.target
        ]

    def _hopeful(self) -> tuple[int, ...] | None:
        """Return the hub set whose dive should beat the best plan, judged by what dives have lost so far."""
        waiting = self._waiting()
        if not waiting:
            return None
        bound, hubs = min(waiting)
        losses = [
            k.value - k.bound for k in self._known.values() if k.lp is None and np.isfinite(k.value - k.bound)
        ]
        if losses and bound + min(losses) >= self.setting.cutoff:
            return None
        return hubs

    def _most_promising(self) -> tuple[int, ...] | None:
        """Return the hub set to search around: the one tried least whose plan is near the best."""
        setting = self.setting
        self._take_in(setting.point, setting.cutoff)
        near = setting.cutoff + _NEAR * abs(setting.cutoff)
        open_sets = [
            (known.round, known.value, hubs)
            for hubs, known in self._known.items()
            if known.point is not None
            and known.round < len(_WIDTHS)
            and known.bound < setting.target
            and known.value <= near
        ]
        return min(open_sets)[2] if open_sets else None

    def _take_in(self, point: Floats | None, value: float) -> None:
        """Note a plan under its hub set."""
        if point is None:
            return
        hubs = tuple(np.flatnonzero(np.round(point[self.setting.of.hub]) > 0).tolist())
        if hubs not in self._known:
            assert self._rows is not None
            self._known[hubs] = HubSet(-np.inf, self._rows, np.zeros(0), None, dived=True)
        known = self._known[hubs]
        if value < known.value - 1e-9 * abs(value):
            known.point, known.value, known.round = point, value, 0

    def _relax(self, hubs: tuple[int, ...]) -> None:
        """Bound a hub set by its LP; where it is the best so far, ask for its neighbours."""
        setting = self.setting
        assert self._rows is not None
        lower, upper = setting.lower.copy(), setting.upper.copy()
        chosen = np.zeros(len(setting.of.hub))
        chosen[list(hubs)] = 1.0
        lower[setting.of.hub] = upper[setting.of.hub] = chosen
        lp = sub_lp(setting, self._rows, lower, upper)
        end = Bounder(setting, lp).rounds(3, least_gain=5e-4)
        if end.status is not LpStatus.OPTIMAL:
            self._known[hubs] = HubSet(np.inf, self._rows, np.zeros(0), None, dived=True)
            return
        best = min((k.bound for k in self._known.values() if np.isfinite(k.bound)), default=np.inf)
        old = self._known.get(hubs)
        _LOG.debug(
            "hubs %s at %.1f s: bound %.6g",
            hubs,
            setting.control.elapsed_s(),
            setting.objective.value_of(lp.objective),
        )
        known = HubSet(lp.objective, lp.tight(), lp.values.copy(), lp)
        if old is not None:
            known.point, known.value, known.round = old.point, old.value, old.round
        self._known[hubs] = known
        if lp.objective < best:
            for other in self._neighbours(hubs):
                self._ask(other, lp.objective)
        self._forget()

    def _forget(self) -> None:
        """Keep the LPs of the most promising sets only."""
        holding = sorted((known.bound, hubs) for hubs, known in self._known.items() if known.lp is not None)
        for _, hubs in holding[_MOST_LPS:]:
            self._known[hubs].lp = None
            self._known[hubs].dived = True

    def _neighbours(self, hubs: tuple[int, ...]) -> list[tuple[int, ...]]:
        """Return the hub sets with one hub more or less, within the count and the musts."""
        setting = self.setting
        fewest, most = setting.model.network.problem.settings.hub_count
        result = []
        for i in np.flatnonzero(setting.upper[setting.of.hub] > 0.0).tolist():
            other = tuple(sorted(set(hubs) ^ {i}))
            if setting.lower[setting.of.hub[i]] > 0.0 and i in hubs:
                continue
            if fewest <= len(other) and (most is None or len(other) <= most):
                result.append(other)
        return result

    def _dive(self, hubs: tuple[int, ...]) -> None:
        known = self._known[hubs]
        known.dived = True
        if known.lp is None:
            return
        values = dive(self.setting, known.lp)
        _LOG.debug("dive %s ended at %.1f s: %s", hubs, self.setting.control.elapsed_s(), values is not None)
        known.lp = None
        if values is not None:
            self._offer(values)

    def _offer(self, values: Floats) -> None:
        """Offer a plan, and note it under its hub set even where it is not the best."""
        setting = self.setting
        point = setting.settle(values)
        if point is not None:
            plan = setting.take(point)
            self._take_in(point, setting.objective.scaled(plan.value))

    def _search(self, hubs: tuple[int, ...]) -> bool:
        """Search around the best plan of a hub set; wider when the last search brought nothing."""
        known = self._known[hubs]
        if known.point is None:
            return False
        width, reopen, nodes, free_hubs = _WIDTHS[known.round]
        known.round += 1
        neighbourhood(
            self.setting,
            known.rows,
            known.point,
            known.values if len(known.values) else known.point,
            self._offer,
            width=width,
            reopen=reopen,
            node_limit=nodes,
            free_hubs=free_hubs,
        )
        return True
