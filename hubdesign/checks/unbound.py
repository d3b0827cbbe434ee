"""Settings and columns that are given but cannot matter."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from hubdesign.checks.places import Case
from hubdesign.errors import Fault
from hubdesign.network import Network


def suspect_unbound_settings(case: Case, network: Network) -> Iterator[Fault]:
    """Settings that are written, but change nothing in this case."""
    for names, why in _unbound(case, network):
        for name in names.split():
            if name in case.places.given:
                yield from case.setting(name, f"cannot bind: {why}")


def _unbound(case: Case, network: Network) -> Iterator[tuple[str, str]]:
    """Give the settings and why they cannot bind."""
    problem, settings = case.problem, case.problem.settings
    candidates = sum(row.may_be_hub for row in problem.stations)
    if not candidates and settings.max_transfers not in (None, 0):
        yield "max_transfers", "no station may be a hub, so that nobody transfers"
    if settings.hubs_max is not None and settings.hubs_max >= candidates:
        yield "hubs_max", f"{candidates} stations may be hubs"
    yield from _unbound_money(case, network)
    if not problem.has_fleet and settings.max_load_factor != 1.0:
        yield "max_load_factor", "there is no fleet"
    if settings.local_volume == "via-hub" and not any(
        row.origin == row.destination for row in problem.demands
    ):
        yield "local_volume", "no O-D row has one station as origin and destination"


def _unbound_money(case: Case, network: Network) -> Iterator[tuple[str, str]]:
    problem, settings = case.problem, case.problem.settings
    if not settings.unserved_allowed and settings.unserved_cost:
        yield "unserved_cost", "nothing may be left unserved"
    if network.link_count and not np.any(network.link.unit_cost > 0):
        factors = "collection_factor transfer_factor distribution_factor"
        yield factors, "it multiplies unit costs, and every unit cost is 0"
    if settings.goal == "least-cost":
        yield "revenue_per_unit revenue_per_km revenue_kept_per_transfer", "least-cost counts no revenue"
    once = any(row.hub_setup_cost for row in problem.stations) or any(row.setup_cost for row in problem.links)
    once = once or any(row.purchase_cost for row in problem.vehicles)
    if settings.investment_limit is not None and not once:
        yield "investment_limit", "nothing has a one-off cost (hub_setup_cost, setup_cost, purchase_cost)"
    burns = any(row.fuel_kg_per_km or row.fuel_kg_per_departure for row in problem.vehicles)
    if problem.has_fleet and not burns:
        yield (
            "co2_price_per_tonne co2_limit_tonnes",
            "no vehicle type burns fuel (fuel_kg_per_km, fuel_kg_per_departure)",
        )


def suspect_no_revenue(case: Case, network: Network) -> Iterator[Fault]:
    """most-profit without revenue carries nothing."""
    goal = case.problem.settings.goal
    if goal == "most-profit" and not np.any(network.demand.revenue * network.demand.volume > 0):
        what = "most-profit, but no O-D row brings revenue: nothing would be carried for its own sake"
        yield from case.setting("goal", what, "give revenue, revenue_per_unit or revenue_per_km")


def suspect_departure_fees(case: Case, network: Network) -> Iterator[Fault]:
    """Columns that need a fleet."""
    if case.problem.has_fleet:
        return
    for i, row in enumerate(case.problem.stations):
        if row.departure_fee:
            yield from case.row("stations", i, "departure_fee", "cannot bind: there is no fleet")


def suspect_today_flags(case: Case, network: Network) -> Iterator[Fault]:
    """current_hub without current.csv only waives the setup cost."""
    if case.problem.current:
        return
    for i, row in enumerate(case.problem.stations):
        if row.current_hub and not row.hub_setup_cost:
            what = "yes, but there is no current table and no hub_setup_cost: it changes nothing"
            yield from case.row("stations", i, "current_hub", what)


def suspect_costly_nothing(case: Case, network: Network) -> Iterator[Fault]:
    """A case in which nothing costs anything."""
    settings, problem = case.problem.settings, case.problem
    costs = [network.link.fixed_cost, network.link.unit_cost, network.service.trip_cost]
    costs += [network.station.hub_fixed_cost, network.station.transfer_cost, network.station.departure_fee]
    costs += [network.station.volume_fee, np.array([row.cost_per_vehicle for row in problem.vehicles])]
    if settings.goal != "most-volume" and network.link_count and not any(np.any(c > 0) for c in costs):
        yield from case.table("settings", "nothing costs anything: every design is as good as any other")


SUSPICIONS = (
    suspect_unbound_settings,
    suspect_no_revenue,
    suspect_departure_fees,
    suspect_today_flags,
    suspect_costly_nothing,
)
