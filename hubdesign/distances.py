"""Lengths on the Earth.

The geodesic on WGS 84 is computed by geographiclib (Karney 2013, Algorithms for geodesics, J. Geodesy
87:43-55); the great circle is the arctangent form of the spherical distance on the mean Earth radius.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from hubdesign.units import EARTH_MEAN_RADIUS_KM

Floats = NDArray[np.float64]
Method = Literal["geodesic", "great-circle"]


def geodesic_km(lat1: float, lon1: float, lat2: float, lon2: float) -> float:
    """Return the length of the shortest geodesic on WGS 84, km; latitudes and longitudes in degrees."""
    # One order of the two ends, so that both directions share a result to the last bit.
    if (lat2, lon2) < (lat1, lon1):
        lat1, lon1, lat2, lon2 = lat2, lon2, lat1, lon1
    return _inverse_km(lat1, lon1, lat2, lon2)


@lru_cache(maxsize=1 << 16)
def _inverse_km(lat1: float, lon1: float, lat2: float, lon2: float) -> float:
    """Solve one inverse problem; 0.1 ms each, and a case asks for every pair several times."""
    from geographiclib.geodesic import Geodesic

    return float(Geodesic.WGS84.Inverse(lat1, lon1, lat2, lon2, Geodesic.DISTANCE)["s12"]) / 1000.0


def great_circle_km(lat1: Floats, lon1: Floats, lat2: Floats, lon2: Floats) -> Floats:
    """Return great-circle distances on the mean sphere, km; element-wise, degrees in.

    The arctangent form keeps full precision for close and for nearly antipodal points.
    """
    phi1, phi2 = np.radians(lat1), np.radians(lat2)
    dlon = np.radians(lon2) - np.radians(lon1)
    sin1, cos1, sin2, cos2 = np.sin(phi1), np.cos(phi1), np.sin(phi2), np.cos(phi2)
    across = np.hypot(cos2 * np.sin(dlon), cos1 * sin2 - sin1 * cos2 * np.cos(dlon))
    along = sin1 * sin2 + cos1 * cos2 * np.cos(dlon)
    return np.asarray(EARTH_MEAN_RADIUS_KM * np.arctan2(across, along), dtype=np.float64)


def distances_km(method: Method, lat1: Floats, lon1: Floats, lat2: Floats, lon2: Floats) -> Floats:
    """Return element-wise distances by `method`, km; NaN where a coordinate is NaN."""
    if method == "great-circle":
        return great_circle_km(lat1, lon1, lat2, lon2)
    known = ~(np.isnan(lat1) | np.isnan(lon1) | np.isnan(lat2) | np.isnan(lon2))
    result = np.full(len(lat1), np.nan)
    quadruples = zip(lat1[known].tolist(), lon1[known].tolist(), lat2[known].tolist(), lon2[known].tolist())
    result[known] = [geodesic_km(*quadruple) for quadruple in quadruples]
    return result


def distance_matrix_km(method: Method, lat: Floats, lon: Floats) -> Floats:
    """Return the symmetric (n, n) matrix of distances, km; NaN where coordinates are missing."""
    n = len(lat)
    i, j = np.triu_indices(n, 1)
    matrix = np.zeros((n, n))
    matrix[i, j] = matrix[j, i] = distances_km(method, lat[i], lon[i], lat[j], lon[j])
    return matrix
