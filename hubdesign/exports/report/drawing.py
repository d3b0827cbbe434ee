"""Maps of the page: links as wide as their volume, hubs as large as their transferring volume."""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from hubdesign.exports.geojson import link_lines
from hubdesign.exports.lines import Line
from hubdesign.exports.report.frame import (
    Frame,
    frame_network,
    graticule_path,
    land_path,
    line_points,
    path_data,
)
from hubdesign.exports.report.labels import Label, place_labels
from hubdesign.exports.report.words import say_number
from hubdesign.problem import Problem
from hubdesign.results import Results

Floats = NDArray[np.float64]
LinkKey = tuple[str, str, str, str]

_WIDEST, _THINNEST = 9.0, 1.0
_LARGEST_HUB, _SMALLEST_HUB = 16.0, 6.0
_SPOKE = 3.4
_ASIDE = 7.0
_NAMED_STATIONS = 30
_LONGEST_NAME = 16

#: Role of a link -> class of its line.
ROLES = {"hub-hub": "hh", "hub-spoke": "hs", "nonstop": "ns"}
_KINDS = {"hub": "hub", "spoke": "spoke", "not served": "bare"}


@dataclass(frozen=True, slots=True)
class DrawnLink:
    """A line of a map: its row in the table of links, its path, its class, width in px, and what it says."""

    row: int
    path: int
    role: str
    width: float
    says: str


@dataclass(frozen=True, slots=True)
class DrawnStation:
    """A mark of a map with its label."""

    row: int
    x: float
    y: float
    kind: str
    radius: float
    text: str
    label: Label
    rank: int
    says: str


@dataclass(frozen=True, slots=True)
class DrawnMap:
    """One structure on the plane."""

    structure: str
    links: tuple[DrawnLink, ...]
    stations: tuple[DrawnStation, ...]


@dataclass(frozen=True, slots=True)
class Sheet:
    """Everything that the maps of a page have in common.

    Attributes
    ----------
    frame
        The plane.
    land, graticule, graticule_degrees
        Path data, and the distance of its lines.
    paths
        Path data of every link on the page; links refer to them by position.
    largest_volume, largest_transfer
        What the widest line and the largest hub stand for.
    maps
        One a structure.
    missing
        Codes of stations without coordinates.
    """

    frame: Frame
    land: str
    graticule: str
    graticule_degrees: float
    paths: tuple[str, ...]
    largest_volume: float
    largest_transfer: float
    maps: tuple[DrawnMap, ...]
    missing: tuple[str, ...]

    @property
    def width_legend(self) -> list[tuple[str, float]]:
        """Round volumes and the width of their lines, px."""
        return [(say_number(v), line_width(v, self.largest_volume)) for v in _rounds(self.largest_volume)]

    @property
    def hub_legend(self) -> list[tuple[str, float]]:
        """Round volumes and the radius of their hubs, px."""
        return [(say_number(v), hub_radius(v, self.largest_transfer)) for v in _rounds(self.largest_transfer)]


def draw_sheet(problem: Problem, results: dict[str, Results]) -> Sheet | None:
    """Return the maps of one or more structures at one scale; None where no station has coordinates.

    Parameters
    ----------
    problem
        Whose stations and [distance] method are drawn.
    results
        Structure -> its tables.
    """
    lines = {name: link_lines(problem, tables) for name, tables in results.items()}
    lat = [np.nan if row.lat is None else row.lat for row in problem.stations]
    lon = [np.nan if row.lon is None else row.lon for row in problem.stations]
    frame = frame_network(lat, lon, [line for group in lines.values() for line in group])
    if frame is None:
        return None
    paths = _Paths(frame)
    volumes = [v for tables in results.values() for v in link_volumes(tables)]
    transfers = [float(v or 0.0) for r in results.values() for v in r.stations.values("transferring_volume")]
    largest_volume, largest_transfer = max(volumes, default=0.0), max(transfers, default=0.0)
    maps = []
    for name, tables in results.items():
        drawn = _draw_links(tables, lines[name], paths, largest_volume)
        runs = [run for link in drawn for run in paths.points[link.path]]
        stations = _draw_stations(tables, frame, runs, largest_transfer)
        maps.append(DrawnMap(name, tuple(drawn), tuple(stations)))
    graticule, degrees = graticule_path(frame)
    missing = tuple(row.station for row in problem.stations if row.lat is None or row.lon is None)
    return Sheet(
        frame,
        land_path(frame),
        graticule,
        degrees,
        tuple(paths.data),
        largest_volume,
        largest_transfer,
        tuple(maps),
        missing,
    )


def link_volumes(results: Results) -> list[float]:
    """Return the volume of each open link, both directions together."""
    table = results.links
    pairs = zip(table.values("volume_out"), table.values("volume_back"))
    return [float(out or 0.0) + float(back or 0.0) for out, back in pairs]


def link_keys(results: Results) -> list[LinkKey]:
    """Return (from, to, mode, direction) of each open link."""
    names = ("from", "to", "mode", "direction")
    columns = [[str(cell) for cell in results.links.values(name)] for name in names]
    return [(a, b, c, d) for a, b, c, d in zip(*columns)]


def line_width(volume: float, largest: float) -> float:
    """Return the width of a link's line, px: in proportion to its volume, but never invisible."""
    return _THINNEST if largest <= 0.0 else max(_THINNEST, _WIDEST * volume / largest)


def hub_radius(volume: float, largest: float) -> float:
    """Return the radius of a hub's mark, px: its area is in proportion to the transferring volume."""
    return _SMALLEST_HUB if largest <= 0.0 else max(_SMALLEST_HUB, _LARGEST_HUB * math.sqrt(volume / largest))


class _Paths:
    """The paths of a page, each drawn once however many maps show it."""

    def __init__(self, frame: Frame) -> None:
        self._frame = frame
        self._known: dict[tuple[LinkKey, int], int] = {}
        self.data: list[str] = []
        self.points: list[list[Floats]] = []

    def add(self, key: LinkKey, line: Line, lane: int) -> int:
        """Return the position of the path of `line`, which is the `lane`-th between its two stations."""
        if (key, lane) not in self._known:
            runs = line_points(self._frame, line, _ASIDE * ((lane + 1) // 2) * (-1) ** lane)
            self._known[key, lane] = len(self.data)
            self.data.append("".join(path_data(run, 1) for run in runs))
            self.points.append(runs)
        return self._known[key, lane]


def _draw_links(
    results: Results, lines: Sequence[Line | None], paths: _Paths, largest: float
) -> list[DrawnLink]:
    """Return the lines of a structure, the narrow ones last so that none is hidden."""
    keys, volumes, roles = link_keys(results), link_volumes(results), results.links.values("role")
    lanes: dict[frozenset[str], int] = {}
    drawn = []
    for row, (key, line, volume, role) in enumerate(zip(keys, lines, volumes, roles)):
        if line is None:
            continue
        pair = frozenset(key[:2])
        lane = lanes.get(pair, -1) + 1
        lanes[pair] = lane
        drawn.append(
            DrawnLink(
                row,
                paths.add(key, line, lane),
                ROLES[str(role)],
                round(line_width(volume, largest), 2),
                f"{key[0]} – {key[1]}: {say_number(volume)}",
            )
        )
    return sorted(drawn, key=lambda link: -link.width)


def _draw_stations(
    results: Results, frame: Frame, runs: Sequence[Floats], largest: float
) -> list[DrawnStation]:
    """Return the marks of a structure with labels, hubs last so that they lie on top."""
    records = [
        (row, record)
        for row, record in enumerate(results.stations.records())
        if record["lat"] is not None and record["lon"] is not None
    ]
    x, y = frame.place([float(r["lat"] or 0) for _, r in records], [float(r["lon"] or 0) for _, r in records])
    hubs = [r["role"] == "hub" for _, r in records]
    moved = [float(r["transferring_volume"] or 0.0) for _, r in records]
    radius = np.array([hub_radius(v, largest) if hub else _SPOKE for v, hub in zip(moved, hubs)])
    local = [float(r["local_volume"] or 0.0) for _, r in records]
    order = sorted(range(len(records)), key=lambda i: (not hubs[i], -moved[i], -local[i], i))
    texts = [_label_text(str(r["station"]), str(r["name"]), len(records)) for _, r in records]
    samples = np.concatenate([_sampled(run) for run in runs]) if runs else np.zeros((0, 2))
    labels = place_labels(x, y, radius, texts, order, samples, (frame.width, frame.height))
    ranks = {i: rank for rank, i in enumerate(order)}
    drawn = [
        DrawnStation(
            row,
            round(float(x[i]), 1),
            round(float(y[i]), 1),
            _KINDS[str(record["role"])],
            round(float(radius[i]), 1),
            texts[i],
            replace(labels[i], dx=round(labels[i].dx, 1), dy=round(labels[i].dy, 1)),
            ranks[i],
            f"{record['name']} ({record['station']}), {record['role']}",
        )
        for i, (row, record) in enumerate(records)
    ]
    return sorted(drawn, key=lambda mark: -mark.rank)


def _label_text(code: str, name: str, count: int) -> str:
    """Return the name where there are few stations and it is short, else the code."""
    return name if count <= _NAMED_STATIONS and 0 < len(name) <= _LONGEST_NAME else code


def _sampled(run: Floats) -> Floats:
    """Return points about every 6 px along a line."""
    pieces = []
    for a, b in itertools.pairwise(run):
        count = max(1, int(math.hypot(*(b - a)) // 6.0))
        pieces.append(a + (b - a) * (np.arange(count) / count)[:, None])
    return np.concatenate(pieces) if pieces else run


def _rounds(largest: float) -> list[float]:
    """Return a few round figures up to `largest`."""
    if largest <= 0.0:
        return []
    power = 10.0 ** math.floor(math.log10(largest))
    top = max(step for step in (1.0, 2.0, 5.0) if step * power <= largest) * power
    return [top, top / 2.0, top / 10.0]
