"""Blank coordinates filled from IATA codes, where the planner asks for it."""

from __future__ import annotations

import dataclasses
from typing import Any

from hubdesign.checks.findings import Findings
from hubdesign.checks.places import Places
from hubdesign.problem import Problem, Station

_RULE = "fill coordinates"


def fill_coordinates(problem: Problem, places: Places, findings: Findings) -> Problem:
    """Return `problem` with blank coordinates filled where fill_coordinates = true; it says which."""
    blank = [i for i, row in enumerate(problem.stations) if row.lat is None and row.lon is None]
    blank = [i for i in blank if not {("stations", i, "lat"), ("stations", i, "lon")} & places.bad]
    if not problem.settings.fill_coordinates or not blank:
        return problem
    airports = _airports()
    if airports is None:
        findings.fault(
            places.setting("fill_coordinates"),
            f"{len(blank)} stations have no coordinates and the airport table is not installed",
            "pip install 'hubdesign[iata]', or write lat and lon",
            _RULE,
        )
        return problem
    stations = list(problem.stations)
    for i in blank:
        row = stations[i]
        found = airports.get(row.station)
        where = places.at("stations", i, "lat", f"station {row.station}")
        if found is None:
            continue  # a fault only where a length is needed; the rule of lengths says so
        stations[i] = dataclasses.replace(row, lat=float(found["lat"]), lon=float(found["lon"]))
        findings.warn(where, f"filled in: {_said(stations[i], found)}", "", _RULE)
    return problem.replace(stations=tuple(stations))


def _said(row: Station, found: dict[str, Any]) -> str:
    return f"lat {row.lat:g}, lon {row.lon:g} of {found['name']} ({found['city']}, {found['country']})"


def _airports() -> dict[str, dict[str, Any]] | None:
    """Return IATA code -> airport of the airportsdata package (MIT licence), None where it is absent."""
    try:
        import airportsdata
    except ImportError:
        return None
    return {code: dict(airport) for code, airport in airportsdata.load("IATA").items()}
