"""Recompute a written result from its files alone: hashes, every rule, every cost, every figure.

The inputs' copy is read again, the plan is read back from the tables, both are verified without a solver,
and every table and total is made anew and compared with what was written. The bound itself is not
rechecked: that would take the solve again.
"""

from __future__ import annotations

import csv
import json
import math
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from hubdesign.answer import Design, Flow, Frequency, Status
from hubdesign.cells import plain_text
from hubdesign.errors import OutputError
from hubdesign.exports.folder import changed_files, read_manifest, repair
from hubdesign.exports.write import input_copy
from hubdesign.inputs import read_case
from hubdesign.network import Network, build_network
from hubdesign.problem import UNLIMITED, Problem
from hubdesign.results import Results, Table, build_results
from hubdesign.units import COST_TOLERANCE
from hubdesign.verification import verify

#: Figures that tell about the run, not about the plan.
_NOT_RECOMPUTED = ("progress",)


@dataclass(frozen=True, slots=True)
class FolderReport:
    """What a recomputation of a result folder found.

    Attributes
    ----------
    path, kind
        The folder; "design" or "comparison".
    breaches, warnings
        What does not come out; what is broken but allowed (today's network).
    figures
        Number of cells and totals that were recomputed and compared.
    parts
        For a comparison, the report of each structure.
    """

    path: Path
    kind: str
    breaches: tuple[str, ...]
    warnings: tuple[str, ...] = ()
    figures: int = 0
    parts: tuple[FolderReport, ...] = ()


def verify_folder(path: str | Path) -> FolderReport:
    """Return what a recomputation of the result folder `path` finds.

    Raises
    ------
    OutputError
        The folder is no result of this tool, or a file of it cannot be read.
    """
    folder = Path(path)
    repair(folder)
    manifest = read_manifest(folder)
    breaches = [f"{folder / name}: changed or missing since it was written" for name in changed_files(folder)]
    if breaches:
        return FolderReport(folder, manifest.kind, tuple(breaches))
    if manifest.kind == "comparison":
        return _verify_comparison(folder)
    return _verify_design(folder)


def _verify_comparison(folder: Path) -> FolderReport:
    summary = json.loads((folder / "comparison.json").read_text("utf-8"))
    parts = tuple(_verify_design(folder / row["folder"]) for row in summary["entries"] if row["folder"])
    breaches = [breach for part in parts for breach in part.breaches]
    written = {row["structure"]: row for row in _read_rows(folder / "comparison.csv")}
    figures = 0
    for row in summary["entries"]:
        if not row["folder"]:
            continue
        own = json.loads((folder / row["folder"] / "summary.json").read_text("utf-8"))
        for group in ("costs", "investment", "totals"):
            for name, value in own[group].items():
                column = _comparison_column(group, name)
                figures += 1
                if not _same(written[row["structure"]][column], value) or not _same(row[group][name], value):
                    breaches.append(
                        f"{folder}: {row['structure']}, {column} differs from its own summary.json"
                    )
    breaches += _interval_faults(folder, summary)
    warnings = tuple(warning for part in parts for warning in part.warnings)
    figures += sum(part.figures for part in parts)
    return FolderReport(folder, "comparison", tuple(breaches), warnings, figures, parts)


def _comparison_column(group: str, name: str) -> str:
    """Return the column of comparison.csv that holds a figure of a summary."""
    if group == "totals" or name in ("revenue", "profit"):
        return name
    if group == "investment":
        return f"{name}_investment"
    return "total_cost" if name == "total" else f"cost_{name}"


def _interval_faults(folder: Path, summary: dict[str, Any]) -> list[str]:
    """Recompute the interval of each difference from the intervals of its two structures."""
    interval = {row["structure"]: row["interval"] for row in summary["entries"]}
    told = []
    for row in summary["differences"]:
        (a, above_a), (b, above_b) = interval[row["first"]], interval[row["second"]]
        if not (_same(row["low"], a - above_b, abs(a)) and _same(row["high"], above_a - b, abs(a))):
            told.append(
                f"{folder / 'comparison.json'}: {row['first']} less {row['second']} does not come out"
            )
    return told


def _verify_design(folder: Path) -> FolderReport:
    summary = json.loads((folder / "summary.json").read_text("utf-8"))
    problem = with_settings_of(read_case(input_copy(folder)), summary["settings"])
    network = build_network(problem)
    try:
        design = read_design(folder, network, summary)
    except (KeyError, ValueError) as error:
        return FolderReport(folder, "design", (f"{folder}: the tables do not fit the inputs ({error})",))
    checked = verify(problem, design, network)
    breaches = [f"{folder}: {sentence}" for sentence in checked.breaches]
    results = build_results(network, design, checked.bill)
    told, figures = _compare_figures(folder, summary, results)
    return FolderReport(folder, "design", (*breaches, *told), checked.warnings, figures)


def with_settings_of(problem: Problem, written: dict[str, dict[str, Any]]) -> Problem:
    """Return `problem` under the settings in force that a summary tells.

    They may differ from the inputs' copy: a comparison changes the structure, a library call any of them.
    """
    changes = {
        name: value
        for section, values in written.items()
        if not section.startswith("mode.")
        for name, value in values.items()
    }
    if changes.get("max_transfers") == "unlimited":
        changes["max_transfers"] = UNLIMITED
    factors = [
        (section.removeprefix("mode."), values["distance_factor"])
        for section, values in written.items()
        if section.startswith("mode.")
    ]
    return problem.with_settings(**changes, mode_distance_factor=tuple(factors))


def read_design(folder: Path, network: Network, summary: dict[str, Any]) -> Design:
    """Return the plan that the tables of `folder` tell.

    Raises
    ------
    KeyError, ValueError
        A row names a station, link or type that is no candidate under the inputs.
    """
    links, frequencies = _read_links(folder, network)
    stations = _read_rows(folder / "stations.csv")
    hubs = tuple(network.index[row["station"]] for row in stations if row["role"] == "hub")
    belongs = [row["allocated_to"] for row in stations]
    held = summary.get("cost_with_volume_held") or {}
    return Design(
        status=Status(summary["status"]),
        objective=summary["objective"],
        bound=summary["bound"],
        hubs=tuple(sorted(hubs)),
        links=links,
        frequencies=frequencies,
        flows=_read_flows(folder, network),
        allocation=tuple(network.index[code] for code in belongs) if all(belongs) else None,
        method=summary["method"],
        second_objective=held.get("objective"),
        second_bound=held.get("bound"),
    )


def _read_links(folder: Path, network: Network) -> tuple[tuple[int, ...], tuple[Frequency, ...]]:
    data = network.link
    place = {
        (int(data.tail[e]), int(data.head[e]), network.modes[int(data.mode[e])]): e
        for e in range(network.link_count)
    }
    service = {
        (int(link), int(vehicle)): s
        for s, (link, vehicle) in enumerate(zip(network.service.link, network.service.vehicle))
    }
    links, frequencies = [], []
    for row in _read_rows(folder / "links.csv"):
        link = place[network.index[row["from"]], network.index[row["to"]], row["mode"]]
        links.append(link)
        for v, vehicle in enumerate(network.problem.vehicles):
            departures = int(row[f"frequency_{vehicle.vehicle}"] or 0)
            if departures:
                frequencies.append(Frequency(service[link, v], departures))
    return tuple(sorted(links)), tuple(sorted(frequencies, key=lambda entry: entry.service))


def _read_flows(folder: Path, network: Network) -> tuple[Flow, ...]:
    demand = {(row.origin, row.destination): k for k, row in enumerate(network.problem.demands)}
    leg = {
        (int(tail), int(head), network.modes[int(network.link.mode[link])]): number
        for number, (link, tail, head) in enumerate(zip(network.leg.link, network.leg.tail, network.leg.head))
    }
    flows = []
    for row in _read_rows(folder / "itineraries.csv"):
        k = demand[row["origin"], row["destination"]]
        stations = [network.index[code] for code in row["stations"].split(" ")]
        modes = row["modes"].split(" ") if row["modes"] else []
        legs = tuple(leg[a, b, mode] for a, b, mode in zip(stations, stations[1:], modes, strict=False))
        if len(legs) != len(modes) or (legs and len(stations) != len(legs) + 1):
            raise ValueError(f"itinerary {row['stations']} has {len(modes)} modes")
        flows.append(Flow(k, legs, float(row["share"])))
    return tuple(sorted(flows, key=lambda flow: (flow.demand, flow.legs)))


def _compare_figures(folder: Path, summary: dict[str, Any], results: Results) -> tuple[list[str], int]:
    """Compare every cell and total with its recomputation; return what differs and how many were compared."""
    told: list[str] = []
    figures = 0
    for table in results.tables:
        if table.name not in _NOT_RECOMPUTED:
            faults, count = _compare_table(folder / f"{table.name}.csv", table)
            told += faults
            figures += count
    for group, values in (
        ("costs", results.costs),
        ("investment", results.investment),
        ("totals", results.totals),
        ("answer", {k: v for k, v in results.answer.items() if k != "method"}),
    ):
        for name, value in values.items():
            written = summary.get(name) if group == "answer" else summary[group].get(name)
            figures += 1
            if isinstance(value, dict) or isinstance(written, dict):
                continue
            if not _same(written, value, results.costs["total"] if group == "costs" else 0.0):
                told.append(f"{folder / 'summary.json'}: {name} is {written!r}, recomputed {value!r}")
    return told, figures


def _compare_table(path: Path, table: Table) -> tuple[list[str], int]:
    rows = _read_rows(path)
    wanted = sorted(([*row] for row in table.rows), key=_row_key)
    found = sorted(([row.get(name, "") for name in table.header] for row in rows), key=_row_key)
    if len(wanted) != len(found):
        return [f"{path}: {len(found)} rows, recomputed {len(wanted)}"], len(found)
    scale = {
        name: max((abs(v) for v in table.values(name) if isinstance(v, int | float)), default=0.0)
        for name in table.header
    }
    told = []
    for want, got in zip(wanted, found):
        for column, value, text in zip(table.columns, want, got):
            if not _same(text, value, scale[column.name]):
                told.append(
                    f"{path}, {' '.join(str(c) for c in want[:3])}: {column.name} is {text!r}, not {value!r}"
                )
    return told, len(found) * len(table.columns)


def _row_key(row: list[Any]) -> tuple[str, ...]:
    return tuple(str(cell) for cell in row[:4] if not isinstance(cell, float))


def _same(written: Any, value: Any, scale: float = 0.0) -> bool:
    """Whether a written cell equals a recomputed one; figures within 1e-6 of themselves (or of `scale`)."""
    if value is None:
        return written in (None, "")
    if isinstance(value, str):
        return bool(written == value)
    number = _number(written)
    if number is None:
        return False
    return math.isclose(number, float(value), rel_tol=COST_TOLERANCE, abs_tol=1e-9 * max(1.0, abs(scale)))


def _number(cell: Any) -> float | None:
    if cell is None or cell == "":
        return None
    try:
        return float(cell)
    except ValueError:
        return None


def _read_rows(path: Path) -> list[dict[str, str]]:
    try:
        with path.open(encoding="utf-8", newline="") as stream:
            rows = list(csv.DictReader(stream))
    except OSError as error:
        raise OutputError(f"{path}: cannot be read ({error.strerror})") from error
    return [{plain_text(name): plain_text(cell) for name, cell in row.items()} for row in rows]
