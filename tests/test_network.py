"""The Problem as arrays: candidates, defaults and lengths."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from hubdesign.distances import geodesic_km
from hubdesign.network import Network, build_network, co2_factor, listed_row, modes_in_force
from hubdesign.problem import CurrentLink, Demand, ListedLink, Problem, Settings, Station, Vehicle

PLANE = Vehicle("plane", capacity=50.0, speed_kmh=500.0, range_km=900.0)
LORRY = Vehicle("lorry", capacity=20.0, speed_kmh=80.0, mode="road")
STATIONS = (
    Station("A", lat=50.0, lon=8.0),
    Station("B", lat=52.0, lon=10.0),
    Station("C", lat=48.0, lon=12.0),
    Station("D", lat=59.0, lon=18.0),
)
AB_KM = geodesic_km(50.0, 8.0, 52.0, 10.0)


def _network(
    *links: ListedLink,
    vehicles: tuple[Vehicle, ...] = (),
    stations: tuple[Station, ...] = STATIONS,
    demands: tuple[Demand, ...] = (Demand("A", "B", 10.0),),
    current: tuple[CurrentLink, ...] = (),
    **settings: Any,
) -> Network:
    return build_network(Problem(stations, demands, vehicles, links, current, Settings(**settings)))


def _pairs(network: Network) -> list[str]:
    codes = [row.station for row in network.problem.stations]
    return [
        f"{codes[tail]}{'-' if both else '>'}{codes[head]}"
        + (f" {network.modes[mode]}" if len(network.modes) > 1 else "")
        for tail, head, mode, both in zip(
            network.link.tail, network.link.head, network.link.mode, network.link.both
        )
    ]


def test_without_links_every_pair_is_a_candidate() -> None:
    assert _pairs(_network()) == ["A-B", "A-C", "A-D", "B-C", "B-D", "C-D"]


def test_listed_links_are_the_only_candidates_where_so_set() -> None:
    assert _pairs(_network(ListedLink("B", "A"), ListedLink("C", "D"), links="listed")) == ["B-A", "C-D"]


def test_all_adds_the_pairs_that_are_not_listed() -> None:
    assert _pairs(_network(ListedLink("B", "A"), links="all")) == ["B-A", "A-C", "A-D", "B-C", "B-D", "C-D"]


def test_never_removes_a_pair_for_good() -> None:
    assert _pairs(_network(ListedLink("A", "B", decision="never"))) == ["A-C", "A-D", "B-C", "B-D", "C-D"]


def test_must_marks_a_link() -> None:
    network = _network(ListedLink("A", "C", decision="must"))
    assert network.link.must.tolist() == [pair == "A-C" for pair in _pairs(network)]


def test_range_removes_what_no_type_can_serve() -> None:
    network = _network(vehicles=(PLANE,))
    assert _pairs(network) == ["A-B", "A-C", "B-C"]  # D lies 930 km from B, farther from the others
    assert (network.link.distance_km <= 900.0).all()


def test_a_link_as_long_as_the_range_can_be_served() -> None:
    link = ListedLink("A", "B", distance_km=900.0)
    assert _pairs(_network(link, vehicles=(PLANE,), links="listed")) == ["A-B"]
    longer = ListedLink("A", "B", distance_km=900.001)
    assert _pairs(_network(longer, vehicles=(PLANE,), links="listed")) == []


def test_each_mode_has_links_of_its_own_between_stations_that_allow_it() -> None:
    stations = (
        Station("A", lat=50.0, lon=8.0),
        Station("B", lat=52.0, lon=10.0, modes=("road",)),
        Station("C", lat=48.0, lon=12.0, modes=("air", "road")),
    )
    network = _network(vehicles=(PLANE, LORRY), stations=stations)
    assert network.modes == ("air", "road")
    assert _pairs(network) == ["A-B road", "A-C air", "A-C road", "B-C road"]
    assert [network.problem.vehicles[v].vehicle for v in network.service.vehicle] == [
        "lorry",
        "plane",
        "lorry",
        "lorry",
    ]


def test_modes_come_from_the_fleet_else_from_what_is_named_else_air() -> None:
    assert modes_in_force(Problem(STATIONS, (), (LORRY,))) == ("road",)
    assert modes_in_force(Problem(STATIONS, (), links=(ListedLink("A", "B", mode="rail"),))) == ("rail",)
    assert modes_in_force(Problem(STATIONS, ())) == ("air",)


def test_types_of_a_link_may_be_restricted() -> None:
    small = Vehicle("small", capacity=9.0, speed_kmh=300.0)
    network = _network(ListedLink("A", "B", vehicles=("small",)), vehicles=(PLANE, small))
    names = [
        [network.problem.vehicles[network.service.vehicle[s]].vehicle for s in services]
        for services in network.services_of
    ]
    assert names[_pairs(network).index("A-B")] == ["small"]
    assert names[_pairs(network).index("A-C")] == ["plane", "small"]


def test_a_both_way_link_has_two_legs_and_a_one_way_link_one() -> None:
    network = _network(
        ListedLink("A", "B"),
        ListedLink("C", "A", direction="one-way"),
        ListedLink("A", "D", direction="one-way"),
        ListedLink("D", "A", direction="one-way"),
        links="listed",
    )
    assert _pairs(network) == ["A-B", "C>A", "A>D", "D>A"]
    legs = list(zip(network.leg.link.tolist(), network.leg.tail.tolist(), network.leg.head.tolist()))
    assert legs == [(0, 0, 1), (0, 1, 0), (1, 2, 0), (2, 0, 3), (3, 3, 0)]
    assert network.ways.tolist() == [2, 1, 1, 1]
    assert network.forward_leg.tolist() == [0, 2, 3, 4]
    assert network.backward_leg.tolist() == [1, -1, -1, -1]


def test_uplift_and_mode_factor_lengthen_computed_links_only() -> None:
    network = _network(
        ListedLink("A", "C", mode="road", distance_km=500.0),
        vehicles=(LORRY,),
        uplift_percent=10.0,
        mode_distance_factor=(("road", 1.25),),
    )
    lengths = dict(zip(_pairs(network), network.link.distance_km.tolist()))
    assert lengths["A-B"] == pytest.approx(AB_KM * 1.1 * 1.25, rel=1e-12)
    assert lengths["A-C"] == 500.0


def test_the_od_distance_has_the_uplift_but_no_mode_factor() -> None:
    network = _network(vehicles=(LORRY,), uplift_percent=10.0, mode_distance_factor=(("road", 1.25),))
    assert network.demand.od_km.tolist() == pytest.approx([AB_KM * 1.1], rel=1e-12)


def test_the_od_distance_is_the_listed_one_of_its_own_direction_first() -> None:
    links = (
        ListedLink("A", "B", direction="one-way", distance_km=300.0),
        ListedLink("B", "A", direction="one-way", distance_km=350.0),
        ListedLink("A", "C", direction="one-way", distance_km=400.0),
    )
    demands = (Demand("A", "B", 1.0), Demand("B", "A", 1.0), Demand("C", "A", 1.0), Demand("D", "D", 1.0))
    assert _network(*links, demands=demands).demand.od_km.tolist() == [300.0, 350.0, 400.0, 0.0]


def test_unknown_lengths_leave_no_candidate_and_a_blank_od_distance() -> None:
    stations = (Station("A"), Station("B"))
    network = _network(stations=stations)
    assert _pairs(network) == []
    assert np.isnan(network.demand.od_km).all()


def test_costs_of_links_default_to_the_settings_and_a_zero_counts_as_given() -> None:
    network = _network(
        ListedLink("A", "B", distance_km=100.0),
        ListedLink("A", "C", distance_km=200.0, fixed_cost=0.0, unit_cost=7.0),
        links="listed",
        link_fixed_cost=50.0,
        link_fixed_cost_per_km=2.0,
        unit_cost_per_km=0.25,
    )
    assert network.link.fixed_cost.tolist() == [250.0, 0.0]
    assert network.link.unit_cost.tolist() == [25.0, 7.0]


def test_revenue_is_given_or_grows_with_the_od_distance() -> None:
    demands = (Demand("A", "B", 1.0), Demand("A", "B", 1.0, revenue=0.0))
    network = _network(
        ListedLink("A", "B", distance_km=100.0), demands=demands, revenue_per_unit=20.0, revenue_per_km=0.5
    )
    assert network.demand.revenue.tolist() == [70.0, 0.0]


def test_demand_takes_its_defaults_from_the_settings() -> None:
    demands = (
        Demand("A", "B", 1.0),
        Demand("A", "C", 1.0, revenue_kept_per_transfer=0.5, unserved_cost=0.0, max_hours=3.0),
    )
    network = _network(demands=demands, revenue_kept_per_transfer=0.9, unserved_cost=4.0, max_hours=8.0)
    assert network.demand.kept.tolist() == [0.9, 0.5]
    assert network.demand.unserved_cost.tolist() == [4.0, 0.0]
    assert network.demand.max_hours.tolist() == [8.0, 3.0]


def test_frequencies_default_to_one_with_a_fleet_and_to_none_without() -> None:
    link = ListedLink("A", "B", min_frequency=3.0, max_frequency=9.0)
    network = _network(link, ListedLink("B", "C"), vehicles=(PLANE,), links="listed")
    assert network.link.min_frequency.tolist() == [3.0, 1.0]
    assert network.link.max_frequency.tolist() == [9.0, np.inf]
    assert _network(ListedLink("B", "C"), links="listed").link.min_frequency.tolist() == [0.0]
    wide = _network(
        link, ListedLink("B", "C"), vehicles=(PLANE,), links="listed", min_frequency=0.0, max_frequency=7.0
    )
    assert wide.link.min_frequency.tolist() == [3.0, 0.0]
    assert wide.link.max_frequency.tolist() == [9.0, 7.0]


def test_stations_take_their_defaults() -> None:
    stations = (
        Station("A", lat=50.0, lon=8.0, transfer_minutes=0.0),
        Station("B", lat=52.0, lon=10.0, max_links=3),
    )
    network = _network(stations=stations, transfer_minutes=90.0)
    assert network.station.transfer_h.tolist() == [0.0, 1.5]
    assert network.station.max_links.tolist() == [np.inf, 3.0]
    assert network.station.min_departures.tolist() == [0.0, 0.0]


def test_the_hours_of_a_leg_are_those_of_the_slowest_type_allowed() -> None:
    slow = Vehicle("slow", capacity=9.0, speed_kmh=250.0, fixed_minutes=30.0)
    network = _network(ListedLink("A", "B", distance_km=500.0), vehicles=(PLANE, slow), links="listed")
    assert network.leg.hours.tolist() == pytest.approx([2.5, 2.5])


def test_today_s_hubs_and_links_cost_no_setup() -> None:
    stations = (
        Station("A", lat=50.0, lon=8.0, may_be_hub=True, hub_setup_cost=70.0, current_hub=True),
        Station("B", lat=52.0, lon=10.0, may_be_hub=True, hub_setup_cost=80.0),
        Station("C", lat=48.0, lon=12.0),
    )
    links = (ListedLink("A", "B", setup_cost=5.0), ListedLink("B", "C", setup_cost=6.0))
    network = _network(
        *links,
        stations=stations,
        vehicles=(PLANE,),
        current=(CurrentLink("B", "A", "plane", 7),),
        links="listed",
    )
    assert network.station.hub_setup_cost.tolist() == [0.0, 80.0, 0.0]
    assert network.link.setup_cost.tolist() == [0.0, 6.0]


def test_point_to_point_knows_no_hub() -> None:
    stations = (
        Station("A", lat=50.0, lon=8.0, may_be_hub=True, must_be_hub=True),
        Station("B", lat=52.0, lon=10.0),
    )
    network = _network(stations=stations, structure="point-to-point")
    assert not network.station.may_be_hub.any()
    assert not network.station.must_be_hub.any()


def test_the_current_network_is_today_s_links_types_and_hubs_whatever_the_range() -> None:
    stations = (*STATIONS[:3], Station("D", lat=59.0, lon=18.0, current_hub=True))
    small = Vehicle("small", capacity=9.0, speed_kmh=300.0)
    network = _network(
        ListedLink("A", "C", decision="never"),
        stations=stations,
        vehicles=(PLANE, small),
        structure="current",
        min_frequency=5.0,
        current=(
            CurrentLink("D", "A", "plane", 3),
            CurrentLink("A", "D", "small", 2),
            CurrentLink("A", "C", "small", 4),
        ),
    )
    assert _pairs(network) == ["A-C", "A-D"]
    assert network.departures_today.tolist() == [4, 3, 2]
    assert network.link.must.all()
    assert network.link.min_frequency.tolist() == [0.0, 0.0]
    assert (
        network.station.may_be_hub.tolist()
        == network.station.must_be_hub.tolist()
        == [False, False, False, True]
    )


def test_listed_rows_are_found_by_direction() -> None:
    problem = Problem(STATIONS, (), links=(ListedLink("A", "B"), ListedLink("C", "D", direction="one-way")))
    assert listed_row(problem, "B", "A", "air") is problem.links[0]
    assert listed_row(problem, "C", "D", "air") is problem.links[1]
    assert listed_row(problem, "D", "C", "air") is None
    assert listed_row(problem, "A", "B", "road") is None


def test_the_co2_factor_defaults_to_jet_fuel_for_air_only() -> None:
    # ICAO Carbon Emissions Calculator Methodology: 3.16 kg CO2 per kg of jet fuel.
    assert (
        co2_factor("air", None),
        co2_factor("road", None),
        co2_factor("road", 3.17),
        co2_factor("air", 0.0),
    ) == (3.16, 0.0, 3.17, 0.0)


def test_building_changes_nothing_of_the_problem() -> None:
    problem = Problem(STATIONS, (Demand("A", "B", 10.0),), (PLANE,), (ListedLink("A", "B"),))
    before = repr(problem)
    first, second = build_network(problem), build_network(problem)
    assert repr(problem) == before
    assert (first.link.distance_km == second.link.distance_km).all()
