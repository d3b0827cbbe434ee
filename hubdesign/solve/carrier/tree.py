"""The bound side: a tree over hubs and fleet on the warm LP; its leaves are solved by SCIP in slices.

The tree partitions the plans by bounds on whole columns; every node's bound is proven by duals
(:meth:`hubdesign.solve.carrier.linear.LinearModel.dual_bound`) or by SCIP on the node's own sub-model, whose
rows are those of the model and cuts that hold everywhere. The smallest bound of the nodes open, in work, or
left as good enough bounds every plan. A SCIP run ends "infeasible" where no plan of the leaf beats the
limit it was given: the limit is then the leaf's bound.

Nodes may be worked on by two threads: one owns the LP, any may take a leaf.
"""

from __future__ import annotations

import heapq
import logging
import threading
from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.carrier.bounding import INTERIOR_SIZE, Bounder, sub_lp
from hubdesign.solve.carrier.planning import branching_priorities
from hubdesign.solve.carrier.restricted import Restricted
from hubdesign.solve.carrier.setting import RowSet, Setting, StepControl
from hubdesign.solve.relaxation import LpStatus
from hubdesign.solve.scip import MipEnd, MipStatus

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

_LOG = logging.getLogger(__name__)

_WHOLE = 1e-6

#: Separation rounds of a node and the relative gain below which they end, with hubs free and with hubs whole.
_HUB_ROUNDS, _HUB_GAIN = 1, 5e-4
_NODE_ROUNDS, _NODE_GAIN = 6, 1e-4

#: SCIP nodes of a leaf's first slice; each further slice adds as many as all before.
_SLICE = 500

#: SCIP nodes of a slice at the least: a slice that does nothing would be asked for again for ever.
_LEAST_NODES = 50

#: A leaf is worked on until its bound passes the next node's by this share of its distance to the target.
_LEVEL_MARGIN = 0.2

#: Plans come from elsewhere: SCIP's dear heuristics cost a leaf half its nodes.
_LEAF_SETTINGS = {
    f"heuristics/{name}/freq": -1
    for name in (
        "actconsdiving",
        "adaptivediving",
        "alns",
        "coefdiving",
        "conflictdiving",
        "crossover",
        "distributiondiving",
        "farkasdiving",
        "feaspump",
        "fracdiving",
        "gins",
        "guideddiving",
        "linesearchdiving",
        "lpface",
        "nlpdiving",
        "objpscostdiving",
        "pscostdiving",
        "rens",
        "rins",
        "rootsoldiving",
        "veclendiving",
    )
}


@dataclass
class Leaf:
    """A node with whole hubs and fleet: its bounds, the rows it was bounded with, its SCIP run.

    A run pauses after `nodes` nodes in all, or after `least` once its bound passes `level`.
    """

    lower: Floats
    upper: Floats
    rows: RowSet
    nodes: int = 0
    least: int = 0
    level: float = np.inf
    model: Restricted | None = None


@dataclass(order=True)
class Node:
    """Bounds on whole columns, with a proven bound (scaled) on every plan inside."""

    bound: float
    number: int
    fixings: dict[int, tuple[float, float]] = field(compare=False)
    rows: RowSet | None = field(default=None, compare=False)
    bounder: Bounder | None = field(default=None, compare=False)
    leaf: Leaf | None = field(default=None, compare=False)


class Tree:
    """Best-first search over `bounder`.

    `on_hubs` hears of each node whose hubs have all become whole: bound and LP values. `after_node` is called
    after each node and told whether it was a leaf.
    """

    def __init__(
        self,
        setting: Setting,
        bounder: Bounder,
        bound: float,
        on_hubs: Callable[[float, Floats], None] | None = None,
        after_node: Callable[[bool], None] | None = None,
    ) -> None:
        self.setting, self.bounder = setting, bounder
        self.large = bounder.lp.row_count > INTERIOR_SIZE
        self.heap: list[Node] = [Node(bound, 0, {})]
        self.left = np.inf  # smallest bound of the nodes left as good enough
        self._rows: RowSet = bounder.lp.tight()
        self.count = 0
        self.nodes = 0
        self.finished = False
        self._on_hubs, self._after_node = on_hubs, after_node
        self._in_work: dict[int, float] = {}
        self._lock = threading.RLock()
        self._moved = threading.Condition(self._lock)

    # -- shared ----------------------------------------------------------------------------------------

    @property
    def bound(self) -> float:
        """The proven bound (scaled) on every plan."""
        with self._lock:
            top = self.heap[0].bound if self.heap else np.inf
            return min(self.left, top, min(self._in_work.values(), default=np.inf), self.setting.cutoff)

    def _take(self, leaves_only: bool) -> Node | None:
        """Return the open node of the weakest bound (the weakest leaf), None where there is none."""
        with self._lock:
            target = self.setting.target
            while self.heap and self.heap[0].bound >= target:
                self._leave(heapq.heappop(self.heap))
            if not self.heap:
                return None
            if leaves_only:
                leaves = [node for node in self.heap if node.bound < target and self._may_help(node)]
                if not leaves:
                    return None
                node = min(leaves)
                self.heap.remove(node)
                heapq.heapify(self.heap)
            else:
                node = heapq.heappop(self.heap)
            self._in_work[node.number] = node.bound
            return node

    def _may_help(self, node: Node) -> bool:
        """Whether a second thread may work on a node: it must not share an LP."""
        return node.leaf is not None or (self.large and node.bounder is None and bool(node.fixings))

    def _leave(self, node: Node) -> None:
        """Close a node whose bound stays as it is."""
        self.left = min(self.left, node.bound)
        if node.leaf is not None and node.leaf.model is not None:
            node.leaf.model.free()
            node.leaf.model = None

    def _done(self, node: Node, again: bool) -> None:
        with self._lock:
            self._in_work.pop(node.number, None)
            if again:
                heapq.heappush(self.heap, node)
            self._moved.notify_all()
        self.setting.improve_bound(self.bound)

    # -- the bound side --------------------------------------------------------------------------------

    def run(self) -> bool:
        """Work until the gap is proven, nothing is open, or time is out; whether the tree is finished."""
        setting = self.setting
        while True:
            setting.improve_bound(self.bound)
            if setting.control.stop_requested() or setting.bound >= setting.target:
                break
            node = self._take(leaves_only=False)
            if node is None:
                with self._lock:
                    if not self.heap and not self._in_work:
                        self.finished = True
                        break
                    self._moved.wait(0.05)
                continue
            was_leaf = node.leaf is not None
            again = self._leaf(node) if was_leaf else self._bound(node)
            self._done(node, again)
            if self._after_node is not None:
                self._after_node(was_leaf)
        setting.improve_bound(self.bound)
        return self.finished

    def help(self) -> bool:
        """Work on one leaf for a slice, or on a node with an LP of its own; whether there was one.

        May be called from a second thread.
        """
        node = self._take(leaves_only=True)
        if node is None:
            return False
        self._done(node, self._leaf(node) if node.leaf is not None else self._bound(node))
        return True

    def _bound(self, node: Node) -> bool:
        """Bound a node by its LP, then branch, close or hand on; True where it stays open as it is."""
        setting = self.setting
        bounder = self._bounder_of(node)
        bounder.fix(node.fixings)
        rounds, gain = (_HUB_ROUNDS, _HUB_GAIN) if node.bounder is None else (_NODE_ROUNDS, _NODE_GAIN)
        end = bounder.rounds(rounds, least_gain=gain, enough=lambda: setting.target)
        self.nodes += 1
        if end.status is LpStatus.INFEASIBLE:
            return False
        node.bound = max(node.bound, end.bound)
        if end.status is not LpStatus.OPTIMAL:
            if not (setting.control.stop_requested() or setting.done.is_set()):
                # No limit but trouble in the LP: taken up again it would only fail again, so SCIP gets it.
                rows = self._rows if node.rows is None else node.rows
                node.leaf = Leaf(bounder.lower.copy(), bounder.upper.copy(), rows)
                node.bounder = None
            return True
        values = bounder.lp.values
        _LOG.debug(
            "node %d at %.1f s: bound %.6g, %d rows, fleet %s",
            node.number,
            setting.control.elapsed_s(),
            setting.objective.value_of(node.bound),
            bounder.lp.row_count,
            values[setting.of.vehicles].round(2),
        )
        if node.bound >= setting.target:
            self._leave(node)
            return False
        column = self._hub_or_fleet(node, values)
        if column is None:
            return self._make_leaf(node, bounder, values)
        self._branch(node, bounder, column, float(values[column]))
        return False

    def _bounder_of(self, node: Node) -> Bounder:
        """Return the LP of a node: the common one, or one of its own without what its hubs shut.

        Large nodes are solved by interior point, which no basis helps: they always get their own.
        """
        if node.bounder is not None:
            return node.bounder
        lower, upper = self.setting.lower.copy(), self.setting.upper.copy()
        hubs = [c for c in self.setting.of.hub.tolist() if upper[c] > lower[c]]
        fixed = bool(hubs) and all(c in node.fixings for c in hubs)
        if not fixed and not self.large:
            return self.bounder
        for column in hubs:
            if column in node.fixings:
                lower[column], upper[column] = node.fixings[column]
        rows = self._rows if node.rows is None else node.rows
        bounder = Bounder(self.setting, sub_lp(self.setting, rows, lower, upper))
        if fixed:
            node.bounder = bounder
        return bounder

    def _hub_or_fleet(self, node: Node, values: Floats) -> int | None:
        """Return the most fractional hub, else the fleet count that weighs most, None where all are whole."""
        setting = self.setting
        away = _distance(values[setting.of.hub])
        if (away > _WHOLE).any():
            return int(setting.of.hub[int(np.argmax(away))])
        for column in setting.of.hub[setting.upper[setting.of.hub] > setting.lower[setting.of.hub]].tolist():
            if column not in node.fixings:
                return int(column)
        if self._on_hubs is not None and not any(c in node.fixings for c in setting.of.vehicles.tolist()):
            self._on_hubs(node.bound, values)
        away = _distance(values[setting.of.vehicles])
        weight = 1e-9 + setting.objective.coefficients[setting.of.vehicles]
        if (away > _WHOLE).any():
            return int(setting.of.vehicles[int(np.argmax(np.where(away > _WHOLE, away * weight, -1.0)))])
        return None

    def _branch(self, node: Node, bounder: Bounder, column: int, value: float) -> None:
        low, high = bounder.lower[column], bounder.upper[column]
        value = min(max(value, low), high)
        down, up = np.floor(value), np.floor(value) + 1.0
        rows = None if node.bounder is not None else bounder.lp.tight()
        if rows is not None and not self.large:
            self._rows = rows
        with self._lock:
            for bounds in ((float(low), float(down)), (float(up), float(high))):
                if bounds[0] <= bounds[1]:
                    self.count += 1
                    heapq.heappush(
                        self.heap,
                        Node(node.bound, self.count, {**node.fixings, column: bounds}, rows, node.bounder),
                    )

    # -- leaves ----------------------------------------------------------------------------------------

    def _make_leaf(self, node: Node, bounder: Bounder, values: Floats) -> bool:
        setting = self.setting
        if not (_distance(values[setting.integer]) > _WHOLE).any():
            setting.offer(values)
            if node.bound >= setting.target:
                self._leave(node)
                return False
        node.leaf = Leaf(bounder.lower.copy(), bounder.upper.copy(), bounder.lp.tight())
        node.bounder = None
        return True

    def _leaf(self, node: Node) -> bool:
        """Solve a leaf for a slice; True where it stays open."""
        setting, leaf = self.setting, node.leaf
        assert leaf is not None
        limit = setting.target
        done = leaf.model.nodes() if leaf.model is not None else 0
        leaf.least, leaf.nodes = done + _LEAST_NODES, done + max(_SLICE, done)
        leaf.level = self._level(node)
        end = self._slice(leaf, limit)
        proven = min(end.bound, limit)
        node.bound = max(node.bound, proven)
        _LOG.debug(
            "leaf %d at %.1f s: %s, bound %.6g, %d nodes",
            node.number,
            setting.control.elapsed_s(),
            end.status.value,
            setting.objective.value_of(node.bound),
            leaf.nodes,
        )
        if end.status is MipStatus.LIMIT and node.bound < setting.target:
            return True
        self._leave(node)
        return False

    def _level(self, node: Node) -> float:
        """Return the bound from which on another node is more urgent than this one."""
        with self._lock:
            others = [other.bound for other in self.heap] + [
                bound for number, bound in self._in_work.items() if number != node.number
            ]
        target = self.setting.target
        if not np.isfinite(target):
            return np.inf
        margin = _LEVEL_MARGIN * (target - node.bound)
        return max(min(others, default=np.inf), node.bound) + margin

    def _slice(self, leaf: Leaf, limit: float) -> MipEnd:
        setting = self.setting
        if leaf.model is not None:
            return leaf.model.resume(leaf.nodes, limit)
        leaf.model = Restricted(setting, leaf.lower, leaf.upper, leaf.rows)
        leaf.model.set_priorities(branching_priorities(setting))

        model = leaf.model

        def hear(point: Floats) -> None:
            setting.offer(point)

        def check(bound: float) -> None:
            if bound >= leaf.level and model.nodes() >= leaf.least:
                model.interrupt()

        return leaf.model.run(
            StepControl(setting.control, setting.done),
            objective_limit=limit if np.isfinite(limit) else None,
            on_plan=hear,
            on_bound=check,
            settings={"limits/totalnodes": leaf.nodes, **_LEAF_SETTINGS},
        )


def _distance(values: Floats) -> Floats:
    """Return the distance to the nearest whole number."""
    return np.asarray(np.abs(values - np.round(values)))
