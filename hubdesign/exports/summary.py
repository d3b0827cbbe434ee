"""summary.json: what was decided, how far it is proven, what it costs, what it was worked out from.

Its keys and meanings are documented in summary.schema.json beside this module (JSON Schema 2020-12); those
of comparison.json in comparison.schema.json.
"""

from __future__ import annotations

import json
import platform
from collections.abc import Sequence
from dataclasses import dataclass, replace
from importlib import metadata, resources
from pathlib import Path
from typing import Any

import hubdesign
from hubdesign.comparison import Comparison, Entry
from hubdesign.problem import Settings
from hubdesign.results import (
    COST_COLUMNS,
    INVESTMENT_COLUMNS,
    TOTAL_COLUMNS,
    Column,
    Results,
    Table,
    build_table,
    settings_in_force,
)
from hubdesign.run import Result, available_cores

_LIBRARIES = ("geographiclib", "highspy", "numpy", "PySCIPOpt", "scipy")


@dataclass(frozen=True, slots=True)
class Seconds:
    """Where the time went, s: wall time of reading, solving, writing; CPU time of solving."""

    read: float
    solve: float
    solve_cpu: float
    write: float

    def as_fields(self) -> dict[str, float]:
        """Return the time fields of a summary; all other fields are the same from run to run."""
        return {
            "seconds": self.read + self.solve + self.write,
            "read_seconds": self.read,
            "solve_seconds": self.solve,
            "solve_cpu_seconds": self.solve_cpu,
            "write_seconds": self.write,
        }


def design_summary(
    result: Result, results: Results, seconds: Seconds, notes: Sequence[str] = ()
) -> dict[str, Any]:
    """Return the content of summary.json.

    Parameters
    ----------
    result, results
        A design and its tables.
    seconds
        Where the time went.
    notes
        What a planner must know besides the result's own warnings.
    """
    settings = result.problem.settings
    return {
        "kind": "design",
        "title": settings.title,
        **results.answer,
        **seconds.as_fields(),
        **_units(settings),
        "costs": results.costs,
        "investment": results.investment,
        "totals": results.totals,
        "warnings": [*notes, *result.warnings],
        **_provenance(settings),
    }


def comparison_summary(
    comparison: Comparison, results: dict[str, Results], seconds: Seconds
) -> dict[str, Any]:
    """Return the content of comparison.json.

    Parameters
    ----------
    comparison
        All entries.
    results
        Structure -> tables of its design; structures without a design are missing.
    seconds
        Where the time went, all structures together.
    """
    settings = comparison.problem.settings
    return {
        "kind": "comparison",
        "title": settings.title,
        "status": "proven" if comparison.all_proven else "feasible",
        "goal": settings.goal,
        **seconds.as_fields(),
        **_units(settings),
        "entries": [_entry_summary(entry, results.get(entry.structure)) for entry in comparison.entries],
        "differences": [
            {
                "first": row.first,
                "second": row.second,
                "low": row.low,
                "high": row.high,
                "decided": row.decided,
                "better": row.better(comparison.maximise),
            }
            for row in comparison.differences
        ],
        **_provenance(settings),
    }


def _entry_summary(entry: Entry, results: Results | None) -> dict[str, Any]:
    told: dict[str, Any] = {
        "structure": entry.structure,
        "status": entry.status.value,
        "comparable": entry.comparable,
        "note": entry.note,
        "folder": None,
        "interval": None if entry.interval is None else list(entry.interval),
    }
    if results is not None and entry.result is not None:
        answer = {name: results.answer[name] for name in _ANSWER}
        told |= {"folder": entry.structure, **answer, "solve_seconds": entry.result.solve_s}
        told |= {"costs": results.costs, "investment": results.investment, "totals": results.totals}
    return told


_ANSWER = ("objective", "objective_unit", "bound", "gap", "difference", "difference_share", "method")


def tabulate_comparison(comparison: Comparison, results: dict[str, Results]) -> Table:
    """Return the table of comparison.csv: a structure a row, every total a column."""
    columns = [
        Column("structure", "text", "", "what was designed, or today's network"),
        Column("status", "text", "", "proven, feasible, infeasible or unknown"),
        Column("comparable", "text", "", "yes where it answers the same question as the others"),
        Column("note", "text", "", "what must be known about the row"),
        Column("objective", "number", "goal", "of the best plan"),
        Column("bound", "number", "goal", "proven: no plan of the structure is better"),
        Column("gap", "number", "share", "|bound - objective| / |objective|"),
        *(replace(column, name=cost_name(column.name)) for column in COST_COLUMNS),
        *(replace(column, name=investment_name(column.name)) for column in INVESTMENT_COLUMNS),
        *TOTAL_COLUMNS,
    ]
    rows = []
    for entry in comparison.entries:
        told = results.get(entry.structure)
        head = [entry.structure, entry.status.value, "yes" if entry.comparable else "no", entry.note]
        figures: list[Any] = [None] * (len(columns) - len(head))
        if told is not None:
            answer = [told.answer[name] for name in ("objective", "bound", "gap")]
            figures = [*answer, *told.costs.values(), *told.investment.values(), *told.totals.values()]
        rows.append([*head, *figures])
    return build_table("comparison", columns, list(zip(*rows)))


def cost_name(part: str) -> str:
    """Return the name of a part of the cost split where it stands among other figures."""
    return {"total": "total_cost", "revenue": "revenue", "profit": "profit"}.get(part, f"cost_{part}")


def investment_name(part: str) -> str:
    """Return the name of a part of the one-off money where it stands among other figures."""
    return f"{part}_investment"


def read_schema(name: str) -> dict[str, Any]:
    """Return the JSON Schema of "summary" or "comparison"."""
    text = resources.files("hubdesign.exports").joinpath(f"{name}.schema.json").read_text("utf-8")
    schema: dict[str, Any] = json.loads(text)
    return schema


def write_json(path: Path, content: dict[str, Any]) -> None:
    """Write `content` with an indent; no figure may be NaN or infinite."""
    text = json.dumps(content, ensure_ascii=False, allow_nan=False, indent=1)
    path.write_bytes((text + "\n").encode("utf-8"))


def _units(settings: Settings) -> dict[str, Any]:
    return {"units": {"money": settings.currency, "volume": settings.volume_unit, "period": settings.period}}


def _provenance(settings: Settings) -> dict[str, Any]:
    return {
        "settings": settings_in_force(settings),
        "seed": settings.seed,
        "threads": settings.threads or available_cores(),
        "versions": library_versions(),
    }


def library_versions() -> dict[str, str]:
    """Return the versions of this program, of Python and of the libraries that figures come from."""
    versions = {"hubdesign": hubdesign.__version__, "python": platform.python_version()}
    for name in _LIBRARIES:
        try:
            versions[name.lower()] = metadata.version(name)
        except metadata.PackageNotFoundError:
            continue
    return versions


def comparison_seconds(comparison: Comparison, read_s: float, write_s: float) -> Seconds:
    """Return where the time of a comparison went; two structures may have been solved at a time."""
    solved = [entry.result for entry in comparison.entries if entry.result is not None]
    return Seconds(read_s, sum(row.solve_s for row in solved), sum(row.cpu_s for row in solved), write_s)
