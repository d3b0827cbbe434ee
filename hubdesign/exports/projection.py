"""Lambert azimuthal equal-area projection, centred where the network is.

Formulas: J. P. Snyder, "Map Projections: A Working Manual", US Geological Survey Professional Paper 1395,
1987, chapter 24 (equations 24-17 to 24-20 for the ellipsoid, 22-4, 22-5 and 24-2 for the sphere) with the
authalic latitude of chapter 3 (3-11 to 3-13). Without flattening the first set becomes the second.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]

#: WGS 84: semi-major axis, km, and first eccentricity squared (NGA.STND.0036).
WGS84_A_KM = 6378.137
WGS84_E2 = 0.00669437999014

#: Closer to a pole than this (degrees) the factor D of 24-20 is taken as its limit, 1.
_POLAR = 1e-7


@dataclass(frozen=True)
class LambertAzimuthal:
    """The projection about one centre.

    Attributes
    ----------
    lat0, lon0
        Centre, degrees.
    a_km, e2
        Semi-major axis, km, and eccentricity squared; 0 for a sphere of radius `a_km`.
    """

    lat0: float
    lon0: float
    a_km: float = WGS84_A_KM
    e2: float = WGS84_E2

    @cached_property
    def radius_km(self) -> float:
        """Radius of the sphere of equal area (3-13), km."""
        return self.a_km * math.sqrt(self._q_pole / 2.0)

    def project(self, lat: ArrayLike, lon: ArrayLike) -> tuple[Floats, Floats]:
        """Return x (east of the centre) and y (north of it), km, in the shape of the input.

        Parameters
        ----------
        lat, lon
            Degrees; any turn of the Earth. The point opposite to the centre, which has no image, is put on
            the rim.
        """
        beta, beta0 = self._authalic(np.asarray(lat, dtype=np.float64)), self._beta0
        turn = np.radians(np.asarray(lon, dtype=np.float64) - self.lon0)
        along = math.sin(beta0) * np.sin(beta) + math.cos(beta0) * np.cos(beta) * np.cos(turn)
        b = self.radius_km * np.sqrt(2.0 / np.maximum(1.0 + along, 1e-15))
        across = math.cos(beta0) * np.sin(beta) - math.sin(beta0) * np.cos(beta) * np.cos(turn)
        return b * self._d * np.cos(beta) * np.sin(turn), b / self._d * across

    @cached_property
    def _beta0(self) -> float:
        return float(self._authalic(np.asarray(self.lat0)))

    @cached_property
    def _d(self) -> float:
        if 90.0 - abs(self.lat0) < _POLAR:
            return 1.0
        sine = math.sin(math.radians(self.lat0))
        m = math.cos(math.radians(self.lat0)) / math.sqrt(1.0 - self.e2 * sine * sine)
        return self.a_km * m / (self.radius_km * math.cos(self._beta0))

    @cached_property
    def _q_pole(self) -> float:
        return float(self._q(np.asarray(1.0)))

    def _q(self, sine: Floats) -> Floats:
        if self.e2 == 0.0:
            return 2.0 * sine
        e = math.sqrt(self.e2)
        ratio = np.log((1.0 - e * sine) / (1.0 + e * sine))
        return np.asarray((1.0 - self.e2) * (sine / (1.0 - self.e2 * sine * sine) - ratio / (2.0 * e)))

    def _authalic(self, lat: Floats) -> Floats:
        """Return the authalic latitude, radians."""
        q = self._q(np.sin(np.radians(lat)))
        return np.arcsin(np.clip(q / self._q_pole, -1.0, 1.0))


def centre_of(lat: ArrayLike, lon: ArrayLike) -> tuple[float, float]:
    """Return the mean place of points on the Earth (lat, lon), degrees; of none, or balanced ones, (0, 0).

    The mean of unit vectors knows neither the date line nor the poles.
    """
    phi, lam = np.radians(np.asarray(lat, np.float64)), np.radians(np.asarray(lon, np.float64))
    if not phi.size:
        return 0.0, 0.0
    x = float((np.cos(phi) * np.cos(lam)).mean())
    y = float((np.cos(phi) * np.sin(lam)).mean())
    z = float(np.sin(phi).mean())
    if math.hypot(x, y, z) < 1e-9:
        return 0.0, 0.0
    return math.degrees(math.atan2(z, math.hypot(x, y))), math.degrees(math.atan2(y, x))
