"""Enumeration against a plain search over all simple paths."""

from __future__ import annotations

import random
from itertools import pairwise, permutations

import numpy as np
import pytest

from hubdesign.errors import InputError
from hubdesign.itineraries import enumerate_itineraries
from hubdesign.network import Network, build_network
from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle


def random_problem(seed: int, **settings: object) -> Problem:
    """Return five stations, two modes, some one-way links, some hubs, local volume."""
    rng = random.Random(seed)
    codes = "ABCDE"
    stations = tuple(
        Station(code, may_be_hub=rng.random() < 0.6, transfer_minutes=rng.choice([None, 30.0]))
        for code in codes
    )
    links = tuple(
        ListedLink(a, b, mode, rng.choice(["both", "one-way"]), distance_km=float(rng.randint(50, 400)))
        for place, a in enumerate(codes)
        for b in codes[place + 1 :]
        for mode in ("air", "road")
        if rng.random() < 0.7
    )
    demands = tuple(Demand(a, b, 1.0) for a in codes for b in codes if rng.random() < 0.6)
    vehicles = (Vehicle("jet", 10, 400.0, "air", fixed_minutes=20.0), Vehicle("van", 5, 70.0, "road"))
    return Problem(stations, demands, vehicles, links, settings=Settings(links="listed", **settings))  # type: ignore[arg-type]


def paths_by_search(network: Network, limit: int) -> set[tuple[int, tuple[int, ...]]]:
    """Return (demand, legs) of every allowed path, found leg by leg in plain Python."""
    problem, found = network.problem, set()
    hubs = [i for i, s in enumerate(problem.stations) if s.may_be_hub]
    legs = list(zip(network.leg.tail.tolist(), network.leg.head.tolist()))
    for k, row in enumerate(problem.demands):
        o, d = network.index[row.origin], network.index[row.destination]
        if o == d and o in hubs:
            found.add((k, ()))
        for stops in range(0 if o != d else 1, (limit if o != d else min(limit, 1)) + 1):
            for inner in permutations([h for h in hubs if h not in (o, d)], stops):
                ways: list[tuple[int, ...]] = [()]
                places = (o, *inner, d)
                for a, b in pairwise(places):
                    ways = [(*w, leg) for w in ways for leg, ends in enumerate(legs) if ends == (a, b)]
                found |= {(k, way) for way in ways if _allowed(network, k, way, inner)}
    return found


def _allowed(network: Network, k: int, way: tuple[int, ...], inner: tuple[int, ...]) -> bool:
    settings = network.problem.settings
    length = sum(network.link.distance_km[network.leg.link[leg]] for leg in way)
    hours = sum(network.leg.hours[leg] for leg in way) + sum(network.station.transfer_h[i] for i in inner)
    if hours > network.demand.max_hours[k] + 1e-9:
        return False
    local = network.demand.origin[k] == network.demand.destination[k]
    od_km = network.demand.od_km[k]
    if settings.max_circuity is None or local or np.isnan(od_km):
        return True
    return bool(length <= settings.max_circuity * od_km + 1e-9)


def test_enumeration_finds_exactly_the_allowed_simple_paths() -> None:
    total = 0
    for seed in range(40):
        rules = [{}, {"max_circuity": 1.3}, {"max_hours": 3.0, "transfer_minutes": 45.0}][seed % 3]
        network = build_network(random_problem(seed, max_transfers=2, **rules))
        for limit in (0, 1, 2):
            found = enumerate_itineraries(network, limit)
            ways = {
                (int(k), tuple(leg for leg in legs if leg >= 0))
                for k, legs in zip(found.demand.tolist(), found.legs.tolist())
            }
            assert len(ways) == len(found)
            assert ways == paths_by_search(network, limit)
            total += len(found)
    assert total > 2000


def test_lengths_and_hours_are_those_of_the_legs_and_stops() -> None:
    network = build_network(random_problem(3, max_transfers=2, transfer_minutes=15.0))
    found = enumerate_itineraries(network)
    for row in range(len(found)):
        legs = [leg for leg in found.legs[row].tolist() if leg >= 0]
        stops = [hub for hub in found.hubs[row].tolist() if hub >= 0]
        assert found.length_km[row] == sum(network.link.distance_km[network.leg.link[leg]] for leg in legs)
        waiting = sum(network.station.transfer_h[hub] for hub in stops)
        assert abs(found.hours[row] - sum(network.leg.hours[leg] for leg in legs) - waiting) < 1e-12
        assert found.transfers[row] == len(stops)


def test_a_case_with_too_many_itineraries_is_refused_in_words(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("hubdesign.itineraries.MOST_WAYS", 10)
    with pytest.raises(InputError, match="more than 10 itineraries") as caught:
        enumerate_itineraries(build_network(random_problem(1, max_transfers=2)))
    assert "fewer stations be hubs" in caught.value.faults[0].cure
