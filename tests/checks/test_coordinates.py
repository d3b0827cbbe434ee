"""Blank coordinates are filled from IATA codes only where asked, and it is said which."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

from hubdesign.inputs import check, read_case
from tests.inputs.broken import write_folder

STATIONS = "station,lat,lon\nLHR,,\nJFK,,\nAAL,50.1,8.2\n"
DEMAND = "origin,destination,volume\nLHR,JFK,5\n"
FILL = "[case]\nfill_coordinates = true\n[cost]\nunit_cost_per_km = 1\n"


def test_iata_codes_are_filled_and_said(tmp_path: Path) -> None:
    pytest.importorskip("airportsdata", reason="the airport table (extra iata) is not installed")
    report = check(write_folder(tmp_path, stations_csv=STATIONS, demand_csv=DEMAND, settings_toml=FILL))
    assert report.problem is not None
    heathrow = report.problem.stations[0]
    # Heathrow's reference point is 51 28 39 N 000 27 41 W (UK AIP, EGLL AD 2.2; from memory).
    assert heathrow.lat == pytest.approx(51.4775, abs=0.02)
    assert heathrow.lon == pytest.approx(-0.4614, abs=0.02)
    filled = [str(warning) for warning in report.warnings if warning.rule == "fill coordinates"]
    assert len(filled) == 2
    assert filled[0].startswith("stations.csv row 2, lat (station LHR): filled in: lat 51.4")


def test_a_code_that_is_no_airport_is_a_fault(tmp_path: Path) -> None:
    pytest.importorskip("airportsdata", reason="the airport table (extra iata) is not installed")
    folder = write_folder(
        tmp_path,
        stations_csv=STATIONS.replace("LHR", "XX1"),
        demand_csv=DEMAND.replace("LHR", "XX1"),
        settings_toml=FILL,
    )
    (fault,) = check(folder).faults
    assert fault.where == "stations.csv row 2, lat (station XX1)"
    assert "XX1 is no IATA code of the airport table" in fault.what


def test_without_the_setting_nothing_is_filled(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, stations_csv=STATIONS, demand_csv=DEMAND)
    assert [fault.rule for fault in check(folder).faults] == ["lengths known"] * 2


def test_without_the_airport_table_the_cure_is_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "airportsdata", None)
    folder = write_folder(tmp_path, stations_csv=STATIONS, demand_csv=DEMAND, settings_toml=FILL)
    faults = [str(fault) for fault in check(folder).faults]
    assert any("pip install 'hubdesign[iata]'" in line for line in faults)


def test_given_coordinates_are_never_replaced(tmp_path: Path) -> None:
    text = "station,lat,lon\nLHR,10,20\nAAL,50.1,8.2\n"
    folder = write_folder(
        tmp_path, stations_csv=text, demand_csv="origin,destination,volume\nLHR,AAL,5\n", settings_toml=FILL
    )
    assert (read_case(folder).stations[0].lat, read_case(folder).stations[0].lon) == (10.0, 20.0)
