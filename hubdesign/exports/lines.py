"""Lines on the Earth as RFC 7946 geometries: densified, cut at the antimeridian, right over a pole.

A GIS draws a straight line in longitude and latitude between two positions, so a geodesic needs positions
in between. On a sphere of radius R a chord of length L in the (lon, lat) plane leaves the great circle by at
most ``L^2 / (8 R) * tan(lat) * sin(az) * (1 + cos(az)^2)`` (second-order expansion of the great circle's
equations ``lat' = cos az, lon' = sin az / cos lat`` about the middle); segments are halved until that is
below the tolerance. Sections of RFC 7946 (Butler et al. 2016): 3.1.9 antimeridian cutting, 5.2 and 5.3
bounding boxes.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache
from typing import Any, Literal, NamedTuple

from hubdesign.units import EARTH_MEAN_RADIUS_KM

Method = Literal["geodesic", "great-circle"]
Position = tuple[float, float]
Box = tuple[float, float, float, float]

#: Positions are written with this many decimals (RFC 7946, 11.2: six are about 10 cm).
DECIMALS = 6

_TOLERANCE_M = 40.0  # promised: 50; the rest is left to rounding and to the ellipsoid
_LONGEST_STEP_M = 500_000.0  # so that a reader who reprojects still has a curve
_CLOSE_M = 50.0  # two vertices this close cannot leave the line by more
_POLE_STEP_M = 1.0  # a quarter turn within this is a pass over the pole itself
_QUARTER_TURN = 90.0


@dataclass(frozen=True, slots=True)
class Line:
    """A line between two stations.

    Attributes
    ----------
    parts
        Runs of (lon, lat), degrees, each of at least two positions; longitudes within -180..180.
    bbox
        west, south, east, north; west > east where the line crosses the antimeridian (RFC 7946, 5.2);
        -180..180 up to the pole where it runs over one (5.3).
    """

    parts: tuple[tuple[Position, ...], ...]
    bbox: Box

    def as_geometry(self) -> dict[str, Any]:
        """Return the GeoJSON geometry: a LineString, or a MultiLineString where the line is cut."""
        runs = [[list(position) for position in part] for part in self.parts]
        if len(runs) == 1:
            return {"type": "LineString", "coordinates": runs[0]}
        return {"type": "MultiLineString", "coordinates": runs}


class _Vertex(NamedTuple):
    """A point of the true line: metres from the start, degrees (longitude unrolled), azimuth."""

    s_m: float
    lat: float
    lon: float
    sin_azimuth: float
    cos_azimuth: float


def trace_line(method: Method, lat1: float, lon1: float, lat2: float, lon2: float) -> Line | None:
    """Return the line of `method` from point 1 to point 2; None where both are the same place.

    The straight (lon, lat) segments stay within 50 m of the true line. The first and last positions are the
    two points to 6 decimals; a point on the antimeridian takes the sign of the side the line runs on.

    Parameters
    ----------
    method
        "geodesic" on WGS 84, or "great-circle" on the mean sphere.
    lat1, lon1, lat2, lon2
        Degrees.
    """
    vertices = _true_line(method, lat1, lon1, lat2, lon2)
    runs = _split_at_poles(vertices)
    over_pole = [lat for run in runs for _, lat in (run[0], run[-1]) if _is_pole(lat)]
    parts = [part for run in runs for part in _cut_at_antimeridian(run)]
    if not parts:
        return None
    return Line(tuple(parts), _bbox(parts, over_pole))


def enclose_boxes(boxes: Iterable[Box]) -> Box | None:
    """Return the smallest box around `boxes` (RFC 7946, 5.2); None where there are none.

    The widest stretch of longitude that no box covers is left out, so a network about the antimeridian has
    a narrow box with west > east.
    """
    known = list(boxes)
    if not known:
        return None
    south, north = min(box[1] for box in known), max(box[3] for box in known)
    spans = sorted((west, east if east >= west else east + 360.0) for west, _, east, _ in known)
    first_west = spans[0][0]
    around = max(end for _, end in spans) - 360.0
    reached, gap, west, east = max(spans[0][1], around), 0.0, -180.0, 180.0
    for start, end in [*spans[1:], (first_west + 360.0, first_west + 360.0)]:
        if start - reached > gap:
            gap, west, east = start - reached, start, reached
        reached = max(reached, end)
    if gap == 0.0:
        return (-180.0, south, 180.0, north)
    return (_wrapped(west), south, _wrapped(east), north)


@cache
def _earth(method: Method) -> Any:
    from geographiclib.geodesic import Geodesic

    # Without flattening the same algorithms trace great circles.
    return Geodesic.WGS84 if method == "geodesic" else Geodesic(EARTH_MEAN_RADIUS_KM * 1000.0, 0.0)


def _true_line(method: Method, lat1: float, lon1: float, lat2: float, lon2: float) -> list[_Vertex]:
    """Return points of the true line, close enough to each other."""
    from geographiclib.geodesic import Geodesic

    wanted = Geodesic.LATITUDE | Geodesic.LONGITUDE | Geodesic.AZIMUTH | Geodesic.LONG_UNROLL
    line = _earth(method).InverseLine(lat1, lon1, lat2, lon2)

    def vertex(s_m: float) -> _Vertex:
        found = line.Position(s_m, wanted)
        azimuth = math.radians(found["azi2"])
        return _Vertex(s_m, found["lat2"], found["lon2"], math.sin(azimuth), math.cos(azimuth))

    done, ahead = [vertex(0.0)], [vertex(line.s13)]
    while ahead:
        if _is_close(done[-1], ahead[-1]):
            done.append(ahead.pop())
        else:
            ahead.append(vertex(0.5 * (done[-1].s_m + ahead[-1].s_m)))
    done[0] = _at(done[0], lat1, lon1)
    done[-1] = _at(done[-1], lat2, lon2)
    return done


def _at(vertex: _Vertex, lat: float, lon: float) -> _Vertex:
    """Return `vertex` at the coordinates it was asked for, in its own turn of the Earth."""
    return vertex._replace(lat=lat, lon=lon + 360.0 * round((vertex.lon - lon) / 360.0))


def _is_close(a: _Vertex, b: _Vertex) -> bool:
    """Whether the straight (lon, lat) segment from `a` to `b` stands for the line between them."""
    step = b.s_m - a.s_m
    if step <= _POLE_STEP_M:
        return True
    if abs(b.lon - a.lon) > _QUARTER_TURN or step > _LONGEST_STEP_M:
        return False
    if step <= _CLOSE_M:
        return True
    return step * step * _bend(a, b) / (8.0 * EARTH_MEAN_RADIUS_KM * 1000.0) <= _TOLERANCE_M


def _bend(a: _Vertex, b: _Vertex) -> float:
    """Return the largest ``tan(lat) sin(az) (1 + cos(az)^2)`` between `a` and `b`, or somewhat more.

    By Clairaut's relation both factors grow with latitude, up to the apex where sin(az) = 1.
    """
    top = a if abs(a.lat) >= abs(b.lat) else b
    cos_top, sine = math.cos(math.radians(top.lat)), abs(top.sin_azimuth)
    if a.cos_azimuth * b.cos_azimuth <= 0.0:
        cos_top, sine = cos_top * sine, 1.0
    cos_top = max(cos_top, 1e-12)
    # s (2 - s^2) grows up to s = sqrt(2/3), where it is 1.0887.
    shape = sine * (2.0 - sine * sine) if sine < math.sqrt(2.0 / 3.0) else 1.0887
    return math.sqrt(max(0.0, 1.0 - cos_top * cos_top)) / cos_top * shape


def _split_at_poles(vertices: list[_Vertex]) -> list[list[Position]]:
    """Return runs of (unrolled lon, lat), split where the line runs over a pole itself.

    A line that starts or ends at a pole is not split: it keeps the longitude its station gives the pole and
    runs along the pole (no way at all on the Earth) to the meridian that it leaves by.
    """
    inner = [vertex for vertex in vertices[1:-1] if not _is_pole(vertex.lat)]
    kept = [vertices[0], *inner, vertices[-1]]
    runs: list[list[Position]] = [[(kept[0].lon, kept[0].lat)]]
    for a, b in itertools.pairwise(kept):
        pole = math.copysign(90.0, a.lat + b.lat)
        if _is_pole(a.lat):
            runs[-1].append((b.lon, pole))
        elif _is_pole(b.lat):
            runs[-1].append((a.lon, pole))
        elif abs(b.lon - a.lon) > _QUARTER_TURN:
            runs[-1].append((a.lon, pole))
            runs.append([(b.lon, pole)])
        runs[-1].append((b.lon, b.lat))
    return runs


def _is_pole(lat: float) -> bool:
    return round(abs(lat), DECIMALS) == 90.0


def _cut_at_antimeridian(run: list[Position]) -> list[tuple[Position, ...]]:
    """Return parts within -180..180, rounded, without repeated positions; none of a single position."""
    lon, lat = run[0]
    turn = 0 if abs(lon) <= 180.0 else math.floor((lon + 180.0) / 360.0)
    parts: list[list[Position]] = [[(lon - 360.0 * turn, lat)]]
    for (lon1, lat1), (lon2, lat2) in itertools.pairwise(run):
        while not -180.0 <= lon2 - 360.0 * turn <= 180.0:
            side = 180.0 if lon2 - 360.0 * turn > 180.0 else -180.0
            ahead = side + 360.0 * turn - lon1
            middle = lat1 + (lat2 - lat1) * (ahead / (lon2 - lon1))
            parts[-1].append((side, middle))
            parts.append([(-side, middle)])
            turn += 1 if side > 0.0 else -1
        parts[-1].append((lon2 - 360.0 * turn, lat2))
    rounded = [_rounded(part) for part in parts]
    return [part for part in rounded if len(part) > 1]


def _rounded(part: list[Position]) -> tuple[Position, ...]:
    """Return positions with 6 decimals and without repeats; a minus zero becomes zero."""
    kept: list[Position] = []
    for lon, lat in part:
        position = (round(lon, DECIMALS) + 0.0, round(lat, DECIMALS) + 0.0)
        if not kept or kept[-1] != position:
            kept.append(position)
    return tuple(kept)


def _bbox(parts: list[tuple[Position, ...]], poles: list[float]) -> Box:
    lats = [lat for part in parts for _, lat in part]
    if poles:
        return (-180.0, min(lats), 180.0, max(lats))
    boxes = []
    for part in parts:
        lons = [lon for lon, _ in part]
        boxes.append((min(lons), 0.0, max(lons), 0.0))
    if len(parts) == 1:
        return (boxes[0][0], min(lats), boxes[0][2], max(lats))
    # The parts meet at the antimeridian: the one that ends at 180 holds the west.
    west = min(box[0] for box in boxes if box[2] == 180.0)
    east = max(box[2] for box in boxes if box[0] == -180.0)
    return (west, min(lats), east, max(lats))


def _wrapped(lon: float) -> float:
    return lon - 360.0 if lon > 180.0 else lon
