"""The summary: status, objective, bound, cost split and every total of a design."""

from __future__ import annotations

from typing import Any

import numpy as np

from hubdesign.design import Design, Status, relative_gap
from hubdesign.network import Network
from hubdesign.pricing import Bill
from hubdesign.problem import UNLIMITED, Settings
from hubdesign.results.travel import Travel
from hubdesign.results.volume import itinerary_hours, itinerary_lengths
from hubdesign.schema import SETTINGS
from hubdesign.units import KG_PER_TONNE


def objective_unit(settings: Settings) -> str:
    """Return the unit of the objective: volume for most-volume, else money."""
    return settings.volume_unit if settings.goal == "most-volume" else settings.currency


def summarise_answer(network: Network, design: Design, bill: Bill) -> dict[str, Any]:
    """Return status, objective, bound and gap, with the difference in the objective's unit and as a share.

    The share is that of the total cost (most-volume: of the volume carried): a share of a small profit says
    little.
    """
    settings = network.problem.settings
    size = bill.volume_carried if settings.goal == "most-volume" else bill.total_cost
    answer: dict[str, Any] = {
        "status": design.status.value,
        "goal": settings.goal,
        "structure": settings.structure,
        "objective": design.objective,
        "objective_unit": objective_unit(settings),
        "bound": design.bound,
        "gap": relative_gap(design.objective, design.bound, size),
        "gap_asked": settings.gap,
        "difference": None,
        "difference_share": None,
        "difference_share_of": "volume carried" if settings.goal == "most-volume" else "total cost",
        "method": design.method,
    }
    if design.objective is not None and design.bound is not None:
        answer["difference"] = abs(design.bound - design.objective)
        answer["difference_share"] = _ratio(answer["difference"], abs(size))
    if design.second_objective is not None:
        answer["cost_with_volume_held"] = {
            "objective": design.second_objective,
            "bound": design.second_bound,
            "gap": relative_gap(design.second_objective, design.second_bound, bill.total_cost),
        }
    return answer


def summarise_costs(bill: Bill) -> dict[str, float]:
    """Return the cost split, money per period: its parts, their sum, revenue and profit."""
    parts = {name: float(getattr(bill, name)) for name in Bill.PARTS}
    return {**parts, "total": bill.total_cost, "revenue": float(bill.revenue), "profit": bill.profit}


def summarise_investment(bill: Bill) -> dict[str, float]:
    """Return one-off money: its parts and their sum."""
    parts = {name: float(getattr(bill, name)) for name in ("hub_setup", "link_setup", "purchase")}
    return {**parts, "total": bill.investment}


def summarise_totals(
    network: Network, design: Design, bill: Bill, travel: Travel
) -> dict[str, float | int | None]:
    """Return every total; None where there is nothing to divide by, or no fleet to count."""
    fleet = network.problem.has_fleet
    volume, carried = float(network.demand.volume.sum()), float(bill.volume_carried)
    lengths, od_km = itinerary_lengths(network, travel), network.demand.od_km[travel.demand]
    known = np.isfinite(od_km) & (od_km > 0.0) & travel.moves
    nonstop = float(travel.volume[travel.stops == 0].sum())

    def if_fleet(value: float) -> float | None:
        return float(value) if fleet else None

    return {
        "links": len(design.links),
        "hubs": len(design.hubs),
        "volume_demanded": volume,
        "volume_carried": carried,
        "volume_unserved": float(bill.volume_unserved),
        "share_served": _ratio(carried, volume),
        "departures": round(bill.departures) if fleet else None,
        "block_hours": if_fleet(bill.block_h),
        "vehicle_hours": if_fleet(float(bill.vehicle_h.sum())),
        "vehicles": int(bill.vehicles_used.sum()) if fleet else None,
        "vehicles_purchased": int(bill.vehicles_purchased.sum()) if fleet else None,
        "vehicle_km": if_fleet(bill.vehicle_km),
        "capacity_km": if_fleet(bill.capacity_km),
        "volume_km": float(bill.volume_km),
        "load_factor": _ratio(bill.volume_km, bill.capacity_km) if fleet else None,
        "stage_length_km": _ratio(bill.vehicle_km, bill.departures) if fleet else None,
        "circuity": _ratio(
            float((travel.volume * lengths)[known].sum()), float((travel.volume * od_km)[known].sum())
        ),
        "transfers": float(bill.transfers),
        "transfers_per_unit": _ratio(bill.transfers, carried),
        "nonstop_share": _ratio(nonstop, carried),
        "itinerary_hours": _ratio(float((travel.volume * itinerary_hours(network, travel)).sum()), carried)
        if fleet
        else None,
        "unit_cost_per_capacity_km": _ratio(bill.total_cost, bill.capacity_km) if fleet else None,
        "unit_cost_per_volume_km": _ratio(bill.total_cost, bill.volume_km),
        "unit_cost_per_unit": _ratio(bill.total_cost, carried),
        "yield_per_volume_km": _ratio(bill.revenue, bill.volume_km),
        "co2_tonnes": if_fleet(bill.co2_kg / KG_PER_TONNE),
        "co2_kg_per_volume_km": _ratio(bill.co2_kg, bill.volume_km) if fleet else None,
    }


def settings_in_force(settings: Settings) -> dict[str, dict[str, Any]]:
    """Return every setting by section as settings.toml would write it, defaults resolved; None: not set."""
    told: dict[str, dict[str, Any]] = {}
    resolved = {
        "unserved": "allowed" if settings.unserved_allowed else "forbidden",
        "max_transfers": settings.transfers_at_most,
    }
    for setting in SETTINGS:
        value = resolved.get(setting.name, getattr(settings, setting.name))
        if setting.name == "max_transfers" and value == UNLIMITED:
            value = "unlimited"
        told.setdefault(setting.section, {})[setting.name] = value
    for mode, factor in settings.mode_distance_factor:
        told[f"mode.{mode}"] = {"distance_factor": factor}
    return told


def is_settled(status: Status) -> bool:
    """Whether a status needs no further search."""
    return status in (Status.PROVEN, Status.INFEASIBLE)


def _ratio(part: float, whole: float) -> float | None:
    return float(part) / float(whole) if whole > 0 else None
