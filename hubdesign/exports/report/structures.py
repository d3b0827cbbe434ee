"""The page of a comparison: structures side by side on the same inputs."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from itertools import combinations

from markupsafe import Markup

from hubdesign.comparison import Comparison
from hubdesign.exports.report import answer, charts, words
from hubdesign.exports.report.across import (
    link_rows,
    plain_key,
    tabulate_links_across,
    tabulate_od_across,
    tabulate_stations_across,
)
from hubdesign.exports.report.differences import Overlay, overlay
from hubdesign.exports.report.drawing import Sheet, draw_sheet, link_keys
from hubdesign.exports.report.pages import render
from hubdesign.exports.report.words import format_for
from hubdesign.problem import Settings
from hubdesign.results import COST_COLUMNS, Cell, Results, Table

_PARTS = {
    "objective": "Answer",
    "cost_operating": "Cost split",
    "hub_setup_investment": "One-off money",
    "links": "Network",
}


@dataclass(frozen=True, slots=True)
class MatrixRow:
    """A figure of comparison.csv: its cells by structure; `part` begins a part of the table."""

    key: str
    label: str
    unit: str
    meaning: str
    cells: tuple[tuple[str, bool], ...]
    part: str = ""


@dataclass(frozen=True, slots=True)
class Panel:
    """One structure beside the others."""

    structure: str
    name: str
    status: str
    sentence: Markup
    page: str


def comparison_page(
    comparison: Comparison, table: Table, results: dict[str, Results], inputs: Mapping[str, bytes]
) -> str:
    """Return report.html of a comparison; see :func:`hubdesign.exports.report.render_comparison_report`."""
    settings = comparison.problem.settings
    sheet = _sheet(comparison, results)
    tables = [
        tabulate_links_across(results, settings),
        tabulate_stations_across(results, settings),
        tabulate_od_across(comparison.problem, results),
    ]
    unit = words.goal_unit(settings)
    spans, ticks = charts.interval_spans(comparison, answer.STRUCTURES)
    contents = [
        ("answer", "Answer"),
        ("figures", "Figures"),
        ("maps", "Maps"),
        ("differences", "What differs"),
    ]
    return render(
        "comparison.html",
        settings,
        inputs,
        tables,
        kind=f"Structures compared on the same demand and rules: {settings.goal}",
        contents=[*contents, ("charts", "Charts"), ("tables", "Tables")],
        headline=answer.comparison_headline(comparison, results),
        decisions=[answer.say_difference(row, comparison) for row in comparison.differences],
        spans=spans,
        ticks=ticks,
        goal=f"{unit} per {settings.period}",
        panels=_panels(comparison, results),
        structures=[answer.STRUCTURES[entry.structure] for entry in comparison.entries],
        matrix=_matrix(table, settings, comparison.maximise),
        sheet=sheet,
        overlays=_overlays(comparison, results, sheet),
        names=answer.STRUCTURES,
        units=f"{settings.volume_unit} per {settings.period}",
        money=f"{settings.currency} per {settings.period}",
        codes=[(row.station, row.name or row.station) for row in comparison.problem.stations],
        missing=answer.missing_places(comparison.problem),
        cost_rows=_cost_rows(results),
        transfer_bars={name: charts.transfer_bars(part) for name, part in results.items()},
        curves={
            name: charts.progress_curves(part, unit) for name, part in results.items() if name != "current"
        },
        shown_tables=tables,
    )


def _sheet(comparison: Comparison, results: dict[str, Results]) -> Sheet | None:
    """Return the maps; their links refer to the rows of the table over all structures."""
    sheet = draw_sheet(comparison.problem, results)
    if sheet is None:
        return None
    rows = link_rows(results)
    maps = []
    for drawn in sheet.maps:
        keys = [plain_key(key) for key in link_keys(results[drawn.structure])]
        links = tuple(replace(link, row=rows[keys[link.row]]) for link in drawn.links)
        maps.append(replace(drawn, links=links))
    return replace(sheet, maps=tuple(maps))


def _panels(comparison: Comparison, results: dict[str, Results]) -> list[Panel]:
    panels = []
    for entry in comparison.entries:
        told = results.get(entry.structure)
        status = entry.status.value if entry.comparable or told is None else "not comparable"
        if entry.structure == "current" and entry.comparable:
            status = "as operated"
        gap = None if told is None else told.answer["gap"]
        if status in ("proven", "feasible") and gap is not None:
            status += f", gap {words.say_share(gap)}"
        page = f"{entry.structure}/report.html" if told is not None else ""
        panels.append(
            Panel(
                entry.structure,
                answer.STRUCTURES[entry.structure],
                status,
                answer.say_entry(entry, told),
                page,
            )
        )
    return panels


def _matrix(table: Table, settings: Settings, maximise: bool) -> list[MatrixRow]:
    """Return comparison.csv on its side; what is blank or zero throughout is left out."""
    comparable = [cell == "yes" for cell in table.values("comparable")]
    rows: list[MatrixRow] = []
    part = ""
    for column in table.columns[3:]:
        part = _PARTS.get(column.name, part)
        values = table.values(column.name)
        if column.kind == "text" or not any(value not in (None, 0) for value in values):
            continue
        style = format_for(column, values)
        best = _best(values, comparable, maximise) if column.name == "objective" else set()
        cells = tuple(
            ("" if value is None or isinstance(value, str) else style(value), place in best)
            for place, value in enumerate(values)
        )
        unit = words.unit_words(column.unit, settings)
        new_part = part if not any(row.part == part for row in rows) else ""
        rows.append(
            MatrixRow(
                column.name, words.heading(column.name, column.unit), unit, column.meaning, cells, new_part
            )
        )
    return rows


def _best(values: list[Cell], comparable: list[bool], maximise: bool) -> set[int]:
    """Return which comparable structures have the best objective, where they differ."""
    known = {
        place: float(value)
        for place, value in enumerate(values)
        if isinstance(value, (int, float)) and comparable[place]
    }
    if len(set(known.values())) < 2:
        return set()
    best = max(known.values()) if maximise else min(known.values())
    return {place for place, value in known.items() if value == best}


def _overlays(comparison: Comparison, results: dict[str, Results], sheet: Sheet | None) -> list[Overlay]:
    """Return an overlay of each pair, that of the two best plans first."""
    if sheet is None or len(results) < 2:
        return []
    ranked = [entry.structure for entry in answer.ranked_entries(comparison)]
    order = [name for name in ranked if name in results] + [name for name in results if name not in ranked]
    rows = link_rows(results)
    drawn = [overlay(first, second, results, sheet, rows) for first, second in combinations(order, 2)]
    return sorted(drawn, key=lambda pair: pair.counts["first"] + pair.counts["second"] == 0)


def _cost_rows(results: dict[str, Results]) -> list[tuple[str, list[charts.Bar | None]]]:
    """Return a row a part of the cost, with a bar a structure, all at one scale."""
    largest = max((abs(v) for r in results.values() for k, v in _parts(r)), default=0.0)
    rows: list[tuple[str, list[charts.Bar | None]]] = []
    for column in COST_COLUMNS:
        if column.name in ("total", "revenue", "profit"):
            continue
        values = [part.costs[column.name] for part in results.values()]
        if any(values):
            style = format_for(column, values)
            bars: list[charts.Bar | None] = [
                charts.Bar(name, style(value), abs(value) / largest) for name, value in zip(results, values)
            ]
            rows.append((words.heading(column.name), bars))
    return rows


def _parts(results: Results) -> list[tuple[str, float]]:
    return [
        (name, value) for name, value in results.costs.items() if name not in ("total", "revenue", "profit")
    ]
