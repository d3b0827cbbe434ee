"""The question: frozen data as the planner gave it, in the units of the input columns.

Fields are named after the input columns and settings (see :mod:`hubdesign.schema` for unit and meaning);
None stands for "not given". :mod:`hubdesign.network` turns a Problem into arrays with every default resolved.
"""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass, field
from typing import Any, Literal, Self

Structure = Literal["point-to-point", "hub-and-spoke", "mixed", "current"]
Goal = Literal["least-cost", "most-profit", "most-volume"]

#: What an objective counts: cost is minimised, profit and volume are maximised.
Phase = Literal["cost", "profit", "volume"]

_PHASE_OF_GOAL: dict[Goal, Phase] = {
    "least-cost": "cost",
    "most-profit": "profit",
    "most-volume": "volume",
}

#: Stands for "unlimited" in `Settings.max_transfers`.
UNLIMITED = -1


@dataclass(frozen=True, slots=True)
class Station:
    """A row of stations.csv."""

    station: str
    name: str = ""
    lat: float | None = None
    lon: float | None = None
    may_be_hub: bool = False
    must_be_hub: bool = False
    hub_fixed_cost: float = 0.0
    hub_setup_cost: float = 0.0
    hub_capacity: float | None = None
    collection_capacity: float | None = None
    transfer_cost: float = 0.0
    transfer_minutes: float | None = None
    departure_fee: float = 0.0
    volume_fee: float = 0.0
    min_departures: float | None = None
    max_departures: float | None = None
    max_links: int | None = None
    modes: tuple[str, ...] | None = None
    current_hub: bool = False


@dataclass(frozen=True, slots=True)
class Demand:
    """A row of demand.csv."""

    origin: str
    destination: str
    volume: float
    revenue: float | None = None
    revenue_kept_per_transfer: float | None = None
    unserved_cost: float | None = None
    min_share: float = 0.0
    max_hours: float | None = None


@dataclass(frozen=True, slots=True)
class Vehicle:
    """A row of fleet.csv."""

    vehicle: str
    capacity: float
    speed_kmh: float
    mode: str = "air"
    range_km: float | None = None
    fixed_minutes: float = 0.0
    turn_minutes: float = 0.0
    cost_per_hour: float = 0.0
    cost_per_departure: float = 0.0
    cost_per_km: float = 0.0
    available: int | None = None
    owned: int = 0
    hours_per_vehicle: float | None = None
    cost_per_vehicle: float = 0.0
    purchase_cost: float = 0.0
    fuel_kg_per_km: float = 0.0
    fuel_kg_per_departure: float = 0.0
    co2_per_fuel_kg: float | None = None


@dataclass(frozen=True, slots=True)
class ListedLink:
    """A row of links.csv; `from_` and `to` are the columns from and to."""

    from_: str
    to: str
    mode: str = "air"
    direction: Literal["both", "one-way"] = "both"
    distance_km: float | None = None
    fixed_cost: float | None = None
    setup_cost: float = 0.0
    unit_cost: float | None = None
    capacity: float | None = None
    decision: Literal["may", "must", "never"] = "may"
    min_frequency: float | None = None
    max_frequency: float | None = None
    vehicles: tuple[str, ...] | None = None


@dataclass(frozen=True, slots=True)
class CurrentLink:
    """A row of current.csv; `vehicle` and `frequency` are None without a fleet."""

    from_: str
    to: str
    vehicle: str | None = None
    frequency: int | None = None


@dataclass(frozen=True, slots=True)
class Settings:
    """settings.toml, one field a setting; `mode_distance_factor` holds the [mode.NAME] sections."""

    title: str = ""
    currency: str = "money"
    volume_unit: str = "units"
    period: str = "period"
    fill_coordinates: bool = False
    method: Literal["geodesic", "great-circle"] = "geodesic"
    uplift_percent: float = 0.0
    structure: Structure = "mixed"
    allocation: Literal["multiple", "single"] = "multiple"
    hubs: int | None = None
    hubs_min: int | None = None
    hubs_max: int | None = None
    max_transfers: int | None = None
    max_circuity: float | None = None
    max_hours: float | None = None
    transfer_minutes: float = 0.0
    links: Literal["all", "listed"] = "all"
    local_volume: Literal["refuse", "via-hub"] = "refuse"
    min_frequency: float | None = None
    max_frequency: float | None = None
    max_load_factor: float = 1.0
    unit_cost_per_km: float = 0.0
    link_fixed_cost: float = 0.0
    link_fixed_cost_per_km: float = 0.0
    collection_factor: float = 1.0
    transfer_factor: float = 1.0
    distribution_factor: float = 1.0
    unserved_cost: float = 0.0
    revenue_per_unit: float = 0.0
    revenue_per_km: float = 0.0
    revenue_kept_per_transfer: float = 1.0
    co2_price_per_tonne: float = 0.0
    goal: Goal = "least-cost"
    unserved: Literal["forbidden", "allowed"] | None = None
    cost_limit: float | None = None
    investment_limit: float | None = None
    co2_limit_tonnes: float | None = None
    time_limit_s: float = 300.0
    gap: float = 0.01
    seed: int = 1
    threads: int | None = None
    mode_distance_factor: tuple[tuple[str, float], ...] = ()

    def replace(self, **changes: Any) -> Self:
        """Return a copy with `changes`."""
        return dataclasses.replace(self, **changes)

    @property
    def unserved_allowed(self) -> bool:
        """Whether demand may be left unserved; the goal decides where the setting is silent."""
        if self.unserved is None:
            return self.goal != "least-cost"
        return self.unserved == "allowed"

    @property
    def objective_phase(self) -> Phase:
        """What the objective of a design counts."""
        return _PHASE_OF_GOAL[self.goal]

    @property
    def transfers_at_most(self) -> int:
        """The most transfers of an itinerary, or `UNLIMITED`; 0 for point-to-point."""
        if self.structure == "point-to-point":
            return 0
        if self.max_transfers is not None:
            return self.max_transfers
        return 2 if self.structure == "hub-and-spoke" or self.single_allocation else 1

    @property
    def single_allocation(self) -> bool:
        """Whether single allocation is in force (point-to-point and today's network know none)."""
        return self.allocation == "single" and self.structure in ("hub-and-spoke", "mixed")

    @property
    def hub_count(self) -> tuple[int, int | None]:
        """Fewest and most hubs; (0, 0) for point-to-point, no count for today's network."""
        if self.structure == "point-to-point":
            return 0, 0
        if self.structure == "current":
            return 0, None
        if self.hubs is not None:
            return self.hubs, self.hubs
        return self.hubs_min or 0, self.hubs_max


@dataclass(frozen=True, slots=True)
class Problem:
    """The whole question. An empty `vehicles` means there is no fleet."""

    stations: tuple[Station, ...]
    demands: tuple[Demand, ...]
    vehicles: tuple[Vehicle, ...] = ()
    links: tuple[ListedLink, ...] = ()
    current: tuple[CurrentLink, ...] = ()
    settings: Settings = field(default_factory=Settings)

    def replace(self, **changes: Any) -> Self:
        """Return a copy with `changes`."""
        return dataclasses.replace(self, **changes)

    def with_settings(self, **changes: Any) -> Self:
        """Return a copy with changed settings."""
        return dataclasses.replace(self, settings=self.settings.replace(**changes))

    @property
    def has_fleet(self) -> bool:
        """Whether there are frequencies."""
        return bool(self.vehicles)
