"""The one table of every input column and setting.

Reading, checking, templates and the README's reference are all made from it.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from hubdesign.units import CO2_PER_JET_FUEL_KG

Kind = Literal["code", "codes", "text", "number", "integer", "yesno", "choice"]
Value = str | float | int | bool | None


@dataclass(frozen=True, slots=True)
class Column:
    """A column of an input table.

    Attributes
    ----------
    name, kind, meaning
        As written in the header, how its text is read, what it means.
    unit
        Unit in words; ``money``, ``volume`` and ``period`` stand for what the settings name.
    required
        Whether a blank is a fault.
    default
        Value of a blank where it is not required; None stands for "none" or "from elsewhere".
    default_text
        The default in words where the value alone does not say it.
    low, high
        Smallest and largest allowed value, None for no limit.
    low_open
        Whether `low` itself is excluded.
    choices
        Allowed words of a ``choice``.
    """

    name: str
    kind: Kind
    meaning: str
    unit: str = ""
    required: bool = False
    default: Value = None
    default_text: str = ""
    low: float | None = None
    high: float | None = None
    low_open: bool = False
    choices: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Table:
    """An input table: its file (or sheet) is ``<name>.csv``."""

    name: str
    required: bool
    meaning: str
    columns: tuple[Column, ...]

    def column(self, name: str) -> Column:
        """Return the column called `name`; KeyError where there is none."""
        for column in self.columns:
            if column.name == name:
                return column
        raise KeyError(name)


@dataclass(frozen=True, slots=True)
class Setting:
    """A setting of settings.toml; fields as in :class:`Column`.

    `kind` is also the TOML type: text and choice are strings, yesno a boolean.
    `alternatives` are words allowed instead of a number (``"unlimited"``).
    """

    section: str
    name: str
    kind: Kind
    meaning: str
    unit: str = ""
    default: Value = None
    default_text: str = ""
    low: float | None = None
    high: float | None = None
    low_open: bool = False
    choices: tuple[str, ...] = ()
    alternatives: tuple[str, ...] = ()


def _code(name: str, meaning: str, required: bool = True) -> Column:
    return Column(name, "code", meaning, required=required)


def _amount(
    name: str, unit: str, meaning: str, default: float | None = 0.0, *, default_text: str = ""
) -> Column:
    return Column(name, "number", meaning, unit, default=default, default_text=default_text, low=0.0)


def _limit(name: str, unit: str, meaning: str, *, positive: bool = False) -> Column:
    return Column(name, "number", meaning, unit, default_text="none", low=0.0, low_open=positive)


def _count(name: str, meaning: str, default: int | None = None, unit: str = "") -> Column:
    text = "none" if default is None else ""
    return Column(name, "integer", meaning, unit, default=default, default_text=text, low=0)


def _flag(name: str, meaning: str) -> Column:
    return Column(name, "yesno", meaning, default=False)


STATIONS = Table(
    "stations",
    True,
    "The places that can be served, one a row.",
    (
        _code("station", "code, unique"),
        Column("name", "text", "name for people", default_text="the code"),
        Column(
            "lat",
            "number",
            "latitude, WGS 84; may be blank where links.csv gives every distance that is needed, or where"
            " the code is an IATA code and fill_coordinates = true",
            "degrees",
            low=-90.0,
            high=90.0,
        ),
        Column(
            "lon", "number", "longitude, WGS 84; blank together with lat", "degrees", low=-180.0, high=180.0
        ),
        _flag("may_be_hub", "whether transfers may happen here"),
        _flag("must_be_hub", "whether it is a hub in every design (implies may_be_hub)"),
        _amount("hub_fixed_cost", "money per period", "cost if open as a hub"),
        _amount(
            "hub_setup_cost",
            "money once",
            "one-off cost of opening the hub, not for today's hubs; counts against investment_limit",
        ),
        _limit("hub_capacity", "volume per period", "most volume for which this station is an interior stop"),
        _limit(
            "collection_capacity",
            "volume per period",
            "most volume whose first hub is this one: its own origin volume and local volume included;"
            " nonstops between non-hubs are not",
        ),
        _amount(
            "transfer_cost", "money per unit of volume", "cost of volume for which it is an interior stop"
        ),
        _amount(
            "transfer_minutes",
            "minutes",
            "time an itinerary spends at an interior stop",
            None,
            default_text="settings",
        ),
        _amount("departure_fee", "money per departure", "landing, handling: each departure from here"),
        _amount("volume_fee", "money per unit of volume", "each unit of volume that starts or ends here"),
        _limit("min_departures", "departures per period", "fewest departures from here, all links together"),
        _limit("max_departures", "departures per period", "most departures from here, all links together"),
        _count("max_links", "most open links here (gates, teams)", unit="links"),
        Column("modes", "codes", "modes that can serve it, blank-separated", default_text="all"),
        _flag("current_hub", "whether transfers happen here today"),
    ),
)

DEMAND = Table(
    "demand",
    True,
    "Origin-destination demand, one row per direction (or demand_matrix.csv).",
    (
        _code("origin", "station where the volume starts"),
        _code("destination", "station where it ends"),
        Column("volume", "number", "O-D volume", "volume per period", required=True, low=0.0),
        _amount(
            "revenue",
            "money per unit of volume",
            "revenue for each unit carried",
            None,
            default_text="settings: revenue_per_unit + revenue_per_km x O-D distance",
        ),
        Column(
            "revenue_kept_per_transfer",
            "number",
            "share of revenue kept for each transfer (loss of attraction, discount)",
            "share",
            default_text="settings",
            low=0.0,
            high=1.0,
        ),
        _amount(
            "unserved_cost",
            "money per unit of volume",
            "cost of each unit not carried",
            None,
            default_text="settings",
        ),
        Column(
            "min_share",
            "number",
            "share of the volume that must be carried (public service, contract)",
            "share",
            default=0.0,
            low=0.0,
            high=1.0,
        ),
        Column(
            "max_hours",
            "number",
            "longest itinerary time",
            "hours",
            default_text="settings",
            low=0.0,
            low_open=True,
        ),
    ),
)

FLEET = Table(
    "fleet",
    False,
    "Vehicle types; without it there are no frequencies and links carry at unit costs up to their capacity.",
    (
        _code("vehicle", "vehicle type, unique"),
        Column("mode", "code", "mode it belongs to", default="air"),
        Column(
            "capacity",
            "number",
            "units of volume per departure",
            "volume",
            required=True,
            low=0.0,
            low_open=True,
        ),
        _limit("range_km", "km", "longest link it can serve", positive=True),
        Column(
            "speed_kmh",
            "number",
            "block time = fixed_minutes + distance / speed",
            "km/h",
            required=True,
            low=0.0,
            low_open=True,
        ),
        _amount("fixed_minutes", "minutes", "fixed part of the block time"),
        _amount(
            "turn_minutes", "minutes", "ground time per departure; counts in vehicle hours, not in block time"
        ),
        _amount("cost_per_hour", "money per block hour", "cost of a block hour"),
        _amount("cost_per_departure", "money per departure", "cost of a departure"),
        _amount("cost_per_km", "money per km", "cost of a kilometre"),
        _count("available", "vehicles at most", unit="vehicles"),
        _count("owned", "vehicles already there, at most `available`", 0, unit="vehicles"),
        Column(
            "hours_per_vehicle",
            "number",
            "block + turn hours one vehicle can work; required with available, owned or a vehicle cost",
            "hours per period",
            default_text="none",
            low=0.0,
            low_open=True,
        ),
        _amount(
            "cost_per_vehicle", "money per vehicle and period", "cost of each vehicle used (lease, crew)"
        ),
        _amount(
            "purchase_cost",
            "money once",
            "one-off cost of each vehicle used beyond `owned`; counts against investment_limit",
        ),
        _amount("fuel_kg_per_km", "kg per km", "fuel burnt per kilometre"),
        _amount("fuel_kg_per_departure", "kg per departure", "fuel burnt per departure"),
        _amount(
            "co2_per_fuel_kg",
            "kg CO2 per kg fuel",
            f"emission factor; ICAO's {CO2_PER_JET_FUEL_KG} for jet fuel is the default for air only",
            None,
            default_text=f"{CO2_PER_JET_FUEL_KG} for air",
        ),
    ),
)

LINKS = Table(
    "links",
    False,
    'What is known of links; with links = "listed" only these are candidates.',
    (
        _code("from", "one end (the tail where one-way)"),
        _code("to", "the other end (the head where one-way)"),
        Column("mode", "code", "mode of the link", default="air"),
        Column(
            "direction",
            "choice",
            "both: an unordered pair; one-way: from -> to only",
            default="both",
            choices=("both", "one-way"),
        ),
        Column(
            "distance_km",
            "number",
            "replaces the computed length (no uplift, no factor); also measures circuity and range",
            "km",
            default_text="computed",
            low=0.0,
            low_open=True,
        ),
        _amount(
            "fixed_cost",
            "money per period",
            "cost if operated, once per link; replaces link_fixed_cost + link_fixed_cost_per_km x distance",
            None,
            default_text="settings",
        ),
        _amount(
            "setup_cost",
            "money once",
            "one-off cost if opened and not in current.csv; counts against investment_limit",
        ),
        _amount(
            "unit_cost",
            "money per unit of volume and leg",
            "replaces unit_cost_per_km x distance",
            None,
            default_text="computed",
        ),
        _limit(
            "capacity",
            "volume per period and direction",
            "most volume each way; a fault where there is a fleet",
        ),
        Column(
            "decision",
            "choice",
            "whether it may, must or must never be operated",
            default="may",
            choices=("may", "must", "never"),
        ),
        _limit("min_frequency", "departures each way per period", "fewest departures if operated"),
        _limit("max_frequency", "departures each way per period", "most departures if operated"),
        Column("vehicles", "codes", "vehicle types allowed, blank-separated", default_text="all of the mode"),
    ),
)

CURRENT = Table(
    "current",
    False,
    "Today's network, evaluated by `compare`.",
    (
        _code("from", "one end (the tail where the link is one-way)"),
        _code("to", "the other end"),
        Column("vehicle", "code", "vehicle type; blank only without a fleet", default_text="none"),
        Column(
            "frequency", "integer", "departures each way", "departures per period", default_text="none", low=0
        ),
    ),
)

TABLES: dict[str, Table] = {table.name: table for table in (STATIONS, DEMAND, FLEET, LINKS, CURRENT)}


def _money_setting(section: str, name: str, unit: str, meaning: str, default: float | None = 0.0) -> Setting:
    return Setting(section, name, "number", meaning, unit, default=default, low=0.0)


SETTINGS: tuple[Setting, ...] = (
    Setting("case", "title", "text", "title of the case", default=""),
    Setting("case", "currency", "text", "unit of money", default="money"),
    Setting("case", "volume_unit", "text", "unit of volume (passengers, parcels, tonnes)", default="units"),
    Setting("case", "period", "text", "the period everything is counted in", default="period"),
    Setting(
        "case",
        "fill_coordinates",
        "yesno",
        "fill blank coordinates from IATA codes (airportsdata)",
        default=False,
    ),
    Setting(
        "distance",
        "method",
        "choice",
        "geodesic on WGS 84, or great circle on a sphere",
        default="geodesic",
        choices=("geodesic", "great-circle"),
    ),
    Setting("distance", "uplift_percent", "number", "added to computed distances", "%", default=0.0, low=0.0),
    Setting(
        "network",
        "structure",
        "choice",
        "point-to-point: every itinerary a nonstop; hub-and-spoke: every open link touches an open hub;"
        " mixed: any link may open",
        default="mixed",
        choices=("point-to-point", "hub-and-spoke", "mixed"),
    ),
    Setting(
        "network",
        "allocation",
        "choice",
        "whether a station may use several hubs or only its own",
        default="multiple",
        choices=("multiple", "single"),
    ),
    Setting("network", "hubs", "integer", "hubs, exactly", "hubs", default_text="none", low=0),
    Setting("network", "hubs_min", "integer", "hubs at least", "hubs", default_text="0", low=0),
    Setting("network", "hubs_max", "integer", "hubs at most", "hubs", default_text="none", low=0),
    Setting(
        "network",
        "max_transfers",
        "integer",
        'most transfers of an itinerary: 0, 1, 2 or "unlimited"; `compare` uses one value throughout',
        "transfers",
        default_text="2 for hub-and-spoke or single allocation, else 1",
        low=0,
        high=2,
        alternatives=("unlimited",),
    ),
    Setting(
        "network",
        "max_circuity",
        "number",
        "longest itinerary as a multiple of the O-D distance",
        "ratio",
        default_text="none",
        low=1.0,
    ),
    Setting(
        "network",
        "max_hours",
        "number",
        "longest itinerary time",
        "hours",
        default_text="none",
        low=0.0,
        low_open=True,
    ),
    Setting(
        "network", "transfer_minutes", "number", "time at an interior stop", "minutes", default=0.0, low=0.0
    ),
    Setting(
        "network",
        "links",
        "choice",
        "listed: only the rows of links.csv are candidates; all: the rest too",
        default="all",
        choices=("all", "listed"),
    ),
    Setting(
        "network",
        "local_volume",
        "choice",
        "what to do with demand from a station to itself",
        default="refuse",
        choices=("refuse", "via-hub"),
    ),
    Setting(
        "network",
        "min_frequency",
        "number",
        "fewest departures each way on an operated link",
        "departures per period",
        default_text="1 with a fleet",
        low=0.0,
    ),
    Setting(
        "network",
        "max_frequency",
        "number",
        "most departures each way on a link",
        "departures per period",
        default_text="none",
        low=0.0,
    ),
    Setting(
        "network",
        "max_load_factor",
        "number",
        "most of the capacity that may be filled",
        "share",
        default=1.0,
        low=0.0,
        high=1.0,
        low_open=True,
    ),
    _money_setting("cost", "unit_cost_per_km", "money per unit of volume and km", "cost of volume on a leg"),
    _money_setting("cost", "link_fixed_cost", "money per period", "cost of operating a link"),
    _money_setting(
        "cost", "link_fixed_cost_per_km", "money per km and period", "cost of operating a link, by length"
    ),
    Setting(
        "cost",
        "collection_factor",
        "number",
        "multiplies unit costs from a non-hub to a hub (chi)",
        "factor",
        default=1.0,
        low=0.0,
    ),
    Setting(
        "cost",
        "transfer_factor",
        "number",
        "multiplies unit costs between hubs (alpha)",
        "factor",
        default=1.0,
        low=0.0,
    ),
    Setting(
        "cost",
        "distribution_factor",
        "number",
        "multiplies unit costs from a hub to a non-hub (delta)",
        "factor",
        default=1.0,
        low=0.0,
    ),
    _money_setting("cost", "unserved_cost", "money per unit of volume", "cost of each unit not carried"),
    _money_setting("cost", "revenue_per_unit", "money per unit of volume", "revenue for each unit carried"),
    _money_setting("cost", "revenue_per_km", "money per unit of volume and km", "revenue by O-D distance"),
    Setting(
        "cost",
        "revenue_kept_per_transfer",
        "number",
        "share of revenue kept for each transfer",
        "share",
        default=1.0,
        low=0.0,
        high=1.0,
    ),
    _money_setting("cost", "co2_price_per_tonne", "money per tonne CO2", "price of emissions"),
    Setting(
        "goal",
        "goal",
        "choice",
        "what the design is best at",
        default="least-cost",
        choices=("least-cost", "most-profit", "most-volume"),
    ),
    Setting(
        "goal",
        "unserved",
        "choice",
        "whether demand may be left unserved",
        default_text="forbidden for least-cost, else allowed",
        choices=("forbidden", "allowed"),
    ),
    Setting(
        "goal",
        "cost_limit",
        "number",
        "most total cost per period",
        "money per period",
        default_text="none",
        low=0.0,
    ),
    Setting(
        "goal", "investment_limit", "number", "most one-off money", "money once", default_text="none", low=0.0
    ),
    Setting(
        "goal",
        "co2_limit_tonnes",
        "number",
        "most CO2 per period",
        "tonnes per period",
        default_text="none",
        low=0.0,
    ),
    Setting(
        "solve",
        "time_limit_s",
        "number",
        "wall time per structure",
        "s",
        default=300.0,
        low=0.0,
        low_open=True,
    ),
    Setting(
        "solve",
        "gap",
        "number",
        "stop when proven within this share",
        "share",
        default=0.01,
        low=0.0,
        high=1.0,
    ),
    Setting("solve", "seed", "integer", "seed of everything random", default=1, low=0, high=2**31 - 1),
    Setting(
        "solve",
        "threads",
        "integer",
        "cores to keep busy",
        "threads",
        default_text="the machine's",
        low=1,
        high=1024,
    ),
)

#: Sections of the form ``[mode.NAME]`` hold these.
MODE_SETTINGS: tuple[Setting, ...] = (
    Setting(
        "mode.NAME",
        "distance_factor",
        "number",
        "turns the geodesic into that mode's length (road detour)",
        "factor",
        default=1.0,
        low=0.0,
        low_open=True,
    ),
)
