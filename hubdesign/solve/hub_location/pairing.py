"""Cuts for single allocation: potentials of every pair of stations, greedily as large as they may be.

For fractional choices x_i, x_j the pair's cost is relaxed to the transport problem with x_i as supply, x_j
as demand and cost pair_ij(k, m): together over all pairs this is the linear relaxation of Skorin-Kapov,
Skorin-Kapov and O'Kelly (1996, EJOR 94:582-593), the tightest in common use. By weak duality of the transport
problem any potentials with ``phi_k + psi_m <= pair_ij(k, m)`` give

    cost of the pair >= phi x_i + psi x_j     for every choice, 0/1 ones included,

so sums of them are valid cuts wherever they were made. Potentials are set one by one by decreasing share in
the point, each to the largest value those before it allow; at 0/1 points that is the exact pair cost.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from hubdesign.solve.hub_location.allocation import Choice
from hubdesign.solve.hub_location.instance import Bools, Floats, Ints

#: Numbers in the working array of pair costs.
BLOCK = 400_000


@dataclass(frozen=True, slots=True)
class Pairs:
    """The pairs of stations with volume between them, the first of each being the row's owner."""

    first: Ints
    second: Ints

    @classmethod
    def of(cls, choice: Choice) -> Pairs:
        """Return the pairs of `choice`, spread evenly over the owners."""
        both = choice.volume + choice.volume.T
        i, j = np.nonzero(np.triu(both, 1))
        # alternate the owner, so that every station owns about as many pairs
        turn = (i + j) % 2 == 1
        return cls(np.where(turn, j, i), np.where(turn, i, j))


def pair_cuts(choice: Choice, pairs: Pairs, point: Floats, allowed: Bools) -> Floats:
    """Return per owner i the cut ``eta_i >= sum coefficients * x`` at `point`, (n, n, K).

    `allowed` (n, K): choices that are left; the others need no potential and get 0.
    """
    n, k = choice.own.shape
    result = np.zeros((n, n, k))
    step = max(1, BLOCK // (k * k))
    for start in range(0, len(pairs.first), step):
        i, j = pairs.first[start : start + step], pairs.second[start : start + step]
        phi, psi = _potentials(choice, i, j, point, allowed)
        np.add.at(result, (i, i), phi)
        result[i, j] = psi
    return result


def _potentials(choice: Choice, i: Ints, j: Ints, point: Floats, allowed: Bools) -> tuple[Floats, Floats]:
    """Return phi and psi (pairs, K) for the pairs (i, j)."""
    k = len(choice.hubs)
    count = len(i)
    rows = np.arange(count)
    costs = (
        choice.volume[i, j][:, None, None] * choice.between
        + choice.volume[j, i][:, None, None] * choice.between.T
    )
    costs_back = costs.transpose(0, 2, 1)
    a = np.where(allowed[i], point[i], -1.0)
    b = np.where(allowed[j], point[j], -1.0)
    weight = np.concatenate((a, b), axis=1)
    weight[rows, a.argmax(axis=1)] = 3.0
    weight[rows, k + b.argmax(axis=1)] = 2.0
    order = np.argsort(-weight, axis=1, kind="stable")
    unset = -np.inf
    phi, psi = np.full((count, k), unset), np.full((count, k), unset)
    phi[rows, order[:, 0]] = 0.0
    last = int((weight >= 0.0).sum(axis=1).max())
    for turn in range(1, last):
        item = order[:, turn]
        live = weight[rows, item] >= 0.0
        left = np.flatnonzero(live & (item < k))
        hub = item[left]
        phi[left, hub] = (costs[left, hub] - psi[left]).min(axis=1)
        right = np.flatnonzero(live & (item >= k))
        hub = item[right] - k
        psi[right, hub] = (costs_back[right, hub] - phi[right]).min(axis=1)
    return np.where(allowed[i], phi, 0.0), np.where(allowed[j], psi, 0.0)
