"""Demand without an itinerary: the same as an enumeration finds, on random small cases of every rule."""

from __future__ import annotations

import random

import numpy as np
import pytest

from hubdesign.checks.reach import demands_without_itinerary
from hubdesign.itineraries import enumerate_itineraries
from hubdesign.network import Network, build_network
from hubdesign.problem import UNLIMITED, Demand, ListedLink, Problem, Settings, Station, Vehicle


def _random_problem(seed: int) -> Problem:
    rng = random.Random(seed)
    codes = [f"S{i}" for i in range(rng.randint(3, 7))]
    modes = ("air", "road") if seed % 3 == 0 else ("air",)
    stations = tuple(
        Station(
            code,
            lat=rng.uniform(40, 50),
            lon=rng.uniform(0, 15),
            may_be_hub=rng.random() < 0.5,
            transfer_minutes=rng.choice([None, 90.0]),
        )
        for code in codes
    )
    pairs = [(a, b) for a in codes for b in codes if a < b and rng.random() < 0.5] or [(codes[0], codes[1])]
    links = tuple(
        ListedLink(
            *(pair if rng.random() < 0.7 else pair[::-1]),
            mode=rng.choice(modes),
            direction=rng.choice(["both", "one-way"]),
        )  # type: ignore[arg-type]
        for pair in pairs
    )
    vehicles = tuple(
        Vehicle(f"v-{mode}", 50.0, rng.choice([80.0, 500.0]), mode=mode, range_km=rng.choice([None, 700.0]))
        for mode in modes
    )
    od = [(a, b) for a in codes for b in codes]
    demands = tuple(
        Demand(a, b, rng.choice([0.0, 5.0]), max_hours=rng.choice([None, None, 4.0])) for a, b in od
    )
    structure = rng.choice(["point-to-point", "hub-and-spoke", "mixed"])
    settings = Settings(
        structure=structure,  # type: ignore[arg-type]
        max_transfers=rng.choice([None, 0, 1, 2]),
        max_circuity=rng.choice([None, 1.3, 2.0]),
        max_hours=rng.choice([None, 9.0]),
        links="listed",
        local_volume="via-hub",
    )
    return Problem(stations, demands, vehicles, links, settings=settings)


def _found_by_enumeration(network: Network) -> list[int]:
    itineraries = enumerate_itineraries(network)
    kept = np.ones(len(itineraries), dtype=bool)
    if network.problem.settings.structure == "hub-and-spoke":
        may = network.station.may_be_hub
        nonstop = (itineraries.transfers == 0) & (itineraries.legs[:, 0] >= 0)
        leg = itineraries.legs[nonstop, 0]
        kept[nonstop] = may[network.leg.tail[leg]] | may[network.leg.head[leg]]
    served = set(itineraries.demand[kept].tolist())
    return [k for k in range(len(network.demand.volume)) if network.demand.volume[k] > 0 and k not in served]


@pytest.mark.parametrize("seed", range(150))
def test_reach_agrees_with_the_enumeration(seed: int) -> None:
    network = build_network(_random_problem(seed))
    assert demands_without_itinerary(network) == _found_by_enumeration(network)


def test_unlimited_transfers_chain_over_hubs_only() -> None:
    stations = tuple(
        Station(code, lat=50.0, lon=float(i), may_be_hub=code in "BC") for i, code in enumerate("ABCDEF")
    )
    links = tuple(ListedLink(a, b) for a, b in ("AB", "BC", "CD", "DE"))
    demands = tuple(Demand(a, b, 1.0) for a, b in ("AD", "AE", "DA", "AF", "DE"))
    problem = Problem(
        stations, demands, links=links, settings=Settings(links="listed", max_transfers=UNLIMITED)
    )
    # A-B-C-D transfers at B and C; E lies behind D, which is no hub; F has no link.
    assert demands_without_itinerary(build_network(problem)) == [1, 3]
