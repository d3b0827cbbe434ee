"""Reading a case: every fault at once, then one raise; or a report for people."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from pathlib import Path

from hubdesign.checks.findings import Findings, listed
from hubdesign.checks.places import Case
from hubdesign.checks.rules import find_faults
from hubdesign.errors import Fault, InputError
from hubdesign.inputs.coordinates import fill_coordinates
from hubdesign.inputs.records import build_problem
from hubdesign.inputs.source import gather
from hubdesign.problem import Problem


@dataclass(frozen=True)
class CheckReport:
    """What `check` found.

    Attributes
    ----------
    path
        The folder or workbook.
    faults, warnings
        What must be put right; what is suspicious, or was read in a special way.
    counts
        What -> how many: stations, hub candidates, O-D rows, vehicle types, listed links and so on.
    files
        The files that were read.
    problem
        The case; None where there is any fault.
    """

    path: Path
    faults: tuple[Fault, ...]
    warnings: tuple[Fault, ...]
    counts: dict[str, float] = field(default_factory=dict)
    files: tuple[Path, ...] = ()
    problem: Problem | None = None


def read_case(path: str | Path) -> Problem:
    """Read a case from a folder of tables or from one workbook.

    Raises
    ------
    InputError
        The inputs hold faults; all of them are in its `faults`.
    """
    findings = Findings()
    case, _ = _read(Path(path), findings)
    if findings.faults:
        raise InputError(findings.faults)
    return case.problem


def check(path: str | Path) -> CheckReport:
    """Return every fault of a case and what is suspicious; bad input raises nothing."""
    from hubdesign.checks.suspicions import find_suspicions

    findings = Findings()
    case, files = _read(Path(path), findings)
    findings.warnings += find_suspicions(case, clean=not findings.faults)
    return CheckReport(
        path=Path(path),
        faults=tuple(findings.faults),
        warnings=tuple(findings.all_warnings()),
        counts=_counts(case.problem),
        files=tuple(files),
        problem=None if findings.faults else case.problem,
    )


def _read(path: Path, findings: Findings) -> tuple[Case, list[Path]]:
    gathered = gather(path, findings)
    problem, places = build_problem(gathered.tables, gathered.settings)
    if not gathered.tables:
        return Case(problem, places), gathered.files
    problem = fill_coordinates(problem, places, findings)
    case = Case(problem, places)
    findings.faults += find_faults(case)
    return case, gathered.files


def _counts(problem: Problem) -> dict[str, float]:
    return {
        "stations": len(problem.stations),
        "hub candidates": sum(row.may_be_hub for row in problem.stations),
        "O-D rows": len(problem.demands),
        "volume": math.fsum(row.volume for row in problem.demands),
        "vehicle types": len(problem.vehicles),
        "listed links": len(problem.links),
        "links operated today": len({frozenset((row.from_, row.to)) for row in problem.current}),
    }


def listed_faults(faults: tuple[Fault, ...] | list[Fault]) -> list[str]:
    """Return faults as sentences, 20 a rule at most, then how many more."""
    return listed(faults)


def listed_warnings(warnings: tuple[Fault, ...] | list[Fault]) -> list[str]:
    """Return warnings as sentences, 20 a rule at most, then how many more."""
    return listed(warnings)
