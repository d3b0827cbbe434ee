"""A first plan from the relaxation: choose hubs, shut the rest, round links, frequencies and fleet up."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.model.layout import Model
from hubdesign.solve.finish import Finisher, set_fleet
from hubdesign.solve.relaxation import LpStatus, Relaxation

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

_ZERO = 1e-6


def round_up(model: Model, lp: Relaxation, finisher: Finisher) -> Floats | None:
    """Return a point with integer columns that flows can follow, None where rounding up fails.

    Hubs are those of the largest relaxed values within the count; the flows of the relaxation with the
    other hubs shut are carried by rounding links, frequencies and fleet up. The LP is left as it was.
    """
    program = model.program
    hub = model.family("hub")
    chosen = _choose_hubs(model, lp.values[hub.members])
    lp.set_bounds(hub.indices, chosen, chosen)
    integer = np.flatnonzero(program.integer)
    try:
        for _ in range(3):
            if lp.separate() is not LpStatus.OPTIMAL:
                return None
            values = lp.values.copy()
            values[integer] = np.ceil(values[integer] - _ZERO)
            values[hub.members] = chosen
            set_allocation(model, values)
            set_fleet(model, values)
            values[integer] = np.minimum(values[integer], program.upper[integer])
            if finisher.plan(values) is not None:
                return finisher.point
            # What was rounded up stays open; the next relaxation tells what is still missing.
            links = model.family("link")
            lp.set_bounds(links.indices, values[links.members], program.upper[links.members])
        return None
    finally:
        lp.set_bounds(integer, program.lower[integer], program.upper[integer])


def _choose_hubs(model: Model, values: Floats) -> Floats:
    """Return 0/1 per station: relaxed hubs, largest first, within the count."""
    fewest, most = model.network.problem.settings.hub_count
    station = model.network.station
    order = sorted(
        np.flatnonzero(station.may_be_hub).tolist(),
        key=lambda i: (not station.must_be_hub[i], -round(float(values[i]), 9), i),
    )
    wanted = [i for i in order if values[i] > _ZERO or station.must_be_hub[i]]
    wanted += [i for i in order if i not in wanted][: max(0, fewest - len(wanted))]
    result = np.zeros(len(values))
    result[wanted if most is None else wanted[:most]] = 1.0
    return result


def set_allocation(model: Model, values: Floats) -> None:
    """Give each station that is no hub the open hub of its largest relaxed allocation."""
    if not model.network.problem.settings.single_allocation:
        return
    own, hub = model.family("allocation"), values[model.family("hub").members]
    station, to_hub = model.pairs
    relaxed = np.where(hub[to_hub] > 0.5, values[own.members], -1.0)
    result = np.zeros(own.count)
    for i in range(model.network.station_count):
        pairs = np.flatnonzero((station == i) & (relaxed >= 0.0))
        if hub[i] < 0.5 and len(pairs):
            result[pairs[np.argmax(relaxed[pairs])]] = 1.0
    values[own.members] = result
