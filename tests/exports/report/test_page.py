"""The page as a file: self-contained, small enough, and inert whatever the inputs are called."""

from __future__ import annotations

import dataclasses
import hashlib
import re
from pathlib import Path

import pytest

from hubdesign.errors import OutputError
from hubdesign.exports.report import (
    page_of,
    render_comparison_report,
    render_design_report,
)
from hubdesign.exports.summary import tabulate_comparison
from hubdesign.exports.write import write_design
from hubdesign.problem import Settings
from hubdesign.results import build_results
from hubdesign.run import Result
from tests.exports.cases import (
    HOSTILE,
    INPUTS,
    comparison_of,
    hand_result,
    hostile_result,
    results_of,
    solved_result,
)
from tests.exports.report.cases import large_result
from tests.exports.report.reading import Element, read_page, read_tables


def page(result: Result) -> str:
    """Return the page of a result."""
    return render_design_report(result, results_of(result), INPUTS.files)


def compared() -> str:
    """Return the page of a comparison."""
    comparison = comparison_of()
    results = {
        entry.structure: build_results(entry.result.network, entry.result.design, entry.result.bill)
        for entry in comparison.entries
        if entry.result is not None
    }
    table = tabulate_comparison(comparison, results)
    return render_comparison_report(comparison, table, dict(results), INPUTS.files)


PAGES = {
    "design": lambda: page(solved_result()),
    "hostile": lambda: page(hostile_result()),
    "by hand": lambda: page(hand_result()),
    "comparison": compared,
}


@pytest.fixture(params=PAGES)
def html(request: pytest.FixtureRequest) -> str:
    """A page."""
    text: str = PAGES[request.param]()
    return text


def test_a_page_asks_nothing_of_any_network(html: str) -> None:
    tree = read_page(html)
    for element in tree.find():
        for name in ("src", "srcset", "action", "poster", "data", "background"):
            assert name not in element.attributes
        for name in ("href", "xlink:href"):
            target = element.attributes.get(name, "#")
            assert target.startswith(("#", "data:,")) or target.endswith("/report.html"), target
    style = "".join(element.text for element in tree.find("style"))
    assert "url(" not in style
    assert "@import" not in style
    assert "default-src 'none'" in html


def test_only_our_script_may_run(html: str) -> None:
    tree = read_page(html)
    assert len(tree.find("script")) == 1
    for element in tree.find():
        assert not [name for name in element.attributes if name.startswith("on")]
        assert not any("javascript:" in value.lower() for value in element.attributes.values())
    policy = next(
        meta.attributes["content"]
        for meta in tree.find("meta")
        if meta.attributes.get("http-equiv") == "Content-Security-Policy"
    )
    assert re.search(r"script-src 'sha256-[\w+/=]+';", policy)


@pytest.mark.parametrize("first", [0, 4])
def test_hostile_names_are_only_names(first: int) -> None:
    result = hostile_result(first)
    html = page(result)
    assert "<script>alert" not in html
    tree = read_page(html)
    names = [row.name for row in result.problem.stations]
    tables = read_tables(tree)
    place = [key for key, _ in tables["stations"].heads].index("name")
    assert [row[place] for row in tables["stations"].rows] == names
    labels = {text.text for text in tree.find("g", class_="labels")[0].find("text")}
    for row in result.problem.stations:
        assert row.name in labels or row.station in labels
    assert tree.find("h1")[0].text == HOSTILE[0]
    # The title is raw text to the reader, whatever stands in it.
    assert result.problem.settings.currency in tree.find("p", class_="lead")[0].text


def test_direction_of_writing_is_kept_within_a_name() -> None:
    tree = read_page(page(hostile_result(4)))
    holders = [
        element
        for element in tree.find()
        for part in element.parts
        if isinstance(part, str) and "\u202e" in part
    ]
    assert len(holders) >= 3
    # A label and a title stand alone; anywhere else a name is isolated from the words around it.
    assert {element.tag for element in holders} <= {"bdi", "text", "title"}


def test_fifteen_stations_and_ninety_nine_hundred_od_rows_fit_their_limits() -> None:
    small, large = large_result(15), large_result(100)
    assert len(large.problem.demands) == 9900
    assert len(page(small).encode("utf-8")) < 400_000
    assert len(page(large).encode("utf-8")) < 3_000_000


def test_without_script_answer_maps_and_tables_are_there(html: str) -> None:
    tree = read_page(html)
    assert tree.find("p", class_="lead")[0].text.strip().endswith(".")
    maps = [svg for box in tree.find("div", class_="map") for svg in box.find("svg")]
    assert maps
    for svg in maps:
        assert svg.find("g", class_="k")
        assert svg.find("g", class_="s")
        assert svg.find("title")
    for name, table in read_tables(tree).items():
        assert table.rows or name == "unserved"
    hidden = [element for element in tree.find() if "hidden" in element.attributes]
    assert {element.tag for element in hidden} <= {"div", "form", "aside"}
    assert not any(element.find("table") or element.find("use") for element in hidden)


def test_every_line_of_a_map_has_its_path_and_every_row_its_line() -> None:
    tree = read_page(page(solved_result()))
    paths = {path.attributes["id"] for path in tree.find("path") if "id" in path.attributes}
    lines = tree.find("g", class_="links")[0].find("g", class_="k")
    for line in lines:
        assert {use.attributes["href"] for use in line.find("use")} <= {f"#{name}" for name in paths}
    assert sorted(int(line.attributes["data-r"]) for line in lines) == list(
        range(len(results_of(solved_result()).links.rows))
    )


def test_every_id_is_there_once_and_every_reference_leads_somewhere(html: str) -> None:
    elements = read_page(html).find()
    ids = [element.attributes["id"] for element in elements if "id" in element.attributes]
    assert len(ids) == len(set(ids))
    for element in elements:
        for name in ("aria-labelledby", "for", "list"):
            if name in element.attributes:
                assert element.attributes[name] in ids
        if element.attributes.get("href", "").startswith("#"):
            assert element.attributes["href"][1:] in ids


def test_wider_lines_carry_more() -> None:
    result = solved_result()
    tree = read_page(page(result))
    volumes = {
        row: (record["volume_out"] or 0.0) + (record["volume_back"] or 0.0)  # type: ignore[operator]
        for row, record in enumerate(results_of(result).links.records())
    }
    lines = [
        (volumes[int(line.attributes["data-r"])], width_of(line))
        for line in tree.find("g", class_="links")[0].find("g", class_="k")
    ]
    widest = max(width for _, width in lines)
    for volume, width in lines:
        assert width == pytest.approx(max(1.0, widest * volume / max(volumes.values())), abs=0.01)


def width_of(line: Element) -> float:
    """Return the width of a line."""
    return float(line.attributes["style"].removeprefix("--w:"))


def test_stations_without_coordinates_are_told_and_none_at_all_gives_no_map() -> None:
    result = solved_result()
    stations = result.problem.stations

    def without(count: int) -> Result:
        blank = tuple(
            dataclasses.replace(row, lat=None, lon=None) if i < count else row
            for i, row in enumerate(stations)
        )
        problem = result.problem.replace(stations=blank)
        lat, lon = result.network.station.lat.copy(), result.network.station.lon.copy()
        lat[:count] = lon[:count] = float("nan")
        station = dataclasses.replace(result.network.station, lat=lat, lon=lon)
        return dataclasses.replace(
            result,
            problem=problem,
            network=dataclasses.replace(result.network, problem=problem, station=station),
        )

    some = read_page(page(without(1)))
    assert f"Without coordinates, so not on the map: {stations[0].station}." in some.text
    assert len(some.find("g", class_="stations")[0].find("g", class_="s")) == len(stations) - 1
    none = read_page(page(without(len(stations))))
    assert not none.find("div", class_="map")
    assert "no map" in none.text
    assert read_tables(none)["links"].rows


def test_the_page_says_the_cautions_the_settings_and_the_hashes(html: str) -> None:
    text = re.sub(r"\s+", " ", read_page(html).text)
    for words in (
        "timetables",
        "rotations",
        "reserves and alternates",
        "extended-range rules",
        "slot limits",
        "traffic rights",
        "crew duty",
        "demand that answers frequency",
        "licensed staff and local rules",
    ):
        assert words in text, words
    for name in Settings.__dataclass_fields__:
        if name != "mode_distance_factor":
            assert name in text, name
    for data in INPUTS.files.values():
        assert hashlib.sha256(data).hexdigest() in text


def test_view_finds_the_page_or_says_that_there_is_none(tmp_path: Path) -> None:
    write_design(hand_result(), tmp_path / "out", INPUTS)
    assert page_of(tmp_path / "out") == (tmp_path / "out" / "report.html").resolve()
    with pytest.raises(OutputError, match=r"report\.html"):
        page_of(tmp_path)
