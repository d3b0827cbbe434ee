"""A written result is recomputed from its files: sound as written, and every tampered figure is named."""

from __future__ import annotations

import csv
import json
import shutil
from pathlib import Path

import pytest

from hubdesign import run
from hubdesign.comparison import compare
from hubdesign.exports.folder import write_manifest
from hubdesign.exports.write import write_comparison, write_design
from hubdesign.inputs import new_case, read_case
from hubdesign.verify_files import verify_folder


@pytest.fixture(scope="module")
def written(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a result folder of the small case."""
    place = tmp_path_factory.mktemp("verify")
    new_case(place / "case", blank=False, workbook=False)
    write_design(run.design(read_case(place / "case")), place / "result", place / "case")
    return place / "result"


@pytest.fixture
def copy(written: Path, tmp_path: Path) -> Path:
    """Return a copy that a test may tamper with."""
    shutil.copytree(written, tmp_path / "result")
    return tmp_path / "result"


def test_a_result_as_written_is_sound(written: Path) -> None:
    report = verify_folder(written)
    assert report.breaches == ()
    assert report.figures > 500


def test_a_file_that_changed_since_is_named(copy: Path) -> None:
    with (copy / "links.csv").open("a") as stream:
        stream.write("\n")
    assert any("links.csv" in breach for breach in verify_folder(copy).breaches)


def list_anew(folder: Path, kind: str = "design") -> None:
    """Write a manifest that fits what was tampered with."""
    (folder / "manifest.json").unlink()
    write_manifest(folder, kind)


def set_cell(path: Path, column: str, value: str) -> None:
    """Overwrite the first non-blank cell of a column."""
    with path.open(newline="") as stream:
        table = list(csv.reader(stream))
    place = table[0].index(column)
    row = next(row for row in table[1:] if row[place])
    assert row[place] != value
    row[place] = value
    with path.open("w", newline="") as stream:
        csv.writer(stream, lineterminator="\n").writerows(table)


@pytest.mark.parametrize(
    ("name", "column", "value"),
    [
        ("links.csv", "volume_out", "1.5"),
        ("links.csv", "trip_cost", "1.5"),
        ("links.csv", "distance_km", "77.0"),
        ("stations.csv", "transferring_volume", "12345.0"),
        ("stations.csv", "departures", "12345.0"),
        ("vehicles.csv", "block_hours", "0.5"),
        ("vehicles.csv", "used", "99"),
        ("itineraries.csv", "revenue", "3.0"),
        ("itineraries.csv", "hours", "99.0"),
        ("unserved.csv", "volume", "99999.0"),
    ],
)
def test_a_figure_that_does_not_come_out_is_named(copy: Path, name: str, column: str, value: str) -> None:
    set_cell(copy / name, column, value)
    list_anew(copy)
    breaches = verify_folder(copy).breaches
    assert any(name in breach and column in breach for breach in breaches), breaches


def test_departures_that_cannot_carry_the_volume_are_named(copy: Path) -> None:
    fleet = (copy / "inputs/fleet.csv").read_text("utf-8").splitlines()[1].split(",")[0]
    set_cell(copy / "links.csv", f"frequency_{fleet}", "0")
    list_anew(copy)
    assert verify_folder(copy).breaches


@pytest.mark.parametrize(("key", "value"), [("objective", 1.0), ("status", "feasible"), ("gap", 0.5)])
def test_a_changed_answer_is_named(copy: Path, key: str, value: object) -> None:
    path = copy / "summary.json"
    summary = json.loads(path.read_text("utf-8"))
    summary[key] = value
    path.write_text(json.dumps(summary), "utf-8")
    list_anew(copy)
    assert verify_folder(copy).breaches


def test_a_changed_total_and_cost_are_named(copy: Path) -> None:
    path = copy / "summary.json"
    summary = json.loads(path.read_text("utf-8"))
    summary["totals"]["load_factor"] = 0.123
    summary["costs"]["operating"] = 1.0
    path.write_text(json.dumps(summary), "utf-8")
    list_anew(copy)
    told = "\n".join(verify_folder(copy).breaches)
    assert "load_factor" in told
    assert "operating" in told


def test_an_itinerary_that_is_no_candidate_is_told_without_a_traceback(copy: Path) -> None:
    set_cell(copy / "itineraries.csv", "stations", "BRK QQQ")
    list_anew(copy)
    assert any("do not fit the inputs" in breach for breach in verify_folder(copy).breaches)


def test_a_comparison_is_recomputed_with_its_intervals(tmp_path: Path) -> None:
    new_case(tmp_path / "case", blank=False, workbook=False)
    write_comparison(compare(read_case(tmp_path / "case")), tmp_path / "result", tmp_path / "case")
    report = verify_folder(tmp_path / "result")
    assert report.breaches == ()
    assert len(report.parts) == 4
    path = tmp_path / "result/comparison.json"
    summary = json.loads(path.read_text("utf-8"))
    summary["differences"][0]["low"] -= 1000.0
    path.write_text(json.dumps(summary), "utf-8")
    list_anew(tmp_path / "result", "comparison")
    assert any("does not come out" in breach for breach in verify_folder(tmp_path / "result").breaches)
