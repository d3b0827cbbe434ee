"""Tables over all structures: a link, station or O-D pair a row, a structure a group of columns."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

from hubdesign.exports.report.drawing import LinkKey, link_keys
from hubdesign.exports.report.rows import Head, PageTable, body_html, columns_html, head_of
from hubdesign.problem import Problem, Settings
from hubdesign.results import Cell, Column, Results

#: Itineraries of one O-D pair stand in one cell, this between them.
BETWEEN = " · "

_LINK_FIGURES = (
    "role",
    "frequency",
    "volume_out",
    "volume_back",
    "load_factor_out",
    "load_factor_back",
    "cost",
)
_STATION_FIGURES = ("role", "transferring_volume", "departures", "links")


def plain_key(key: LinkKey) -> LinkKey:
    """Return the key of a link whichever end comes first; a one-way link keeps its direction."""
    a, b, mode, direction = key
    return key if direction == "one-way" or a <= b else (b, a, mode, direction)


def link_rows(results: Mapping[str, Results]) -> dict[LinkKey, int]:
    """Return the row of each link that any structure opens."""
    keys = dict.fromkeys(plain_key(key) for tables in results.values() for key in link_keys(tables))
    return {key: row for row, key in enumerate(keys)}


def tabulate_links_across(results: Mapping[str, Results], settings: Settings) -> PageTable:
    """Return the links of all structures."""
    rows = link_rows(results)
    columns: list[Column] = []
    cells: list[list[Cell]] = []
    groups: list[str] = []
    first = next(iter(results.values())).links
    names = ("from", "to", "mode", "direction")
    columns += [column for column in first.columns if column.name in names]
    cells += [[key[place] for key in rows] for place in range(4)]
    lengths: list[Cell] = [None] * len(rows)
    for tables in results.values():
        for key, length in zip(link_keys(tables), tables.links.values("distance_km")):
            lengths[rows[plain_key(key)]] = length
    columns.append(next(column for column in first.columns if column.name == "distance_km"))
    cells.append(lengths)
    groups += [""] * 5
    for structure, tables in results.items():
        by_name = {column.name: column for column in tables.links.columns}
        keys = link_keys(tables)
        for name in _LINK_FIGURES:
            values: list[Cell] = [None] * len(rows)
            for key, value in zip(keys, _turned(tables, name, keys)):
                values[rows[plain_key(key)]] = value
            columns.append(by_name[name])
            cells.append(values)
            groups.append(structure)
    return _put_together("links", "Links of all structures", columns, cells, groups, settings)


def _turned(tables: Results, name: str, keys: Sequence[LinkKey]) -> list[Cell]:
    """Return a column of links; out and back change places where the key names the ends the other way."""
    values = tables.links.values(name)
    other = {"_out": "_back", "_back": "_out"}
    for end, opposite in other.items():
        if name.endswith(end):
            swapped = tables.links.values(name.removesuffix(end) + opposite)
            return [b if plain_key(key) != key else a for key, a, b in zip(keys, values, swapped)]
    return values


def tabulate_stations_across(results: Mapping[str, Results], settings: Settings) -> PageTable:
    """Return every station with its part in each structure."""
    first = next(iter(results.values())).stations
    columns = [column for column in first.columns if column.name in ("station", "name")]
    cells = [first.values(column.name) for column in columns]
    groups = ["", ""]
    for structure, tables in results.items():
        by_name = {column.name: column for column in tables.stations.columns}
        for name in _STATION_FIGURES:
            columns.append(by_name[name])
            cells.append(tables.stations.values(name))
            groups.append(structure)
    return _put_together("stations", "Stations in all structures", columns, cells, groups, settings)


def tabulate_od_across(problem: Problem, results: Mapping[str, Results]) -> PageTable:
    """Return every O-D demand with what each structure carries of it and how."""
    rows = {(row.origin, row.destination): place for place, row in enumerate(problem.demands)}
    columns = [
        Column("origin", "text", "", "station where the volume starts"),
        Column("destination", "text", "", "station where it ends"),
        Column("volume", "number", "volume per period", "O-D volume of the inputs"),
    ]
    cells: list[list[Cell]] = [
        [a for a, _ in rows],
        [b for _, b in rows],
        [r.volume for r in problem.demands],
    ]
    groups = ["", "", ""]
    for structure, tables in results.items():
        carried: list[Cell] = [0.0] * len(rows)
        ways: list[list[str]] = [[] for _ in rows]
        for record in tables.itineraries.records():
            place = rows[str(record["origin"]), str(record["destination"])]
            carried[place] = float(carried[place] or 0.0) + float(record["volume"] or 0.0)
            ways[place].append(str(record["stations"]))
        columns.append(Column("carried", "number", "volume per period", "volume carried"))
        columns.append(Column("stations", "text", "", "stations of each itinerary in order"))
        cells += [carried, [BETWEEN.join(stops) for stops in ways]]
        groups += [structure, structure]
    return _put_together("od", "O-D volume in all structures", columns, cells, groups, problem.settings)


def _put_together(
    name: str,
    caption: str,
    columns: Sequence[Column],
    cells: Sequence[Sequence[Cell]],
    groups: Sequence[str],
    settings: Settings,
) -> PageTable:
    """Return a table of columns that belong to structures, without those blank or zero throughout."""
    kept = [
        place
        for place, values in enumerate(cells)
        if not groups[place] or columns[place].kind == "text" or any(v not in (None, "", 0) for v in values)
    ]
    heads: list[Head] = [head_of(columns[place], settings, groups[place]) for place in kept]
    shown, formats = columns_html([columns[place] for place in kept], [cells[place] for place in kept])
    count = len(cells[0]) if cells else 0
    table = PageTable(name, tuple(heads), body_html(shown, count), count, caption=caption, formats=formats)
    return replace(table, printed=_printed(table))


def _printed(table: PageTable) -> tuple[int, ...]:
    """Return what stands on paper: who it is, and of each structure a figure or two."""
    wanted = {"frequency", "volume_out", "role", "transferring_volume", "carried"}
    if table.name == "links":
        wanted -= {"role"}
    return tuple(
        place for place, head in enumerate(table.heads, start=1) if not head.group or head.key in wanted
    )
