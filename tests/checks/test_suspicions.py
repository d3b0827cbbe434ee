"""What is suspicious is said once, by row, and what is sound is not."""

from __future__ import annotations

from pathlib import Path

import pytest

from hubdesign.inputs import check, listed_warnings
from tests.inputs.broken import write_folder

STATIONS = """station,lat,lon,may_be_hub
AAL,50.1,8.2,yes
BRO,51.4,9.9,no
CEL,49.2,11.3,yes
DOR,52.3,12.1,no
"""
DEMAND = "origin,destination,volume,revenue\nAAL,BRO,120,90\nBRO,CEL,80,110\nCEL,DOR,60,140\n"
FLEET = "vehicle,capacity,range_km,speed_kmh,cost_per_hour\ngull-50,50,1200,500,1500\n"
SETTINGS = '[goal]\ngoal = "most-profit"\n'


def _warned(place: Path, **files: str) -> list[str]:
    texts = {"stations_csv": STATIONS, "demand_csv": DEMAND, "fleet_csv": FLEET, "settings_toml": SETTINGS}
    report = check(write_folder(place, **{**texts, **files}))
    assert not report.faults, [str(fault) for fault in report.faults]
    return [str(warning) for warning in report.warnings]


def test_a_sound_case_raises_no_suspicion(tmp_path: Path) -> None:
    assert _warned(tmp_path) == []


def test_swapped_coordinates_inside_the_ranges(tmp_path: Path) -> None:
    swapped = STATIONS.replace("49.2,11.3", "11.3,49.2")
    (line,) = _warned(tmp_path, stations_csv=swapped, fleet_csv=FLEET.replace("1200", ""))
    assert line.startswith("stations.csv row 4, lat (station CEL): 11.3, 49.2 lies ")
    assert line.endswith("are lat and lon swapped?")


def test_a_far_station_is_not_taken_for_a_swapped_one(tmp_path: Path) -> None:
    far = STATIONS + "FAR,-33.9,18.6,no\n"
    assert (
        _warned(
            tmp_path,
            stations_csv=far,
            demand_csv=DEMAND + "FAR,AAL,5,50\n",
            fleet_csv=FLEET.replace("1200", ""),
        )
        == []
    )


def test_zero_coordinates(tmp_path: Path) -> None:
    lines = _warned(
        tmp_path, stations_csv=STATIONS.replace("52.3,12.1", "0,0"), fleet_csv=FLEET.replace("1200", "")
    )
    assert lines == ["stations.csv row 5, lat (station DOR): 0/0 lies in the sea off Africa; is it a blank?"]


def test_two_stations_within_a_kilometre(tmp_path: Path) -> None:
    # 0.005 degrees of latitude are 556 m on the mean sphere.
    lines = _warned(tmp_path, stations_csv=STATIONS.replace("52.3,12.1", "50.105,8.2"))
    assert lines == [
        "stations.csv row 5, lat (station DOR): 556 m from station AAL (row 2); are they one station?"
    ]


def test_codes_that_differ_in_case_only(tmp_path: Path) -> None:
    lines = _warned(tmp_path, stations_csv=STATIONS + "aal,53,13,no\n", demand_csv=DEMAND + "aal,BRO,5,80\n")
    assert lines == [
        "stations.csv row 6, station (station aal): aal differs from AAL (row 2) in case or"
        " coding only; are they one?"
    ]


def test_missing_coordinates_and_null_geometry(tmp_path: Path) -> None:
    links = "from,to,distance_km\nAAL,BRO,190\nBRO,CEL,260\nCEL,DOR,350\n"
    lines = _warned(
        tmp_path,
        stations_csv=STATIONS.replace("52.3,12.1", ","),
        links_csv=links,
        settings_toml='[network]\nlinks = "listed"\n' + SETTINGS,
    )
    assert lines == [
        "stations.csv row 5, lat (station DOR): blank: it has no place on the map (null geometry)"
    ]


@pytest.mark.parametrize(("given", "word"), [("120", "under"), ("1900", "far above")])
def test_a_listed_length_that_does_not_fit_the_coordinates(given: str, word: str, tmp_path: Path) -> None:
    lines = _warned(
        tmp_path, links_csv=f"from,to,distance_km\nAAL,BRO,{given}\n", fleet_csv=FLEET.replace("1200", "")
    )
    assert any(
        line.startswith("links.csv row 2, distance_km (AAL-BRO air)") and word in line for line in lines
    )


def test_a_station_that_no_vehicle_reaches(tmp_path: Path) -> None:
    lines = _warned(tmp_path, stations_csv=STATIONS.replace("52.3,12.1", "-52.3,12.1"))
    assert any(
        line.startswith("stations.csv row 5, station (station DOR): no vehicle reaches it") for line in lines
    )
    assert any("1 O-D rows (60 of 260 volume) have no itinerary: CEL-DOR (row 4)" in line for line in lines)


def test_demand_without_an_itinerary_is_counted_with_examples(tmp_path: Path) -> None:
    never = "from,to,decision\nAAL,BRO,never\nBRO,CEL,never\n"
    settings = SETTINGS + "[network]\nmax_transfers = 0\n"
    (line,) = _warned(tmp_path, links_csv=never, settings_toml=settings)
    assert "2 O-D rows (200 of 260 volume) have no itinerary: AAL-BRO (row 2), BRO-CEL (row 3)" in line
    assert "they stay unserved" in line


def test_a_share_that_must_be_carried_without_an_itinerary_is_said_infeasible(tmp_path: Path) -> None:
    demand = (
        DEMAND.replace("revenue", "min_share")
        .replace(",90", ",0.9")
        .replace(",110", ",")
        .replace(",140", ",")
    )
    lines = _warned(
        tmp_path,
        demand_csv=demand,
        links_csv="from,to,decision\nAAL,BRO,never\n",
        settings_toml='[goal]\ngoal = "most-volume"\n[network]\nmax_transfers = 0\n',
    )
    assert any("no design can serve them, so none is feasible" in line for line in lines)


def test_demand_beyond_the_frequencies_allowed(tmp_path: Path) -> None:
    lines = _warned(
        tmp_path,
        settings_toml=SETTINGS + "[network]\nlinks = 'listed'\nmax_frequency = 2\nmax_load_factor = 0.5\n",
        links_csv="from,to\nAAL,BRO\nBRO,CEL\nCEL,DOR\n",
    )
    # One link each way at AAL: 2 departures x 50 seats x 0.5 = 50 of 120.
    assert any(
        line.startswith("stations.csv row 2, station (station AAL): 120 leave here, but no more than 50 can")
        for line in lines
    )
    assert any(
        line.startswith(
            "stations.csv row 3, station (station BRO): 120 arrive here, but no more than 100 can"
        )
        for line in lines
    )


def test_demand_beyond_the_departures_allowed(tmp_path: Path) -> None:
    stations = STATIONS.replace("may_be_hub", "may_be_hub,max_departures").replace("8.2,yes", "8.2,yes,2")
    stations = (
        stations.replace("9.9,no", "9.9,no,").replace("11.3,yes", "11.3,yes,").replace("12.1,no", "12.1,no,")
    )
    lines = _warned(tmp_path, stations_csv=stations)
    assert any("120 leave here, but no more than 100 can" in line for line in lines)


def test_demand_beyond_the_capacities_of_links(tmp_path: Path) -> None:
    settings = "[network]\nlinks = 'listed'\n[cost]\nunit_cost_per_km = 1\nunserved_cost = 5\n"
    folder = write_folder(
        tmp_path,
        stations_csv=STATIONS,
        demand_csv=DEMAND,
        links_csv="from,to,capacity\nAAL,BRO,70\nBRO,CEL,\nCEL,DOR,\n",
        settings_toml=settings + "[goal]\nunserved = 'allowed'\n",
    )
    lines = [str(warning) for warning in check(folder).warnings]
    assert any("(station AAL): 120 leave here, but no more than 70 can" in line for line in lines)


def test_demand_beyond_what_hubs_may_collect(tmp_path: Path) -> None:
    stations = STATIONS.replace("may_be_hub", "may_be_hub,collection_capacity").replace(",yes", ",yes,150")
    stations = stations.replace(",no", ",no,")
    settings = SETTINGS + "[network]\nstructure = 'hub-and-spoke'\nhubs_max = {}\n"
    (line,) = _warned(tmp_path, stations_csv=stations, settings_toml=settings.format(1))
    assert line.startswith("stations.csv: the 1 largest hub(s) collect 150 at most (collection_capacity);")
    assert "the demand is 260" in line


def test_demand_beyond_the_fleet(tmp_path: Path) -> None:
    fleet = "vehicle,capacity,speed_kmh,available,hours_per_vehicle,cost_per_hour\ngull-10,10,100,1,10,5\n"
    lines = _warned(tmp_path, fleet_csv=fleet)
    assert any(line.startswith("fleet.csv: all vehicles on their shortest links carry") for line in lines)


def test_rows_that_play_no_part(tmp_path: Path) -> None:
    lines = _warned(
        tmp_path,
        stations_csv=STATIONS.replace("may_be_hub", "may_be_hub,modes")
        .replace(",yes\n", ",yes,\n")
        .replace(",no\n", ",no,\n")
        + "EIN,47.3,8.5,no,\nFUR,47.9,9.1,yes,airr\n",
        demand_csv=DEMAND + "DOR,AAL,0,9\n",
        fleet_csv="vehicle,mode,capacity,range_km,speed_kmh,cost_per_hour,available,hours_per_vehicle\n"
        "gull-50,air,50,1200,500,1500,,\nwren-5,air,5,20,200,100,,\ntern-9,air,9,900,300,500,0,60\n",
        links_csv="from,to,mode,vehicles\nAAL,DOR,air,wren-5\nAAL,CEL,road,\n",
    )
    told = "\n".join(lines)
    assert "demand.csv: 1 row has a volume of 0 and no part in the design (row 5)" in told
    assert "stations.csv row 6, station (station EIN): has no demand and may not be a hub" in told
    assert "stations.csv row 7, station (station FUR): has no demand and no link" in told
    assert (
        "stations.csv row 7, modes (station FUR): no vehicle type has the mode airr; did you mean air?"
        in told
    )
    assert "fleet.csv row 3, vehicle (vehicle wren-5): can serve no link that may be operated" in told
    assert "fleet.csv row 4, available (vehicle tern-9): 0: the type has no part in the design" in told
    assert "links.csv row 2, from (AAL-DOR air): cannot be operated by any vehicle" in told
    assert "links.csv row 3, from (AAL-CEL road): cannot be operated by any vehicle" in told


def test_settings_that_cannot_bind(tmp_path: Path) -> None:
    settings = """[network]
hubs_max = 2
local_volume = "via-hub"
[cost]
transfer_factor = 0.7
co2_price_per_tonne = 50
unserved_cost = 4
revenue_per_unit = 3
[goal]
goal = "least-cost"
investment_limit = 1000
"""
    told = "\n".join(_warned(tmp_path, settings_toml=settings, demand_csv=DEMAND.replace("revenue", "note")))
    for name in (
        "hubs_max",
        "local_volume",
        "transfer_factor",
        "co2_price_per_tonne",
        "unserved_cost",
        "revenue_per_unit",
        "investment_limit",
    ):
        assert f"] {name}: cannot bind: " in told
    assert told.count("cannot bind") == 7


def test_profit_without_revenue(tmp_path: Path) -> None:
    lines = _warned(tmp_path, demand_csv=DEMAND.replace("revenue", "note"))
    assert any("no O-D row brings revenue" in line for line in lines)


def test_twenty_warnings_of_a_rule_are_listed_and_the_rest_counted(tmp_path: Path) -> None:
    stations = "station,lat,lon\n" + "".join(f"S{i},{50 + i / 1000},8\n" for i in range(30))
    report = check(
        write_folder(tmp_path, stations_csv=stations, demand_csv="origin,destination,volume\nS0,S9,5\n")
    )
    near = [line for line in listed_warnings(report.warnings) if "are they one station" in line]
    assert len(near) == 20
    assert any(
        line.startswith("... and ") and line.endswith("more like these (near stations)")
        for line in listed_warnings(report.warnings)
    )


def test_modes_that_differ_in_case_only(tmp_path: Path) -> None:
    fleet = "vehicle,mode,capacity,speed_kmh,cost_per_hour\ngull-50,air,50,500,1500\ntern-9,Air,9,300,500\n"
    lines = _warned(tmp_path, fleet_csv=fleet)
    assert any("row 3, mode (vehicle tern-9): Air differs from air (row 2) in case" in x for x in lines)


@pytest.mark.parametrize("speed", ["28", "1300"])
def test_a_speed_that_is_rare_for_its_mode(speed: str, tmp_path: Path) -> None:
    (line,) = _warned(tmp_path, fleet_csv=FLEET.replace(",500,", f",{speed},"))
    assert line.startswith(f"fleet.csv row 2, speed_kmh (vehicle gull-50): {speed} km/h is rare for air")


def test_more_vehicle_hours_than_the_period_has(tmp_path: Path) -> None:
    fleet = FLEET.replace("\n", ",hours_per_vehicle\n", 1).replace("1500\n", "1500,200\n")
    (line,) = _warned(tmp_path, fleet_csv=fleet, settings_toml="[case]\nperiod = 'Week'\n" + SETTINGS)
    assert "200 hours are more than a week has (168)" in line


def test_fewer_vehicle_hours_than_a_departure_takes(tmp_path: Path) -> None:
    # The shortest pair, BRO-DOR, is 181.4 km long: 0.363 h at 500 km/h.
    fleet = FLEET.replace("\n", ",hours_per_vehicle\n", 1).replace("1500\n", "1500,0.3\n")
    (line,) = _warned(tmp_path, fleet_csv=fleet)
    assert "0.3 hours are less than its shortest departure takes (0.363 h)" in line


def test_demand_in_one_direction_only(tmp_path: Path) -> None:
    stations = "station,lat,lon,may_be_hub\n" + "".join(f"S{i},{45 + i},{5 + i},yes\n" for i in range(5))
    rows = "".join(f"S{a},S{b},5,90\n" for a in range(5) for b in range(a))
    demand = "origin,destination,volume,revenue\n" + rows
    (line,) = _warned(tmp_path, stations_csv=stations, demand_csv=demand)
    assert line.startswith("demand.csv: none of 10 O-D pairs has its way back")


def test_mixed_without_a_candidate_is_said_to_be_point_to_point(tmp_path: Path) -> None:
    stations = STATIONS.replace("may_be_hub", "hub_fixed_cost").replace("yes", "900").replace("no", "")
    (line,) = _warned(tmp_path, stations_csv=stations)
    assert "mixed is point-to-point then; yet hub columns are filled (AAL, CEL)" in line


def test_a_one_way_link_without_a_way_back(tmp_path: Path) -> None:
    links = "from,to,direction\nAAL,BRO,one-way\nBRO,CEL,one-way\nCEL,AAL,one-way\nCEL,DOR,one-way\n"
    settings = SETTINGS + "[network]\nlinks = 'listed'\nmax_transfers = 2\n"
    lines = _warned(tmp_path, links_csv=links, settings_toml=settings)
    assert [line for line in lines if "way back" in line] == [
        "links.csv row 5, direction (CEL-DOR air): one-way, and no vehicle type that serves it has a way"
        " back: it cannot be operated; list its way back, or remove it"
    ]


def test_many_stations_without_coordinates_are_one_line(tmp_path: Path) -> None:
    lines = _warned(
        tmp_path,
        stations_csv="station,may_be_hub\nAAL,yes\nBRO,no\nCEL,no\nDOR,no\n",
        links_csv="from,to,distance_km\nAAL,BRO,190\nBRO,CEL,260\nCEL,DOR,350\nAAL,CEL,300\nAAL,DOR,400\n",
        settings_toml='[network]\nlinks = "listed"\n' + SETTINGS,
    )
    assert lines == [
        "stations.csv: 4 stations have no coordinates and no place on the map (null geometry):"
        " AAL (row 2), BRO (row 3), CEL (row 4) and 1 more"
    ]
