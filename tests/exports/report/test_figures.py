"""Every figure on the page is that of the CSV tables and the summary, rounded to the digits shown."""

from __future__ import annotations

import csv
import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from hubdesign.cells import plain_text
from hubdesign.exports.report.across import BETWEEN
from hubdesign.exports.report.rows import SHORT
from hubdesign.exports.write import write_comparison, write_design
from hubdesign.run import Result
from tests.exports.cases import INPUTS, comparison_of, hand_result, hostile_result, solved_result
from tests.exports.report.cases import large_result
from tests.exports.report.reading import Element, numbers_in, read_page, read_tables, shows

RESULTS = {
    "hand": hand_result,
    "mixed": solved_result,
    "point-to-point": lambda: solved_result(5, "point-to-point"),
    "hostile": hostile_result,
    "large": lambda: large_result(30),
}


@pytest.fixture(params=RESULTS)
def written(request: pytest.FixtureRequest, tmp_path: Path) -> tuple[Result, Path]:
    """A result and the folder it was written to."""
    result = RESULTS[request.param]()
    write_design(result, tmp_path / "out", INPUTS)
    return result, tmp_path / "out"


def page_in(folder: Path) -> Element:
    """Return the page of a result folder."""
    return read_page((folder / "report.html").read_text("utf-8"))


def read_csv(path: Path) -> list[dict[str, str]]:
    """Return a CSV table as texts."""
    with open(path, encoding="utf-8", newline="") as file:
        return [{name: plain_text(cell) for name, cell in row.items()} for row in csv.DictReader(file)]


def same(shown: str, told: str, share: bool) -> bool:
    """Whether a cell of the page is that of the CSV table."""
    if told == "" or shown == "":
        return shown == told
    try:
        value = float(told)
    except ValueError:
        return shown == SHORT.get(told, told)
    try:
        return shows(shown, 100.0 * value if share else value)
    except ValueError:
        return False


def is_share(key: str) -> bool:
    """Whether a column is a share, which the page shows in per cent."""
    return key.startswith("load_factor") or key in ("share", "share_served", "nonstop_share", "gap")


def test_every_cell_of_every_table_is_the_csvs(written: tuple[Result, Path]) -> None:
    _, folder = written
    tables = read_tables(page_in(folder))
    assert {"links", "stations", "itineraries"} <= set(tables)
    for name, table in tables.items():
        rows = read_csv(folder / f"{name}.csv")
        assert len(table.rows) == len(rows), name
        for shown, told in zip(table.rows, rows):
            assert len(shown) == len(table.heads)
            for (key, _), cell in zip(table.heads, shown):
                text = key in (
                    "station",
                    "name",
                    "from",
                    "to",
                    "origin",
                    "destination",
                    "stations",
                    "vehicle",
                )
                good = cell == told[key] if text else same(cell, told[key], is_share(key))
                assert good, (name, key, cell, told[key])


def test_what_a_table_leaves_out_is_blank_or_zero_throughout(written: tuple[Result, Path]) -> None:
    _, folder = written
    for name, table in read_tables(page_in(folder)).items():
        shown = {key for key, _ in table.heads}
        for row in read_csv(folder / f"{name}.csv"):
            for key, cell in row.items():
                if key not in shown and key != "modes":
                    assert cell in ("", "0", "0.0"), (name, key)


def test_every_figure_of_the_answer_is_in_the_summary(written: tuple[Result, Path]) -> None:
    result, folder = written
    known = list(known_figures(folder, result))
    page = page_in(folder)
    told = [element.text for element in page.find("p", class_="lead") + page.find("dl", class_="points")]
    told += [dd.text for dl in page.find("dl", class_="figures") for dd in dl.find("dd")]
    told += [row.text for table in page.find("table", class_="bars") for row in table.find("td")]
    names = [row.name for row in result.problem.stations] + [row.vehicle for row in result.problem.vehicles]
    names += [row.station for row in result.problem.stations] + [result.problem.settings.title]
    found = 0
    for text in told:
        for name in sorted(filter(None, names), key=len, reverse=True):
            text = text.replace(name, " ")
        for number in numbers_in(text):
            found += 1
            # A bound is rounded outward, by less than one of its last digit.
            assert any(shows(number, value) for value in known) or outward(number, result), (number, text)
    assert found >= 15


def outward(number: str, result: Result) -> bool:
    """Whether a figure is the bound, rounded outward."""
    bound = result.design.bound
    assert bound is not None
    plain = number.replace(",", "").replace("−", "-")
    step = 10.0 ** -len(plain.partition(".")[2])
    shown, least = float(plain), result.problem.settings.goal == "least-cost"
    return 0.0 <= (bound - shown if least else shown - bound) <= step


def known_figures(folder: Path, result: Result) -> Iterator[float]:
    """Yield every figure of the summary, as it is and in per cent, and what the page may count or sum up."""
    summary = json.loads((folder / "summary.json").read_text("utf-8"))
    for value in leaves({name: summary[name] for name in summary if name not in ("settings", "versions")}):
        yield from (value, abs(value), 100.0 * value)
    stations, vehicles = read_csv(folder / "stations.csv"), read_csv(folder / "vehicles.csv")
    yield from (len(stations), sum(row["role"] != "not served" for row in stations))
    yield from (float(row["used"]) for row in vehicles)
    total = summary["costs"]["total"]
    yield from (100.0 * value / total for value in summary["costs"].values())
    sums: dict[str, float] = {}
    for row in read_csv(folder / "itineraries.csv"):
        sums[row["transfers"]] = sums.get(row["transfers"], 0.0) + float(row["volume"])
    yield from sums.values()
    yield from (100.0 * value / sum(sums.values()) for value in sums.values())


def leaves(value: Any) -> Iterator[float]:
    """Yield every number in a JSON value."""
    if isinstance(value, dict):
        for part in value.values():
            yield from leaves(part)
    elif isinstance(value, (int, float)) and not isinstance(value, bool):
        yield float(value)


@pytest.fixture
def compared(tmp_path: Path) -> Path:
    """The folder of a comparison."""
    write_comparison(comparison_of(), tmp_path / "out", INPUTS)
    return tmp_path / "out"


def test_every_figure_side_by_side_is_that_of_comparison_csv(compared: Path) -> None:
    rows = read_csv(compared / "comparison.csv")
    matrix = page_in(compared).find("div", class_="matrix")[0]
    seen = set()
    for row in matrix.find("tr"):
        if "data-k" not in row.attributes:
            continue
        key = row.attributes["data-k"]
        seen.add(key)
        cells = [cell.text for cell in row.find("td")][:-1]
        assert len(cells) == len(rows)
        for cell, told in zip(cells, rows):
            assert same(cell, told[key], is_share(key)), (key, cell, told[key])
    for key, cell in rows[1].items():
        if key not in seen and key not in ("structure", "status", "comparable", "note"):
            assert all(row[key] in ("", "0", "0.0") for row in rows), (key, cell)


def test_every_cell_over_all_structures_is_that_of_its_own_csv(compared: Path) -> None:
    tables = read_tables(page_in(compared))
    groups = [name for name in ("point-to-point", "hub-and-spoke", "mixed") if (compared / name).is_dir()]
    assert len(groups) == 3
    for group in groups:
        links = {frozenset((row["from"], row["to"])): row for row in read_csv(compared / group / "links.csv")}
        stations = {row["station"]: row for row in read_csv(compared / group / "stations.csv")}
        opened = 0
        for name, known in (("links", links), ("stations", stations)):
            table = tables[name]
            for row in table.rows:
                cells = {key: cell for (key, g), cell in zip(table.heads, row) if g in ("", group)}
                key = frozenset((cells["from"], cells["to"])) if name == "links" else cells["station"]
                if key not in known:
                    assert cells["role"] == ""
                    continue
                told = known[key]
                opened += name == "links"
                turned = name == "links" and cells["from"] != told["from"]
                for column, cell in cells.items():
                    if column in ("from", "to", "station", "name"):
                        continue
                    wanted = column
                    if turned and column.endswith(("_out", "_back")):
                        stem, _, end = column.rpartition("_")
                        wanted = f"{stem}_{'back' if end == 'out' else 'out'}"
                    assert same(cell, told[wanted], is_share(column)), (group, column, cell, told[wanted])
        assert opened == len(links)


def test_the_od_table_over_all_structures_holds_every_itinerary(compared: Path) -> None:
    table = read_tables(page_in(compared))["od"]
    for group in ("point-to-point", "hub-and-spoke", "mixed"):
        ways: dict[tuple[str, str], set[str]] = {}
        carried: dict[tuple[str, str], float] = {}
        for row in read_csv(compared / group / "itineraries.csv"):
            pair = row["origin"], row["destination"]
            ways.setdefault(pair, set()).add(row["stations"])
            carried[pair] = carried.get(pair, 0.0) + float(row["volume"])
        for row in table.rows:
            cells = {key: cell for (key, g), cell in zip(table.heads, row) if g in ("", group)}
            pair = cells["origin"], cells["destination"]
            assert set(filter(None, cells["stations"].split(BETWEEN))) == ways.get(pair, set())
            assert shows(cells["carried"], carried.get(pair, 0.0))
