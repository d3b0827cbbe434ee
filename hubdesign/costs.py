"""Unit and trip costs: pure functions, scalars or numpy arrays alike.

The model, the verification and the tables all price with these, so a figure means the same everywhere.
"""

from __future__ import annotations

from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from hubdesign.units import KG_PER_TONNE, MINUTES_PER_HOUR

Number = TypeVar("Number", float, NDArray[np.float64])


def block_hours(distance_km: Number, speed_kmh: Number, fixed_minutes: Number) -> Number:
    """Return the block time of a leg, h: ``fixed_minutes / 60 + distance / speed``."""
    return fixed_minutes / MINUTES_PER_HOUR + distance_km / speed_kmh


def vehicle_hours(block_h: Number, turn_minutes: Number) -> Number:
    """Return the hours a departure keeps a vehicle busy, h: block time and turn."""
    return block_h + turn_minutes / MINUTES_PER_HOUR


def trip_cost(
    block_h: Number,
    distance_km: Number,
    cost_per_hour: Number,
    cost_per_departure: Number,
    cost_per_km: Number,
) -> Number:
    """Return the operating cost of one departure, money; fees and CO2 are priced apart."""
    return cost_per_departure + cost_per_hour * block_h + cost_per_km * distance_km


def fuel_kg(distance_km: Number, kg_per_km: Number, kg_per_departure: Number) -> Number:
    """Return the fuel of one departure, kg."""
    return kg_per_departure + kg_per_km * distance_km


def co2_cost(co2_kg: Number, price_per_tonne: float) -> Number:
    """Return the price of emissions, money."""
    return co2_kg * (price_per_tonne / KG_PER_TONNE)


def leg_factor(
    tail_is_hub: bool, head_is_hub: bool, collection: float, transfer: float, distribution: float
) -> float:
    """Return the factor on the unit cost of a leg by what its two ends act as.

    Between hubs `transfer` (alpha of the hub-location literature), from non-hub to hub `collection` (chi),
    from hub to non-hub `distribution` (delta), between non-hubs 1 (Campbell 1994, EJOR 72:387-405; Ernst and
    Krishnamoorthy 1996, Location Science 4:139-154).
    """
    if tail_is_hub:
        return transfer if head_is_hub else distribution
    return collection if head_is_hub else 1.0


def kept_revenue(revenue: Number, kept_per_transfer: Number, transfers: Number) -> Number:
    """Return the revenue left after `transfers`, money per unit: each keeps the share `kept_per_transfer`."""
    kept: Number = kept_per_transfer**transfers
    return revenue * kept
