"""Closed-form cuts: near-optimal duals of every O-D pair at a point z, without a linear program.

For an O-D pair the relaxed cost as a function of the hub variables z is the linear program

    min sum_km F_km x_km   subject to   sum_km x_km = 1,   sum of x over pairs that use h <= z_h   for each h

(Hamacher, Labbe, Nickel and Sonneborn 2004, Discrete Applied Mathematics 145:104-116: the strong rows), with
the dual  max v - sum_h z_h u_h  subject to  u_k + u_m >= v - F_km  for k != m,  u_k >= v - F_kk,  u >= 0.
By weak duality every feasible (v, u) gives ``cost(z) >= v - u z`` for all z: a valid cut wherever it was made
(Benders decomposition; Contreras, Cordeau and Laporte 2011, Operations Research 59:1477-1490).

For a given v the hubs are taken by decreasing z, and each covers what the earlier ones leave of its pairs:
``u_k = max(0, v - F_kk, max over earlier m of v - F_km - u_m)``. That is feasible by construction, exact at
integer z, and cheap for the open hubs. The best v is sought by the sign of the slope of
``v - u(v) z``, from the v of the cuts before outward and then by bisection; any v gives a valid cut.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np

from hubdesign.solve.hub_location.instance import Bools, Floats, Ints
from hubdesign.solve.hub_location.relaxation import Relaxation

#: Numbers in a working array: one block of O-D pairs stays in the cache.
BLOCK = 120_000
#: Bisections of v; the dual loses at most 2**-9 of the range of path costs.
BISECTIONS = 9
#: Evaluations of v where the last cut's v is the first guess, and the first step from it, of the range.
FROM_GUESS = 7
FIRST_STEP = 1.0 / 32.0
#: A hub below this value is left out of the choice of v (never out of the cut).
SMALL = 0.02


@dataclass(frozen=True, slots=True)
class Cuts:
    """One cut per origin i: cost of its volume ``>= const[i] - slope[i] @ z``.

    Attributes
    ----------
    const, slope
        (n,), (n, K), scaled.
    v, u
        (n, n) and (n, K, n): the duals per unit, by origin, hub, destination.
    """

    const: Floats
    slope: Floats
    v: Floats
    u: Floats


def make_cuts(
    relaxation: Relaxation,
    z: Floats,
    tie: Floats,
    threads: int = 1,
    careful: Bools | None = None,
    guess: Floats | None = None,
) -> Cuts:
    """Return the cuts at `z` (K,); the result does not depend on `threads`.

    Parameters
    ----------
    relaxation
        The costs.
    z
        The point, (K,).
    tie
        (K,); hubs of equal z are taken by decreasing `tie`.
    threads
        Cores to use.
    careful
        (K,), the hubs to charge as little as may be (all by default); the others, 0 in z, cover each of
        their pairs alone, which is quicker and as valid.
    guess
        (n, n), where to look for v first.
    """
    n, k = relaxation.volume.shape[0], len(relaxation.hubs)
    careful = np.ones(k, dtype=bool) if careful is None else careful | (z > 0.0)
    order = np.lexsort((-tie, -z, ~careful))
    view, z = relaxation.restrict(order), z[order]
    support, exact = max(1, int((z > SMALL).sum())), int(careful.sum())
    v, u = np.empty((n, n)), np.empty((n, k, n))
    alone = _cheapest_use(view, exact)

    def work(origins: Ints) -> None:
        pairs = pair_costs(view, origins, support)
        best = _best_level(pairs, z[:support], None if guess is None else guess[origins].ravel())
        duals = np.empty((k, len(origins), n))
        _cover(pairs, best, duals.reshape(k, -1)[:support])
        level = best.reshape(len(origins), n)
        for hub in range(support, exact):
            lift(view, origins, level, duals, hub)
        if exact < k:
            duals[exact:] = np.maximum(level - alone(origins), 0.0)
        v[origins] = level
        u[origins[:, None], order] = duals.transpose(1, 0, 2)

    over_origins(work, n, max(k, support * support // 4), threads)
    const, slope = weigh(relaxation, v, u)
    return Cuts(const, slope, v, u)


def _cheapest_use(view: Relaxation, first: int) -> Callable[[Ints], Floats]:
    """Return the cheapest path over each hub from position `first` on, as a function of the origins."""
    k = len(view.hubs)
    outer = np.arange(first, k)
    reach = np.array([(view.entry + view.between[:, hub]).min(axis=1) for hub in outer])
    onward = np.array([(view.between[hub][:, None] + view.exit).min(axis=0) for hub in outer])

    def cheapest(origins: Ints) -> Floats:
        use = view.entry[origins][:, outer].T[:, :, None] + onward[:, None, :]
        np.minimum(use, reach[:, origins, None] + view.exit[outer][:, None, :], out=use)
        use[:, np.arange(len(origins)), origins] = view.local[origins][:, outer].T
        return np.asarray(use)

    return cheapest


def over_origins(work: Callable[[Ints], None], n: int, width: int, threads: int) -> None:
    """Call `work` on blocks of origins whose arrays of `width` x origins x n stay in the cache."""
    step = max(1, BLOCK // (n * width))
    blocks = [np.arange(start, min(n, start + step)) for start in range(0, n, step)]
    if threads == 1 or len(blocks) < 8:
        for block in blocks:
            work(block)
        return
    with ThreadPoolExecutor(threads) as pool:
        for done in [pool.submit(work, block) for block in blocks]:
            done.result()


def weigh(relaxation: Relaxation, v: Floats, u: Floats) -> tuple[Floats, Floats]:
    """Return const (n,) and slope (n, K) of the duals v (n, n) and u (n, K, n)."""
    return np.einsum("ij,ij->i", relaxation.volume, v), np.einsum("ikj,ij->ik", u, relaxation.volume)


def pair_costs(view: Relaxation, origins: Ints, support: int) -> Floats:
    """Return F over the first `support` hubs, both ways of travel, (s, s, origins x n)."""
    n, size = view.volume.shape[0], len(origins)
    s = np.arange(support)
    reach = view.entry[np.ix_(origins, s)].T[:, None, :] + view.between[:support, :support, None]
    one_way = reach[:, :, :, None] + view.exit[None, :support, None, :]
    pairs = np.minimum(one_way, one_way.transpose(1, 0, 2, 3)).reshape(support, support, size * n)
    at_home = np.arange(size) * n + origins
    pairs[:, :, at_home] = np.inf
    pairs[s[:, None], s[:, None], at_home] = view.local[np.ix_(origins, s)].T
    return pairs


def lift(view: Relaxation, origins: Ints, level: Floats, duals: Floats, hub: int) -> None:
    """Write ``duals[hub]`` so that it covers its pairs with the hubs before it, whose duals stand.

    `level` is (origins, n), `duals` (K, origins, n).
    """
    entry, leave = view.entry[origins, hub][:, None], view.exit[hub]
    need = entry + view.between[hub, hub] + leave
    if hub:
        known = duals[:hub]
        onward = known + (view.between[hub, :hub, None] + view.exit[:hub])[:, None, :]
        np.minimum(need, entry + onward.min(axis=0), out=need)
        inward = view.entry[origins, :hub].T + view.between[:hub, hub, None]
        np.add(known, inward[:, :, None], out=onward)
        np.minimum(need, leave + onward.min(axis=0), out=need)
    need[np.arange(len(origins)), origins] = view.local[origins, hub]
    np.maximum(level - need, 0.0, out=duals[hub])


def _cover(pairs: Floats, level: Floats, duals: Floats) -> None:
    """Write the duals (s, N) of the hubs in their order for the level v (N,)."""
    for hub in range(len(duals)):
        need = pairs[hub, hub]
        if hub:
            need = np.minimum(need, (pairs[hub, :hub] + duals[:hub]).min(axis=0))
        np.maximum(level - need, 0.0, out=duals[hub])


def _cover_with_slope(pairs: Floats, level: Floats, duals: Floats, slopes: Floats) -> None:
    """As `_cover`, and write the slope of each dual in v."""
    columns = np.arange(len(level))
    for hub in range(len(duals)):
        need, slope = pairs[hub, hub], np.ones(len(level))
        if hub:
            through = pairs[hub, :hub] + duals[:hub]
            which = through.argmin(axis=0)
            value = through[which, columns]
            other = value < need
            need = np.where(other, value, need)
            slope = np.where(other, 1.0 - slopes[which, columns], 1.0)
        np.maximum(level - need, 0.0, out=duals[hub])
        slopes[hub] = np.where(level > need, slope, 0.0)


def _best_level(pairs: Floats, z: Floats, guess: Floats | None) -> Floats:
    """Return the v (N,) that about maximises ``v - u(v) z`` over the hubs of `pairs`, from a `guess`.

    Below the cheapest path no hub is charged; above the level where the hubs whose own path is cheaper sum to
    1 in z nothing is gained, so the best lies between.
    """
    s, _, count = pairs.shape
    columns = np.arange(count)
    own = pairs[np.arange(s), np.arange(s)]
    order = own.argsort(axis=0)
    full = np.minimum((z[order].cumsum(axis=0) < 1.0 - 1e-9).sum(axis=0), s - 1)
    high = own[order[full, columns], columns]
    low = pairs.reshape(s * s, count).min(axis=0)
    best: Floats = low.copy()
    gain = low.copy()
    duals, slopes = np.empty((s, count)), np.empty((s, count))
    level, step = 0.5 * (low + high), (high - low) * FIRST_STEP
    rose = np.full(count, guess is None)
    fell = rose.copy()
    if guess is not None:
        level = np.clip(guess, low, high)
    for _ in range(BISECTIONS if guess is None else FROM_GUESS):
        _cover_with_slope(pairs, level, duals, slopes)
        value = level - z @ duals
        better = value > gain
        best, gain = np.where(better, level, best), np.where(better, value, gain)
        rising = z @ slopes < 1.0
        rose |= rising
        fell |= ~rising
        low, high = np.where(rising, level, low), np.where(rising, high, level)
        outward = np.where(rising, np.minimum(high, level + step), np.maximum(low, level - step))
        level = np.where(rose & fell, 0.5 * (low + high), outward)
        step = 3.0 * step
    return best
