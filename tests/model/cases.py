"""Three stations on a line, 100 km apart, for row tests that can be read."""

from __future__ import annotations

from typing import Any

from hubdesign.model.build import build_model
from hubdesign.model.layout import Model
from hubdesign.network import build_network
from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle

LINKS = (
    ListedLink("A", "B", distance_km=100.0),
    ListedLink("B", "C", distance_km=100.0),
    ListedLink("A", "C", distance_km=200.0),
)
TYPE = Vehicle("bus", capacity=40.0, speed_kmh=100.0, hours_per_vehicle=50.0)


def line_problem(
    *,
    hubs: str = "B",
    fleet: bool = False,
    demands: tuple[Demand, ...] = (Demand("A", "C", 10.0), Demand("C", "B", 4.0)),
    links: tuple[ListedLink, ...] = LINKS,
    stations: dict[str, dict[str, Any]] | None = None,
    vehicles: tuple[Vehicle, ...] = (TYPE,),
    **settings: Any,
) -> Problem:
    """Return the case; `stations` overrides columns by code."""
    rows = tuple(Station(code, may_be_hub=code in hubs, **(stations or {}).get(code, {})) for code in "ABC")
    return Problem(
        rows,
        demands,
        vehicles if fleet else (),
        links,
        settings=Settings(**{"links": "listed", "max_transfers": 1, **settings}),
    )


def line_model(**changes: Any) -> Model:
    """Return the model of :func:`line_problem`."""
    return build_model(build_network(line_problem(**changes)))
