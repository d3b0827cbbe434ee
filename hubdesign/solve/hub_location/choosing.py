"""The relaxation over allocations, with bounds that do not rest on a solver's tolerances.

    min sum_k fixed_k x_kk + sum_ik own_ik x_ik + sum_i eta_i
    subject to   sum_k x_ik = 1;   x_ik <= x_kk;   hubs_min <= sum_k x_kk <= hubs_max;
        sum_i load_i x_ik <= capacity_k x_kk, and its covers (:mod:`covers`);
        eta_i >= G_c x  for each cut c of owner i (:mod:`pairing`)

(x_kk: the station of hub k belongs to itself.) HiGHS proposes multipliers: lambda >= 0 for the cuts, scaled
to sum to 1 per owner, mu >= 0 for the capacities, any v for the assignments. By weak (Lagrangian) duality

    cost(x) >= sum_i v_i + sum_k r_k x_kk,
    c_ik = own_ik + sum_c lambda_c G_c,ik + mu_k load_i,
    r_k = fixed_k - mu_k capacity_k + c_kk - v_k - sum over i other than k's station of max(0, v_i - c_ik)

(a cover row with multiplier nu counts as a capacity row with loads 0 or 1)
for every allocation, since ``(c_ik - v_i) x_ik >= -max(0, v_i - c_ik) x_kk``. The minimum over the allowed
hub vectors is a sort (:func:`master.bound_over`); an allocation x_ik = 1 costs at least the bound with hub k
open plus ``max(0, c_ik - v_i)``. Capacities may be broken in HiGHS at a price, so that it always answers.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from hubdesign.solve.highs import new_highs
from hubdesign.solve.hub_location.allocation import Choice
from hubdesign.solve.hub_location.covers import Cover, drop_what_overflows, fewest_hubs
from hubdesign.solve.hub_location.instance import Bools, Floats, Ints
from hubdesign.solve.hub_location.master import Bound, Domain, bound_over

#: Price of breaking a capacity by the whole load (the first plan costs 100).
ELASTIC = 3000.0


@dataclass(frozen=True, slots=True)
class Left:
    """What is left to decide: the hubs' domain and the allocations (n, K) not ruled out."""

    domain: Domain
    allowed: Bools


@dataclass(frozen=True, slots=True)
class AllocationBound:
    """A bound on hubs, and the least cost of each allocation (n, K)."""

    hubs: Bound
    if_allocated: Floats

    @property
    def value(self) -> float:
        """The minimum over everything left."""
        return self.hubs.value


def settle(choice: Choice, left: Left) -> Left | None:
    """Return `left` with the consequences of what is fixed drawn; None where nothing is possible."""
    lower, upper = left.domain.lower.copy(), left.domain.upper.copy()
    allowed = left.allowed.copy()
    places = np.arange(len(lower))
    capped = bool(np.isfinite(choice.capacity).any())
    fewest = left.domain.hubs_min
    while True:
        before = (lower.sum(), upper.sum(), allowed.sum())
        allowed[:, upper < 0.5] = False
        upper[~allowed[choice.hubs, places]] = 0.0
        opened = lower > 0.5
        own = allowed[choice.hubs[opened]] & (places == places[opened][:, None])
        allowed[choice.hubs[opened]] = own
        if capped and not drop_what_overflows(choice, allowed):
            return None
        only = allowed.sum(axis=1) == 1
        lower[allowed[only].any(axis=0)] = 1.0
        if (lower > upper).any() or not allowed.any(axis=1).all():
            return None
        needed = fewest_hubs(choice.capacity, lower > 0.5, upper > 0.5, float(choice.load.sum()))
        if needed is None:
            return None
        fewest = max(fewest, needed)
        if max(lower.sum(), fewest) > left.domain.hubs_max or upper.sum() < fewest:
            return None
        if before == (lower.sum(), upper.sum(), allowed.sum()):
            return Left(Domain(lower, upper, fewest, left.domain.hubs_max), allowed)


class AllocationMaster:
    """The relaxation in HiGHS, with the cuts it stands on."""

    def __init__(self, choice: Choice, floor: Floats, left: Left) -> None:
        self.choice = choice
        self.floor = floor
        self.n, self.k = choice.own.shape
        self.capped = np.flatnonzero(np.isfinite(choice.capacity))
        self.total_load = max(float(choice.load.sum()), 1e-300)
        self.owners: list[int] = []
        self.cuts: list[Floats] = []
        self.covers: list[Cover] = []
        self._idle: list[int] = []
        self._build(left)

    def _build(self, left: Left) -> None:
        n, k = self.n, self.k
        own = self.choice.hubs * k + np.arange(k)
        cost = np.concatenate((self.choice.own.ravel(), np.ones(n), np.full(len(self.capped), ELASTIC)))
        cost[own] += self.choice.fixed
        lower = np.concatenate((np.zeros(n * k), self.floor, np.zeros(len(self.capped))))
        upper = np.concatenate((left.allowed.ravel().astype(float), np.full(n + len(self.capped), np.inf)))
        rows, low, high = self._fixed_rows(left, own)
        self._lp = new_highs()
        self._lp.setOptionValue("presolve", "off")
        self._lp.setOptionValue("dual_feasibility_tolerance", 1e-9)
        self._lp.passModel(_highs_lp(cost, lower, upper, rows, low, high))
        self._base = len(low)
        owners, cuts, covers = self.owners, self.cuts, self.covers
        self.owners, self.cuts, self.covers, self._idle = [], [], [], []
        self._cut_rows: list[int] = []
        self._cover_rows: list[int] = []
        self._append(owners, cuts)
        self.add_covers(covers)

    def _fixed_rows(self, left: Left, own: Ints) -> tuple[sp.csr_matrix, Floats, Floats]:
        """Return the rows: assignments, hub count, capacities, links x_ik <= x_kk for what is allowed."""
        n, k = self.n, self.k
        width = n * k + n + len(self.capped)
        assign = sp.csr_matrix((np.ones(n * k), (np.repeat(np.arange(n), k), np.arange(n * k))), (n, width))
        count = sp.csr_matrix((np.ones(k), (np.zeros(k, dtype=int), own)), (1, width))
        share = self.choice.load / self.total_load
        blocks = [assign, count]
        for place, capped in enumerate(self.capped):
            used = np.append(np.arange(n) * k + capped, n * k + n + place)
            shares = np.append(share, -1.0)
            shares[self.choice.hubs[capped]] -= self.choice.capacity[capped] / self.total_load
            blocks.append(sp.csr_matrix((shares, (np.zeros(n + 1, dtype=int), used)), (1, width)))
        i, hub = np.nonzero(left.allowed)
        other = self.choice.hubs[hub] != i
        i, hub = i[other], hub[other]
        m = len(i)
        index = np.concatenate((i * k + hub, own[hub]))
        value = np.concatenate((np.ones(m), -np.ones(m)))
        blocks.append(sp.csr_matrix((value, (np.tile(np.arange(m), 2), index)), (m, width)))
        domain = left.domain
        low = np.concatenate((np.ones(n), [float(domain.hubs_min)], np.full(len(self.capped) + m, -np.inf)))
        high = np.concatenate((np.ones(n), [float(domain.hubs_max)], np.zeros(len(self.capped) + m)))
        return sp.csr_matrix(sp.vstack(blocks)), low, high

    def _append(self, owners: list[int], cuts: list[Floats]) -> None:
        if not owners:
            return
        n, k = self.n, self.k
        index, value, starts = [], [], [0]
        for owner, cut in zip(owners, cuts):
            used = np.flatnonzero(cut)
            index.append(np.append(used, n * k + owner))
            value.append(np.append(-cut.ravel()[used], 1.0))
            starts.append(starts[-1] + len(used) + 1)
        self._lp.addRows(
            len(owners),
            np.zeros(len(owners)),
            np.full(len(owners), np.inf),
            starts[-1],
            np.array(starts[:-1], dtype=np.int32),
            np.concatenate(index).astype(np.int32),
            np.concatenate(value),
        )
        first = self._base + len(self._cut_rows) + len(self._cover_rows)
        self._cut_rows += range(first, first + len(owners))
        self.owners += owners
        self.cuts += cuts
        self._idle += [0] * len(owners)

    def add_covers(self, covers: list[Cover]) -> None:
        """Add cover rows; the price of breaking the capacity breaks them too."""
        n, k = self.n, self.k
        for cover in covers:
            members = np.flatnonzero(cover.members)
            index = np.concatenate(
                (
                    members * k + cover.hub,
                    [self.choice.hubs[cover.hub] * k + cover.hub],
                    [n * k + n + int(np.searchsorted(self.capped, cover.hub))],
                )
            )
            value = np.concatenate((np.ones(len(members)), [-float(cover.most), -float(n)]))
            self._lp.addRow(-np.inf, 0.0, len(index), index.astype(np.int32), value)
            self._cover_rows.append(self._base + len(self._cut_rows) + len(self._cover_rows))
            self.covers.append(cover)

    def add(self, cuts: Floats, x: Floats, eta: Floats, tolerance: float) -> int:
        """Add the cuts (n, n, K) that the point violates; return how many."""
        flat = cuts.reshape(self.n, -1)
        short = np.flatnonzero(flat @ x.ravel() - eta > tolerance)
        self._append(short.tolist(), [flat[i].copy() for i in short])
        return len(short)

    def solve(self, left: Left) -> tuple[Floats, Floats]:
        """Return x (n, K) and eta over `left`; the multipliers are kept for `bound`."""
        n, k = self.n, self.k
        columns = np.arange(n * k, dtype=np.int32)
        lower = np.zeros((n, k))
        only = left.allowed.sum(axis=1) == 1
        lower[only] = left.allowed[only]
        lower[self.choice.hubs, np.arange(k)] = np.maximum(
            lower[self.choice.hubs, np.arange(k)], left.domain.lower
        )
        self._lp.changeColsBounds(n * k, columns, lower.ravel(), left.allowed.ravel().astype(np.float64))
        self._lp.changeRowBounds(n, float(left.domain.hubs_min), float(left.domain.hubs_max))
        self._lp.run()
        solution = self._lp.getSolution()
        values, duals = np.array(solution.col_value), np.array(solution.row_dual)
        if len(values) != n * k + n + len(self.capped) or not np.isfinite(values).all():
            values = np.zeros(n * k + n + len(self.capped))
            values[: n * k] = (left.allowed / left.allowed.sum(axis=1, keepdims=True)).ravel()
        count = self._base + len(self._cut_rows) + len(self._cover_rows)
        if len(duals) != count:
            duals = np.zeros(count)
        self._row_duals = np.where(np.isfinite(duals), duals, 0.0)
        used = self._row_duals[self._cut_rows] > 0.0
        self._idle = [0 if now else idle + 1 for now, idle in zip(used, self._idle)]
        x = np.clip(values[: n * k].reshape(n, k), lower, left.allowed)
        return x, values[n * k : n * k + n]

    def bound(self, left: Left, x: Floats) -> AllocationBound:
        """Return the safe bound over `left` from the multipliers of the last solve, x being its point."""
        n, k = self.n, self.k
        price = np.zeros(k)
        price[self.capped] = (
            np.maximum(-self._row_duals[n + 1 : n + 1 + len(self.capped)], 0.0) / self.total_load
        )
        weights, covered = self._multipliers()
        changed = np.zeros(n * k)
        if self.cuts:
            changed = weights @ np.array(self.cuts)
        costs = self.choice.own + changed.reshape(n, k) + price * self.choice.load[:, None]
        fixed = self.choice.fixed.copy()
        fixed[self.capped] -= price[self.capped] * self.choice.capacity[self.capped]
        for cover, row in zip(self.covers, self._cover_rows):
            weight = max(-float(self._row_duals[row]), 0.0)
            costs[cover.members, cover.hub] += weight
            fixed[cover.hub] -= weight * cover.most
        base = float(self.floor[~covered].sum())
        opened = x[self.choice.hubs, np.arange(k)] > 0.5
        best: AllocationBound | None = None
        for v in self._levels(left, costs, opened):
            trial = _bound_from(self.choice, left, costs, fixed, v, base)
            if best is None or trial.value > best.value:
                best = trial
        assert best is not None
        return best

    def _levels(self, left: Left, costs: Floats, opened: Bools) -> list[Floats]:
        """Return candidates for v: the solver's, and the cheapest open choice of each station.

        Neither below the station's cheapest choice left: up to there v charges no hub.
        """
        least = np.where(left.allowed, costs, np.inf).min(axis=1)
        cheapest = np.where(left.allowed & opened, costs, np.inf).min(axis=1)
        solver = np.maximum(self._row_duals[: self.n], least)
        return [solver, np.where(np.isfinite(cheapest), cheapest, solver)]

    def _multipliers(self) -> tuple[Floats, Bools]:
        owner = np.array(self.owners, dtype=np.int64)
        duals = np.maximum(self._row_duals[self._cut_rows], 0.0)
        total = np.bincount(owner, duals, self.n)
        first = np.zeros(len(owner))
        first[np.unique(owner, return_index=True)[1]] = 1.0
        weights = np.where(total[owner] > 0.0, duals / np.where(total > 0.0, total, 1.0)[owner], first)
        return weights, np.bincount(owner, minlength=self.n) > 0

    def purge(self, idle: int, left: Left) -> None:
        """Drop the cuts that carried no multiplier in the last `idle` solves."""
        if sum(age >= idle for age in self._idle) * 3 > len(self.owners) + 3 * self.n:
            keep = [place for place, age in enumerate(self._idle) if age < idle]
            self.owners = [self.owners[place] for place in keep]
            self.cuts = [self.cuts[place] for place in keep]
            self._build(left)

    def restrict(self, choice: Choice, keep: Ints, left: Left) -> None:
        """Keep only the hubs at the positions `keep`; `choice` and `left` are over those."""
        used = [place for place, age in enumerate(self._idle) if age < 2]
        self.owners = [self.owners[place] for place in used]
        self.cuts = [self.cuts[place].reshape(self.n, self.k)[:, keep].ravel() for place in used]
        place = {int(old): new for new, old in enumerate(keep)}
        self.covers = [
            Cover(place[cover.hub], cover.members, cover.most) for cover in self.covers if cover.hub in place
        ]
        self.choice, self.k = choice, len(keep)
        self.capped = np.flatnonzero(np.isfinite(choice.capacity))
        self._build(left)


def _bound_from(
    choice: Choice, left: Left, costs: Floats, fixed: Floats, v: Floats, base: float
) -> AllocationBound:
    """Return the bound of the module's formula for the modified costs and levels v."""
    k = len(choice.hubs)
    places = np.arange(k)
    credit = np.where(left.allowed, np.maximum(v[:, None] - costs, 0.0), 0.0)
    credit[choice.hubs, places] = 0.0
    reduced = fixed + costs[choice.hubs, places] - v[choice.hubs] - credit.sum(axis=0)
    hubs = bound_over(base + float(v.sum()), reduced, left.domain)
    beyond = np.maximum(costs - v[:, None], 0.0)
    beyond[choice.hubs, places] = 0.0
    return AllocationBound(hubs, hubs.if_open + beyond)


def _highs_lp(
    cost: Floats, lower: Floats, upper: Floats, rows: sp.csr_matrix, low: Floats, high: Floats
) -> object:
    import highspy

    lp = highspy.HighsLp()
    lp.num_col_, lp.num_row_ = len(cost), len(low)
    lp.col_cost_, lp.col_lower_, lp.col_upper_ = cost, lower, upper
    lp.row_lower_, lp.row_upper_ = low, high
    lp.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
    lp.a_matrix_.start_ = rows.indptr.astype(np.int32)
    lp.a_matrix_.index_ = rows.indices.astype(np.int32)
    lp.a_matrix_.value_ = rows.data
    return lp
