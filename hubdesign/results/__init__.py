"""A design as people want it: tables, cost split and totals.

Every figure comes from the arrays of :mod:`hubdesign.network` and the bill of :mod:`hubdesign.pricing`, which
price with :mod:`hubdesign.costs`; nothing is priced a second time here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from hubdesign.answer import Design
from hubdesign.network import Network
from hubdesign.pricing import Bill
from hubdesign.results.operation import (
    STATION_COLUMNS,
    VEHICLE_COLUMNS,
    link_columns,
    tabulate_links,
    tabulate_stations,
    tabulate_vehicles,
)
from hubdesign.results.summary import (
    COST_COLUMNS,
    INVESTMENT_COLUMNS,
    TOTAL_COLUMNS,
    objective_unit,
    settings_in_force,
    summarise_answer,
    summarise_costs,
    summarise_investment,
    summarise_totals,
)
from hubdesign.results.table import Cell, Column, Table, build_table
from hubdesign.results.travel import trace_travel
from hubdesign.results.volume import (
    ITINERARY_COLUMNS,
    PROGRESS_COLUMNS,
    UNSERVED_COLUMNS,
    tabulate_itineraries,
    tabulate_progress,
    tabulate_unserved,
)

__all__ = [
    "COST_COLUMNS",
    "INVESTMENT_COLUMNS",
    "TABLE_COLUMNS",
    "TOTAL_COLUMNS",
    "Cell",
    "Column",
    "Results",
    "Table",
    "build_results",
    "build_table",
    "objective_unit",
    "settings_in_force",
]


#: Columns of every table, for documentation; the links have a frequency column for each vehicle type.
TABLE_COLUMNS: dict[str, tuple[Column, ...]] = {
    "links": link_columns(["<vehicle>"]),
    "stations": STATION_COLUMNS,
    "vehicles": VEHICLE_COLUMNS,
    "itineraries": ITINERARY_COLUMNS,
    "unserved": UNSERVED_COLUMNS,
    "progress": PROGRESS_COLUMNS,
}


@dataclass(frozen=True, slots=True)
class Results:
    """Tables and figures of one design.

    Attributes
    ----------
    links, stations, vehicles, itineraries, unserved, progress
        As the result folder holds them.
    answer
        Status, objective, bound, gap and what surrounds them.
    costs, investment
        The cost split (with total, revenue and profit), and one-off money.
    totals
        Volumes, hours, vehicles, load factor and so on.
    """

    links: Table
    stations: Table
    vehicles: Table
    itineraries: Table
    unserved: Table
    progress: Table
    answer: dict[str, Any]
    costs: dict[str, float]
    investment: dict[str, float]
    totals: dict[str, float | int | None]

    @property
    def tables(self) -> tuple[Table, ...]:
        """All tables, in the order people read them."""
        return (self.links, self.stations, self.vehicles, self.itineraries, self.unserved, self.progress)


def build_results(network: Network, design: Design, bill: Bill) -> Results:
    """Return tables and figures of a design that has a plan.

    Parameters
    ----------
    network, design, bill
        The question as arrays, the answer, and the answer priced (:func:`hubdesign.pricing.price`).
    """
    travel = trace_travel(network, design)
    return Results(
        links=tabulate_links(network, design, bill, travel),
        stations=tabulate_stations(network, design, bill, travel),
        vehicles=tabulate_vehicles(network, design, bill),
        itineraries=tabulate_itineraries(network, design, travel),
        unserved=tabulate_unserved(network, design),
        progress=tabulate_progress(design),
        answer=summarise_answer(network, design, bill),
        costs=summarise_costs(bill),
        investment=summarise_investment(bill),
        totals=summarise_totals(network, design, bill, travel),
    )
