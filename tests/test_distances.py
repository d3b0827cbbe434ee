"""Distances against published worked examples, each named."""

from __future__ import annotations

import math

import numpy as np
import pytest

from hubdesign.distances import distance_matrix_km, distances_km, geodesic_km, great_circle_km
from hubdesign.units import EARTH_MEAN_RADIUS_KM

#: Lines of Karney's test set for geodesics (GeodTest.dat, doi 10.5281/zenodo.32156; the first line) and of
#: the list of test cases that GeographicLib's own tests share; from memory. lat1 lon1 lat2 lon2 s12 (m)
GEODTEST = [
    (36.530042355041, 0.0, -48.164270779097768864, 5.762344694676510456, 9398502.0434687),
    (35.60777, -139.44815, -11.17491, -69.95921, 8935244.5604818305),
    (55.52454, 106.05087, 77.03196, 197.18234, 4105086.1713924406),
]


def _one(lat1: float, lon1: float, lat2: float, lon2: float) -> float:
    arrays = [np.array([value]) for value in (lat1, lon1, lat2, lon2)]
    return float(great_circle_km(*arrays)[0])


@pytest.mark.parametrize(("lat1", "lon1", "lat2", "lon2", "metres"), GEODTEST)
def test_geodesics_of_karneys_test_set(
    lat1: float, lon1: float, lat2: float, lon2: float, metres: float
) -> None:
    assert geodesic_km(lat1, lon1, lat2, lon2) * 1000 == pytest.approx(metres, abs=1e-5)


def test_wellington_to_salamanca_of_the_geographiclib_documentation() -> None:
    # GeographicLib for Python, "Examples": "The distance is 19959679.267 m" (nearly antipodal); from memory.
    assert geodesic_km(-41.32, 174.81, 40.96, -5.50) == pytest.approx(19959.679267, abs=5e-7)


def test_jfk_to_lhr_of_the_geographiclib_documentation() -> None:
    # GeographicLib, class Geodesic, example "Distance from JFK to LHR"; its result 5551.76 km from memory.
    assert geodesic_km(40.6, -73.8, 51.6, -0.5) == pytest.approx(5551.76, abs=0.005)


def test_jfk_to_cdg_of_the_geographiclib_tests() -> None:
    # GeographicLib, test GeodSolve0: 40.6 -73.8 to 49d01'N 2d33'E is 5853226 m to half a metre; from memory.
    assert geodesic_km(40.6, -73.8, 49 + 1 / 60, 2.55) == pytest.approx(5853.226, abs=5e-4)


def test_jfk_to_singapore_of_the_geodsolve_manual() -> None:
    # GeodSolve(1), EXAMPLES: 40:38:23N 073:46:44W to 01:21:33N 103:59:22E, 15347628 m; from memory.
    jfk = (40 + 38 / 60 + 23 / 3600, -(73 + 46 / 60 + 44 / 3600))
    singapore = (1 + 21 / 60 + 33 / 3600, 103 + 59 / 60 + 22 / 3600)
    assert geodesic_km(*jfk, *singapore) == pytest.approx(15347.628, abs=5e-4)


def test_a_pair_on_which_vincentys_iteration_fails() -> None:
    # Karney 2013, J. Geodesy 87:43-55: (0, 0) to (0.5, 179.5), 19936288.579 m; from memory.
    assert geodesic_km(0.0, 0.0, 0.5, 179.5) == pytest.approx(19936.288579, abs=5e-7)


def test_the_quarter_meridian_and_a_degree_of_the_equator() -> None:
    # WGS 84: quarter meridian 10 001 965.729 m; a degree of the equator is pi a / 180, a = 6378.137 km.
    assert geodesic_km(0.0, 30.0, 90.0, 0.0) == pytest.approx(10001.965729, abs=1e-6)
    assert geodesic_km(0.0, 10.0, 0.0, 11.0) == pytest.approx(math.pi * 6378.137 / 180, abs=1e-9)


def test_lax_to_jfk_of_the_aviation_formulary() -> None:
    # E. Williams, Aviation Formulary, worked example: LAX 33d57'N 118d24'W, JFK 40d38'N 73d47'W, the
    # great circle is 0.623585 radians = 2144 nm (a minute of arc is a mile there); from memory.
    angle = _one(33 + 57 / 60, -118.4, 40 + 38 / 60, -(73 + 47 / 60)) / EARTH_MEAN_RADIUS_KM
    assert angle == pytest.approx(0.623585, abs=5e-7)
    assert math.degrees(angle) * 60 == pytest.approx(2144, abs=0.5)


def test_the_great_circle_keeps_precision_close_by_and_far_off() -> None:
    assert _one(50.0, 8.0, 50.0, 8.0) == 0.0
    assert _one(0.0, 0.0, 0.0, 1e-7) == pytest.approx(EARTH_MEAN_RADIUS_KM * math.radians(1e-7), rel=1e-9)
    assert _one(30.0, 20.0, -30.0, -160.0) == pytest.approx(math.pi * EARTH_MEAN_RADIUS_KM, rel=1e-12)
    assert _one(90.0, 12.0, -90.0, 99.0) == pytest.approx(math.pi * EARTH_MEAN_RADIUS_KM, rel=1e-12)


@pytest.mark.parametrize("method", ["geodesic", "great-circle"])
def test_the_antimeridian_is_no_obstacle(method: str) -> None:
    lat1, lon1, lat2, lon2 = (np.array([value]) for value in (0.0, 179.5, 0.0, -179.5))
    assert distances_km(method, lat1, lon1, lat2, lon2)[0] == pytest.approx(111.3, abs=0.2)  # type: ignore[arg-type]


def test_geodesic_and_great_circle_differ_by_half_a_percent_at_most() -> None:
    rng = np.random.default_rng(3)
    lat, lon = rng.uniform(-85, 85, (2, 300)), rng.uniform(-180, 180, (2, 300))
    geodesic = distances_km("geodesic", lat[0], lon[0], lat[1], lon[1])
    sphere = distances_km("great-circle", lat[0], lon[0], lat[1], lon[1])
    # The flattening is 1/298: the sphere errs by up to 0.56 % (common knowledge of navigation).
    assert np.abs(geodesic / sphere - 1).max() < 0.0057
    assert np.abs(geodesic / sphere - 1).max() > 0.001


def test_both_directions_are_equal_to_the_last_bit() -> None:
    rng = np.random.default_rng(4)
    lat, lon = rng.uniform(-90, 90, (2, 200)), rng.uniform(-180, 180, (2, 200))
    there = distances_km("geodesic", lat[0], lon[0], lat[1], lon[1])
    back = distances_km("geodesic", lat[1], lon[1], lat[0], lon[0])
    assert (there == back).all()


def test_a_hundred_stations_have_4950_distances() -> None:
    rng = np.random.default_rng(5)
    lat, lon = rng.uniform(-60, 60, 100), rng.uniform(-180, 180, 100)
    matrix = distance_matrix_km("geodesic", lat, lon)
    i, j = np.triu_indices(100, 1)
    assert len(i) == 4950
    assert (matrix == matrix.T).all()
    assert (np.diag(matrix) == 0).all()
    assert (matrix[i, j] > 0).all()
    for a, b in ((0, 1), (17, 80), (98, 99)):
        assert matrix[a, b] == geodesic_km(lat[a], lon[a], lat[b], lon[b])


def test_blank_coordinates_give_blank_distances() -> None:
    nan = float("nan")
    lat, lon = np.array([1.0, nan, 2.0]), np.array([5.0, 6.0, nan])
    for method in ("geodesic", "great-circle"):
        result = distances_km(method, lat, lon, np.zeros(3), np.zeros(3))  # type: ignore[arg-type]
        assert np.isnan(result).tolist() == [False, True, True]
