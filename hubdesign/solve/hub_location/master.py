"""The master problem over hub variables, with bounds that do not rest on a solver's tolerances.

    min sum_k fixed_k z_k + sum_i eta_i
    subject to   eta_i >= const_c - slope_c z   for each cut c of origin i,
        hubs_min <= sum z <= hubs_max,   z in {0, 1}

HiGHS solves the relaxation and proposes a multiplier for every cut. Whatever the multipliers are, made
non-negative and scaled to sum to 1 over the cuts of an origin they give, by weak (Lagrangian) duality,

    cost(z) >= sum_c lambda_c const_c + sum_k (fixed_k - sum_c lambda_c slope_ck) z_k   for every z,

and the minimum of the right side over the allowed 0/1 vectors is a sort. So the bound, and with it the fixing
of a hub (the minimum with that hub forced open or closed is above the best plan: reduced-cost fixing), is
recomputed in float64 from the cuts alone (Neumaier and Shcherbina 2004, Mathematical Programming 99:283-296,
for the idea of a safe bound from approximate multipliers).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import highspy
import numpy as np

from hubdesign.solve.highs import new_highs
from hubdesign.solve.hub_location.ascent import Cuts
from hubdesign.solve.hub_location.instance import Floats, Ints


@dataclass(frozen=True, slots=True)
class Row:
    """A cut of one origin: cost of its volume ``>= const - slope @ z``.

    `v` (n,) and `u` (K, n) are the duals behind it, kept (u not None) while hubs may still join.
    """

    origin: int
    const: float
    slope: Floats
    v: Floats
    u: Floats | None


@dataclass(frozen=True, slots=True)
class Domain:
    """Which hub vectors are left: bounds per hub (K,) and the number of open hubs."""

    lower: Floats
    upper: Floats
    hubs_min: int
    hubs_max: int

    def with_hub(self, hub: int, value: float) -> Self:
        """Return the domain with one hub fixed."""
        lower, upper = self.lower.copy(), self.upper.copy()
        lower[hub] = upper[hub] = value
        return type(self)(lower, upper, self.hubs_min, self.hubs_max)

    @property
    def free(self) -> Ints:
        """Positions of the hubs not fixed."""
        return np.flatnonzero(self.lower < self.upper)


@dataclass(frozen=True, slots=True)
class Bound:
    """``cost(z) >= const + reduced @ z``, and what follows for a domain.

    `value` is the minimum over the domain; `if_open`, `if_closed` (K,) with one more hub fixed.
    """

    const: float
    reduced: Floats
    value: float
    if_open: Floats
    if_closed: Floats


def bound_over(const: float, reduced: Floats, domain: Domain) -> Bound:
    """Return the minimum of ``const + reduced @ z`` over `domain`, and with each hub fixed either way."""
    opened = domain.lower > 0.5
    free = domain.free
    const_open = const + float(reduced[opened].sum())
    few, many = domain.hubs_min - int(opened.sum()), domain.hubs_max - int(opened.sum())
    r = reduced[free]
    order = np.argsort(r, kind="stable")
    prefix = np.concatenate(([0.0], r[order].cumsum()))
    negative = int((r < 0.0).sum())
    count = len(r)
    if_open = np.where(opened, -np.inf, np.inf)
    if_closed = np.where(opened, np.inf, -np.inf)
    if many < 0 or few > count:
        return Bound(const, reduced, np.inf, np.full(len(reduced), np.inf), np.full(len(reduced), np.inf))
    take = min(max(negative, few), many, count)
    value = const_open + float(prefix[take])
    if count:
        rank = np.empty(count, dtype=np.int64)
        rank[order] = np.arange(count)
        others = negative - (r < 0.0)

        def cheapest(least: int, most: int) -> Floats:
            wanted = np.minimum(np.minimum(np.maximum(others, least), most), count - 1)
            inside = rank < wanted
            total = np.where(inside, prefix[np.minimum(wanted + 1, count)] - r, prefix[wanted])
            return np.full(count, np.inf) if most < 0 or least > count - 1 else total

        if_open[free] = const_open + r + cheapest(max(few - 1, 0), many - 1)
        if_closed[free] = const_open + cheapest(max(few, 0), many)
    if_open[opened] = value
    if_closed[~opened & (domain.upper < 0.5)] = value
    return Bound(const, reduced, value, if_open, if_closed)


class Master:
    """The relaxation of the master problem in HiGHS, with the rows it stands on."""

    def __init__(self, fixed: Floats, origins: int, domain: Domain) -> None:
        self.fixed = fixed
        self.origins = origins
        self.domain = domain
        self.rows: list[Row] = []
        self._idle: list[int] = []
        self._duals = np.zeros(0)
        self._build()

    def _build(self) -> None:
        k = len(self.fixed)
        self._lp = new_highs()
        self._lp.setOptionValue("presolve", "off")
        lp = highspy.HighsLp()
        lp.num_col_, lp.num_row_ = k + self.origins, 1
        lp.col_cost_ = np.concatenate((self.fixed, np.ones(self.origins)))
        lp.col_lower_ = np.concatenate((self.domain.lower, np.zeros(self.origins)))
        lp.col_upper_ = np.concatenate((self.domain.upper, np.full(self.origins, highspy.kHighsInf)))
        lp.row_lower_ = np.array([float(self.domain.hubs_min)])
        lp.row_upper_ = np.array([float(self.domain.hubs_max)])
        lp.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
        lp.a_matrix_.start_ = np.array([0, k], dtype=np.int32)
        lp.a_matrix_.index_ = np.arange(k, dtype=np.int32)
        lp.a_matrix_.value_ = np.ones(k)
        self._lp.passModel(lp)
        rows, self.rows, self._idle = self.rows, [], []
        for row in rows:
            self._append(row)

    def _append(self, row: Row) -> None:
        used = np.flatnonzero(row.slope > 0.0)
        index = np.append(used, len(self.fixed) + row.origin).astype(np.int32)
        value = np.append(row.slope[used], 1.0)
        self._lp.addRow(row.const, highspy.kHighsInf, len(index), index, value)
        self.rows.append(row)
        self._idle.append(0)

    def add(self, cuts: Cuts, z: Floats, eta: Floats, tolerance: float, *, keep_duals: bool) -> int:
        """Add the cuts that `z` (K,) with the origins' costs `eta` violates; return how many."""
        short = cuts.const - cuts.slope @ z - eta > tolerance
        for i in np.flatnonzero(short):
            duals = cuts.u[i].copy() if keep_duals else None
            row = Row(int(i), float(cuts.const[i]), cuts.slope[i], cuts.v[i], duals)
            self._append(row)
        return int(short.sum())

    def solve(self, domain: Domain) -> tuple[Floats, Floats]:
        """Return z (K,) and eta of the relaxation over `domain`; the multipliers are kept for `bound`."""
        k = len(self.fixed)
        columns = np.arange(k, dtype=np.int32)
        self._lp.changeColsBounds(k, columns, domain.lower, domain.upper)
        self._lp.run()
        solution = self._lp.getSolution()
        values = np.array(solution.col_value)
        self._duals = np.maximum(np.array(solution.row_dual)[1:], 0.0)
        if len(values) != k + self.origins or not np.isfinite(values).all():
            values = np.concatenate((0.5 * (domain.lower + domain.upper), np.zeros(self.origins)))
        self._idle = [0 if used else idle + 1 for used, idle in zip(self._duals > 0.0, self._idle)]
        return np.clip(values[:k], domain.lower, domain.upper), values[k:]

    def multipliers(self) -> Floats:
        """Return a multiplier per row, non-negative, summing to 1 over the rows of each origin."""
        owner = np.array([row.origin for row in self.rows], dtype=np.int64)
        duals = np.where(np.isfinite(self._duals), self._duals, 0.0)
        if len(duals) != len(owner):
            duals = np.zeros(len(owner))
        total = np.bincount(owner, duals, self.origins)
        first = np.zeros(len(owner))
        first[np.unique(owner, return_index=True)[1]] = 1.0
        return np.where(total[owner] > 0.0, duals / np.where(total > 0.0, total, 1.0)[owner], first)

    def bound(self, domain: Domain) -> Bound:
        """Return the safe bound over `domain` from the multipliers of the last solve."""
        weights = self.multipliers()
        const = float(weights @ np.array([row.const for row in self.rows]))
        reduced = self.fixed - weights @ np.array([row.slope for row in self.rows])
        return bound_over(const, reduced, domain)

    def purge(self, idle: int) -> None:
        """Drop the rows that carried no multiplier in the last `idle` solves."""
        if sum(age >= idle for age in self._idle) * 3 > len(self.rows):
            self.rows = [row for row, age in zip(self.rows, self._idle) if age < idle]
            self._build()

    def change_hubs(self, fixed: Floats, rows: list[Row], domain: Domain) -> None:
        """Replace the hubs: new costs, rows over the new list, domain."""
        self.fixed, self.rows, self.domain = fixed, rows, domain
        self._build()

    @property
    def active_rows(self) -> list[Row]:
        """The rows with a multiplier in the last solve."""
        return [row for row, weight in zip(self.rows, self.multipliers()) if weight > 0.0]
