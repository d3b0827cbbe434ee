"""Where the labels of a map go: next to their station, over no other label or station."""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Box = tuple[float, float, float, float]

FONT_PX = 12.5
_HEIGHT = 14.0
_GAP = 4.0

#: Sides in order of liking: (share of the width to the left of the anchor, x and y direction, text-anchor).
SIDES = {
    "e": (0.0, 1.0, 0.0, "start"),
    "w": (1.0, -1.0, 0.0, "end"),
    "n": (0.5, 0.0, -1.0, "middle"),
    "s": (0.5, 0.0, 1.0, "middle"),
    "ne": (0.0, 0.75, -0.75, "start"),
    "se": (0.0, 0.75, 0.75, "start"),
    "nw": (1.0, -0.75, -0.75, "end"),
    "sw": (1.0, -0.75, 0.75, "end"),
}


@dataclass(frozen=True, slots=True)
class Label:
    """A placed label: offset of its baseline from the station, px, its text-anchor, and whether it shows."""

    dx: float
    dy: float
    anchor: str
    shown: bool


def place_labels(
    x: Floats,
    y: Floats,
    radius: Floats,
    texts: Sequence[str],
    order: Sequence[int],
    lines: Floats,
    size: tuple[float, float],
) -> list[Label]:
    """Return a label for each station, placed greedily.

    Parameters
    ----------
    x, y, radius
        Place and size of each station's mark, px, shape (n,).
    texts
        What each label says.
    order
        Stations, the most important first.
    lines
        Points along the links, px, shape (m, 2); a side that hides few of them is liked better.
    size
        Width and height of the map, px.
    """
    taken: list[Box] = []
    marks = np.column_stack([x - radius, y - radius, x + radius, y + radius])
    result = [Label(0.0, 0.0, "start", False)] * len(texts)
    for i in order:
        best: tuple[float, str, Box] | None = None
        for rank, side in enumerate(SIDES):
            box = _box(float(x[i]), float(y[i]), float(radius[i]), texts[i], side)
            if not _inside(box, size) or _hits(box, taken) or _hits_marks(box, marks, i):
                continue
            cost = rank * 0.6 + _covered(box, lines)
            if best is None or cost < best[0]:
                best = (cost, side, box)
        side = "e" if best is None else best[1]
        _, right, up, anchor = SIDES[side]
        away = float(radius[i]) + _GAP
        result[i] = Label(right * away, up * (away + 5.0) + 4.3, anchor, best is not None)
        if best is not None:
            taken.append(best[2])
    return result


def text_width(text: str) -> float:
    """Return about how wide a label is, px."""
    units = sum(1.75 if unicodedata.east_asian_width(sign) in "WF" else 1.0 for sign in text)
    return units * FONT_PX * 0.56 + 2.0


def _box(x: float, y: float, radius: float, text: str, side: str) -> Box:
    left, right, up, _ = SIDES[side]
    width, away = text_width(text), radius + _GAP
    x0, y0 = x + right * away - left * width, y + up * (away + 5.0) - _HEIGHT / 2.0
    return x0, y0, x0 + width, y0 + _HEIGHT


def _inside(box: Box, size: tuple[float, float]) -> bool:
    return box[0] >= 2.0 and box[1] >= 2.0 and box[2] <= size[0] - 2.0 and box[3] <= size[1] - 2.0


def _hits(box: Box, taken: list[Box]) -> bool:
    return any(box[0] < o[2] and o[0] < box[2] and box[1] < o[3] and o[1] < box[3] for o in taken)


def _hits_marks(box: Box, marks: Floats, own: int) -> bool:
    over = (box[0] < marks[:, 2]) & (marks[:, 0] < box[2]) & (box[1] < marks[:, 3]) & (marks[:, 1] < box[3])
    over[own] = False
    return bool(over.any())


def _covered(box: Box, lines: Floats) -> float:
    if not len(lines):
        return 0.0
    inside = (lines[:, 0] > box[0]) & (lines[:, 0] < box[2]) & (lines[:, 1] > box[1]) & (lines[:, 1] < box[3])
    return float(inside.sum()) * 0.35
