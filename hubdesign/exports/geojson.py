"""Links and stations for maps: GeoJSON as RFC 7946 asks (lon/lat, no crs member, 6 decimals, bbox, ids)."""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from hubdesign.exports.lines import DECIMALS, Box, Line, enclose_boxes, trace_line
from hubdesign.network import Network
from hubdesign.problem import Problem
from hubdesign.results import Results


def station_features(results: Results) -> list[dict[str, Any]]:
    """Return a point feature a station; its geometry is null where coordinates are missing (3.2)."""
    features = []
    for record in results.stations.records():
        lon, lat = record["lon"], record["lat"]
        point, box = None, None
        if isinstance(lon, float) and isinstance(lat, float):
            place = (round(lon, DECIMALS) + 0.0, round(lat, DECIMALS) + 0.0)
            point, box = {"type": "Point", "coordinates": list(place)}, (*place, *place)
        features.append(_feature(str(record["station"]), record, point, box))
    return features


def link_features(problem: Problem, results: Results) -> list[dict[str, Any]]:
    """Return a line feature an open link, drawn by the [distance] method."""
    lines = link_lines(problem, results)
    features = []
    for record, line in zip(results.links.records(), lines):
        name = f"{record['from']} {record['to']} {record['mode']}"
        geometry, box = (None, None) if line is None else (line.as_geometry(), line.bbox)
        features.append(_feature(name, record, geometry, box))
    return features


def link_lines(problem: Problem, results: Results) -> list[Line | None]:
    """Return the line of each open link; None where an end has no coordinates or both are one place."""
    places = {row.station: (row.lat, row.lon) for row in problem.stations}
    lines: list[Line | None] = []
    for start, end in zip(results.links.values("from"), results.links.values("to")):
        (lat1, lon1), (lat2, lon2) = places[str(start)], places[str(end)]
        if lat1 is None or lon1 is None or lat2 is None or lon2 is None:
            lines.append(None)
        else:
            lines.append(trace_line(problem.settings.method, lat1, lon1, lat2, lon2))
    return lines


def write_geojson(path: Path, features: Sequence[dict[str, Any]]) -> None:
    """Write a FeatureCollection, a feature a line."""
    path.write_bytes(geojson_text(features).encode("utf-8"))


def geojson_text(features: Sequence[dict[str, Any]]) -> str:
    """Return a FeatureCollection as text; its bbox encloses those of the features (5.2, 5.3)."""
    boxes: list[Box] = [feature["bbox"] for feature in features if "bbox" in feature]
    box = enclose_boxes(boxes)
    head = '{"type":"FeatureCollection",' + ("" if box is None else f'"bbox":{_json(list(box))},')
    body = ",\n".join(_json(feature) for feature in features)
    return f'{head}"features":[\n{body}\n]}}\n'


def write_maps(folder: Path, network: Network, results: Results) -> None:
    """Write links.geojson and stations.geojson."""
    write_geojson(folder / "links.geojson", link_features(network.problem, results))
    write_geojson(folder / "stations.geojson", station_features(results))


def _feature(
    name: str, properties: dict[str, Any], geometry: dict[str, Any] | None, box: Box | None
) -> dict[str, Any]:
    feature: dict[str, Any] = {"type": "Feature", "id": name}
    if box is not None:
        feature["bbox"] = list(box)
    return {**feature, "geometry": geometry, "properties": properties}


def _json(value: object) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
