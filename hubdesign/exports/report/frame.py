"""The picture plane of a map: projection, scale, land, graticule, lines as SVG path data."""

from __future__ import annotations

import itertools
import json
import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from hubdesign.exports.lines import Line
from hubdesign.exports.projection import LambertAzimuthal, centre_of

Floats = NDArray[np.float64]

WIDTH = 960.0
_LOWEST, _HIGHEST = 440.0, 720.0
_MARGIN_X, _MARGIN_Y = 84.0, 52.0
_SMALLEST_KM = 20.0  # a network of one place still has a map around it
_LAND_STEP = 2.0  # degrees between vertices of land, so that its edges bend with the projection
_GRATICULE_STEPS = (1.0, 2.0, 5.0, 10.0, 15.0, 30.0)


@dataclass(frozen=True, slots=True)
class Frame:
    """A map's plane: `scale` pixels per km at the centre; `left`, `top` are km of the upper left corner."""

    projection: LambertAzimuthal
    left: float
    top: float
    scale: float
    width: float
    height: float

    def place(self, lat: ArrayLike, lon: ArrayLike) -> tuple[Floats, Floats]:
        """Return pixels from the left and from the top."""
        x, y = self.projection.project(lat, lon)
        return (x - self.left) * self.scale, (self.top - y) * self.scale

    @property
    def scale_bar(self) -> tuple[float, float]:
        """Return a round length, km, and its share of the width: about a sixth."""
        wanted = self.width / self.scale / 6.0
        power = 10.0 ** math.floor(math.log10(wanted))
        length = max(step * power for step in (1.0, 2.0, 5.0) if step * power <= wanted)
        return length, length * self.scale / self.width


def frame_network(lat: ArrayLike, lon: ArrayLike, lines: Iterable[Line | None] = ()) -> Frame | None:
    """Return the frame around stations and lines; None where no station has coordinates."""
    lat, lon = np.asarray(lat, np.float64), np.asarray(lon, np.float64)
    known = np.isfinite(lat) & np.isfinite(lon)
    if not known.any():
        return None
    projection = LambertAzimuthal(*centre_of(lat[known], lon[known]))
    x, y = projection.project(lat[known], lon[known])
    for line in lines:
        for part in () if line is None else line.parts:
            more_x, more_y = projection.project([p[1] for p in part], [p[0] for p in part])
            x, y = np.append(x, more_x), np.append(y, more_y)
    middle_x, middle_y = (x.min() + x.max()) / 2.0, (y.min() + y.max()) / 2.0
    span_x, span_y = max(np.ptp(x), _SMALLEST_KM), max(np.ptp(y), _SMALLEST_KM)
    scale = (WIDTH - 2.0 * _MARGIN_X) / span_x
    height = float(np.clip(span_y * scale + 2.0 * _MARGIN_Y, _LOWEST, _HIGHEST))
    scale = min(scale, (height - 2.0 * _MARGIN_Y) / span_y)
    left, top = middle_x - WIDTH / 2.0 / scale, middle_y + height / 2.0 / scale
    return Frame(projection, float(left), float(top), float(scale), WIDTH, round(height))


def land_path(frame: Frame) -> str:
    """Return the land in the frame as SVG path data.

    Source: Natural Earth, land at 1:110 million (public domain).
    """
    from shapely import MultiPolygon, Polygon, box, make_valid, unary_union

    rim = 2.0 * frame.projection.radius_km * frame.scale
    centre_x, centre_y = frame.place(frame.projection.lat0, frame.projection.lon0)
    angles = np.linspace(0.0, 2.0 * math.pi, 721)
    disc = Polygon(
        np.column_stack([centre_x + 0.999 * rim * np.cos(angles), centre_y + 0.999 * rim * np.sin(angles)])
    )
    # Panning and zooming out show a little more than the frame.
    view = box(-0.6 * frame.width, -0.6 * frame.height, 1.6 * frame.width, 1.6 * frame.height)
    pieces: list[Any] = []
    for outer, *holes in _land():
        shape = _projected(frame, outer, disc)
        for hole in holes:
            shape = shape.difference(_projected(frame, hole, disc))
        # A hair wider, so that parts cut at the antimeridian grow together.
        pieces.append(make_valid(shape).intersection(view).buffer(0.1))
    whole = unary_union(pieces).simplify(0.35)
    parts = whole.geoms if isinstance(whole, MultiPolygon) else [whole]
    polygons = [part for part in parts if isinstance(part, Polygon) and not part.is_empty and part.area > 1.0]
    rings = [ring for part in polygons for ring in (part.exterior, *part.interiors)]
    return "".join(path_data(np.asarray(ring.coords)[:-1], 1) + "z" for ring in rings)


def _projected(frame: Frame, ring: Floats, disc: Any) -> Any:
    """Return a ring in the plane; one about the point opposite to the centre is the outside of its image."""
    from shapely import Point, Polygon, make_valid

    away_lat, away_lon = -frame.projection.lat0, frame.projection.lon0 + 180.0
    away_lon = (away_lon + 180.0) % 360.0 - 180.0
    dense = _densified(ring)
    x, y = frame.place(dense[:, 1], dense[:, 0])
    image = make_valid(Polygon(np.column_stack([x, y])))
    return disc.difference(image) if Polygon(ring).contains(Point(away_lon, away_lat)) else image


def _densified(ring: Floats) -> Floats:
    points = [ring[:1]]
    for a, b in itertools.pairwise(ring):
        count = max(1, math.ceil(float(np.abs(b - a).max()) / _LAND_STEP))
        points.append(a + (b - a) * (np.arange(1, count + 1) / count)[:, None])
    return np.concatenate(points)


@cache
def _land() -> tuple[tuple[Floats, ...], ...]:
    """Return the rings of each polygon of land, lon/lat degrees, the outer one first."""
    text = resources.files("hubdesign.exports.report").joinpath("land.geojson").read_text("utf-8")
    polygons: list[tuple[Floats, ...]] = []
    for feature in json.loads(text)["features"]:
        geometry = feature["geometry"]
        parts = geometry["coordinates"]
        for part in parts if geometry["type"] == "MultiPolygon" else [parts]:
            polygons.append(tuple(np.asarray(ring, np.float64) for ring in part))
    return tuple(polygons)


def graticule_path(frame: Frame) -> tuple[str, float]:
    """Return meridians and parallels as SVG path data, and their distance in degrees."""
    degrees = frame.height / frame.scale / 111.2
    step = next((step for step in _GRATICULE_STEPS if degrees / step <= 6.0), 30.0)
    fine = min(step, 2.0) / 2.0
    span_x = frame.width / frame.scale / 111.2
    reach = min(180.0, math.hypot(degrees, span_x))
    lat0, lon0 = frame.projection.lat0, frame.projection.lon0
    lats = np.arange(
        math.ceil(max(-90.0, lat0 - reach) / step), math.floor(min(90.0, lat0 + reach) / step) + 1
    )
    widest = min(180.0, reach / max(0.05, math.cos(math.radians(min(89.0, abs(lat0) + degrees / 2.0)))))
    lons = np.arange(math.ceil((lon0 - widest) / step), math.floor((lon0 + widest) / step) + 1)
    parallel = np.arange(lon0 - widest, lon0 + widest + fine, fine)
    meridian = np.arange(max(-90.0, lat0 - reach), min(90.0, lat0 + reach) + fine, fine)
    paths = [_within(frame, np.full(parallel.shape, lat * step), parallel) for lat in lats]
    paths += [_within(frame, meridian.clip(-90.0, 90.0), np.full(meridian.shape, lon * step)) for lon in lons]
    return "".join(paths), step


def _within(frame: Frame, lat: Floats, lon: Floats) -> str:
    """Return the runs of a line that lie in the frame or a little around it."""
    x, y = frame.place(lat, lon)
    inside = (x > -0.6 * frame.width) & (x < 1.6 * frame.width)
    inside &= (y > -0.6 * frame.height) & (y < 1.6 * frame.height)
    path, start = "", None
    for place, flag in enumerate([*inside.tolist(), False]):
        if flag and start is None:
            start = place
        elif not flag and start is not None:
            if place - start > 1:
                path += path_data(_thinned(np.column_stack([x[start:place], y[start:place]])), 0)
            start = None
    return path


def line_points(frame: Frame, line: Line, aside: float = 0.0) -> list[Floats]:
    """Return the runs of a line in pixels, shape (n, 2) each, moved `aside` to its right by so many.

    Parts that meet at the antimeridian are one run.
    """
    runs: list[Floats] = []
    for part in line.parts:
        x, y = frame.place([p[1] for p in part], [p[0] for p in part])
        points = np.column_stack([x, y])
        if runs and math.dist(runs[-1][-1], points[0]) < 0.5:
            runs[-1] = np.concatenate([runs[-1], points[1:]])
        else:
            runs.append(points)
    return [_moved(_thinned(run), aside) for run in runs]


def _moved(points: Floats, aside: float) -> Floats:
    """Return a line bulging to its right by `aside` pixels in the middle; its ends stay."""
    if aside == 0.0 or len(points) < 2:
        return points
    way = points[-1] - points[0]
    length = math.hypot(*way)
    if length == 0.0:
        return points
    share = np.linspace(0.0, 1.0, max(len(points), 9))
    steps = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    dense = np.column_stack([np.interp(share * steps[-1], steps, points[:, axis]) for axis in (0, 1)])
    normal = np.array([-way[1], way[0]]) / length
    return np.asarray(dense + np.sin(share * math.pi)[:, None] * aside * normal)


def _thinned(points: Floats) -> Floats:
    from shapely import LineString

    return np.asarray(LineString(points).simplify(0.25).coords) if len(points) > 2 else points


def path_data(points: Floats | Sequence[Sequence[float]], decimals: int) -> str:
    """Return a polyline as SVG path data with relative steps, without drifting from the true places."""
    factor = 10**decimals
    whole = np.rint(np.asarray(points) * factor).astype(np.int64)
    steps = np.diff(whole, axis=0)
    steps = steps[(steps != 0).any(axis=1)]

    def say(value: int) -> str:
        return f"{value / factor:.{decimals}f}".rstrip("0").rstrip(".") if decimals else str(value)

    text = f"M{say(int(whole[0, 0]))} {say(int(whole[0, 1]))}"
    if len(steps):
        text += "l" + " ".join(f"{say(int(dx))} {say(int(dy))}" for dx, dy in steps.tolist())
    return text.replace(" -", "-")
