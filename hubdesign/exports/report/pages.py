"""The page of one design: what its template is given."""

from __future__ import annotations

import base64
import hashlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any

import jinja2
from markupsafe import Markup

from hubdesign.exports.report import answer, charts, words
from hubdesign.exports.report.drawing import ROLES, draw_sheet
from hubdesign.exports.report.rows import PageTable, show_table
from hubdesign.exports.summary import library_versions
from hubdesign.problem import Settings
from hubdesign.results import TOTAL_COLUMNS, Column, Results, settings_in_force
from hubdesign.run import Result, available_cores

_FOLDER = "hubdesign.exports.report"

#: Totals that stand under the answer.
_FIGURES = (
    "links",
    "hubs",
    "volume_carried",
    "share_served",
    "departures",
    "block_hours",
    "vehicles",
    "load_factor",
    "stage_length_km",
    "nonstop_share",
    "circuity",
    "itinerary_hours",
    "volume_km",
    "unit_cost_per_unit",
    "unit_cost_per_capacity_km",
    "yield_per_volume_km",
    "co2_tonnes",
)

#: Columns that stand on paper, where all would be too wide for A4.
PRINTED = {
    "links": (
        "from",
        "to",
        "mode",
        "role",
        "distance_km",
        "frequency",
        "capacity",
        "volume_out",
        "volume_back",
        "load_factor_out",
        "load_factor_back",
        "cost",
    ),
    "stations": (
        "station",
        "name",
        "role",
        "allocated_to",
        "starting_volume",
        "ending_volume",
        "transferring_volume",
        "departures",
        "links",
    ),
    "itineraries": (
        "origin",
        "destination",
        "stations",
        "volume",
        "share",
        "transfers",
        "distance_km",
        "circuity",
        "hours",
        "revenue",
    ),
}

REASONS = (
    "no itinerary: none obeys the rules on the candidate links. left by plan: there is one, but no room on"
    " it, or it is not worth it."
)


@dataclass(frozen=True, slots=True)
class Figure:
    """A total under the answer."""

    label: str
    value: str
    unit: str
    meaning: str


def design_page(
    result: Result, results: Results, inputs: Mapping[str, bytes], notes: Sequence[str] = ()
) -> str:
    """Return report.html of a design; see :func:`hubdesign.exports.report.render_design_report`."""
    settings = result.problem.settings
    tables = design_tables(results, settings)
    unit = f"{settings.volume_unit} per {settings.period}"
    contents = [("answer", "Answer"), ("maps", "Map"), ("charts", "Charts"), ("tables", "Tables")]
    return render(
        "design.html",
        settings,
        inputs,
        [table for table, _ in tables],
        kind=f"Network design: {answer.STRUCTURES[settings.structure]}, {settings.goal}",
        contents=contents,
        headline=answer.headline(result, results),
        points=answer.answer_points(result, results),
        method=results.answer["method"] or "Solved",
        solve_words=_solve_words(result),
        warnings=[*notes, *result.warnings],
        figures=total_figures(results, settings),
        sheet=draw_sheet(result.problem, {settings.structure: results}),
        what=f"{len(results.links.rows)} links, {results.totals['hubs']} hubs",
        units=unit,
        money=f"{settings.currency} per {settings.period}",
        codes=[(row.station, row.name or row.station) for row in result.problem.stations],
        missing=answer.missing_places(result.problem),
        cost_bars=charts.cost_bars(results.costs),
        transfer_bars=charts.transfer_bars(results),
        scatter=charts.load_scatter(results, ROLES),
        curves=charts.progress_curves(results, results.answer["objective_unit"]),
        shown_tables=tables,
    )


def design_tables(results: Results, settings: Settings) -> list[tuple[PageTable, str]]:
    """Return the tables of a design's page with a note on each."""

    def show(name: str, caption: str, **more: Any) -> PageTable:
        return show_table(getattr(results, name), settings, caption, printed=PRINTED.get(name, ()), **more)

    ends = ("from", "to", "mode", "direction", "role", "distance_km", "volume_out", "volume_back")
    one_mode = len(set(results.links.values("mode"))) <= 1
    shown = [
        (show("links", "Links", always=ends), "An open link a row, direction out is from the first end."),
        (show("stations", "Stations", always=("station", "name", "role", "transferring_volume")), ""),
        (show("vehicles", "Vehicles", always=("vehicle", "used")), ""),
        (
            show(
                "itineraries",
                "O-D volume carried, by itinerary",
                always=("origin", "destination", "stations", "volume", "share", "transfers"),
                never=("modes",) if one_mode else (),
            ),
            "Choosing a row shows the O-D pair on the map.",
        ),
        (show("unserved", "Unserved volume"), REASONS),
    ]
    return [row for row in shown if row[0].count or row[0].name != "vehicles"]


def total_figures(results: Results, settings: Settings) -> list[Figure]:
    """Return the totals that are known, in the words of the inputs."""
    columns = {column.name: column for column in TOTAL_COLUMNS}
    figures = []
    for name in _FIGURES:
        value = results.totals[name]
        if value is not None and (value or name != "yield_per_volume_km"):
            figures.append(say_total(columns[name], value, settings))
    return figures


def say_total(column: Column, value: float | int, settings: Settings) -> Figure:
    """Return a total as the page shows it."""
    unit = words.unit_words(column.unit, settings)
    if column.unit == "share":
        text, unit = words.say_share(float(value)), ""
    else:
        text = words.say_number(float(value))
    if column.unit in ("links", "hubs", "vehicles", "ratio"):
        unit = ""
    return Figure(words.heading(column.name, column.unit), text, unit, column.meaning)


def _solve_words(result: Result) -> str:
    return f"Solved in {words.say_number(round(result.solve_s, 1))} s."


def render(
    template: str,
    settings: Settings,
    inputs: Mapping[str, bytes],
    tables: Sequence[PageTable],
    **context: Any,
) -> str:
    """Return a page from its template and what every page is given."""
    style, script = _asset("page.css"), _asset("page.js")
    title = settings.title or "Network design"
    return (
        _environment()
        .get_template(template)
        .render(
            title=title,
            style=Markup(style),
            script=Markup(script),
            script_hash=base64.b64encode(hashlib.sha256(script.encode("utf-8")).digest()).decode("ascii"),
            tables=tables,
            settings=settings,
            say=answer.say_isolated,
            setting=say_setting,
            hashes=[(name, hashlib.sha256(data).hexdigest()) for name, data in inputs.items()],
            versions=library_versions(),
            threads=settings.threads or available_cores(),
            in_force=settings_in_force(settings),
            **{**context, "contents": [*context["contents"], ("cautions", "Cautions"), ("inputs", "Inputs")]},
        )
    )


def say_setting(value: object) -> str:
    """Return a setting as settings.toml would say it."""
    if value is None:
        return "not set"
    if isinstance(value, bool):
        return "yes" if value else "no"
    return f"{value:,g}" if isinstance(value, float) and abs(value) < 1e6 else str(value)


@cache
def _environment() -> jinja2.Environment:
    return jinja2.Environment(
        loader=jinja2.PackageLoader(_FOLDER, "templates"),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )


@cache
def _asset(name: str) -> str:
    return resources.files(_FOLDER).joinpath(name).read_text("utf-8").strip() + "\n"
