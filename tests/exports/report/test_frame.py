"""Maps: land where land is, lines without a seam, labels that cover nothing."""

from __future__ import annotations

import re

import numpy as np
import pytest
from shapely import Point, Polygon
from shapely.geometry.base import BaseGeometry

from hubdesign.exports.lines import trace_line
from hubdesign.exports.report.charts import nice_ticks, short_number
from hubdesign.exports.report.frame import Frame, frame_network, land_path, line_points, path_data
from hubdesign.exports.report.labels import FONT_PX, place_labels, text_width

# Places well inside land or sea (common knowledge).
LAND = {
    "Sahara": (23.0, 10.0),
    "Siberia": (62.0, 100.0),
    "Kansas": (38.5, -98.5),
    "Brazil": (-10.0, -52.0),
    "Australia": (-25.0, 134.0),
    "Greenland": (73.0, -40.0),
    "Antarctica": (-82.0, 60.0),
    "Chukotka": (67.0, 178.0),
    "Viti Levu": (-17.8, 178.0),
}
SEA = {
    "Pacific": (0.0, -140.0),
    "Tasman Sea": (-40.0, 160.0),
    "Atlantic": (30.0, -40.0),
    "Indian Ocean": (-20.0, 80.0),
    "Arctic Ocean": (86.0, 0.0),
    "Southern Ocean": (-60.0, -150.0),
    "Tonga Trench": (-19.0, -173.0),
    "Between Fiji and Samoa": (-17.0, -177.0),
}
NETWORKS = {
    "date line": ([-18.0, -14.0, -21.0], [177.0, -172.0, -175.0]),
    "south pole": ([-54.0, -43.5, -34.0], [-68.0, 172.0, 18.5]),
    "arctic": ([64.0, 65.0, 69.0, 62.0], [-20.0, -150.0, 33.0, 130.0]),
    "pacific, Africa and Asia on the far side": ([21.0, -17.0, 37.0], [-157.0, -149.0, -122.0]),
    "the whole world": ([51.5, 1.3, -33.9, 40.7, -33.4], [0.0, 103.8, 151.2, -74.0, -70.7]),
}


def frame_of(name: str) -> Frame:
    """Return the frame of a network."""
    frame = frame_network(*NETWORKS[name])
    assert frame is not None
    return frame


def shapes(path: str) -> list[BaseGeometry]:
    """Return the closed rings of SVG path data as polygons."""
    rings = []
    for text in re.findall(r"M([^z]*)z", path):
        start, _, steps = text.partition("l")
        numbers = [float(n) for n in re.findall(r"-?\d*\.?\d+", start + " " + steps)]
        points = np.cumsum(np.reshape(numbers, (-1, 2)), axis=0)
        rings.append(Polygon(points).buffer(0.0))
    return rings


def on_land(rings: list[BaseGeometry], x: float, y: float) -> bool:
    """Whether a pixel lies in an odd number of rings, as SVG's evenodd and holes wound otherwise have it."""
    return sum(ring.contains(Point(x, y)) for ring in rings) % 2 == 1


@pytest.mark.parametrize("name", NETWORKS)
def test_land_is_where_land_is(name: str) -> None:
    frame = frame_of(name)
    rings = shapes(land_path(frame))
    seen = 0
    for places, expected in ((LAND, True), (SEA, False)):
        for place, (lat, lon) in places.items():
            x, y = (float(v) for v in frame.place(lat, lon))
            if -0.5 * frame.width < x < 1.5 * frame.width and -0.5 * frame.height < y < 1.5 * frame.height:
                seen += 1
                assert on_land(rings, x, y) == expected, place
    assert seen >= 1


def test_land_cut_at_the_antimeridian_has_no_seam() -> None:
    frame = frame_network([66.0, 67.5, 65.0], [178.0, -178.0, 179.0])
    assert frame is not None
    rings = shapes(land_path(frame))
    for lat in np.linspace(66.0, 68.0, 21):
        x, y = (float(v) for v in frame.place(lat, 180.0))
        assert on_land(rings, x, y)


@pytest.mark.parametrize("name", NETWORKS)
def test_every_station_lies_within_its_frame(name: str) -> None:
    frame = frame_of(name)
    x, y = frame.place(*NETWORKS[name])
    assert ((x > 20.0) & (x < frame.width - 20.0)).all()
    assert ((y > 20.0) & (y < frame.height - 20.0)).all()


def test_a_line_over_the_date_line_is_one_run_without_a_jump() -> None:
    line = trace_line("geodesic", -18.0, 177.0, -14.0, -172.0)
    assert line is not None
    assert len(line.parts) == 2
    frame = frame_network([-18.0, -14.0], [177.0, -172.0], [line])
    assert frame is not None
    runs = line_points(frame, line)
    assert len(runs) == 1
    ends = np.column_stack(frame.place([-18.0, -14.0], [177.0, -172.0]))
    assert np.allclose(runs[0][[0, -1]], ends, atol=0.01)
    way = np.hypot(*np.diff(runs[0], axis=0).T).sum()
    assert way < 1.02 * np.hypot(*(ends[1] - ends[0]))


def test_the_second_line_of_a_pair_bulges_aside_between_the_same_ends() -> None:
    line = trace_line("geodesic", 40.0, 0.0, 41.0, 8.0)
    assert line is not None
    frame = frame_network([40.0, 41.0], [0.0, 8.0], [line])
    assert frame is not None
    straight, aside = line_points(frame, line)[0], line_points(frame, line, 7.0)[0]
    assert np.allclose(straight[[0, -1]], aside[[0, -1]], atol=1e-6)
    middle = aside[len(aside) // 2]
    gap = np.abs(np.interp(middle[0], straight[:, 0], straight[:, 1]) - middle[1])
    assert gap == pytest.approx(7.0, abs=1.0)


def test_path_data_does_not_drift() -> None:
    points = np.cumsum(np.full((400, 2), 0.34), axis=0)
    numbers = [float(n) for n in re.findall(r"-?\d*\.?\d+", path_data(points, 0))]
    assert np.allclose(np.reshape(numbers, (-1, 2)).sum(axis=0), points[-1], atol=0.51)


def test_no_station_has_no_frame_and_one_has_some_map_around_it() -> None:
    assert frame_network([np.nan], [np.nan]) is None
    one = frame_network([10.0], [20.0])
    assert one is not None
    assert np.isfinite([one.scale, one.left, one.top]).all()
    assert [float(v) for v in one.place(10.0, 20.0)] == pytest.approx([one.width / 2, one.height / 2])


def test_shown_labels_cover_neither_each_other_nor_a_station() -> None:
    rng = np.random.default_rng(3)
    x, y = rng.uniform(40.0, 900.0, 90), rng.uniform(40.0, 500.0, 90)
    texts, radius = [f"Station {i}" for i in range(90)], np.full(90, 3.4)
    labels = place_labels(x, y, radius, texts, range(90), np.zeros((0, 2)), (960.0, 560.0))
    boxes = []
    for i, label in enumerate(labels):
        if label.shown:
            width = text_width(texts[i])
            left = x[i] + label.dx - {"start": 0.0, "middle": width / 2.0, "end": width}[label.anchor]
            boxes.append((i, left, y[i] + label.dy - 0.8 * FONT_PX, left + width, y[i] + label.dy))
    assert len(boxes) >= 60
    for place, (i, left, top, right, bottom) in enumerate(boxes):
        for _, left2, top2, right2, bottom2 in boxes[:place]:
            assert left >= right2 or left2 >= right or top >= bottom2 or top2 >= bottom
        inside = (x > left) & (x < right) & (y > top) & (y < bottom)
        inside[i] = False
        assert not inside.any()


@pytest.mark.parametrize(("low", "high"), [(0.0, 1.0), (-198126.0, 47322.0), (1e-9, 3e-9), (5.0, 5.0)])
def test_ticks_are_round_and_enclose_the_range(low: float, high: float) -> None:
    ticks = nice_ticks(low, high)
    assert ticks[0] <= low + 1e-9 * abs(low)
    assert ticks[-1] >= high - 1e-9 * abs(high)
    assert 3 <= len(ticks) <= 9
    steps = np.diff(ticks)
    assert np.allclose(steps, steps[0])


def test_ticks_are_said_shortly() -> None:
    assert [short_number(v) for v in (0.0, 500.0, 25_000.0, -1_200_000.0, 3e9)] == [
        "0",
        "500",
        "25 k",
        "−1.2 M",
        "3 G",
    ]
