"""First plans by capacity scaling.

Katayama, Chen and Kubo (2009, J. of Computational and Applied Mathematics 232:90-101): the linear relaxation
pays a link for the part of its capacity in use, so capacities are moved towards the flows of the last
relaxation; what is used becomes open, what is not dear, and after some rounds most links are open or shut.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.control import Control
from hubdesign.solve.fixed_charge.plan import FlowSolver, Incumbent
from hubdesign.solve.fixed_charge.relaxation import PathRelaxation

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]

_LEAST = 1e-3
_ROUNDS = 25
_WHOLE = 0.02


def scale_capacities(
    lp: PathRelaxation, flows: FlowSolver, incumbent: Incumbent, control: Control, step: float
) -> list[Floats]:
    """Offer plans along the way; return the relaxed openings of the last rounds (E,), newest last.

    The LP's capacities are put back.
    """
    inst = lp.form.instance
    factor = np.ones(inst.arcs)
    seen: list[Floats] = []
    last: Bools | None = None
    for _ in range(_ROUNDS):
        lp.scale_capacity(factor)
        if not lp.solve(control, rounds=6):
            break
        filled = np.clip(lp.y[inst.link] * factor, 0.0, 1.0)
        opened = lp.y > 1e-6
        seen.append(np.zeros(inst.links))
        np.maximum.at(seen[-1], inst.link, filled)
        if last is None or not np.array_equal(opened, last):
            incumbent.offer(flows.plan(opened, control, incumbent.scaled))
        last = opened
        between = (lp.y > _WHOLE) & (lp.y < 1.0 / np.maximum(_LEAST, factor_of_link(factor, lp)) - _WHOLE)
        if not between.any() or control.stop_requested():
            break
        factor = np.maximum(_LEAST, step * filled + (1.0 - step) * factor)
        upper = np.where(lp.upper > 0.0, np.maximum(1.0, 1.0 / factor_of_link(factor, lp)), 0.0)
        lp.set_links(lp.lower, upper)
    lp.scale_capacity(np.ones(inst.arcs))
    lp.set_links(lp.lower, np.minimum(lp.upper, 1.0))
    return seen


def factor_of_link(factor: Floats, lp: PathRelaxation) -> Floats:
    """Return the largest factor of a link's arcs, shape (E,)."""
    result = np.zeros(lp.links)
    np.maximum.at(result, lp.form.instance.link, factor)
    return result
