"""Each constraint family of a three-station case, compared as text with the written formulation."""

from __future__ import annotations

from hubdesign.problem import Demand, ListedLink
from tests.model.cases import line_model


def test_demand_rows_share_out_each_demand_over_its_itineraries_and_what_is_unserved() -> None:
    model = line_model()
    assert model.program.row_text("demand") == [
        "demand[A>C]: +1 unserved[A>C] +1 flow[A>C:A>C:air:-1,-1] +1 flow[A>C:A>B:air+B>C:air:-1,-1] = 1",
        "demand[C>B]: +1 unserved[C>B] +1 flow[C>B:C>B:air:-1,-1] = 1",
    ]


def test_without_a_fleet_capacity_rows_tie_each_direction_to_the_open_link() -> None:
    links = (ListedLink("A", "C", distance_km=200.0, capacity=5.0), ListedLink("C", "B", distance_km=100.0))
    model = line_model(links=links)
    assert model.program.row_text("capacity") == [
        "capacity[A>C:air]: -1 link[A-C:air] +2 flow[A>C:A>C:air:-1,-1] <= 0"
    ]


def test_with_a_fleet_capacity_rows_tie_volume_to_departures_under_the_load_factor() -> None:
    model = line_model(fleet=True, max_load_factor=0.8)
    # 10 units in vehicles of 40 filled to 0.8: 10 / 32 of a departure.
    assert "capacity[A>C:air]: -1 frequency[A-C:air:bus] +0.3125 flow[A>C:A>C:air:-1,-1] <= 0" in (
        model.program.row_text("capacity")
    )


def test_strong_link_rows_hold_each_demand_to_the_open_link() -> None:
    model = line_model()
    assert model.program.row_text("link_linking") == [
        "link_linking[A>C,A-B:air]: -1 link[A-B:air] +1 flow[A>C:A>B:air+B>C:air:-1,-1] <= 0",
        "link_linking[A>C,A-C:air]: -1 link[A-C:air] +1 flow[A>C:A>C:air:-1,-1] <= 0",
        "link_linking[A>C,B-C:air]: -1 link[B-C:air] +1 flow[A>C:A>B:air+B>C:air:-1,-1] <= 0",
        "link_linking[C>B,B-C:air]: -1 link[B-C:air] +1 flow[C>B:C>B:air:-1,-1] <= 0",
    ]


def test_a_demand_above_the_link_capacity_fits_only_in_part() -> None:
    links = (ListedLink("A", "C", distance_km=200.0, capacity=5.0), ListedLink("C", "B", distance_km=100.0))
    model = line_model(links=links)
    assert model.program.row_text("leg_linking") == [
        "leg_linking[A>C,A>C:air]: -0.5 link[A-C:air] +1 flow[A>C:A>C:air:-1,-1] <= 0"
    ]


def test_strong_hub_rows_need_the_hub_open_for_a_transfer() -> None:
    model = line_model()
    assert model.program.row_text("hub_linking") == [
        "hub_linking[A>C,B]: -1 hub[B] +1 flow[A>C:A>B:air+B>C:air:-1,-1] <= 0"
    ]


def test_an_end_that_acts_as_no_hub_needs_the_hub_shut_where_factors_tell_them_apart() -> None:
    model = line_model(transfer_factor=0.5, unit_cost_per_km=1.0, demands=(Demand("C", "B", 4.0),))
    assert model.program.row_text("spoke_linking") == [
        "spoke_linking[C>B,B]: +1 hub[B] +1 flow[C>B:C>B:air:0,0] <= 1"
    ]
    assert model.program.row_text("hub_linking") == [
        "hub_linking[C>B,B]: -1 hub[B] +1 flow[C>B:C>B:air:0,1] <= 0"
    ]


def test_hub_capacity_counts_volume_that_stops_inside() -> None:
    model = line_model(stations={"B": {"hub_capacity": 8.0}})
    assert model.program.row_text("hub_capacity") == [
        "hub_capacity[B]: -1 hub[B] +1.25 flow[A>C:A>B:air+B>C:air:-1,-1] <= 0"
    ]


def test_collection_capacity_counts_volume_by_its_first_hub() -> None:
    model = line_model(stations={"B": {"collection_capacity": 20.0}}, demands=(Demand("A", "B", 10.0),))
    assert model.program.row_text("collection_capacity") == [
        "collection_capacity[B]: -1 hub[B] +0.5 flow[A>B:A>B:air:0,1] <= 0"
    ]


def test_hub_count_and_links_at_a_station() -> None:
    model = line_model(hubs="AB", hubs_min=1, hubs_max=2, stations={"A": {"max_links": 1}})
    assert model.program.row_text("hub_count") == ["hub_count[all]: 1 <= +1 hub[A] +1 hub[B] +1 hub[C] <= 2"]
    assert model.program.row_text("max_links") == ["max_links[A]: +1 link[A-B:air] +1 link[A-C:air] <= 1"]


def test_hub_and_spoke_links_touch_an_open_hub() -> None:
    model = line_model(structure="hub-and-spoke")
    assert "spoke_link[A-C:air]: -1 hub[A] -1 hub[C] +1 link[A-C:air] <= 0" in model.program.row_text(
        "spoke_link"
    )


def test_single_allocation_gives_each_station_one_open_hub_over_an_open_link() -> None:
    model = line_model(allocation="single", hubs="AB", max_transfers=2)
    assert "one_hub[C]: +1 hub[C] +1 allocation[C>A] +1 allocation[C>B] = 1" in model.program.row_text(
        "one_hub"
    )
    assert "allocated_hub_open[C>A]: -1 hub[A] +1 allocation[C>A] <= 0" in (
        model.program.row_text("allocated_hub_open")
    )
    assert "allocated_link_open[C>A]: -1 link[A-C:air] +1 allocation[C>A] <= 0" in (
        model.program.row_text("allocated_link_open")
    )
    way = "flow[C>B:C>A:air+A>B:air:0"
    assert f"origin_way[C>B,C>A]: -1 allocation[C>A] +1 {way},0] +1 {way},1] <= 0" in (
        model.program.row_text("origin_way")
    )


def test_frequency_rows_hold_departures_between_minimum_and_what_demand_can_need() -> None:
    model = line_model(fleet=True, min_frequency=2)
    assert "min_frequency[A-C:air]: +2 link[A-C:air] -1 frequency[A-C:air:bus] <= 0" in (
        model.program.row_text("min_frequency")
    )
    assert "max_frequency[A-C:air]: -1 link[A-C:air] +0.5 frequency[A-C:air:bus] <= 0" in (
        model.program.row_text("max_frequency")
    )


def test_types_balance_at_stations_with_one_way_links() -> None:
    links = (
        ListedLink("A", "B", direction="one-way", distance_km=100.0),
        ListedLink("B", "A", direction="one-way", distance_km=100.0),
    )
    model = line_model(fleet=True, links=links, demands=(Demand("A", "B", 10.0),))
    assert model.program.row_text("balance") == [
        "balance[bus:A]: +1 frequency[A>B:air:bus] -1 frequency[B>A:air:bus] = 0",
        "balance[bus:B]: -1 frequency[A>B:air:bus] +1 frequency[B>A:air:bus] = 0",
    ]


def test_departures_count_at_both_ends_of_a_two_way_link() -> None:
    model = line_model(fleet=True, stations={"A": {"max_departures": 9.0}})
    assert model.program.row_text("departures") == [
        "departures[A]: 0 <= +1 frequency[A-B:air:bus] +1 frequency[A-C:air:bus] <= 9"
    ]


def test_vehicle_hours_count_both_directions() -> None:
    model = line_model(fleet=True)
    # 1 h each way A-B in 50 h a vehicle: 0.04 of a vehicle for a daily pair.
    assert model.program.row_text("vehicle_hours") == [
        "vehicle_hours[bus]: +0.04 frequency[A-B:air:bus] +0.08 frequency[A-C:air:bus]"
        " +0.04 frequency[B-C:air:bus] -1 vehicles[bus] <= 0"
    ]


def test_cost_limit_row_is_divided_by_the_limit() -> None:
    model = line_model(cost_limit=100.0, unit_cost_per_km=1.0, demands=(Demand("C", "B", 4.0),))
    assert model.program.row_text("cost_limit") == ["cost_limit[all]: +4 flow[C>B:C>B:air:-1,-1] <= 1"]


def test_unlimited_transfers_conserve_flow_at_every_inner_station() -> None:
    model = line_model(max_transfers=-1, hubs="ABC", demands=(Demand("A", "C", 10.0),))
    assert model.program.row_text("demand") == [
        "demand[A>C]: +1 unserved[A>C] +1 flow[A>C:A>B:air:-1,-1] +1 flow[A>C:A>C:air:-1,-1] = 1"
    ]
    assert model.program.row_text("conservation") == [
        "conservation[A>C:B]: +1 flow[A>C:A>B:air:-1,-1] -1 flow[A>C:B>C:air:-1,-1] = 0"
    ]
