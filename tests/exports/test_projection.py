"""The map projection against Snyder's worked examples and against what it promises."""

from __future__ import annotations

import math

import numpy as np
import pytest
from geographiclib.geodesic import Geodesic
from hypothesis import given
from hypothesis import strategies as st

from hubdesign.exports.projection import WGS84_A_KM, LambertAzimuthal, centre_of

# Numerical examples of J. P. Snyder, "Map Projections: A Working Manual", USGS Professional Paper 1395
# (1987), appendix A, Lambert azimuthal equal-area, pages 332-337; the figures are from memory.
EXAMPLES = [
    pytest.param((40.0, -100.0, 3.0, 0.0), (-20.0, 100.0), (-4.2339303, 4.0257775), 5e-8, id="sphere"),
    pytest.param(
        (40.0, -100.0, 6378206.4, 0.00676866),
        (30.0, -110.0),
        (-965932.1, -1056814.9),
        0.05,
        id="oblique-clarke-1866",
    ),
    pytest.param(
        (90.0, -100.0, 6378388.0, 0.00672267),
        (80.0, 5.0),
        (1077459.7, 288704.5),
        0.05,
        id="polar-international",
    ),
]


@pytest.mark.parametrize(("centre", "place", "expected", "tolerance"), EXAMPLES)
def test_snyders_worked_example_is_met(
    centre: tuple[float, float, float, float],
    place: tuple[float, float],
    expected: tuple[float, float],
    tolerance: float,
) -> None:
    x, y = LambertAzimuthal(*centre).project(*place)
    assert float(x) == pytest.approx(expected[0], abs=tolerance)
    assert float(y) == pytest.approx(expected[1], abs=tolerance)


def test_the_south_polar_aspect_is_the_north_polar_one_turned_over() -> None:
    north = LambertAzimuthal(90.0, -100.0).project(80.0, 5.0)
    south = LambertAzimuthal(-90.0, -100.0).project(-80.0, 5.0)
    assert float(south[0]) == pytest.approx(float(north[0]))
    assert float(south[1]) == pytest.approx(-float(north[1]))


@given(
    lat0=st.floats(-90, 90),
    lon0=st.floats(-180, 180),
    lat=st.floats(-85, 85),
    lon=st.floats(-180, 180),
)
def test_areas_are_true_everywhere(lat0: float, lon0: float, lat: float, lon: float) -> None:
    plane = LambertAzimuthal(lat0, lon0)
    away = Geodesic.WGS84.Inverse(lat0, lon0, lat, lon)["a12"]
    if away > 150.0:
        return
    half = 0.05
    corners = [(-half, -half), (-half, half), (half, half), (half, -half)]
    x, y = plane.project([lat + a for a, _ in corners], [lon + b for _, b in corners])
    area = 0.5 * abs(float(np.dot(x, np.roll(y, -1)) - np.dot(y, np.roll(x, -1))))
    cell = Geodesic.WGS84.Polygon()
    for a, b in corners:
        cell.AddPoint(lat + a, lon + b)
    assert area == pytest.approx(abs(cell.Compute()[2]) / 1e6, rel=2e-3)


def test_distances_from_the_centre_are_true_near_it() -> None:
    plane = LambertAzimuthal(-17.0, 179.5)
    for azimuth in range(0, 360, 30):
        place = Geodesic.WGS84.Direct(-17.0, 179.5, azimuth, 200_000.0)
        x, y = plane.project(place["lat2"], place["lon2"])
        assert math.hypot(float(x), float(y)) == pytest.approx(200.0, rel=2e-3)


def test_the_date_line_is_no_seam() -> None:
    plane = LambertAzimuthal(-17.0, 179.0)
    x, y = plane.project([-18.0, -18.0, -18.0], [180.0, -180.0, 540.0])
    assert np.ptp(x) == pytest.approx(0.0, abs=1e-9)
    assert np.ptp(y) == pytest.approx(0.0, abs=1e-9)


def test_the_point_opposite_to_the_centre_lies_on_the_rim() -> None:
    plane = LambertAzimuthal(30.0, 10.0)
    x, y = plane.project(-30.0, -170.0)
    assert np.isfinite([float(x), float(y)]).all()
    assert math.hypot(float(x), float(y)) <= 2.0 * plane.radius_km * 1.01


def test_the_centre_of_a_network_across_the_date_line_lies_on_it() -> None:
    lat, lon = centre_of([0.0, 0.0], [179.0, -179.0])
    assert lat == pytest.approx(0.0, abs=1e-9)
    assert abs(lon) == pytest.approx(180.0)


def test_balanced_points_and_none_have_some_centre() -> None:
    assert centre_of([0.0, 0.0], [0.0, 180.0]) == (0.0, 0.0)
    assert centre_of([], []) == (0.0, 0.0)


def test_without_flattening_the_radius_is_the_spheres() -> None:
    assert LambertAzimuthal(10.0, 20.0, 6371.0, 0.0).radius_km == pytest.approx(6371.0)
    # Radius of the sphere of equal area of WGS 84: 6371.0072 km (NGA.STND.0036; from memory).
    assert LambertAzimuthal(0.0, 0.0).radius_km == pytest.approx(6371.0072, abs=1e-4)
    assert LambertAzimuthal(0.0, 0.0).a_km == WGS84_A_KM
