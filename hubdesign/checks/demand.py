"""Rules of the demand table."""

from __future__ import annotations

from collections.abc import Iterator

from hubdesign.checks.places import Case
from hubdesign.checks.references import unknown_code
from hubdesign.errors import Fault


def check_demand_stations(case: Case) -> Iterator[Fault]:
    """Origins and destinations are stations."""
    for i, row in enumerate(case.problem.demands):
        for column, code in (("origin", row.origin), ("destination", row.destination)):
            yield from unknown_code(case, "demand", i, column, code, "stations")


def check_demand_repeats(case: Case) -> Iterator[Fault]:
    """An O-D pair stands once per direction."""
    first: dict[tuple[str, str], int] = {}
    for i, row in enumerate(case.problem.demands):
        earlier = first.setdefault((row.origin, row.destination), i)
        if earlier != i:
            what = f"repeats {case.where('demand', earlier)}"
            yield from case.row("demand", i, "origin destination", what, "add their volumes in one row")


def check_self_pairs(case: Case) -> Iterator[Fault]:
    """Origin and destination differ, unless local volume goes via a hub."""
    if case.problem.settings.local_volume == "via-hub":
        return
    for i, row in enumerate(case.problem.demands):
        if row.origin == row.destination:
            what = f"origin and destination are both {row.origin}"
            cure = 'remove the row, or write local_volume = "via-hub" in [network]'
            yield from case.row("demand", i, "destination origin", what, cure)


def check_some_volume(case: Case) -> Iterator[Fault]:
    """There is some volume to carry."""
    demands = case.problem.demands
    if demands and case.sure("demand", "volume") and not any(row.volume > 0 for row in demands):
        yield from case.table("demand", "holds no volume above 0", "there is nothing to design a network for")


def check_demand_hours(case: Case) -> Iterator[Fault]:
    """max_hours needs a fleet: without vehicle types there are no speeds."""
    if not case.no_fleet:
        return
    for i, row in enumerate(case.problem.demands):
        if row.max_hours is not None:
            what = f"{row.max_hours:g} h needs a fleet: without vehicle types there are no speeds"
            yield from case.row("demand", i, "max_hours", what, "add the fleet table, or clear the cell")


CHECKS = (
    check_demand_stations,
    check_demand_repeats,
    check_self_pairs,
    check_some_volume,
    check_demand_hours,
)
