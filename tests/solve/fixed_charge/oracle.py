"""Small fixed-charge instances and their optima by enumeration of link sets and by an arc-flow MILP."""

from __future__ import annotations

import itertools

import numpy as np
from scipy import sparse
from scipy.optimize import Bounds, LinearConstraint, linprog, milp

from hubdesign.solve.fixed_charge.instance import FixedChargeInstance


def random_instance(seed: int, links: int = 8) -> FixedChargeInstance:
    """Return an instance of 5 nodes: one- and two-way links, finite and infinite capacities, odd rules."""
    rng = np.random.default_rng(seed)
    nodes, commodities = 5, int(rng.integers(2, 6))
    pairs = [(i, j) for i in range(nodes) for j in range(nodes) if i != j]
    ends = [pairs[p] for p in rng.choice(len(pairs), links, replace=False)]
    link, tail, head = [], [], []
    for e, (i, j) in enumerate(ends):
        link.append(e), tail.append(i), head.append(j)
        if seed % 2:
            link.append(e), tail.append(j), head.append(i)
    arcs = len(link)
    ods = [pairs[p] for p in rng.choice(len(pairs), commodities, replace=False)]
    capacity = rng.uniform(3.0, 25.0, arcs)
    capacity[rng.random(arcs) < 0.3] = np.inf
    leave = seed % 3 == 0
    return FixedChargeInstance(
        nodes=nodes,
        fixed_cost=np.round(rng.uniform(0.0, 100.0, links), 1) * (rng.random(links) < 0.9),
        must_open=rng.random(links) < (0.15 if seed % 5 == 0 else 0.0),
        link=np.array(link),
        tail=np.array(tail),
        head=np.array(head),
        unit_cost=np.round(rng.uniform(0.0, 5.0, arcs), 1),
        capacity=capacity,
        through=rng.random(nodes) < (0.7 if seed % 7 == 0 else 1.1),
        transfer_cost=rng.uniform(0.0, 2.0, nodes) * (seed % 4 == 0),
        origin=np.array([o for o, _ in ods]),
        destination=np.array([d for _, d in ods]),
        volume=np.round(rng.uniform(1.0, 10.0, commodities), 1),
        unserved_cost=rng.uniform(5.0, 60.0, commodities) if leave else np.full(commodities, np.inf),
        carried_cost=rng.uniform(0.0, 3.0, commodities) * (seed % 4 == 1),
    )


def arc_model(inst: FixedChargeInstance) -> tuple[np.ndarray, ...]:
    """Return costs, equality matrix, its sides, inequality matrix of volumes (K x A, then s) and openings."""
    k_count, a_count, n = inst.commodities, inst.arcs, inst.nodes
    flows = k_count * a_count
    cost = np.zeros(flows + k_count + inst.links)
    upper = np.full(len(cost), np.inf)
    rows, columns, values, sides = [], [], [], np.zeros(k_count * n)
    for k in range(k_count):
        o, d = int(inst.origin[k]), int(inst.destination[k])
        sides[k * n + o], sides[k * n + d] = inst.volume[k], -inst.volume[k]
        for a in range(a_count):
            i, j = int(inst.tail[a]), int(inst.head[a])
            column = k * a_count + a
            cost[column] = inst.unit_cost[a]
            cost[column] += inst.carried_cost[k] if i == o else inst.transfer_cost[i]
            rows += [k * n + i, k * n + j]
            columns += [column, column]
            values += [1.0, -1.0]
            if (i != o and not inst.through[i]) or j == o or i == d:
                upper[column] = 0.0
        rows += [k * n + o, k * n + d]
        columns += [flows + k, flows + k]
        values += [1.0, -1.0]
        if np.isinf(inst.unserved_cost[k]):
            upper[flows + k] = 0.0
        else:
            cost[flows + k] = inst.unserved_cost[k]
    cost[flows + k_count :] = inst.fixed_cost
    equal = sparse.csr_array((values, (rows, columns)), shape=(k_count * n, len(cost)))
    limit = sparse.lil_array((a_count, len(cost)))
    for a in range(a_count):
        limit[a, a:flows:a_count] = 1.0
        limit[a, flows + k_count + inst.link[a]] = -min(inst.capacity[a], inst.volume.sum())
    lower = np.zeros(len(cost))
    lower[flows + k_count :] = inst.must_open
    upper[flows + k_count :] = 1.0
    return cost, equal, sides, limit.tocsr(), lower, upper


def optimum_by_milp(inst: FixedChargeInstance) -> float:
    """Return the least cost, inf where nothing is feasible."""
    cost, equal, sides, limit, lower, upper = arc_model(inst)
    whole = np.zeros(len(cost))
    whole[len(cost) - inst.links :] = 1
    found = milp(
        cost,
        integrality=whole,
        bounds=Bounds(lower, upper),
        constraints=[LinearConstraint(equal, sides, sides), LinearConstraint(limit, -np.inf, 0.0)],
        options={"mip_rel_gap": 0.0},
    )
    assert found.status in (0, 2), found.message
    return float(found.fun) if found.status == 0 else np.inf


def cost_of_links(inst: FixedChargeInstance, opened: np.ndarray) -> float:
    """Return the least cost with exactly these links open, inf where they do not carry all."""
    cost, equal, sides, limit, lower, upper = arc_model(inst)
    lower[len(cost) - inst.links :] = opened
    upper[len(cost) - inst.links :] = opened
    found = linprog(cost, limit, np.zeros(inst.arcs), equal, sides, np.column_stack((lower, upper)))
    return float(found.fun) if found.status == 0 else np.inf


def optimum_by_enumeration(inst: FixedChargeInstance) -> float:
    """Return the least cost over all sets of links."""
    best = np.inf
    for choice in itertools.product((False, True), repeat=inst.links):
        opened = np.array(choice)
        if not (inst.must_open & ~opened).any():
            best = min(best, cost_of_links(inst, opened))
    return best
