"""Each rule of a plan, broken alone by a tampered Design, is named in words."""

from __future__ import annotations

import dataclasses
from typing import Any

import pytest

from hubdesign.answer import Design, Flow, Frequency, Status
from hubdesign.network import Network, build_network
from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle
from hubdesign.verification import verify

LINKS = (
    ListedLink("A", "B", distance_km=100.0),
    ListedLink("A", "C", distance_km=220.0),
    ListedLink("B", "C", distance_km=130.0),
)


def problem(*, stations: dict[str, dict[str, Any]] | None = None, **settings: Any) -> Problem:
    """Return a bus case of three stations, B a hub; `stations` overrides columns by code."""
    rows = tuple(Station(c, may_be_hub=c in "AB", **(stations or {}).get(c, {})) for c in "ABC")
    bus = Vehicle(
        "bus", 40.0, 100.0, mode="air", cost_per_departure=10.0, hours_per_vehicle=50.0, range_km=500.0
    )
    defaults = {"links": "listed", "max_transfers": 1, "unserved_cost": 3.0, "unserved": "allowed"}
    return Problem(
        rows,
        (Demand("A", "C", 60.0), Demand("C", "B", 20.0)),
        (bus,),
        LINKS,
        settings=Settings(**{**defaults, **settings}),
    )


def sound(case: Problem) -> tuple[Network, Design]:
    """Return A-B and B-C at two departures each way, A to C by B, priced by hand."""
    network = build_network(case)
    legs = {(int(t), int(h)): n for n, (t, h) in enumerate(zip(network.leg.tail, network.leg.head))}
    flows = (Flow(0, (legs[0, 1], legs[1, 2]), 1.0), Flow(1, (legs[2, 1],), 1.0))
    # Two links, two departures each way, 10 a departure: 80 a period.
    design = Design(
        Status.PROVEN,
        objective=80.0,
        bound=80.0,
        hubs=(1,),
        links=(0, 2),
        frequencies=(Frequency(0, 2), Frequency(2, 2)),
        flows=flows,
    )
    return network, design


def breaches(case: Problem, change: Any = None) -> str:
    """Return what verification says of the sound design after `change`."""
    network, design = sound(case)
    return "\n".join(verify(case, design if change is None else change(design, network), network).breaches)


def test_the_untouched_design_is_sound() -> None:
    assert breaches(problem()) == ""


def flow_to(design: Design, *flows: Flow) -> Design:
    return design.replace(flows=flows)


@pytest.mark.parametrize(
    ("settings", "change", "words"),
    [
        (
            {},
            lambda d, n: d.replace(objective=81.0, bound=81.0),
            "objective 81 does not come out: recomputed 80",
        ),
        ({}, lambda d, n: d.replace(bound=82.0), "wrong side"),
        ({}, lambda d, n: d.replace(bound=40.0), "does not fit the gap"),
        ({}, lambda d, n: flow_to(d, dataclasses.replace(d.flows[0], share=1.2), d.flows[1]), "outside 0..1"),
        ({}, lambda d, n: flow_to(d, d.flows[0], *d.flows), "more than 1"),
        (
            {"unserved": "forbidden"},
            lambda d, n: flow_to(d, dataclasses.replace(d.flows[0], share=0.4), d.flows[1]),
            "A -> C: 0.4 of the volume is carried, at least 1 must be",
        ),
        ({}, lambda d, n: flow_to(d, Flow(0, d.flows[0].legs[::-1], 1.0), d.flows[1]), "do not join"),
        ({}, lambda d, n: d.replace(links=(0,)), "not open"),
        ({}, lambda d, n: d.replace(hubs=()), "transfers at B, which is no open hub"),
        ({"max_transfers": 0}, None, "1 transfers, at most 0 are allowed"),
        ({"max_circuity": 1.01}, None, "times the O-D distance"),
        ({"max_hours": 2.0}, None, "takes 2.3 h, at most 2 are allowed"),
        ({"max_load_factor": 0.5}, None, "exceeds what is offered, 40"),
        ({}, lambda d, n: d.replace(hubs=(1, 2)), "C is a hub but may not be"),
        ({"hubs_min": 2}, None, "1 hubs are open, at least 2 are asked for"),
        (
            {"structure": "hub-and-spoke"},
            lambda d, n: d.replace(links=(0, 1, 2)),
            "A - C by air touches no open hub",
        ),
        ({"structure": "point-to-point"}, None, "B is a hub but may not be"),
        ({"min_frequency": 3}, None, "2 departures each way, at least 3 are asked for"),
        ({"max_frequency": 1}, None, "2 departures each way, 1 to 1 are asked for"),
        ({"cost_limit": 79.0}, None, "total cost 80 exceeds the limit of 79"),
        ({"allocation": "single", "max_transfers": 2}, None, "no allocation is given"),
        (
            {"allocation": "single", "max_transfers": 2},
            lambda d, n: d.replace(allocation=(2, 1, 1)),
            "A belongs to C, which is no open hub",
        ),
    ],
)
def test_a_broken_rule_is_named(settings: dict[str, Any], change: Any, words: str) -> None:
    assert words in breaches(problem(**settings), change)


@pytest.mark.parametrize(
    ("station", "columns", "words"),
    [
        ("A", {"must_be_hub": True}, "A must be a hub but is not"),
        ("B", {"hub_capacity": 59.0}, "B: transferring volume 60 exceeds its capacity 59"),
        ("B", {"collection_capacity": 79.0}, "B: collected volume 80 exceeds its capacity 79"),
        ("B", {"max_links": 1}, "B: 2 links are open, at most 1 may be"),
        ("B", {"max_departures": 3.0}, "B: 4 departures, at most 3 may be"),
        ("A", {"min_departures": 3.0}, "A: 2 departures, at least 3 must be"),
    ],
)
def test_a_broken_rule_of_a_station_is_named(station: str, columns: dict[str, Any], words: str) -> None:
    assert words in breaches(problem(stations={station: columns}))


def test_a_must_link_that_is_shut_is_named() -> None:
    case = problem().replace(links=(LINKS[0], dataclasses.replace(LINKS[1], decision="must"), LINKS[2]))
    assert "A - C by air must be operated but is not" in breaches(case)


def test_too_few_vehicles_and_too_much_carbon_are_named() -> None:
    case = problem(co2_limit_tonnes=0.5)
    bus = dataclasses.replace(case.vehicles[0], available=0, hours_per_vehicle=5.0, fuel_kg_per_km=1.0)
    told = breaches(case.replace(vehicles=(bus,)))
    # 4 x 1 h and 4 x 1.3 h; 920 km at 3.16 kg CO2.
    assert "bus: 9.2 hours need 2 vehicles, 0 are available" in told
    assert "2.9072 t CO2, at most 0.5 are allowed" in told


def test_a_type_that_does_not_come_back_is_named() -> None:
    links = (dataclasses.replace(LINKS[0], direction="one-way"), *LINKS[1:])
    case = problem().replace(links=links)
    network = build_network(case)
    design = Design(Status.PROVEN, 20.0, 20.0, links=(0,), frequencies=(Frequency(0, 2),))
    told = verify(case, design, network).breaches
    assert any("A: arrivals less departures of bus are -2, not 0" in sentence for sentence in told)


def test_todays_limits_are_warned_of_and_not_forbidden() -> None:
    from hubdesign.problem import CurrentLink

    case = problem(structure="current", stations={"B": {"current_hub": True, "max_departures": 3.0}}).replace(
        current=(CurrentLink("A", "B", "bus", 2), CurrentLink("B", "C", "bus", 2))
    )
    network = build_network(case)
    legs = {(int(t), int(h)): n for n, (t, h) in enumerate(zip(network.leg.tail, network.leg.head))}
    flows = (Flow(0, (legs[0, 1], legs[1, 2]), 1.0), Flow(1, (legs[2, 1],), 1.0))
    frequencies = (Frequency(0, 2), Frequency(1, 2))
    design = Design(Status.PROVEN, 80.0, 80.0, (1,), (0, 1), frequencies, flows)
    checked = verify(case, design, network)
    assert checked.breaches == ()
    assert checked.warnings == ("B: 4 departures, at most 3 may be",)
