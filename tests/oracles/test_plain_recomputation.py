"""A written result recomputed with csv, json, tomllib and math alone: nothing of the package has a say."""

from __future__ import annotations

import csv
import itertools
import json
import math
import subprocess
import sys
import tomllib
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).resolve().parents[2]


def rows(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8-sig", newline="") as stream:
        return list(csv.DictReader(stream))


def number(row: dict[str, str], name: str, default: float = 0.0) -> float:
    return float(row.get(name) or default)


@pytest.fixture(scope="module")
def result(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a result folder written by the command line in a process of its own."""
    place = tmp_path_factory.mktemp("plain")
    for words in (["new", "case"], ["design", "case", "-o", "result"]):
        command = [sys.executable, "-m", "hubdesign", *words]
        subprocess.run(command, cwd=place, check=True, capture_output=True, env={"PYTHONPATH": str(ROOT)})
    return place / "result"


def settings_of(result: Path) -> dict[str, Any]:
    read = tomllib.loads((result / "inputs/settings.toml").read_text("utf-8"))
    return {name: value for section in read.values() for name, value in section.items()}


def test_costs_and_profit_come_out(result: Path) -> None:
    settings = settings_of(result)
    stations = {row["station"]: row for row in rows(result / "inputs/stations.csv")}
    fleet = {row["vehicle"]: row for row in rows(result / "inputs/fleet.csv")}
    demand = {(r["origin"], r["destination"]): r for r in rows(result / "inputs/demand.csv")}
    operating = fees = link_fixed = co2_kg = 0.0
    hours = dict.fromkeys(fleet, 0.0)
    special = {frozenset((r["from"], r["to"])): r for r in rows(result / "inputs/links.csv")}
    for row in rows(result / "links.csv"):
        km = float(row["distance_km"])
        own = special.get(frozenset((row["from"], row["to"])), {})
        standard = settings.get("link_fixed_cost", 0.0) + settings.get("link_fixed_cost_per_km", 0.0) * km
        link_fixed += number(own, "fixed_cost", standard)
        for name, vehicle in fleet.items():
            each_way = int(row[f"frequency_{name}"] or 0)
            block = number(vehicle, "fixed_minutes") / 60 + km / float(vehicle["speed_kmh"])
            trip = number(vehicle, "cost_per_departure") + number(vehicle, "cost_per_hour") * block
            operating += 2 * each_way * (trip + number(vehicle, "cost_per_km") * km)
            hours[name] += 2 * each_way * (block + number(vehicle, "turn_minutes") / 60)
            fees += each_way * sum(number(stations[row[end]], "departure_fee") for end in ("from", "to"))
            fuel = number(vehicle, "fuel_kg_per_departure") + number(vehicle, "fuel_kg_per_km") * km
            co2_kg += 2 * each_way * fuel * number(vehicle, "co2_per_fuel_kg", 3.16)
    vehicle_cost = sum(
        math.ceil(hours[n] / number(v, "hours_per_vehicle", math.inf) - 1e-9) * number(v, "cost_per_vehicle")
        for n, v in fleet.items()
    )
    hubs = [row["station"] for row in rows(result / "stations.csv") if row["role"] == "hub"]
    hub_fixed = sum(number(stations[hub], "hub_fixed_cost") for hub in hubs)
    transfer = volume_fees = revenue = carried = 0.0
    for row in rows(result / "itineraries.csv"):
        volume, stops = float(row["volume"]), row["stations"].split()[1:-1]
        asked = demand[row["origin"], row["destination"]]
        kept = number(asked, "revenue_kept_per_transfer", settings.get("revenue_kept_per_transfer", 1.0))
        transfer += volume * sum(number(stations[stop], "transfer_cost") for stop in stops)
        volume_fees += volume * sum(number(stations[row[e]], "volume_fee") for e in ("origin", "destination"))
        each = number(asked, "revenue", settings.get("revenue_per_unit", 0.0))
        if not asked.get("revenue"):
            each += settings.get("revenue_per_km", 0.0) * float(row["od_distance_km"])
        revenue += volume * each * kept ** len(stops)
        carried += volume
        assert all(stop in hubs for stop in stops)
    summary = json.loads((result / "summary.json").read_text("utf-8"))
    co2 = co2_kg / 1000 * settings.get("co2_price_per_tonne", 0.0)
    unserved = sum(number(r, "volume") for r in demand.values()) - carried
    parts = {
        "operating": operating,
        "departure_fees": fees,
        "link_fixed": link_fixed,
        "vehicle": vehicle_cost,
        "hub_fixed": hub_fixed,
        "transfer": transfer,
        "volume_fees": volume_fees,
        "co2": co2,
        "unserved": unserved * settings.get("unserved_cost", 0.0),
    }
    for name, value in parts.items():
        assert summary["costs"][name] == pytest.approx(value, rel=1e-6, abs=1e-6), name
    assert summary["costs"]["total"] == pytest.approx(sum(parts.values()), rel=1e-6)
    assert summary["objective"] == pytest.approx(revenue - sum(parts.values()), rel=1e-6)
    assert summary["totals"]["volume_carried"] == pytest.approx(carried, rel=1e-9)


def test_volume_fits_what_departures_offer(result: Path) -> None:
    settings = settings_of(result)
    fleet = {row["vehicle"]: float(row["capacity"]) for row in rows(result / "inputs/fleet.csv")}
    load: dict[tuple[str, str], float] = {}
    for row in rows(result / "itineraries.csv"):
        stations = row["stations"].split()
        for leg in itertools.pairwise(stations):
            load[leg] = load.get(leg, 0.0) + float(row["volume"])
    for row in rows(result / "links.csv"):
        offered = settings["max_load_factor"] * sum(
            int(row[f"frequency_{name}"] or 0) * capacity for name, capacity in fleet.items()
        )
        for leg in ((row["from"], row["to"]), (row["to"], row["from"])):
            assert load.pop(leg, 0.0) <= offered * (1 + 1e-6)
    assert load == {}
