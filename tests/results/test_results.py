"""Tables and totals against a case worked out by hand, and against the bill on solved cases."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest

from hubdesign.answer import Design, Flow, Status
from hubdesign.network import build_network
from hubdesign.pricing import price
from hubdesign.problem import UNLIMITED, Demand, ListedLink, Problem, Settings, Station
from hubdesign.results import TABLE_COLUMNS, Results, build_results
from hubdesign.results.table import Column, build_table
from hubdesign.results.volume import LEFT_BY_PLAN, NO_ITINERARY, has_itinerary
from tests.results.cases import HAND, hand_worked, random_case, solved


@pytest.fixture(scope="module")
def hand() -> Results:
    return build_results(*hand_worked())


def close(value: float) -> object:
    return pytest.approx(value, rel=1e-12)


def test_a_link_has_its_figures_each_way(hand: Results) -> None:
    link = hand.links.records()[0]
    assert (link["from"], link["to"], link["mode"], link["direction"], link["role"]) == (
        "A",
        "H",
        "air",
        "both",
        "hub-spoke",
    )
    assert (link["distance_km"], link["frequency"], link["frequency_prop"], link["departures"]) == (
        400,
        2,
        2,
        4,
    )
    assert link["capacity"] == 100.0
    assert (link["volume_out"], link["volume_back"]) == (50.0, 30.0)
    assert (link["load_factor_out"], link["load_factor_back"]) == (0.5, 0.3)
    # 20 min + 400 km / 800 km/h; four departures.
    assert link["block_minutes"] == close(50.0)
    assert link["block_hours"] == close(4 * 50 / 60)
    assert link["capacity_km"] == close(4 * 50 * 400)
    assert link["volume_km"] == close(80 * 400)


def test_a_link_has_its_cost_split(hand: Results) -> None:
    link = hand.links.records()[0]
    trip = 100 + 1000 * 50 / 60 + 400
    assert link["trip_cost"] == close(4 * trip)
    assert link["link_fixed_cost"] == 7.0
    assert link["departure_fees"] == close(2 * 10)  # only the departures from H pay
    # 4 a unit; to the hub times 1, from the hub times 2.
    assert link["volume_cost"] == close(50 * 4 * 1 + 30 * 4 * 2)
    # (100 + 800) kg of fuel a trip, 3.16 kg CO2 a kg, 50 a tonne.
    assert link["co2_kg"] == close(4 * 900 * 3.16)
    assert link["co2_cost"] == close(4 * 0.9 * 3.16 * 50)
    assert link["cost"] == close(4 * trip + 7 + 20 + 440 + 4 * 0.9 * 3.16 * 50)
    assert link["setup_cost"] == 70.0


def test_a_station_has_its_role_and_its_volumes(hand: Results) -> None:
    rows = {row["station"]: row for row in hand.stations.records()}
    assert [row["role"] for row in rows.values()] == ["spoke", "hub", "spoke", "not served"]
    hub = rows["H"]
    assert (hub["starting_volume"], hub["ending_volume"], hub["local_volume"]) == (0.0, 20.0, 20.0)
    assert hub["transferring_volume"] == 60.0
    assert hub["collected_volume"] == 80.0
    assert (hub["departures"], hub["links"]) == (4.0, 2)
    assert (hub["hub_fixed_cost"], hub["hub_setup_cost"]) == (100.0, 3000.0)
    assert (hub["transfer_cost"], hub["departure_fees"], hub["volume_fees"]) == (120.0, 40.0, 20.0)
    assert rows["A"]["name"] == "Alder"
    assert hub["name"] == "H"
    assert rows["A"]["allocated_to"] is None


def test_a_vehicle_type_has_its_hours_and_its_money(hand: Results) -> None:
    (row,) = hand.vehicles.records()
    block, turn = 4 * 50 / 60 + 4 * 65 / 60, 8 * 40 / 60
    assert row["departures"] == 8
    assert row["block_hours"] == close(block)
    assert row["turn_hours"] == close(turn)
    assert row["vehicle_hours"] == close(13.0)
    assert (row["used"], row["owned"], row["purchased"]) == (2, 1, 1)
    assert row["hours_available"] == 20.0
    assert row["trip_cost"] == close(4 * (100 + 1000 * 50 / 60 + 400) + 4 * (100 + 1000 * 65 / 60 + 600))
    assert (row["vehicle_cost"], row["purchase_cost"]) == (1000.0, 9000.0)
    assert row["capacity_km"] == 200_000.0


def test_an_itinerary_tells_how_volume_travels(hand: Results) -> None:
    out, back, short = hand.itineraries.records()
    assert (out["origin"], out["destination"], out["stations"], out["modes"]) == (
        "A",
        "B",
        "A H B",
        "air air",
    )
    assert (out["volume"], out["share"], out["transfers"]) == (30.0, 0.5, 1)
    assert (out["distance_km"], out["od_distance_km"]) == (1000.0, 900.0)
    assert out["circuity"] == close(10 / 9)
    assert out["hours"] == close(50 / 60 + 0.5 + 65 / 60)
    assert out["revenue"] == close(30 * 100 * 0.9)
    # 4 to the hub, 2 x 6 from it, 2 for the transfer; fees only at ends, and H is none.
    assert out["cost"] == close(30 * (4 + 12 + 2))
    assert back["cost"] == close(30 * (6 + 8 + 2))
    assert short["cost"] == close(20 * (4 + 1))
    assert short["transfers"] == 0


def test_what_is_left_unserved_has_its_reason(hand: Results) -> None:
    assert hand.unserved.rows == (
        ("A", "B", 30.0, 60.0, LEFT_BY_PLAN),
        ("B", "H", 10.0, 10.0, LEFT_BY_PLAN),
        ("A", "X", 5.0, 5.0, NO_ITINERARY),
    )


def test_the_totals_are_those_worked_out_by_hand(hand: Results) -> None:
    totals = hand.totals
    total_cost = hand.costs["total"]
    assert (totals["links"], totals["hubs"], totals["departures"], totals["vehicles"]) == (2, 1, 8, 2)
    assert (totals["volume_demanded"], totals["volume_carried"], totals["volume_unserved"]) == (
        125.0,
        80.0,
        45.0,
    )
    assert totals["share_served"] == close(80 / 125)
    assert totals["block_hours"] == close(23 / 3)
    assert totals["capacity_km"] == close(200_000)
    assert totals["volume_km"] == close(68_000)
    assert totals["load_factor"] == close(0.34)
    assert totals["stage_length_km"] == close(500)
    assert totals["circuity"] == close(68 / 62)
    assert (totals["transfers"], totals["transfers_per_unit"], totals["nonstop_share"]) == (60.0, 0.75, 0.25)
    assert totals["unit_cost_per_capacity_km"] == close(total_cost / 200_000)
    assert totals["unit_cost_per_volume_km"] == close(total_cost / 68_000)
    assert totals["unit_cost_per_unit"] == close(total_cost / 80)
    assert totals["yield_per_volume_km"] == close(7400 / 68_000)
    assert totals["co2_tonnes"] == close(27.808)
    assert totals["itinerary_hours"] == close((60 * (115 / 60 + 0.5) + 20 * 50 / 60) / 80)


def test_the_cost_split_is_the_one_worked_out_by_hand(hand: Results) -> None:
    split = hand.costs
    assert split["operating"] == close(4 * (500 + 2500 / 3) + 4 * (700 + 3250 / 3))
    assert (split["volume"], split["transfer"], split["hub_fixed"], split["link_fixed"]) == (
        980,
        120,
        100,
        14,
    )
    assert (split["vehicle"], split["departure_fees"], split["volume_fees"]) == (1000, 40, 20)
    assert split["co2"] == close(27.808 * 50)
    assert split["unserved"] == 225.0
    assert split["total"] == close(16356.0 + 1.0 / 15.0)
    assert split["revenue"] == close(7400)
    assert split["profit"] == close(-8956.0 - 1.0 / 15.0)
    assert hand.investment == {"hub_setup": 3000, "link_setup": 70, "purchase": 9000, "total": 12070}


def test_the_answer_names_its_gap_three_ways(hand: Results) -> None:
    answer = hand.answer
    assert (answer["status"], answer["objective_unit"], answer["bound"]) == ("feasible", "crowns", -8000.0)
    assert answer["difference"] == close(956.0 + 1.0 / 15.0)
    assert answer["gap"] == close((956 + 1 / 15) / (8956 + 1 / 15))
    assert answer["difference_share"] == close((956 + 1 / 15) / (16356 + 1 / 15))
    assert answer["difference_share_of"] == "total cost"
    assert hand.progress.rows == ((0.1, None, -7000.0, None), (0.25, -9000.0, -8000.0, close(1 / 9)))


@pytest.mark.parametrize(
    "settings",
    [
        {},
        {"structure": "point-to-point"},
        {"structure": "hub-and-spoke"},
        {"structure": "hub-and-spoke", "allocation": "single", "hubs": 2, "max_transfers": 2},
        {"goal": "most-volume", "cost_limit": 150_000.0},
        {"goal": "least-cost", "unserved": "allowed", "unserved_cost": 90.0},
    ],
)
def test_the_tables_add_up_to_the_bill(settings: dict[str, object]) -> None:
    network, design, bill = solved(random_case(5, **settings))
    results = build_results(network, design, bill)

    def total(table: str, column: str) -> float:
        return math.fsum(value or 0.0 for value in getattr(results, table).values(column))

    def same(*values: float) -> bool:
        return all(math.isclose(value, values[0], rel_tol=1e-9, abs_tol=1e-6) for value in values)

    split, totals = results.costs, results.totals
    assert same(total("links", "trip_cost"), total("vehicles", "trip_cost"), split["operating"])
    assert same(total("links", "volume_cost"), split["volume"])
    assert same(total("links", "link_fixed_cost"), split["link_fixed"])
    assert same(
        total("links", "departure_fees"), total("stations", "departure_fees"), split["departure_fees"]
    )
    assert same(total("links", "co2_cost"), split["co2"])
    assert same(total("links", "co2_kg"), total("vehicles", "co2_kg"), 1000 * totals["co2_tonnes"])
    assert same(total("stations", "transfer_cost"), split["transfer"])
    assert same(total("stations", "volume_fees"), split["volume_fees"])
    assert same(total("stations", "hub_fixed_cost"), split["hub_fixed"])
    assert same(total("vehicles", "vehicle_cost"), split["vehicle"])
    assert same(total("itineraries", "revenue"), split["revenue"])
    assert same(total("itineraries", "cost"), split["volume"] + split["transfer"] + split["volume_fees"])
    volume = math.fsum(a * b for a, b in zip(*map(results.itineraries.values, ("volume", "transfers"))))
    assert same(volume, total("stations", "transferring_volume"), totals["transfers"])
    assert same(
        total("itineraries", "volume"), total("stations", "starting_volume"), totals["volume_carried"]
    )
    assert same(total("stations", "ending_volume"), totals["volume_carried"])
    assert same(total("unserved", "volume"), totals["volume_unserved"])
    assert same(totals["volume_carried"] + totals["volume_unserved"], totals["volume_demanded"])
    for column in ("departures", "block_hours", "capacity_km"):
        assert same(total("links", column), total("vehicles", column), totals[column])
    assert same(total("links", "volume_km"), totals["volume_km"])
    assert total("stations", "links") == 2 * totals["links"]
    parts = [value for name, value in split.items() if name not in ("total", "revenue", "profit")]
    assert same(math.fsum(parts), split["total"])
    assert all(factor is None or factor <= 1.0 + 1e-6 for factor in results.links.values("load_factor_out"))
    if settings.get("allocation") == "single":
        assert set(results.stations.values("allocated_to")) <= {
            row["station"] for row in results.stations.records() if row["role"] == "hub"
        }


def no_fleet(**settings: object) -> Problem:
    """Return A - H - B by distance alone, with a one-way link and local volume; no coordinates."""
    return Problem(
        stations=(Station("A"), Station("H", may_be_hub=True), Station("B"), Station("C")),
        demands=(Demand("A", "B", 4.0), Demand("A", "A", 2.0), Demand("H", "H", 1.0), Demand("C", "A", 3.0)),
        links=(
            ListedLink("A", "H", distance_km=10.0, capacity=100.0),
            ListedLink("H", "B", direction="one-way", distance_km=20.0),
            ListedLink("B", "C", distance_km=5.0),
        ),
        settings=Settings(links="listed", local_volume="via-hub", unit_cost_per_km=1.0, **settings),
    )


def test_without_a_fleet_there_are_no_frequencies_and_local_volume_travels_via_its_hub() -> None:
    network = build_network(no_fleet(goal="most-volume"))
    ends = {(int(a), int(b)): leg for leg, (a, b) in enumerate(zip(network.leg.tail, network.leg.head))}
    flows = (
        Flow(0, (ends[0, 1], ends[1, 2]), 1.0),
        Flow(1, (ends[0, 1], ends[1, 0]), 1.0),
        Flow(2, (), 1.0),
    )
    links = tuple(sorted({int(network.leg.link[leg]) for flow in flows for leg in flow.legs}))
    design = Design(Status.PROVEN, 7.0, 7.0, hubs=(1,), links=links, flows=flows)
    results = build_results(network, design, price(network, design))
    first, second = results.links.records()
    assert (first["volume_out"], first["volume_back"], first["load_factor_out"]) == (6.0, 2.0, 0.06)
    assert (second["direction"], second["volume_out"], second["volume_back"]) == ("one-way", 4.0, None)
    assert (second["capacity"], second["load_factor_out"]) == (None, None)
    assert first["frequency"] is first["departures"] is first["block_minutes"] is first["capacity_km"] is None
    assert results.vehicles.rows == ()
    assert [row["stations"] for row in results.itineraries.records()] == ["A H B", "A H A", "H"]
    assert [row["modes"] for row in results.itineraries.records()] == ["air air", "air air", ""]
    assert [row["transfers"] for row in results.itineraries.records()] == [1, 1, 0]
    assert [row["circuity"] for row in results.itineraries.records()] == [None, None, None]
    assert [row["lat"] for row in results.stations.records()] == [None] * 4
    assert results.totals["departures"] is results.totals["load_factor"] is None
    # C - A would have to change at B, which may not be a hub; H - B cannot be travelled back anyhow.
    assert results.unserved.rows == (("C", "A", 3.0, 3.0, NO_ITINERARY),)


@pytest.mark.parametrize("max_transfers", [1, UNLIMITED])
def test_reasons_are_the_same_with_few_and_with_unlimited_transfers(max_transfers: int) -> None:
    network = build_network(no_fleet(max_transfers=max_transfers))
    assert has_itinerary(network, np.arange(4)).tolist() == [True, True, True, False]
    assert has_itinerary(network, np.array([3, 0])).tolist() == [False, True]


def test_hub_and_spoke_has_no_itinerary_between_stations_that_can_never_be_hubs() -> None:
    problem = HAND.with_settings(structure="hub-and-spoke", max_transfers=0)
    assert has_itinerary(build_network(problem), np.arange(5)).tolist() == [False, False, True, True, False]


def test_a_table_turns_no_figure_into_a_blank() -> None:
    columns = [Column("a", "number", "", ""), Column("b", "integer", "", ""), Column("c", "text", "", "")]
    table = build_table("t", columns, [[np.nan, -0.0], np.array([np.inf, 3.0]), [None, "x"]])
    assert table.rows == ((None, None, None), (0.0, 3, "x"))
    assert str(table.rows[1][0]) == "0.0"
    assert table.values("c") == [None, "x"]
    with pytest.raises(ValueError, match="not in tuple"):
        table.values("d")


def test_a_design_that_serves_nothing_has_whole_if_empty_tables() -> None:
    network = build_network(HAND)
    design = Design(Status.PROVEN, objective=-625.0, bound=-625.0)
    results = build_results(network, design, price(network, design))
    assert results.links.rows == results.itineraries.rows == results.progress.rows == ()
    assert len(results.unserved.rows) == 5
    assert {row["role"] for row in results.stations.records()} == {"not served"}
    assert results.vehicles.records()[0]["used"] == 0
    assert results.totals["volume_carried"] == 0.0
    ratios = ("load_factor", "stage_length_km", "circuity", "unit_cost_per_unit", "yield_per_volume_km")
    assert [results.totals[name] for name in ratios] == [None] * 5


def test_an_itinerary_of_many_legs_is_told_whole() -> None:
    codes = "ABCDEF"
    problem = Problem(
        stations=tuple(Station(code, may_be_hub=True, transfer_cost=1.0) for code in codes),
        demands=(Demand("A", "F", 2.0),),
        links=tuple(ListedLink(a, b, direction="one-way", distance_km=7.0) for a, b in pairwise(codes)),
        settings=Settings(links="listed", max_transfers=UNLIMITED, unit_cost_per_km=1.0),
    )
    network = build_network(problem)
    design = Design(
        Status.PROVEN, 78.0, 78.0, (1, 2, 3, 4), tuple(range(5)), flows=(Flow(0, tuple(range(5)), 1.0),)
    )
    results = build_results(network, design, price(network, design))
    (row,) = results.itineraries.records()
    assert (row["stations"], row["transfers"], row["distance_km"]) == ("A B C D E F", 4, 35.0)
    assert row["cost"] == results.costs["total"] == 2 * 35 + 2 * 4


def test_the_documented_columns_are_those_of_the_tables(hand: Results) -> None:
    for table in hand.tables:
        documented = [column.name.replace("<vehicle>", "prop") for column in TABLE_COLUMNS[table.name]]
        assert list(table.header) == documented
        assert all(column.meaning for column in table.columns)
