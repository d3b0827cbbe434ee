"""links.geojson and stations.geojson against RFC 7946, read back by GDAL through pyogrio."""

from __future__ import annotations

import json
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest
import shapely

from hubdesign.exports.geojson import geojson_text, link_features, station_features, write_maps
from hubdesign.run import Result
from tests.exports.cases import HOSTILE, hand_result, hostile_result, results_of, solved_result

pyogrio = pytest.importorskip("pyogrio", reason="pyogrio is not installed")


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    place = tmp_path_factory.mktemp("maps")
    result = solved_result()
    write_maps(place, result.network, results_of(result))
    return place


def read(path: Path) -> dict[str, Any]:
    return json.loads(path.read_text("utf-8"))  # type: ignore[no-any-return]


def numbers(value: Any) -> list[float]:
    return [value] if not isinstance(value, list) else [x for part in value for x in numbers(part)]


@pytest.mark.parametrize("name", ["links", "stations"])
def test_a_collection_has_a_box_ids_and_no_crs(folder: Path, name: str) -> None:
    told = read(folder / f"{name}.geojson")
    assert set(told) == {"type", "bbox", "features"}
    assert told["type"] == "FeatureCollection"
    ids = [feature["id"] for feature in told["features"]]
    assert len(set(ids)) == len(ids) > 0
    for feature in told["features"]:
        assert set(feature) == {"type", "id", "bbox", "geometry", "properties"}
        for value in numbers(feature["geometry"]["coordinates"]) + feature["bbox"]:
            assert round(value, 6) == value


def test_the_boxes_of_a_network_about_the_antimeridian_are_narrow(folder: Path) -> None:
    # RFC 7946, 5.2: west > east.
    stations = solved_result().problem.stations
    west, south, east, north = read(folder / "links.geojson")["bbox"]
    assert west > 150.0
    assert east < -150.0
    assert south <= min(row.lat for row in stations) + 1e-6  # type: ignore[type-var]
    assert north >= max(row.lat for row in stations) - 1e-6  # type: ignore[type-var]


def test_an_independent_reader_finds_every_end_at_its_station_and_no_long_step(folder: Path) -> None:
    _, _, stations, fields = pyogrio.raw.read(folder / "stations.geojson", columns=["station"])
    places = dict(zip(fields[0], shapely.from_wkb(stations)))
    _, _, lines, ends = pyogrio.raw.read(folder / "links.geojson", columns=["from", "to"])
    crossing = 0
    for line, start, end in zip(shapely.from_wkb(lines), *ends, strict=True):
        parts = list(getattr(line, "geoms", [line]))
        crossing += len(parts) > 1
        assert parts[0].coords[0] == places[start].coords[0]
        assert parts[-1].coords[-1] == places[end].coords[0]
        for part in parts:
            assert all(abs(b[0] - a[0]) < 180.0 for a, b in pairwise(part.coords))
    assert crossing > 0, "the case was meant to cross the antimeridian"


@pytest.mark.parametrize("make", [solved_result, hostile_result, hand_result])
def test_the_properties_are_the_figures_of_the_tables(make: Any) -> None:
    result: Result = make()
    results = results_of(result)
    links = json.loads(geojson_text(link_features(result.problem, results)))["features"]
    stations = json.loads(geojson_text(station_features(results)))["features"]
    assert [feature["properties"] for feature in links] == results.links.records()
    assert [feature["properties"] for feature in stations] == results.stations.records()


def test_hostile_names_read_back_as_they_were(tmp_path: Path) -> None:
    result = hostile_result()
    write_maps(tmp_path, result.network, results_of(result))
    _, _, _, (codes, names) = pyogrio.raw.read(tmp_path / "stations.geojson", columns=["station", "name"])
    assert list(names) == list(HOSTILE[: len(names)])
    assert list(codes[:2]) == ["=1+1", "<b>&"]


def test_a_station_without_coordinates_has_null_geometry_and_so_have_its_links() -> None:
    result = hand_result()
    stations = tuple(
        replace(row, lat=None, lon=None) if row.station == "A" else row for row in result.problem.stations
    )
    problem = result.problem.replace(stations=stations)
    network = replace(result.network, problem=problem)
    network.station.lat[0] = network.station.lon[0] = float("nan")
    results = results_of(replace(result, problem=problem, network=network))
    links, points = link_features(problem, results), station_features(results)
    assert [feature["geometry"] is None for feature in points] == [True, False, False, False]
    assert [feature["geometry"] is None for feature in links] == [True, False]
    assert "bbox" not in points[0]
    assert json.loads(geojson_text(points))["bbox"] == [23.0, 11.0, 50.0, 50.0]
    assert "bbox" not in json.loads(geojson_text(points[:1]))


def test_great_circle_settings_draw_great_circles() -> None:
    result = solved_result()
    drawn = [
        link_features(result.problem.with_settings(method=method), results_of(result))[0]["geometry"]
        for method in ("geodesic", "great-circle")
    ]
    assert drawn[0] != drawn[1]
