"""Lines are true, cut and boxed as RFC 7946 asks; deviations are measured apart from the code."""

import itertools
import math

import numpy as np
import pytest
import shapely
from geographiclib.geodesic import Geodesic
from hypothesis import example, given, settings
from hypothesis import strategies as st

from hubdesign.exports.lines import _cut_at_antimeridian, enclose_boxes, trace_line

EARTH_M = 6371008.8

# lat1, lon1, lat2, lon2
FIJI = [
    (-17.755, 177.443, -16.691, -179.877),
    (-18.043, 178.559, -13.285, -176.2),
    (-18.0, -179.0, 52.0, 179.5),
]
NEAR_ANTIPODAL = [(10.0, 20.0, -9.7, -160.4), (0.0, 0.0, 0.5, 179.5), (-41.3, 174.8, 40.4, -3.7)]
HIGH = [
    (61.2, -149.9, 60.3, 25.0),
    (78.2, 15.6, 74.7, -95.0),
    (85.0, -170.0, 85.0, 100.0),
    (-77.8, 166.7, -75.1, -20),
]
MERIDIONAL = [(-60.0, 25.0, 70.0, 25.0), (5.0, 180.0, 25.0, -180.0), (12.0, -33.3, 13.0, -33.3)]
EQUATORIAL = [(0.0, -20.0, 0.0, 100.0), (0.0, 170.0, 0.0, -170.0)]
AT_THE_LINE = [
    (10.0, 180.0, 12.0, -179.0),
    (10.0, -180.0, 12.0, 179.0),
    (10.0, 179.0, 12.0, -180.0),
    (0, -179, 1, 180),
]
HARD = FIJI + NEAR_ANTIPODAL + HIGH + MERIDIONAL + EQUATORIAL + AT_THE_LINE

latitudes = st.floats(-90, 90)
longitudes = st.floats(-180, 180)


def positions(line):
    return [position for part in line.parts for position in part]


def geodesic_deviation_m(lat1, lon1, lat2, lon2, line):
    """Return the largest distance from the middles and quarters of the drawn segments to the geodesic, m.

    The foot of the perpendicular is found by Newton steps along an InverseLine that knows nothing of the
    drawn vertices.
    """
    truth = Geodesic.WGS84.InverseLine(lat1, lon1, lat2, lon2)
    worst = 0.0
    for part in line.parts:
        for (lon_a, lat_a), (lon_b, lat_b) in itertools.pairwise(part):
            for t in (0.5, 0.25):
                lat, lon = lat_a + t * (lat_b - lat_a), lon_a + t * (lon_b - lon_a)
                if abs(lat) > 85.0:
                    continue
                s = Geodesic.WGS84.Inverse(lat1, lon1, lat, lon)["s12"]
                for _ in range(3):
                    on = truth.Position(s)
                    gap = Geodesic.WGS84.Inverse(on["lat2"], on["lon2"], lat, lon)
                    s += gap["s12"] * math.cos(math.radians(gap["azi1"] - on["azi2"]))
                    s = min(max(s, 0.0), truth.s13)
                on = truth.Position(s)
                worst = max(worst, Geodesic.WGS84.Inverse(on["lat2"], on["lon2"], lat, lon)["s12"])
    return worst


def unit(lat, lon):
    phi, lam = math.radians(lat), math.radians(lon)
    return (math.cos(phi) * math.cos(lam), math.cos(phi) * math.sin(lam), math.sin(phi))


def great_circle_deviation_m(lat1, lon1, lat2, lon2, line):
    """Return the largest distance of the drawn segments to the plane of the great circle, m."""
    p, q = unit(lat1, lon1), unit(lat2, lon2)
    normal = (p[1] * q[2] - p[2] * q[1], p[2] * q[0] - p[0] * q[2], p[0] * q[1] - p[1] * q[0])
    size = math.hypot(*normal)
    worst = 0.0
    for part in line.parts:
        for (lon_a, lat_a), (lon_b, lat_b) in itertools.pairwise(part):
            for t in (0.25, 0.5, 0.75):
                lat, lon = lat_a + t * (lat_b - lat_a), lon_a + t * (lon_b - lon_a)
                if abs(lat) <= 85.0:
                    off = sum(a * b for a, b in zip(normal, unit(lat, lon))) / size
                    worst = max(worst, EARTH_M * abs(math.asin(off)))
    return worst


def same_place(position, lat, lon):
    """Whether `position` is (lat, lon) to 6 decimals; -180 and 180 are one meridian."""
    step = abs(position[0] - round(lon, 6))
    return position[1] == round(lat, 6) and step in (0.0, 360.0)


def check_shape(lat1, lon1, lat2, lon2, line):
    assert same_place(line.parts[0][0], lat1, lon1)
    assert same_place(line.parts[-1][-1], lat2, lon2)
    for part in line.parts:
        assert len(part) >= 2
        assert all(a != b for a, b in itertools.pairwise(part)), "a repeated position"
        assert all(abs(b[0] - a[0]) <= 180.0 for a, b in itertools.pairwise(part))
        assert all(-180.0 <= lon <= 180.0 and -90.0 <= lat <= 90.0 for lon, lat in part)
        assert all(round(value, 6) == value for position in part for value in position)
    for before, after in zip(line.parts, line.parts[1:]):
        (lon_a, lat_a), (lon_b, lat_b) = before[-1], after[0]
        if abs(lat_a) == 90.0:
            assert lat_b == lat_a, "the parts do not meet at the pole"
        else:
            assert (abs(lon_a), lat_a, lon_a + lon_b) == (180.0, lat_b, 0.0), "the parts do not meet at 180"
    west, south, east, north = line.bbox
    for lon, lat in positions(line):
        assert south <= lat <= north
        assert west <= lon <= east if west <= east else (lon >= west or lon <= east)


@pytest.mark.parametrize("ends", HARD)
@pytest.mark.parametrize("method", ["geodesic", "great-circle"])
def test_hard_lines_keep_their_ends_their_side_and_their_course(method, ends):
    line = trace_line(method, *ends)
    check_shape(*ends, line)
    measure = geodesic_deviation_m if method == "geodesic" else great_circle_deviation_m
    if method == "geodesic" or ends[1] != ends[3]:
        assert measure(*ends, line) <= 50.0


@settings(max_examples=60, deadline=None, derandomize=True)
@given(latitudes, longitudes, latitudes, longitudes)
@example(90.0, 30.0, 10.0, -100.0)
@example(90.0, 170.0, 50.0, -100.0)
@example(-90.0, 0.0, 90.0, 120.0)
@example(0.0, 0.0, 89.99999999999999, 91.0)
@example(89.9999, 0.0, 89.9999, 180.0)
@example(89.9999999, 10.0, 89.9999999, -170.0)
@example(0.0, 179.9999999, 1.0, -179.0)
@example(0.0, -179.9999999, 0.0, 179.9999999)
def test_any_line_has_the_right_shape(lat1, lon1, lat2, lon2):
    line = trace_line("geodesic", lat1, lon1, lat2, lon2)
    if line is None:
        assert Geodesic.WGS84.Inverse(lat1, lon1, lat2, lon2)["s12"] < 0.3
    else:
        check_shape(lat1, lon1, lat2, lon2, line)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(st.floats(-85, 85), longitudes, st.floats(-85, 85), longitudes)
def test_any_geodesic_is_drawn_within_50_m(lat1, lon1, lat2, lon2):
    line = trace_line("geodesic", lat1, lon1, lat2, lon2)
    if line is not None:
        assert geodesic_deviation_m(lat1, lon1, lat2, lon2, line) <= 50.0


@settings(max_examples=150, deadline=None, derandomize=True)
@given(st.floats(-85, 85), longitudes, st.floats(-85, 85), longitudes)
def test_any_great_circle_is_drawn_within_50_m(lat1, lon1, lat2, lon2):
    line = trace_line("great-circle", lat1, lon1, lat2, lon2)
    if line is not None:
        check_shape(lat1, lon1, lat2, lon2, line)
        apart = math.hypot(*(a - b for a, b in zip(unit(lat1, lon1), unit(lat2, lon2))))
        if 1e-6 < apart < 2.0 - 1e-9:
            assert great_circle_deviation_m(lat1, lon1, lat2, lon2, line) <= 50.0


def test_the_measure_sees_a_line_that_is_too_coarse():
    # Otherwise the tests above could not fail: two positions alone are hundreds of kilometres off.
    line = trace_line("geodesic", 50.0, -100.0, 55.0, 20.0)
    coarse = type(line)((positions(line)[:: len(positions(line)) - 1],), line.bbox)
    assert geodesic_deviation_m(50.0, -100.0, 55.0, 20.0, coarse) > 100_000.0
    thinned = type(line)((positions(line)[::4],), line.bbox)
    assert geodesic_deviation_m(50.0, -100.0, 55.0, 20.0, thinned) > 50.0


def test_cutting_gives_the_example_of_rfc_7946_section_3_1_9():
    # "a line extending from 45 degrees N, 170 degrees E across the antimeridian to 45 degrees N, 170 W"
    assert _cut_at_antimeridian([(170.0, 45.0), (190.0, 45.0)]) == [
        ((170.0, 45.0), (180.0, 45.0)),
        ((-180.0, 45.0), (-170.0, 45.0)),
    ]


def test_cutting_westwards_and_at_a_vertex_leaves_no_empty_part():
    assert _cut_at_antimeridian([(-170.0, 45.0), (-180.0, 46.0), (-190.0, 47.0)]) == [
        ((-170.0, 45.0), (-180.0, 46.0)),
        ((180.0, 46.0), (170.0, 47.0)),
    ]
    assert _cut_at_antimeridian([(180.0, 1.0), (190.0, 2.0)]) == [((-180.0, 1.0), (-170.0, 2.0))]
    assert _cut_at_antimeridian([(170.0, 1.0), (180.0, 2.0)]) == [((170.0, 1.0), (180.0, 2.0))]


@pytest.mark.parametrize("ends", FIJI + [(61.2, 149.9, 45.0, -120.0), (-33.9, 151.2, -12.0, -77.1)])
def test_the_crossing_is_where_another_library_finds_it(ends):
    antimeridian = pytest.importorskip("antimeridian", reason="the antimeridian package is not installed")
    line = trace_line("geodesic", *ends)
    assert len(line.parts) == 2
    uncut = shapely.LineString([*line.parts[0][:-1], *line.parts[1][1:]])
    first, second = antimeridian.fix_line_string(uncut, great_circle=True).geoms
    for part, found in ((line.parts[0], first), (line.parts[1], second)):
        # On a steep line 50 m aside are several times as much along the antimeridian.
        assert np.asarray(part) == pytest.approx(np.asarray(found.coords), abs=2e-3)


def test_a_line_over_the_pole_is_split_there_and_boxed_to_it():
    line = trace_line("geodesic", 60.0, 20.0, 65.0, -160.0)
    assert [(part[0], part[-1]) for part in line.parts] == [
        ((20.0, 60.0), (20.0, 90.0)),
        ((-160.0, 90.0), (-160.0, 65.0)),
    ]
    # RFC 7946, 5.3: "a bounding box that contains the North Pole extends from ... to 90 degrees N, 180 E".
    assert line.bbox == (-180.0, 60.0, 180.0, 90.0)
    assert line.as_geometry()["type"] == "MultiLineString"


def test_a_line_that_passes_close_to_the_pole_turns_around_it_in_small_steps():
    line = trace_line("geodesic", 80.0, 0.0, 80.0, 179.99)
    assert len(line.parts) == 1
    steps = [abs(b[0] - a[0]) for a, b in zip(positions(line), positions(line)[1:])]
    assert max(steps) <= 90.0
    assert line.bbox[3] > 89.99


def test_the_box_of_a_line_across_the_antimeridian_has_west_above_east():
    assert trace_line("geodesic", -17.755, 177.443, -16.691, -179.877).bbox == (
        177.443,
        -17.755,
        -179.877,
        -16.691,
    )


def test_one_place_has_no_line():
    assert trace_line("geodesic", 10.0, 20.0, 10.0, 20.0) is None
    assert trace_line("great-circle", 5.0, 180.0, 5.0, -180.0) is None


def test_boxes_add_up_to_the_smallest_one_as_in_rfc_7946_section_5_2():
    # "a set of point features within the Fiji archipelago": [177.0, -20.0, -178.0, -16.0]
    fiji = [(177.0, -20.0, 177.0, -20.0), (-178.0, -16.0, -178.0, -16.0)]
    assert enclose_boxes(fiji) == (177.0, -20.0, -178.0, -16.0)
    assert enclose_boxes([(10.0, 1.0, 20.0, 2.0), (-30.0, 0.0, -5.0, 1.0)]) == (-30.0, 0.0, 20.0, 2.0)
    assert enclose_boxes([(170.0, 0.0, -170.0, 1.0), (160.0, 0.0, 165.0, 1.0)]) == (160.0, 0.0, -170.0, 1.0)
    assert enclose_boxes([(-180.0, 60.0, 180.0, 90.0), (3.0, 50.0, 4.0, 51.0)]) == (-180.0, 50.0, 180.0, 90.0)
    assert enclose_boxes([]) is None


@settings(max_examples=200, deadline=None, derandomize=True)
@given(st.lists(st.tuples(longitudes, longitudes), min_size=1, max_size=6))
def test_the_common_box_holds_every_box(spans):
    west, _, east, _ = enclose_boxes([(a, 0.0, b, 1.0) for a, b in spans])
    width = east - west if east >= west else east - west + 360.0
    for a, b in spans:
        for lon in (a, b):
            assert (lon - west) % 360.0 <= width + 1e-9 or (lon - west) % 360.0 >= 360.0 - 1e-9
