"""Every rule of the inputs, in the order in which faults are listed."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Iterator

from hubdesign.checks import demand, fleet, lengths, links, settings, stations
from hubdesign.checks.places import Case, Places
from hubdesign.errors import Fault
from hubdesign.problem import Problem

Check = Callable[[Case], Iterator[Fault]]

CHECKS: tuple[Check, ...] = (
    *settings.CHECKS,
    *stations.CHECKS,
    *demand.CHECKS,
    *fleet.CHECKS,
    *links.CHECKS,
    *lengths.CHECKS,
)


def rule_name(check: Callable[..., object]) -> str:
    """Return the rule a check stands for: ``check_owned_vehicles`` -> ``owned vehicles``."""
    name: str = getattr(check, "__name__", "rule")
    return name.removeprefix("check_").removeprefix("suspect_").replace("_", " ")


def find_faults(case: Case) -> list[Fault]:
    """Return every fault of the case, by rule."""
    return [dataclasses.replace(fault, rule=rule_name(check)) for check in CHECKS for fault in check(case)]


def check_problem(problem: Problem) -> list[Fault]:
    """Return every fault of a Problem made or changed in Python; places are then the records themselves."""
    return find_faults(Case(problem, Places()))
