"""Why nothing is feasible, in planner's words: cheap proofs with their numbers first, then a conflict.

A cheap proof needs no solver and names the rule that cannot be kept. Where none is found, the model is
solved with every limit made soft: the limits that the least total violation breaks, and by how much, are
the conflict. That is one way out, not the only one, and is told as such.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.itineraries import enumerate_itineraries
from hubdesign.model.build import build_model
from hubdesign.model.layout import Model
from hubdesign.model.program import Program
from hubdesign.network import Network, build_network
from hubdesign.problem import UNLIMITED, Problem
from hubdesign.rules import link_name
from hubdesign.solve.control import Control
from hubdesign.solve.scip import ScipModel

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Examples named per rule; the rest is counted.
_EXAMPLES = 5

#: Violations (of scaled rows) below this are rounding.
_TRACE = 1e-5

#: Soft families: name -> (what is too tight, in words).
_SOFT = {
    "hub_capacity": "hub_capacity of a station",
    "collection_capacity": "collection_capacity of a station",
    "hub_count": "the number of hubs",
    "max_links": "max_links of a station",
    "max_frequency": "max_frequency of a link",
    "departures": "min_departures or max_departures of a station",
    "vehicle_hours": "the vehicles available",
    "cost_limit": "cost_limit",
    "investment_limit": "investment_limit",
    "co2_limit": "co2_limit_tonnes",
    "capacity": "capacity of a link",
    "demand": "serving the demand (unserved, min_share)",
    "spoke_link": "every link touches an open hub (structure)",
    "balance": "departures equal arrivals over one-way links",
}


def diagnose(problem: Problem, time_limit_s: float = 20.0) -> tuple[str, ...]:
    """Return sentences that say why no design of `problem` obeys every rule."""
    network = build_network(problem)
    told = [sentence for proof in CHEAP_PROOFS for sentence in proof(network)]
    if told:
        return tuple(told)
    return tuple(explain_conflict(network, time_limit_s)) or (
        "no design obeys every rule; no single rule could be named within"
        f" {time_limit_s:g} s: allow demand to go unserved, or lift one limit at a time",
    )


def prove_no_itinerary(network: Network) -> list[str]:
    """O-D demands that must be carried but have no itinerary at all under the rules."""
    settings, data = network.problem.settings, network.demand
    if settings.transfers_at_most == UNLIMITED:
        return []
    found = np.zeros(len(data.volume), dtype=bool)
    found[enumerate_itineraries(network).demand] = True
    least = data.min_share if settings.unserved_allowed else np.ones(len(data.volume))
    stuck = np.flatnonzero(~found & (least > 0) & (data.volume > 0)).tolist()
    pairs = [
        f"{network.problem.demands[k].origin} -> {network.problem.demands[k].destination}" for k in stuck
    ]
    if not pairs:
        return []
    rules = "transfers, circuity, hours, hubs, range, modes"
    return [f"{len(pairs)} O-D demands have no itinerary under the rules ({rules}): {_some(pairs)}"]


def prove_unreached_stations(network: Network) -> list[str]:
    """Stations with demand to carry that no candidate link touches."""
    settings, data = network.problem.settings, network.demand
    least = data.min_share if settings.unserved_allowed else np.ones(len(data.volume))
    needed = (least > 0) & (data.volume > 0) & (data.origin != data.destination)
    ends = set(data.origin[needed].tolist()) | set(data.destination[needed].tolist())
    touched = set(network.link.tail.tolist()) | set(network.link.head.tolist())
    codes = [network.problem.stations[i].station for i in sorted(ends - touched)]
    return [f"no vehicle or link reaches {_some(codes)}, where demand must be carried"] if codes else []


def prove_hub_counts(network: Network) -> list[str]:
    """Counts of hubs that the candidates cannot meet."""
    fewest, most = network.problem.settings.hub_count
    may, must = int(network.station.may_be_hub.sum()), int(network.station.must_be_hub.sum())
    told = []
    if fewest > may:
        told.append(f"{fewest} hubs are asked for, {may} stations may be hubs")
    if most is not None and must > most:
        told.append(f"{must} stations must be hubs, at most {most} are allowed")
    return told


def prove_collection_capacity(network: Network) -> list[str]:
    """Single allocation: the volume collected in all exceeds what the hubs may collect."""
    settings, station = network.problem.settings, network.station
    if not settings.single_allocation or settings.structure != "hub-and-spoke" or settings.unserved_allowed:
        return []
    capacity = np.sort(station.collection_capacity[station.may_be_hub])[::-1]
    most = settings.hub_count[1]
    offered = float(capacity[:most].sum())
    volume = float(network.demand.volume.sum())
    if offered >= volume:
        return []
    which = "all hub candidates" if most is None else f"the {most} largest hubs"
    may = f"{which} may collect {offered:,.6g} (collection_capacity)"
    return [f"{volume:,.6g} of volume must be collected, {may}"]


def prove_must_links(network: Network) -> list[str]:
    """Must-links whose least frequency exceeds their most, or their stations' departures."""
    told = []
    link = network.link
    for e in np.flatnonzero(link.must).tolist():
        if network.problem.has_fleet and np.ceil(link.min_frequency[e]) > np.floor(link.max_frequency[e]):
            least, most = link.min_frequency[e], link.max_frequency[e]
            told.append(
                f"{link_name(network, e)} must be operated at least {least:g} times but at most {most:g}"
            )
    count = np.bincount(
        np.concatenate((link.tail[link.must], link.head[link.must])), minlength=network.station_count
    )
    for i in np.flatnonzero(count > network.station.max_links).tolist():
        most = network.station.max_links[i]
        code = network.problem.stations[i].station
        told.append(f"{count[i]} links at {code} must be operated, max_links is {most:g}")
    return told


def prove_station_capacity(network: Network) -> list[str]:
    """Volume that must leave or reach a station exceeds all that its links and departures can offer."""
    settings, data, leg = network.problem.settings, network.demand, network.leg
    least = data.min_share if settings.unserved_allowed else np.ones(len(data.volume))
    due = np.where(data.origin != data.destination, data.volume * least, 0.0)
    offered, largest = _leg_offers(network)
    told = []
    for i, row in enumerate(network.problem.stations):
        for word, ends, at in (("leave", data.origin, leg.tail), ("reach", data.destination, leg.head)):
            volume, offer = float(due[ends == i].sum()), float(offered[at == i].sum())
            if word == "leave" and network.problem.has_fleet:
                offer = min(offer, float(network.station.max_departures[i]) * largest)
            if volume > offer * (1 + 1e-9):
                told.append(f"{volume:,.6g} of volume must {word} {row.station}, at most {offer:,.6g} can")
    return told


def _leg_offers(network: Network) -> tuple[Floats, float]:
    """Return the most volume each leg can carry, and the most that any departure can."""
    link, settings, service = network.link, network.problem.settings, network.service
    if not network.problem.has_fleet:
        return link.capacity[network.leg.link], np.inf
    usable = np.zeros(network.link_count)
    np.maximum.at(usable, service.link, settings.max_load_factor * service.capacity)
    return (usable * np.floor(link.max_frequency))[network.leg.link], float(usable.max(initial=0.0))


CHEAP_PROOFS: tuple[Callable[[Network], list[str]], ...] = (
    prove_unreached_stations,
    prove_no_itinerary,
    prove_hub_counts,
    prove_collection_capacity,
    prove_must_links,
    prove_station_capacity,
)


def explain_conflict(network: Network, time_limit_s: float) -> list[str]:
    """Return the limits that the least total violation breaks, grouped by rule."""
    model = build_model(network)
    soft = _soften(model)
    scip = ScipModel(soft.program, soft.coefficients)
    end = scip.run(Control(time_limit_s), gap=0.05)
    if end.values is None:
        return []
    amounts = end.values[soft.first :]
    broken: dict[str, list[tuple[float, str]]] = {}
    for slack in np.flatnonzero(amounts > _TRACE).tolist():
        row = int(soft.row[slack])
        name = model.program.rows.name_of(row)
        family, key = name.split("[", 1)
        broken.setdefault(family, []).append((float(amounts[slack]), key.rstrip("]")))
    if not broken:
        return []
    lines = ["no single rule is at fault; together these cannot be kept (the least that would have to give):"]
    for family, entries in broken.items():
        entries.sort(reverse=True)
        lines.append(f"{_SOFT[family]}: {_some([_violation(family, *entry) for entry in entries])}")
    return lines


def _violation(family: str, amount: float, key: str) -> str:
    if family in ("demand", "cost_limit", "investment_limit", "co2_limit", "capacity", "hub_capacity"):
        share = f"{100 * amount:.3g} %"
        return f"over by {share}" if key == "all" else f"{key} by {share}"
    return f"{key} by {amount:.3g}"


class _Soft:
    """The program with a violation column for every soft row."""

    def __init__(self, program: Program, coefficients: Floats, first: int, row: Ints) -> None:
        self.program = program
        self.coefficients = coefficients
        self.first = first
        self.row = row


def _soften(model: Model) -> _Soft:
    """Return the model's rows with slack on the soft families, the sum of slack to be minimised."""
    old = model.program
    rows = [f.indices for f in old.rows.families if f.name in _SOFT]
    soft = np.concatenate(rows) if rows else np.zeros(0, dtype=np.int64)
    lower, upper = old.rows.lower, old.rows.upper
    above, below = soft[np.isfinite(upper[soft])], soft[np.isfinite(lower[soft])]
    row = np.concatenate((above, below))
    sign = np.concatenate((-np.ones(len(above)), np.ones(len(below))))
    program = Program()
    program.add_columns("model", old.lower, old.upper, integer=old.integer, label=old.name_of)
    program.add_columns("slack", np.zeros(len(row)), np.full(len(row), np.inf), integer=False, label=str)
    matrix = old.rows.matrix(old.column_count).tocoo()
    joined = sparse.coo_array(
        (
            np.concatenate((matrix.data, sign)),
            (
                np.concatenate((matrix.row, row)),
                np.concatenate((matrix.col, old.column_count + np.arange(len(row)))),
            ),
        ),
        shape=(old.rows.count, old.column_count + len(row)),
    )
    program.rows.add("rows", joined.row, joined.col, joined.data, lower, upper, str)
    coefficients = np.concatenate((np.zeros(old.column_count), np.ones(len(row))))
    return _Soft(program, coefficients, old.column_count, row)


def _some(names: list[str]) -> str:
    shown = ", ".join(names[:_EXAMPLES])
    return shown if len(names) <= _EXAMPLES else f"{shown} and {len(names) - _EXAMPLES} more"
