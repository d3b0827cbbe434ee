"""The root: cutting over a core of hubs, pricing the others in, fixing hubs by their bounds."""

from __future__ import annotations

from typing import Protocol

import numpy as np

from hubdesign.solve.control import Control
from hubdesign.solve.hub_location.ascent import Cuts, lift, make_cuts, over_origins
from hubdesign.solve.hub_location.instance import Bools, Floats, Ints
from hubdesign.solve.hub_location.master import Bound, Domain, Master, Row, bound_over
from hubdesign.solve.hub_location.relaxation import Relaxation
from hubdesign.solve.hub_location.search import improve, round_point

#: Up to this many hubs all are in the core from the start.
CORE = 45
#: A cut must be violated by this much (the first plan costs 100).
VIOLATION = 1e-7
#: Rounds without this share of the gap closed end the cutting.
LEAST_SHARE = 0.06


class Incumbent(Protocol):
    """Where plans are priced and the best is kept; `cost` is ``money * scale - shift``."""

    cost: float
    scale: float
    shift: float

    def offer(self, stations: Ints) -> float:
        """Price a hub set truly and keep it if it is the best; return its cost."""

    def cutoff(self) -> float:
        """Return the bound from which on nothing is worth finding."""


class Root:
    """Hubs still possible, the core's relaxation with its rows, and the bound.

    Attributes
    ----------
    core
        The relaxation over the core's hubs.
    outside
        The relaxation's positions of hubs neither in the core nor fixed closed.
    finished
        Whether the bound reached the cutoff.
    """

    def __init__(
        self,
        relaxation: Relaxation,
        incumbent: Incumbent,
        control: Control,
        promise: Floats,
        starts: list[list[int]],
    ) -> None:
        self.full = relaxation
        self.incumbent = incumbent
        self.control = control
        count = len(relaxation.hubs)
        size = count if count <= CORE + 10 else CORE
        rank = np.lexsort((promise, ~relaxation.forced))
        chosen = np.sort(rank[: max(size, int(relaxation.forced.sum()), relaxation.hubs_min)])
        self.position = chosen
        self.outside = np.setdiff1d(np.arange(count), chosen)
        self.core = relaxation.restrict(chosen)
        self.domain = self._domain()
        self.master = Master(self.core.fixed, len(relaxation.volume), self.domain)
        self.finished = False
        self._level: Floats | None = None
        self.value = relaxation.trivial_bound()
        self.point = np.zeros(len(chosen))
        self.centre = self._first_centre(starts)

    def _domain(self) -> Domain:
        lower = self.core.forced.astype(np.float64)
        return Domain(lower, np.ones(len(lower)), self.full.hubs_min, self.full.hubs_max)

    def _first_centre(self, starts: list[list[int]]) -> Floats:
        """Return a point inside the domain, half of it on the first plan."""
        plan = np.zeros(len(self.position))
        plan[np.isin(self.position, starts[0])] = 1.0
        return np.asarray(0.5 * plan + 0.5 * max(1.0, plan.sum()) / len(plan))

    def run(self) -> float:
        """Cut, price and fix until the core holds every hub that is left; return the scaled bound."""
        self._cut(np.minimum(1.0, self.centre))
        while True:
            bound = self._cut_core()
            if self.control.stop_requested():
                return self.value
            bound, reduced = self._price(bound)
            self._raise(bound.value)
            if self.value >= self.incumbent.cutoff():
                self.finished = True
                return self.value
            if not len(self.outside):
                return self.value
            self._enlarge(bound, reduced)

    def _raise(self, value: float) -> None:
        """Take a bound over all hubs that are left."""
        if value > self.value:
            self.value = value
            self.report(value)

    def report(self, value: float) -> None:
        """Show a scaled bound; what was given up at the cutoff is proven no further."""
        shown = min(value, self.incumbent.cutoff())
        if np.isfinite(shown):
            self.control.report(bound=(shown + self.full.constant) / self.full.scale)

    def _cut(self, point: Floats) -> int:
        cuts = self.cuts_at(point, None)
        z, eta = self.point, np.full(len(cuts.const), -np.inf)
        if self.master.rows:
            eta = self._eta
        return self.master.add(cuts, z, eta, VIOLATION, keep_duals=len(self.outside) > 0)

    def cuts_at(self, point: Floats, careful: Bools | None) -> Cuts:
        """Return the cuts at `point`, looking for v near that of the cuts before."""
        cuts = make_cuts(self.core, point, self.centre, self.control.threads, careful, self._level)
        self._level = cuts.v
        return cuts

    def _cut_core(self) -> Bound:
        """Cut until the bound over the core stalls or reaches the cutoff; return the last bound."""
        best, stalled = -np.inf, 0
        while True:
            z, eta = self.master.solve(self.domain)
            self.point, self._eta = z, eta
            bound = self.master.bound(self.domain)
            target = self.incumbent.cutoff()
            gap = max(target - best, 0.0) if np.isfinite(best) else np.inf
            gained = bound.value - best
            best = max(best, bound.value)
            if not len(self.outside):
                self._raise(bound.value)
            if best >= target or self.control.stop_requested():
                return bound
            self._try_plan(z)
            slow = gained < LEAST_SHARE * gap
            stalled = stalled + 1 if slow else 0
            if stalled > (1 if len(self.outside) else 3):
                return bound
            if not len(self.outside) and self._fix(bound):
                z, eta = self.master.solve(self.domain)
                self.point, self._eta = z, eta
            self.centre = 0.5 * (self.centre + z)
            added = 0 if stalled > 1 else self._cut(0.5 * (self.centre + z))
            if not added:
                added = self._cut(z)
            if not added:
                return bound
            self.master.purge(4)

    def _try_plan(self, z: Floats) -> None:
        """Offer the hub set nearest to the point, improved locally once."""
        chosen = round_point(self.core, z)
        before = self.incumbent.cost
        if self.incumbent.offer(self.core.hubs[chosen]) < before:
            _, chosen, _ = improve(self.core, chosen, self.control.stop_requested)
            self.incumbent.offer(self.core.hubs[chosen])

    def _fix(self, bound: Bound) -> bool:
        """Drop core hubs that no better plan opens, once enough can go; open those every one opens."""
        limit = self.incumbent.cutoff()
        keep = np.flatnonzero(bound.if_open < limit)
        must = bound.if_closed >= limit
        if must.any() and len(keep):
            lower = self.domain.lower.copy()
            lower[must & (bound.if_open < limit)] = 1.0
            self.domain = Domain(lower, self.domain.upper, self.domain.hubs_min, self.domain.hubs_max)
        if len(keep) > 0.85 * len(self.position) or len(keep) < max(1, self.full.hubs_min):
            return False
        self._keep(keep)
        return True

    def _keep(self, keep: Ints) -> None:
        rows = [
            Row(row.origin, row.const, row.slope[keep], row.v, None if row.u is None else row.u[keep])
            for row in self.master.active_rows
        ]
        self.position = self.position[keep]
        self.core = self.core.restrict(keep)
        self.point, self.centre = self.point[keep], self.centre[keep]
        domain = self.domain
        self.domain = Domain(domain.lower[keep], domain.upper[keep], domain.hubs_min, domain.hubs_max)
        self.master.change_hubs(self.core.fixed, rows, self.domain)

    def _price(self, bound: Bound) -> tuple[Bound, Floats]:
        """Return the bound over all hubs left and their reduced costs; drop outside hubs that cannot win."""
        if not len(self.outside):
            return bound, bound.reduced
        averaged = average_rows(self.master, len(self.full.volume), len(self.position))
        inside = len(self.position)
        view = self.full.restrict(np.concatenate((self.position, self.outside)))
        reduced = np.concatenate(
            (
                bound.reduced,
                view.fixed[inside:] - outside_charges(view, averaged, inside, self.control.threads),
            )
        )
        whole = bound_over(bound.const, reduced, self._wider(len(self.outside)))
        left = whole.if_open[inside:] < self.incumbent.cutoff()
        self.outside = self.outside[left]
        reduced = np.concatenate((reduced[:inside], reduced[inside:][left]))
        return bound_over(bound.const, reduced, self._wider(len(self.outside))), reduced

    def _wider(self, further: int) -> Domain:
        """Return the core's domain with `further` free hubs behind it."""
        lower = np.concatenate((self.domain.lower, np.zeros(further)))
        return Domain(lower, np.ones(len(lower)), self.full.hubs_min, self.full.hubs_max)

    def _enlarge(self, bound: Bound, reduced: Floats) -> None:
        """Move the outside hubs of least bound into the core; the core's hopeless ones leave for good."""
        inside = len(self.position)
        limit = self.incumbent.cutoff()
        keep = np.flatnonzero(bound.if_open[:inside] < limit)
        if max(1, self.full.hubs_min) <= len(keep) < inside:
            self._keep(keep)
        ranked = np.argsort(bound.if_open[inside:], kind="stable")
        count = len(ranked) if len(ranked) <= CORE else CORE
        chosen = np.sort(ranked[:count])
        joining = self.outside[chosen]
        self.outside = np.delete(self.outside, chosen)
        old = len(self.position)
        view = self.full.restrict(np.concatenate((self.position, joining)))
        rows = [extend_row(view, row, old) for row in self.master.active_rows]
        self.position = np.concatenate((self.position, joining))
        self.core = view
        self.domain = self._wider(len(joining))
        share = 0.2 * max(1.0, float(self.point.sum())) / len(self.position)
        self.centre = np.concatenate((self.centre, np.full(len(joining), share)))
        self.point = np.concatenate((self.point, np.zeros(len(joining))))
        self.master.change_hubs(self.core.fixed, rows, self.domain)


def average_rows(master: Master, origins: int, hubs: int) -> tuple[Floats, Floats]:
    """Return the duals v (n, n) and u (n, K, n) of the rows averaged by their multipliers."""
    v = np.zeros((origins, origins))
    u = np.zeros((origins, hubs, origins))
    for row, weight in zip(master.rows, master.multipliers()):
        if weight > 0.0 and row.u is not None:
            v[row.origin] += weight * row.v
            u[row.origin] += weight * row.u
    return v, u


def outside_charges(
    view: Relaxation, averaged: tuple[Floats, Floats], inside: int, threads: int = 1
) -> Floats:
    """Return what the duals charge each hub of `view` from position `inside` on, scaled cost.

    Each is left what the core and the outside hubs before it do not cover of its pairs.
    """
    v, u = averaged
    n, k = view.entry.shape
    charge = np.zeros((n, k - inside))

    def work(origins: Ints) -> None:
        duals = np.empty((k, len(origins), n))
        duals[:inside] = u[origins].transpose(1, 0, 2)
        for hub in range(inside, k):
            lift(view, origins, v[origins], duals, hub)
        charge[origins] = np.einsum("kbj,bj->bk", duals[inside:], view.volume[origins])

    over_origins(work, n, k, threads)
    total: Floats = charge.sum(axis=0)
    return total


def extend_row(view: Relaxation, row: Row, old: int) -> Row:
    """Return `row` with duals for the hubs of `view` from position `old` on."""
    assert row.u is not None
    k, n = len(view.hubs), view.volume.shape[0]
    duals = np.empty((k, 1, n))
    duals[:old, 0] = row.u
    for hub in range(old, k):
        lift(view, np.array([row.origin]), row.v[None], duals, hub)
    added = duals[old:, 0] @ view.volume[row.origin]
    return Row(row.origin, row.const, np.concatenate((row.slope, added)), row.v, duals[:, 0])
