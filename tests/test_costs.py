"""Unit and trip costs against an example worked by hand."""

from __future__ import annotations

import numpy as np
import pytest

from hubdesign import costs
from hubdesign.network import build_network
from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle

# By hand: 480 km at 400 km/h are 1.2 h, and 18 minutes more make a block time of 1.5 h; with 30 minutes
# of turn the vehicle is busy for 2 h. The trip costs 1.5 h x 1000 + 480 km x 0.5 + 260 = 2000. It burns
# 480 km x 1.25 kg + 150 kg = 750 kg of jet fuel, which emit 750 x 3.16 = 2370 kg CO2: 118.50 at 50 a tonne.
VEHICLE = Vehicle(
    "gull-50",
    capacity=50.0,
    speed_kmh=400.0,
    fixed_minutes=18.0,
    turn_minutes=30.0,
    cost_per_hour=1000.0,
    cost_per_departure=260.0,
    cost_per_km=0.5,
    fuel_kg_per_km=1.25,
    fuel_kg_per_departure=150.0,
)


def test_the_worked_example_by_function() -> None:
    block = costs.block_hours(480.0, 400.0, 18.0)
    assert block == pytest.approx(1.5)
    assert costs.vehicle_hours(block, 30.0) == pytest.approx(2.0)
    assert costs.trip_cost(block, 480.0, 1000.0, 260.0, 0.5) == pytest.approx(2000.0)
    fuel = costs.fuel_kg(480.0, 1.25, 150.0)
    assert fuel == pytest.approx(750.0)
    assert costs.co2_cost(fuel * 3.16, 50.0) == pytest.approx(118.5)


def test_the_worked_example_through_the_network() -> None:
    problem = Problem(
        (Station("A"), Station("B")),
        (Demand("A", "B", 10.0, 90.0),),
        (VEHICLE,),
        (ListedLink("A", "B", distance_km=480.0),),
    )
    service = build_network(problem).service
    assert service.block_h.tolist() == pytest.approx([1.5])
    assert service.vehicle_h.tolist() == pytest.approx([2.0])
    assert service.trip_cost.tolist() == pytest.approx([2000.0])
    assert service.co2_kg.tolist() == pytest.approx([2370.0])


def test_functions_take_arrays_as_they_take_numbers() -> None:
    km = np.array([480.0, 960.0])
    block = costs.block_hours(km, np.array([400.0, 400.0]), np.array([18.0, 18.0]))
    assert block.tolist() == pytest.approx([1.5, 2.7])


@pytest.mark.parametrize(
    ("tail", "head", "factor"),
    [(False, False, 1.0), (False, True, 3.0), (True, True, 0.75), (True, False, 2.0)],
)
def test_factors_by_the_roles_of_a_leg(tail: bool, head: bool, factor: float) -> None:
    # The AP set's chi = 3, alpha = 0.75, delta = 2 (Ernst and Krishnamoorthy 1996).
    assert costs.leg_factor(tail, head, 3.0, 0.75, 2.0) == factor


def test_factors_touch_unit_costs_of_a_leg_only() -> None:
    settings = Settings(
        collection_factor=3.0, transfer_factor=0.75, distribution_factor=2.0, unit_cost_per_km=0.5
    )
    problem = Problem(
        (Station("A"), Station("B")),
        (Demand("A", "B", 10.0),),
        (VEHICLE,),
        (ListedLink("A", "B", distance_km=100.0),),
        settings=settings,
    )
    network = build_network(problem)
    assert [
        network.leg_unit_cost(0, *roles)
        for roles in ((False, False), (False, True), (True, True), (True, False))
    ] == [
        50.0,
        150.0,
        37.5,
        100.0,
    ]
    assert (
        build_network(problem.with_settings(transfer_factor=0.1)).service.trip_cost
        == network.service.trip_cost
    )


def test_each_transfer_keeps_its_share_of_revenue() -> None:
    # By hand: 200 x 0.9 x 0.9 = 162.
    assert costs.kept_revenue(200.0, 0.9, 2.0) == pytest.approx(162.0)
    assert costs.kept_revenue(200.0, 0.9, 0.0) == 200.0
    assert costs.kept_revenue(200.0, 0.0, 0.0) == 200.0
