"""The summary: status, objective, bound, cost split and every total of a design."""

from __future__ import annotations

from typing import Any

import numpy as np

from hubdesign.answer import Design, relative_gap
from hubdesign.network import Network
from hubdesign.pricing import Bill
from hubdesign.problem import UNLIMITED, Settings
from hubdesign.results.table import Column
from hubdesign.results.travel import Travel
from hubdesign.results.volume import itinerary_hours, itinerary_lengths
from hubdesign.schema import SETTINGS
from hubdesign.units import KG_PER_TONNE

_MONEY, _ONCE = "money per period", "money once"

COST_COLUMNS = (
    Column("operating", "number", _MONEY, "trips: departures, block hours, kilometres"),
    Column("volume", "number", _MONEY, "unit costs of volume on its legs"),
    Column("transfer", "number", _MONEY, "volume at its interior stops"),
    Column("hub_fixed", "number", _MONEY, "open hubs"),
    Column("link_fixed", "number", _MONEY, "open links"),
    Column("vehicle", "number", _MONEY, "vehicles used"),
    Column("departure_fees", "number", _MONEY, "departures at their stations"),
    Column("volume_fees", "number", _MONEY, "volume where it starts and ends"),
    Column("co2", "number", _MONEY, "emissions"),
    Column("unserved", "number", _MONEY, "volume left unserved"),
    Column("total", "number", _MONEY, "sum of the parts"),
    Column("revenue", "number", _MONEY, "revenue kept after transfers"),
    Column("profit", "number", _MONEY, "revenue less total"),
)
INVESTMENT_COLUMNS = (
    Column("hub_setup", "number", _ONCE, "opening hubs that are none today"),
    Column("link_setup", "number", _ONCE, "opening links that are not operated today"),
    Column("purchase", "number", _ONCE, "vehicles beyond the owned"),
    Column("total", "number", _ONCE, "sum of the three"),
)
TOTAL_COLUMNS = (
    Column("links", "integer", "links", "open links"),
    Column("hubs", "integer", "hubs", "open hubs"),
    Column("volume_demanded", "number", "volume per period", "O-D volume of the inputs"),
    Column("volume_carried", "number", "volume per period", "O-D volume carried, each unit once"),
    Column("volume_unserved", "number", "volume per period", "O-D volume left unserved"),
    Column("share_served", "number", "share", "volume carried / volume demanded"),
    Column("departures", "integer", "departures per period", "both directions of every link"),
    Column("block_hours", "number", "hours per period", "block time of all departures"),
    Column("vehicle_hours", "number", "hours per period", "block and turn time of all departures"),
    Column("vehicles", "integer", "vehicles", "vehicles used"),
    Column("vehicles_purchased", "integer", "vehicles", "used beyond the owned"),
    Column("vehicle_km", "number", "km per period", "distance of all departures"),
    Column("capacity_km", "number", "volume-km per period", "capacity times distance (ASK)"),
    Column("volume_km", "number", "volume-km per period", "volume times the distance travelled (RPK)"),
    Column("load_factor", "number", "share", "volume_km / capacity_km"),
    Column("stage_length_km", "number", "km", "vehicle_km / departures"),
    Column("circuity", "number", "ratio", "distance travelled / O-D distance, weighted by volume"),
    Column("transfers", "number", "volume per period", "volume times its interior stops"),
    Column("transfers_per_unit", "number", "ratio", "transfers / volume carried"),
    Column("nonstop_share", "number", "share", "share of the volume carried that never transfers"),
    Column("itinerary_hours", "number", "hours", "average time of an itinerary, weighted by volume"),
    Column("unit_cost_per_capacity_km", "number", "money per volume-km", "total cost / capacity_km"),
    Column("unit_cost_per_volume_km", "number", "money per volume-km", "total cost / volume_km"),
    Column("unit_cost_per_unit", "number", "money per unit of volume", "total cost / volume carried"),
    Column("yield_per_volume_km", "number", "money per volume-km", "revenue / volume_km"),
    Column("co2_tonnes", "number", "tonnes per period", "emissions"),
    Column("co2_kg_per_volume_km", "number", "kg per volume-km", "emissions / volume_km"),
)


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


def _ratio(part: float, whole: float) -> float | None:
    return float(part) / float(whole) if whole > 0 else None
