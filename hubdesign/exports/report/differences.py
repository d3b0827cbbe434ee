"""What differs between two structures, drawn on one map."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from hubdesign.exports.report.across import plain_key
from hubdesign.exports.report.drawing import DrawnMap, DrawnStation, LinkKey, Sheet, link_keys
from hubdesign.results import Results


@dataclass(frozen=True, slots=True)
class OverlayLink:
    """A link of the overlay: row, path, whether of the first, the second or both, width, what it says."""

    row: int
    path: int
    side: str
    width: float
    says: str


@dataclass(frozen=True, slots=True)
class OverlayMark:
    """A station of the overlay: whether it is a hub in the first, the second, both or neither."""

    station: DrawnStation
    side: str


@dataclass(frozen=True, slots=True)
class Overlay:
    """Two structures on one map."""

    first: str
    second: str
    links: tuple[OverlayLink, ...]
    marks: tuple[OverlayMark, ...]
    counts: dict[str, int]
    hubs: dict[str, list[str]]


def overlay(
    first: str, second: str, results: Mapping[str, Results], sheet: Sheet, rows: Mapping[LinkKey, int]
) -> Overlay:
    """Return what `first` and `second` have in common and what only one of them has."""
    maps = {drawn.structure: drawn for drawn in sheet.maps}
    keys = {name: [plain_key(key) for key in link_keys(results[name])] for name in (first, second)}
    own = {name: set(keys[name]) for name in keys}
    drawn: dict[LinkKey, OverlayLink] = {}
    for name in (first, second):
        # Rows of a drawn map are those of the table over all structures.
        by_row = {row: key for key, row in rows.items()}
        for link in maps[name].links:
            key = by_row[link.row]
            side = "both" if key in own[first] and key in own[second] else _side(name, first)
            width = max(link.width, drawn[key].width) if key in drawn else link.width
            says = {"both": "in both", "first": f"only {first}", "second": f"only {second}"}[side]
            drawn[key] = OverlayLink(link.row, link.path, side, width, f"{key[0]} – {key[1]}: {says}")
    order = {"both": 0, "first": 1, "second": 2}
    links = sorted(drawn.values(), key=lambda link: (order[link.side], -link.width))
    marks, hubs = _marks(maps[first], maps[second], first, second, results)
    counts = {
        "both": len(own[first] & own[second]),
        "first": len(own[first] - own[second]),
        "second": len(own[second] - own[first]),
    }
    return Overlay(first, second, tuple(links), tuple(marks), counts, hubs)


def _side(name: str, first: str) -> str:
    return "first" if name == first else "second"


def _marks(
    a: DrawnMap, b: DrawnMap, first: str, second: str, results: Mapping[str, Results]
) -> tuple[list[OverlayMark], dict[str, list[str]]]:
    hub = {
        name: {row for row, role in enumerate(results[name].stations.values("role")) if role == "hub"}
        for name in (first, second)
    }
    codes = [str(code) for code in results[first].stations.values("station")]
    ranks = {mark.row: min(mark.rank, other.rank) for mark, other in zip(_by_row(a), _by_row(b))}
    marks = []
    hubs: dict[str, list[str]] = {"both": [], "first": [], "second": []}
    for mark in sorted(_by_row(a), key=lambda mark: -ranks[mark.row]):
        in_first, in_second = mark.row in hub[first], mark.row in hub[second]
        side = "both" if in_first and in_second else "first" if in_first else "second" if in_second else ""
        marks.append(OverlayMark(mark, side))
    for row, code in enumerate(codes):
        in_first, in_second = row in hub[first], row in hub[second]
        if in_first or in_second:
            hubs["both" if in_first and in_second else "first" if in_first else "second"].append(code)
    return marks, hubs


def _by_row(drawn: DrawnMap) -> list[DrawnStation]:
    return sorted(drawn.stations, key=lambda mark: mark.row)
