"""Rules of the fleet table."""

from __future__ import annotations

from collections.abc import Iterator

from hubdesign.checks.places import Case
from hubdesign.errors import Fault


def check_vehicle_codes_unique(case: Case) -> Iterator[Fault]:
    """A vehicle type stands once."""
    first: dict[str, int] = {}
    for i, row in enumerate(case.problem.vehicles):
        earlier = first.setdefault(row.vehicle, i)
        if earlier != i:
            what = f"{row.vehicle} repeats {case.where('fleet', earlier)}"
            yield from case.row("fleet", i, "vehicle", what, "keep one, or give it another code")


def check_owned_vehicles(case: Case) -> Iterator[Fault]:
    """owned is at most available."""
    for i, row in enumerate(case.problem.vehicles):
        if row.available is not None and row.owned > row.available:
            what = f"{row.owned} is above available = {row.available}"
            yield from case.row(
                "fleet", i, "owned available", what, "available counts all, the owned included"
            )


def check_hours_per_vehicle(case: Case) -> Iterator[Fault]:
    """hours_per_vehicle is needed where vehicles are counted."""
    for i, row in enumerate(case.problem.vehicles):
        if row.hours_per_vehicle is not None:
            continue
        counted = ("available", "owned", "cost_per_vehicle", "purchase_cost")
        given = [
            name
            for name in counted
            if (row.available is not None if name == "available" else getattr(row, name))
        ]
        if given:
            what = f"blank, while {' and '.join(given)} count vehicles"
            cure = "give the block + turn hours one vehicle can work per period"
            yield from case.row("fleet", i, f"hours_per_vehicle {' '.join(given)}", what, cure)


def check_co2_factor(case: Case) -> Iterator[Fault]:
    """Fuel of a mode other than air needs its own emission factor."""
    for i, row in enumerate(case.problem.vehicles):
        burns = row.fuel_kg_per_km > 0 or row.fuel_kg_per_departure > 0
        if burns and row.mode != "air" and row.co2_per_fuel_kg is None:
            what = (
                f"blank, while a type of mode {row.mode} burns fuel; the default is jet fuel's, for air only"
            )
            columns = "co2_per_fuel_kg mode fuel_kg_per_km fuel_kg_per_departure"
            yield from case.row("fleet", i, columns, what, "give kg CO2 per kg of its fuel")


CHECKS = (check_vehicle_codes_unique, check_owned_vehicles, check_hours_per_vehicle, check_co2_factor)
