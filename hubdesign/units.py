"""Physical and trade constants, with their sources."""

from __future__ import annotations

#: Mean Earth radius R1 = (2a + b) / 3 of WGS 84, km (IUGG; Moritz 2000, Geodetic Reference System 1980).
EARTH_MEAN_RADIUS_KM = 6371.0088

#: kg CO2 per kg of jet fuel: ICAO Carbon Emissions Calculator Methodology (Jet A / A-1).
CO2_PER_JET_FUEL_KG = 3.16

MINUTES_PER_HOUR = 60.0
KG_PER_TONNE = 1000.0

#: Relative tolerance of every recomputed cost.
COST_TOLERANCE = 1e-6

#: Absolute tolerance on shares (0..1) and, relative to a right-hand side, on capacities and limits.
SHARE_TOLERANCE = 1e-6

#: The smallest gap that anybody is promised: float arithmetic and solver tolerances end here.
GAP_FLOOR = 1e-6
