"""The strong linear relaxation over paths: columns priced, rows separated, one warm model in HiGHS.

Columns: share x_p of a commodity on a path, open y_e in [0, 1], share s_k not carried. Rows:

1. ``sum_p x_p + s_k = 1`` per commodity;
2. ``sum_p (volume_k / capacity_a) x_p <= y_e`` per arc a of link e, capacities cut to the total volume;
3. ``sum_p (in k, over e) x_p / min(1, capacity_a / volume_k) <= y_e`` per commodity and link, separated
   (Gendron and Crainic 1994, CRT-965, for the arc form). Costs are not negative, so some best plan sends no
   commodity over both directions of a link: both directions may share the row.

Where a commodity must be carried, s_k is there at a high price so that the LP always has a point; a point
that uses it is no plan.

Bound. For any multipliers w >= 0 on rows 2 and v >= 0 on rows 3, relaxing those rows leaves a shortest path
for each commodity and a choice of y_e within its bounds for each link: the sum of both bounds every plan from
below (Geoffrion 1974, Math. Programming Study 2:82-114). It needs no optimal LP and no solver's tolerances.
Costs of the relaxation are scaled; the algorithm is the column and row generation of Katayama, Chen and Kubo
(2009, J. of Computational and Applied Mathematics 232:90-101).
"""

from __future__ import annotations

import copy
from typing import Any

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.control import Control
from hubdesign.solve.fixed_charge.instance import FixedChargeInstance
from hubdesign.solve.fixed_charge.paths import STEP, PathFinder
from hubdesign.solve.highs import new_highs

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

#: A row violated by less than this (in shares) is left out; the bound does not depend on it.
VIOLATION = 1e-4
#: The relaxation's objective is about this large; tolerances of the solver are 1e-7.
SIZE = 1000.0
#: HiGHS' names of its simplex strategies.
DUAL, PRIMAL = 1, 4


class Formulation:
    """Scaled costs and coefficients of an instance, shared by every relaxation and model of it."""

    def __init__(self, instance: FixedChargeInstance) -> None:
        self.instance = instance
        self.finder = PathFinder(instance)
        self.capacity = np.minimum(instance.capacity, instance.volume.sum())
        open_arc = self.capacity > 0.0
        self.usable = instance.usable() & open_arc[None, :]
        safe = np.where(open_arc, self.capacity, 1.0)
        self.load = instance.volume[:, None] / safe[None, :]  # (K, A): part of an arc a commodity fills
        money = instance.leg_costs()
        share = instance.fixed_cost[instance.link][None, :] * np.minimum(1.0, self.load)
        lengths = self.finder.lengths(np.where(self.usable, money + share, np.inf))
        best = lengths[np.arange(instance.commodities), instance.destination]
        self.reachable = np.isfinite(best)
        total = float(best[self.reachable].sum()) + float(instance.fixed_cost[instance.must_open].sum())
        self.scale = total / SIZE if total > 1e-12 * max(1.0, float(money.max(initial=0.0))) else 1.0
        self.cost = np.where(self.usable, money / self.scale, np.inf)
        self.fixed = instance.fixed_cost / self.scale
        self.forced = ~np.isfinite(instance.unserved_cost)
        dear = 20.0 * (np.where(self.reachable, best, 0.0) / self.scale + self.fixed.max(initial=0.0)) + 1.0
        given = np.where(self.forced, 0.0, instance.unserved_cost * instance.volume) / self.scale
        self.unserved = np.where(self.forced, dear, given)
        self.per_row = np.maximum(1.0, self.load)  # 1 / min(1, capacity / volume)

    def carrying(self) -> Formulation:
        """Return the formulation that only asks what part of the forced commodities cannot be carried.

        Nothing costs but that part, 1 for a whole commodity, so a positive bound proves that not all can be.
        """
        result = copy.copy(self)
        result.cost = np.where(self.usable, 0.0, np.inf)
        result.fixed = np.zeros_like(self.fixed)
        result.unserved = self.forced.astype(np.float64)
        return result

    def raise_price(self) -> None:
        """Make it dearer to leave forced commodities; relaxations made before keep the old price."""
        self.unserved = np.where(self.forced, 30.0 * self.unserved, self.unserved)


class PathRelaxation:
    """The LP; `paths` and rows only ever grow."""

    def __init__(self, form: Formulation, seed: int = 1) -> None:
        import highspy

        self.form = form
        self.kinds: Any = highspy.HighsModelStatus
        inst = form.instance
        self.infinity: float = highspy.kHighsInf
        self.highs = new_highs(threads=1, seed=seed)
        self.highs.setOptionValue("presolve", "off")
        self.links, self.arcs, self.commodities = inst.links, inst.arcs, inst.commodities
        self.lower = inst.must_open.astype(np.float64)
        self.upper = np.ones(self.links)
        self.row_of = np.full((self.commodities, self.links), -1, dtype=np.int64)
        self.row_pairs: list[tuple[int, int]] = []
        self.paths: list[tuple[int, tuple[int, ...]]] = []
        self.known: set[tuple[int, tuple[int, ...]]] = set()
        self._of: list[list[int]] = [[] for _ in range(self.commodities)]
        self._entry_path: list[int] = []
        self._entry_arc: list[int] = []
        self.unserved = form.unserved.copy()
        self.capacity_row = np.full(self.arcs, 1.0)  # divisor of capacity under capacity scaling
        self.one_way = bool(np.array_equal(inst.link, np.arange(inst.links)))
        self.priced = -np.inf  # bound of the multipliers that `link_reduced` belongs to
        self._build()
        self.y = np.zeros(self.links)
        self.x = np.zeros(0)
        self.s = np.zeros(self.commodities)
        self.objective = -np.inf
        self.bound = -np.inf
        self.link_reduced = np.zeros(self.links)

    def _build(self) -> None:
        add_rows, add_cols = self.highs.addRows, self.highs.addCols
        rows = self.commodities + self.arcs
        lower = np.concatenate((np.ones(self.commodities), np.full(self.arcs, -self.infinity)))
        upper = np.concatenate((np.ones(self.commodities), np.zeros(self.arcs)))
        none = np.zeros(0, dtype=np.int32)
        add_rows(rows, lower, upper, 0, np.zeros(rows, dtype=np.int32), none, np.zeros(0))
        order = np.argsort(self.form.instance.link, kind="stable")
        counts = np.bincount(self.form.instance.link, minlength=self.links)
        starts = np.concatenate(([0], np.cumsum(counts)[:-1])).astype(np.int32)
        add_cols(
            self.links,
            self.form.fixed,
            self.lower,
            self.upper,
            self.arcs,
            starts,
            (self.commodities + order).astype(np.int32),
            np.full(self.arcs, -1.0),
        )
        k = np.arange(self.commodities, dtype=np.int32)
        ones = np.ones(self.commodities)
        add_cols(self.commodities, self.unserved, 0.0 * ones, ones, self.commodities, k, k, ones)

    # ---- growing

    def add_paths(self, found: list[tuple[int, tuple[int, ...]]]) -> int:
        """Put new paths in; how many were new."""
        new = [path for path in found if path not in self.known]
        cost: list[float] = []
        starts: list[int] = []
        index: list[int] = []
        value: list[float] = []
        for k, arcs in new:
            place = len(self.paths)
            self.known.add((k, arcs))
            self.paths.append((k, arcs))
            self._of[k].append(place)
            starts.append(len(index))
            index.append(k)
            value.append(1.0)
            total = 0.0
            for a in arcs:
                total += float(self.form.cost[k, a])
                self._entry_path.append(place)
                self._entry_arc.append(a)
                index.append(self.commodities + a)
                value.append(float(self.form.load[k, a] / self.capacity_row[a]))
                row = int(self.row_of[k, self.form.instance.link[a]])
                if row >= 0:
                    index.append(row)
                    value.append(float(self.form.per_row[k, a]))
            cost.append(total)
        if new:
            self.highs.addCols(
                len(new),
                np.array(cost),
                np.zeros(len(new)),
                np.full(len(new), self.infinity),
                len(index),
                np.array(starts, dtype=np.int32),
                np.array(index, dtype=np.int32),
                np.array(value),
            )
        return len(new)

    def add_rows(self, pairs: list[tuple[int, int]]) -> None:
        """Put rows 3 of (commodity, link) pairs in."""
        first = self.links + self.commodities
        link = self.form.instance.link
        starts: list[int] = []
        index: list[int] = []
        value: list[float] = []
        for k, e in pairs:
            self.row_of[k, e] = self.commodities + self.arcs + len(self.row_pairs)
            self.row_pairs.append((k, e))
            starts.append(len(index))
            index.append(e)
            value.append(-1.0)
            for place in self._of[k]:
                for a in self.paths[place][1]:
                    if link[a] == e:
                        index.append(first + place)
                        value.append(float(self.form.per_row[k, a]))
        if pairs:
            self.highs.addRows(
                len(pairs),
                np.full(len(pairs), -self.infinity),
                np.zeros(len(pairs)),
                len(index),
                np.array(starts, dtype=np.int32),
                np.array(index, dtype=np.int32),
                np.array(value),
            )

    def copy_from(self, other: PathRelaxation) -> None:
        """Take over the paths and rows of `other`."""
        self.add_paths(list(other.paths))
        self.add_rows([pair for pair in other.row_pairs if self.row_of[pair] < 0])

    def set_links(self, lower: Floats, upper: Floats) -> None:
        """Bound the links."""
        changed = np.flatnonzero((lower != self.lower) | (upper != self.upper)).astype(np.int32)
        if len(changed):
            self.highs.setOptionValue("simplex_strategy", DUAL)
            self.highs.changeColsBounds(len(changed), changed, lower[changed], upper[changed])
        self.lower, self.upper = lower.copy(), upper.copy()

    def scale_capacity(self, factor: Floats) -> None:
        """Let row 2 of an arc stand for `factor` times its capacity; only for plans, it spoils the bound."""
        changed = np.flatnonzero(factor != self.capacity_row)
        self.capacity_row = factor.copy()
        link = self.form.instance.link
        for a in changed.tolist():
            self.highs.changeCoeff(self.commodities + a, int(link[a]), -float(factor[a]))

    # ---- solving

    def run(self) -> bool:
        """Solve the LP as it stands; whether it ended optimal."""
        self.highs.run()
        if self.highs.getModelStatus() != self.kinds.kOptimal:
            self.highs.clearSolver()  # the trouble may lie in the basis: once more without it
            self.highs.run()
            if self.highs.getModelStatus() != self.kinds.kOptimal:
                return False
        solution = self.highs.getSolution()
        values = np.asarray(solution.col_value, dtype=np.float64)
        self.y = values[: self.links]
        self.s = values[self.links : self.links + self.commodities]
        self.x = values[self.links + self.commodities :]
        duals = np.asarray(solution.row_dual, dtype=np.float64)
        self.pi = duals[: self.commodities]
        self.w = np.maximum(0.0, -duals[self.commodities : self.commodities + self.arcs])
        self.v = np.maximum(0.0, -duals[self.commodities + self.arcs :])
        self.objective = float(self.highs.getInfo().objective_function_value)
        return True

    def arc_shares(self) -> Floats:
        """Return the share of each commodity on each arc, shape (K, A)."""
        result = np.zeros((self.commodities, self.arcs))
        used = np.flatnonzero(self.x > 1e-12)
        for place in used.tolist():
            k, arcs = self.paths[place]
            result[k, list(arcs)] += self.x[place]
        return result

    def price(self) -> tuple[float, list[tuple[int, tuple[int, ...]]]]:
        """Return the bound of the current multipliers and the paths that would improve the LP."""
        form, inst = self.form, self.form.instance
        extra = np.zeros((self.commodities, self.links))
        gain = np.zeros(self.links)
        if self.row_pairs:
            k, e = (pairs[: len(self.v)] for pairs in self._pair_arrays())  # rows added since are at 0
            extra[k, e] = self.v
            gain += np.bincount(e, weights=self.v, minlength=self.links)
        gain += np.bincount(inst.link, weights=self.w * self.capacity_row_coefficient(), minlength=self.links)
        cost = form.cost + form.load * self.w[None, :] + form.per_row * extra[:, inst.link]
        cost[:, self.upper[inst.link] <= 0.0] = np.inf
        dist = form.finder.lengths(cost)
        shortest = dist[np.arange(self.commodities), inst.destination]
        self.link_reduced = form.fixed - gain
        at_best = np.where(self.link_reduced > 0.0, self.lower, self.upper)
        carried = np.minimum(np.maximum(shortest - inst.nodes * STEP, 0.0), self.unserved)
        bound = float(carried.sum() + (self.link_reduced * at_best).sum())
        self.priced = bound
        better = np.flatnonzero(shortest < self.pi - 1e-7 * (1.0 + np.abs(self.pi)))
        traced = form.finder.trace(cost, dist, better)
        return bound, [(int(k), arcs) for k, arcs in zip(better.tolist(), traced)]

    def capacity_row_coefficient(self) -> Floats:
        """Return the coefficient of y in each row 2, shape (A,)."""
        return self.capacity_row

    def _pair_arrays(self) -> tuple[Ints, Ints]:
        if getattr(self, "_pairs_count", -1) != len(self.row_pairs):
            self._pairs = np.array(self.row_pairs, dtype=np.int64)
            self._pairs_count = len(self.row_pairs)
        return self._pairs[:, 0], self._pairs[:, 1]

    def violated(self, most: int) -> list[tuple[int, int]]:
        """Return the worst violated pairs of rows 3 that are not in yet."""
        shares = self.arc_shares() * self.form.per_row
        if self.one_way:
            by_link = shares
        else:
            by_link = np.zeros((self.commodities, self.links))
            np.add.at(by_link.T, self.form.instance.link, shares.T)
        excess = by_link - self.y[None, :]
        excess[self.row_of >= 0] = 0.0
        found = np.flatnonzero(excess.ravel() > VIOLATION)
        found = found[np.argsort(-excess.ravel()[found], kind="stable")][:most]
        return [(int(p) // self.links, int(p) % self.links) for p in found]

    def solve(
        self, control: Control, cutoff: float = np.inf, rounds: int = 1000, tolerance: float = 1e-6
    ) -> bool:
        """Price and separate until the bound meets the LP, `cutoff` or `rounds`; False at a limit.

        `bound` is then the best bound seen under the present bounds of the links.
        """
        self.bound = -np.inf
        for _ in range(rounds):
            if control.stop_requested() or not self.run():
                return False
            bound, found = self.price()
            self.bound = max(self.bound, bound)
            if self.bound >= cutoff:
                return True
            # Columns leave the basis feasible for the primal simplex, rows for the dual one: never both.
            if self.objective - self.bound > tolerance * abs(self.objective) and self.add_paths(found):
                self.highs.setOptionValue("simplex_strategy", PRIMAL)
                continue
            rows = self.violated(max(100, self.commodities * 2))
            if not rows:
                return True
            self.highs.setOptionValue("simplex_strategy", DUAL)
            self.add_rows(rows)
        return True
