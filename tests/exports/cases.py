"""Results to write: solved once per test run, with names that try to be something else."""

from __future__ import annotations

from dataclasses import replace
from functools import cache
from pathlib import Path

from hubdesign.answer import Design, Flow, Status
from hubdesign.comparison import Comparison, Entry
from hubdesign.exports.write import InputFiles
from hubdesign.network import build_network
from hubdesign.pricing import price
from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station
from hubdesign.results import Results, build_results
from hubdesign.run import Result
from tests.results.cases import hand_worked, random_case, solved

HOSTILE = (
    "<script>alert('x')</script>",
    "=1+1",
    "+cmd|' /C calc'!A0",
    "\"double\", 'single'; `back`",
    "שלום עולם \u202eright to left",
    "✈️🚂 飛行機 naïve",
    "n" * 300,
    "@SUM(A1:A9)",
    "-2+3",
    "http://example.org/?a=1&b=2",
)

INPUTS = InputFiles(
    Path("nowhere-at-all"), {"stations.csv": b"\xef\xbb\xbfstation;lat\r\n", "settings.toml": b"[case]\n"}
)


def hand_result() -> Result:
    """Return the hand-worked design."""
    network, design, bill = hand_worked()
    return Result(network.problem, network, design, bill, ("a warning <b>",), 0.5, 0.4)


def placeless_result() -> Result:
    """Return a design of two stations without coordinates and without a fleet."""
    problem = Problem(
        stations=(Station("A"), Station("B")),
        demands=(Demand("A", "B", 4.0),),
        links=(ListedLink("A", "B", distance_km=10.0),),
        settings=Settings(links="listed", unit_cost_per_km=1.0),
    )
    network = build_network(problem)
    design = Design(Status.PROVEN, 40.0, 40.0, links=(0,), flows=(Flow(0, (0,), 1.0),))
    return Result(problem, network, design, price(network, design))


@cache
def solved_result(seed: int = 5, structure: str = "mixed") -> Result:
    """Return a solved case about the antimeridian."""
    network, design, bill = solved(random_case(seed, structure=structure, max_transfers=2))
    return Result(network.problem, network, design, bill, (), 1.0, 0.9)


def with_names(problem: Problem) -> Problem:
    """Return `problem` with hostile station names, and a code and a vehicle that look like formulas."""
    codes = {row.station: row.station for row in problem.stations}
    codes |= {problem.stations[0].station: "=1+1", problem.stations[1].station: "<b>&"}
    types = {row.vehicle: row.vehicle for row in problem.vehicles} | {problem.vehicles[0].vehicle: "-9"}
    return problem.replace(
        stations=tuple(
            replace(row, station=codes[row.station], name=HOSTILE[i % len(HOSTILE)])
            for i, row in enumerate(problem.stations)
        ),
        demands=tuple(
            replace(row, origin=codes[row.origin], destination=codes[row.destination])
            for row in problem.demands
        ),
        vehicles=tuple(replace(row, vehicle=types[row.vehicle]) for row in problem.vehicles),
        settings=problem.settings.replace(title=HOSTILE[0], currency='=€"<i>', volume_unit="@seats"),
    )


@cache
def hostile_result(first: int = 0) -> Result:
    """Return a solved case with hostile names, beginning with the one at `first`."""
    problem = with_names(random_case(5, max_transfers=2))
    names = HOSTILE[first:] + HOSTILE[:first]
    stations = tuple(replace(row, name=names[i]) for i, row in enumerate(problem.stations))
    network, design, bill = solved(problem.replace(stations=stations))
    return Result(network.problem, network, design, bill, (HOSTILE[1],), 1.0, 0.9)


def results_of(result: Result) -> Results:
    """Return the tables of a result."""
    return build_results(result.network, result.design, result.bill)


def comparison_of() -> Comparison:
    """Return three solved structures and one without a design."""
    structures = ("point-to-point", "hub-and-spoke", "mixed")
    entries = [Entry("current", Status.INFEASIBLE, None, False, "no station may be a hub")]
    for structure in structures:
        result = solved_result(5, structure)
        entries.append(Entry(structure, result.design.status, result, True))  # type: ignore[arg-type]
    return Comparison(entries[1].result.problem, tuple(entries))  # type: ignore[union-attr]
