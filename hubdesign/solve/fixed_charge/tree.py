"""A best-first tree over links with warm path relaxations; its least open bound bounds every plan.

Validity. The children of a node split its plans by whether one link is open, so the least bound of the open
and the cut-off nodes bounds every plan (Land and Doig 1960, Econometrica 28:497-520). Paths and rows hold
for every node. A node is cut off when its bound reaches the plan in hand less the gap asked, and counts
with its bound. Reduced-cost fixing: with the multipliers of a node's bound, moving link e off its better
value costs at least ``|reduced cost|``; where bound plus that reaches the cut-off value, e stays, and the
node counts with the cut-off value for the plans given up. Scores for branching are guesses and touch no
bound.
"""

from __future__ import annotations

import heapq
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.control import Control
from hubdesign.solve.fixed_charge.plan import FlowSolver, Incumbent
from hubdesign.solve.fixed_charge.relaxation import DUAL, PathRelaxation

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bytes = NDArray[np.int8]

_FRACTION = 1e-5
#: Links probed at most where their effect is not known yet, simplex steps of a probe.
_PROBES = 8
_PROBE_STEPS = 40
_RELIABLE = 1


@dataclass(order=True)
class _Node:
    bound: float
    number: int
    lower: Bytes = field(compare=False)
    upper: Bytes = field(compare=False)
    link: int = field(compare=False, default=-1)
    up: bool = field(compare=False, default=False)
    part: float = field(compare=False, default=0.0)


class LinkTree:
    """Grows until the gap asked is proven, the tree is empty or the limit is reached.

    Attributes
    ----------
    bound
        Least bound of what is open or was cut off, scaled.
    done
        Whether no node is left.

    Parameters
    ----------
    plunge
        Deepest node first, for plans; nothing is then reported as a bound.
    least_gain
        Nodes that cannot better the plan in hand by this share are cut off.
    """

    def __init__(
        self,
        lp: PathRelaxation,
        flows: FlowSolver,
        incumbent: Incumbent,
        control: Control,
        *,
        plunge: bool = False,
        least_gain: float = 0.0,
    ) -> None:
        self.lp, self.flows, self.incumbent, self.control = lp, flows, incumbent, control
        self.plunge, self.least_gain = plunge, least_gain
        self.bound = -np.inf
        self.done = False
        self.nodes = 0
        self._cut_off = np.inf
        self._count = 0
        self._open: list[_Node] = []
        self._gain = np.zeros((2, lp.links))
        self._times = np.zeros((2, lp.links))
        self._heap_root()

    def _heap_root(self) -> None:
        lower, upper = self.lp.lower.astype(np.int8), self.lp.upper.astype(np.int8)
        self._open = [_Node(-np.inf if self.plunge else self.lp.bound, 0, lower, upper)]

    @property
    def _cutoff(self) -> float:
        return self.incumbent.cutoff - self.least_gain * abs(self.incumbent.scaled)

    def grow(self, node_limit: int | None = None) -> None:
        """Branch until done."""
        first = self.nodes
        while self._open and not self.control.stop_requested():
            if node_limit is not None and self.nodes - first >= node_limit:
                break
            node = self._open.pop() if self.plunge else heapq.heappop(self._open)
            if node.bound >= self._cutoff:
                self._cut_off = min(self._cut_off, node.bound)
                continue
            self._raise(node.bound)
            if self.control.gap_reached():
                self._push(node)
                break
            self._visit(node)
        self.done = not self._open
        self._raise(min([self._cut_off, *(node.bound for node in self._open)]))

    def _push(self, node: _Node) -> None:
        if self.plunge:
            self._open.append(node)
        else:
            heapq.heappush(self._open, node)

    def _raise(self, bound: float) -> None:
        if self.plunge:
            return
        value = min(bound, self._cut_off, self.incumbent.scaled)
        if np.isfinite(value) and value > self.bound:
            self.bound = value
            scaled = value - 0.5e-9 * abs(value)
            self.control.report(bound=scaled * self.lp.form.scale)

    def _visit(self, node: _Node) -> None:
        lp = self.lp
        self.nodes += 1
        lp.set_links(node.lower.astype(np.float64), node.upper.astype(np.float64))
        rounds, tolerance = (8, 1e-3) if self.plunge else (40, 1e-5)
        whole = lp.solve(self.control, self._cutoff, rounds=rounds, tolerance=tolerance)
        bound = max(node.bound, lp.bound)
        if node.link >= 0 and np.isfinite(lp.bound):
            self._learn(node, bound)
        if bound >= self._cutoff:
            self._cut_off = min(self._cut_off, bound)
            return
        if not whole and self.control.stop_requested():
            self._push(_Node(bound, node.number, node.lower, node.upper))
            return
        if whole:
            lower, upper = self._fix(node, bound)
            link = self._choose(lower, upper)
            if link is None:
                link = self._leaf(lower, upper, bound)
        else:
            lower, upper = node.lower, node.upper
            link = self._blind(node, bound)
        if link is None:
            return
        part = float(np.clip(lp.y[link], 0.05, 0.95))
        for up in (True, False) if part < 0.3 and self.plunge else (False, True):
            self._count += 1
            low, high = lower.copy(), upper.copy()
            (low if up else high)[link] = 1 if up else 0
            child = _Node(bound, self._count, low, high, link, up, 1.0 - part if up else part)
            self._push(child)

    def _blind(self, node: _Node, bound: float) -> int | None:
        """Return a link to split a node on whose LP could not be solved; None where every link is decided.

        Such a node keeps the bound it has; taking it up again as it is would never end.
        """
        free = np.flatnonzero(node.lower < node.upper)
        if not len(free):
            self._cut_off = min(self._cut_off, bound)
            return None
        return int(free[np.argmax(self.lp.form.fixed[free])])

    def _leaf(self, lower: Bytes, upper: Bytes, bound: float) -> int | None:
        """Take the plan of a node whose links are whole; return a link to split on where it is not closed."""
        lp = self.lp
        opened = lp.y > 0.5
        self.incumbent.offer(self.flows.plan(opened, self.control, self.incumbent.scaled))
        if bound >= self._cutoff:
            self._cut_off = min(self._cut_off, bound)
            return None
        free = np.flatnonzero(lower < upper)
        if len(free):
            return int(free[np.argmax(lp.form.fixed[free])])
        if float(lp.s[lp.form.forced].max(initial=0.0)) > 1e-7:
            self._cut_off = min(self._cut_off, self._shut(lower, bound))
        else:
            self._cut_off = min(self._cut_off, bound)
        return None

    def _shut(self, lower: Bytes, bound: float) -> float:
        """Return the bound of a node with every link decided: inf where these links cannot carry all."""
        return np.inf if self.flows.cannot_carry(lower > 0, self.control) else bound

    def _fix(self, node: _Node, bound: float) -> tuple[Bytes, Bytes]:
        lp, cutoff = self.lp, self._cutoff
        lower, upper = node.lower.copy(), node.upper.copy()
        if not np.isfinite(cutoff):
            return lower, upper
        lp_bound, reduced = lp.priced, lp.link_reduced
        free = lower < upper
        shut = free & (reduced > 0) & (lp_bound + reduced >= cutoff)
        held = free & (reduced < 0) & (lp_bound - reduced >= cutoff)
        if shut.any() or held.any():
            self._cut_off = min(self._cut_off, max(bound, cutoff))
        upper[shut] = 0
        lower[held] = 1
        return lower, upper

    # ---- branching scores

    def _learn(self, node: _Node, bound: float) -> None:
        way = int(node.up)
        self._gain[way, node.link] += max(0.0, bound - node.bound) / node.part
        self._times[way, node.link] += 1

    def _choose(self, lower: Bytes, upper: Bytes) -> int | None:
        """Return the link to branch on, None where all that are free are whole."""
        y = self.lp.y
        free = np.flatnonzero((lower < upper) & (y > _FRACTION) & (y < 1.0 - _FRACTION))
        if not len(free):
            return None
        known = self._times.sum(axis=1)
        mean = np.where(known > 0, self._gain.sum(axis=1) / np.maximum(1.0, known), 1.0)
        rate = (self._gain + mean[:, None]) / (self._times + 1.0)
        down, up = rate[0, free] * y[free], rate[1, free] * (1.0 - y[free])
        guess = self.lp.form.fixed[free] * np.minimum(y[free], 1.0 - y[free])
        score = np.maximum(down, 1e-6) * np.maximum(up, 1e-6)
        order = np.argsort(-score * (1.0 + 1e-9 * guess), kind="stable")
        probed = [i for i in order if self._times[:, free[i]].min() < _RELIABLE][
            : 2 if self.plunge else _PROBES
        ]
        best, best_score = int(order[0]), -1.0
        if probed:
            results = self._probe(free[probed])
            for place, value in zip(probed, results):
                score[place] = value
            candidates = sorted({*probed, int(order[0])})
            for place in candidates:
                if score[place] > best_score:
                    best, best_score = int(place), float(score[place])
        return int(free[best])

    def _probe(self, links: Ints) -> list[float]:
        """Return the product of the rises of the LP when each link is shut and opened, few steps each."""
        lp = self.lp
        highs = lp.highs
        basis = highs.getBasis()
        base = lp.objective
        y = lp.y.copy()
        highs.setOptionValue("simplex_strategy", DUAL)
        highs.setOptionValue("simplex_iteration_limit", _PROBE_STEPS)
        scores = []
        for e in links.tolist():
            rises = []
            for way, value in ((0, 0.0), (1, 1.0)):
                highs.changeColBounds(e, value, value)
                highs.run()
                rise = max(0.0, float(highs.getInfo().objective_function_value) - base)
                part = max(0.05, 1.0 - y[e] if way else y[e])
                if self._times[way, e] == 0:
                    self._gain[way, e] += rise / part
                    self._times[way, e] += 1
                rises.append(rise)
                highs.changeColBounds(e, lp.lower[e], lp.upper[e])
                highs.setBasis(basis)
            scores.append(max(rises[0], 1e-6) * max(rises[1], 1e-6))
        highs.setOptionValue("simplex_iteration_limit", 2147483647)
        return scores
