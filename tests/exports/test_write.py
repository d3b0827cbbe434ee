"""A written result: which files, the inputs byte for byte, the same bytes from run to run."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from hubdesign import run
from hubdesign.answer import Design, Status
from hubdesign.comparison import Comparison
from hubdesign.errors import OutputError
from hubdesign.exports.folder import changed_files, claim_target, read_manifest
from hubdesign.exports.gis import FORMATS, export_gis
from hubdesign.exports.swap import free_name, record_of
from hubdesign.exports.write import input_copy, read_inputs, write_comparison, write_design
from hubdesign.inputs import read_case
from hubdesign.pricing import price
from hubdesign.verify_files import verify_folder
from tests.exports.cases import (
    HOSTILE,
    INPUTS,
    comparison_of,
    hand_result,
    hostile_result,
    placeless_result,
    solved_result,
)

ROOT = Path(__file__).parents[2]

DESIGN_FILES = {
    "itineraries.csv",
    "links.csv",
    "links.geojson",
    "progress.csv",
    "stations.csv",
    "stations.geojson",
    "summary.json",
    "tables.xlsx",
    "unserved.csv",
    "vehicles.csv",
    "inputs/settings.toml",
    "inputs/stations.csv",
}


def test_a_design_folder_holds_the_promised_files(tmp_path: Path) -> None:
    written = write_design(solved_result(), tmp_path / "out", INPUTS, 0.25)
    assert set(written) >= DESIGN_FILES
    assert changed_files(tmp_path / "out") == []
    assert read_manifest(tmp_path / "out").kind == "design"
    summary = json.loads((tmp_path / "out" / "summary.json").read_text("utf-8"))
    assert summary["read_seconds"] == 0.25
    assert summary["solve_seconds"] == 1.0
    assert 0.0 < summary["write_seconds"] < 60.0


def test_the_inputs_are_copied_byte_for_byte(tmp_path: Path) -> None:
    case = tmp_path / "case"
    case.mkdir()
    odd = b"\xef\xbb\xbfstation;name\r\nA;\xe4\r\n"
    (case / "stations.csv").write_bytes(odd)
    (case / "settings.toml").write_bytes(b"[case]\r\n")
    (case / "demand_matrix.csv").write_bytes(b"x")
    (case / "README.md").write_bytes(b"not read, not copied")
    write_design(hand_result(), tmp_path / "out", case)
    copied = {path.name: path.read_bytes() for path in (tmp_path / "out" / "inputs").iterdir()}
    assert copied == {"stations.csv": odd, "settings.toml": b"[case]\r\n", "demand_matrix.csv": b"x"}
    assert input_copy(tmp_path / "out") == tmp_path / "out" / "inputs"


def test_a_workbook_is_copied_as_it_is(tmp_path: Path) -> None:
    book = tmp_path / "case" / "my case.xlsx"
    book.parent.mkdir()
    book.write_bytes(b"PK\x03\x04")
    write_design(hand_result(), tmp_path / "out", book)
    assert input_copy(tmp_path / "out") == tmp_path / "out" / "inputs" / "my case.xlsx"
    assert input_copy(tmp_path / "out").read_bytes() == b"PK\x03\x04"


def test_what_was_read_is_copied_even_where_the_file_changes_meanwhile(tmp_path: Path) -> None:
    case = tmp_path / "case"
    case.mkdir()
    (case / "stations.csv").write_bytes(b"as solved")
    read = read_inputs(case)
    (case / "stations.csv").write_bytes(b"edited during the solve")
    write_design(hand_result(), tmp_path / "out", read)
    assert (tmp_path / "out" / "inputs" / "stations.csv").read_bytes() == b"as solved"


def test_a_target_that_holds_the_inputs_is_refused(tmp_path: Path) -> None:
    (tmp_path / "case").mkdir()
    (tmp_path / "case" / "stations.csv").write_bytes(b"mine")
    for target in (tmp_path, tmp_path / "case", tmp_path / "case" / "out"):
        with pytest.raises(OutputError):
            write_design(hand_result(), target, tmp_path / "case")
    assert [path.name for path in tmp_path.iterdir()] == ["case"]


def test_a_claim_held_during_the_solve_is_used_and_keeps_others_out(tmp_path: Path) -> None:
    with claim_target(tmp_path / "out") as claim:
        with pytest.raises(OutputError, match="another run"):
            write_design(hand_result(), tmp_path / "out", INPUTS)
        write_design(hand_result(), tmp_path / "out", INPUTS, claim=claim)
    assert changed_files(tmp_path / "out") == []


def without_times(folder: Path) -> dict[str, bytes]:
    """Return the files of a result with the time fields blanked, and what is hashed from them left out."""
    found = {}
    for path in sorted(folder.rglob("*")):
        name = path.relative_to(folder).as_posix()
        if not path.is_file():
            continue
        content = path.read_bytes()
        if path.name in ("summary.json", "comparison.json"):
            content = re.sub(rb'("(?:\w+_)?seconds": )[0-9.e-]+', rb"\1", content)
        if path.name == "progress.csv":
            content = re.sub(rb"(?m)^[0-9.e-]+,", b",", content)
        if path.name == "report.html":
            content = re.sub(rb"(?s)<!--time-->.*?<!--/time-->", b"", content)
        if path.name == "manifest.json":
            content = re.sub(
                rb'("(?:.*/)?(?:(?:summary|comparison|manifest).json|progress.csv|report.html)": )"\w+"',
                rb"\1",
                content,
            )
        found[name] = content
    return found


@pytest.mark.parametrize("make", [solved_result, hostile_result])
def test_the_same_design_gives_the_same_bytes_but_for_time_fields(tmp_path: Path, make: Any) -> None:
    result = make()
    write_design(result, tmp_path / "a", INPUTS, 0.1)
    later = tuple(replace(row, seconds=row.seconds + 1.5) for row in result.design.progress)
    slower = replace(result, solve_s=2.0, cpu_s=3.0, design=result.design.replace(progress=later))
    write_design(slower, tmp_path / "b", INPUTS, 0.7)
    first, second = without_times(tmp_path / "a"), without_times(tmp_path / "b")
    assert first == second
    assert (tmp_path / "a" / "summary.json").read_bytes() != (tmp_path / "b" / "summary.json").read_bytes()


def test_a_comparison_holds_a_whole_result_for_each_structure(tmp_path: Path) -> None:
    written = set(write_comparison(comparison_of(), tmp_path / "out", INPUTS, 0.5))
    assert {"comparison.csv", "comparison.json", "tables.xlsx", "inputs/settings.toml"} <= written
    for structure in ("point-to-point", "hub-and-spoke", "mixed"):
        assert {f"{structure}/{name}" for name in (*DESIGN_FILES, "manifest.json")} <= written
        assert changed_files(tmp_path / "out" / structure) == []
        summary = json.loads((tmp_path / "out" / structure / "summary.json").read_text("utf-8"))
        assert summary["structure"] == structure
    assert not (tmp_path / "out" / "current").exists()
    assert read_manifest(tmp_path / "out").kind == "comparison"
    assert changed_files(tmp_path / "out") == []
    write_comparison(comparison_of(), tmp_path / "out", INPUTS)  # and is replaced like any result of ours


def test_the_same_comparison_gives_the_same_bytes_but_for_time_fields(tmp_path: Path) -> None:
    for name in ("a", "b"):
        write_comparison(comparison_of(), tmp_path / name, INPUTS)
    assert without_times(tmp_path / "a") == without_times(tmp_path / "b")


def test_a_comparison_without_any_design_writes_nothing(tmp_path: Path) -> None:
    full = comparison_of()
    with pytest.raises(OutputError, match="no structure has a design"):
        write_comparison(Comparison(full.problem, full.entries[:1]), tmp_path / "out", INPUTS)
    assert list(tmp_path.iterdir()) == []


def test_a_note_of_a_comparison_stands_in_the_summary_of_its_structure(tmp_path: Path) -> None:
    full = comparison_of()
    noted = replace(full.entries[1], note="not comparable: leaves 5 units unserved", comparable=False)
    write_comparison(Comparison(full.problem, (noted, *full.entries[2:])), tmp_path / "out", INPUTS)
    summary = json.loads((tmp_path / "out" / "point-to-point" / "summary.json").read_text("utf-8"))
    assert summary["warnings"] == ["not comparable: leaves 5 units unserved"]


@pytest.mark.parametrize("size_kb", [16, 40])
def test_a_disk_that_fills_up_during_the_writing_is_said(tmp_path: Path, size_kb: int) -> None:
    """A memory disk in a mount namespace of its own: too small for the tables, or for the workbook."""
    if shutil.which("unshare") is None:
        pytest.skip("no unshare command: a small disk cannot be mounted")
    script = (
        "import sys; from pathlib import Path\n"
        "from tests.exports.cases import INPUTS, solved_result\n"
        "from hubdesign.errors import OutputError\n"
        "from hubdesign.exports.write import write_design\n"
        "try:\n    write_design(solved_result(), Path(sys.argv[1]) / 'out', INPUTS)\n"
        "except OutputError as error:\n    print(error)\n"
        "print(*Path(sys.argv[1]).iterdir())\n"
    )
    mount = f'mount -t tmpfs -o size={size_kb}k none "$2" && exec "$0" -c "$1" "$2"'
    command = [
        "unshare",
        "--map-root-user",
        "--mount",
        "sh",
        "-c",
        mount,
        sys.executable,
        script,
        str(tmp_path),
    ]
    done = subprocess.run(command, capture_output=True, text=True, check=False, cwd=ROOT)
    if done.returncode != 0 and "Traceback" not in done.stderr:
        pytest.skip(f"a small disk cannot be mounted here: {done.stderr.strip()}")
    assert done.returncode == 0, done.stderr
    said, left = done.stdout.splitlines()
    assert said == f"{tmp_path}/out: the disk is full; make room or choose another disk; nothing was written"
    assert left == ""


@pytest.fixture(scope="module")
def case(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Four towns whose codes and types look like formulas and tags."""
    folder = tmp_path_factory.mktemp("case")
    names = [name.replace('"', '""') for name in HOSTILE]
    rows = [
        f'=1+1,"{names[0]}",10,170,yes',
        f'<b>&,"{names[4].split(chr(0x202E))[0]}",-5,179,no',
        f'-2+3,"{names[3]}",0,-175,no',
        f'@SUM,"{names[6]}",12,-170,no',
    ]
    (folder / "stations.csv").write_text("station,name,lat,lon,may_be_hub\n" + "\n".join(rows), "utf-8")
    codes = [row.split(",")[0] for row in rows]
    pairs = [(a, b) for a in codes for b in codes if a != b]
    demand = [f"{a},{b},{30 + 9 * place},400" for place, (a, b) in enumerate(pairs)]
    (folder / "demand.csv").write_text("origin,destination,volume,revenue\n" + "\n".join(demand), "utf-8")
    fleet = "vehicle,capacity,speed_kmh,cost_per_hour\n+cmd,40,500,1500\n@x,90,600,2900\n"
    (folder / "fleet.csv").write_text(fleet, "utf-8")
    settings = '[goal]\ngoal = "most-profit"\n[solve]\ngap = 0.05\ntime_limit_s = 10\nthreads = 1\n'
    (folder / "settings.toml").write_text(settings, "utf-8")
    return folder


def test_a_result_full_of_formulas_and_tags_is_recomputed_from_its_files(case: Path, tmp_path: Path) -> None:
    result = run.design(read_case(case))
    write_design(result, tmp_path / "out", case)
    report = verify_folder(tmp_path / "out")
    assert report.breaches == ()
    assert report.figures > 300
    assert len(result.design.links) > 2


def test_a_finished_solve_on_one_thread_gives_the_same_bytes_twice(case: Path, tmp_path: Path) -> None:
    for name in ("a", "b"):
        write_design(run.design(read_case(case)), tmp_path / name, case)
    first, second = without_times(tmp_path / "a"), without_times(tmp_path / "b")
    assert first == second


def test_a_reader_first_finishes_the_swap_of_a_killed_run(case: Path, tmp_path: Path) -> None:
    write_design(run.design(read_case(case)), tmp_path / "out", case)
    new, old = (free_name(tmp_path / "out", word) for word in ("new", "old"))
    (tmp_path / "out").rename(new)
    record_of(tmp_path / "out").write_text(json.dumps({"new": new.name, "old": old.name}))
    assert verify_folder(tmp_path / "out").breaches == ()
    assert [path.name for path in tmp_path.iterdir()] == ["out"]


def test_a_design_that_serves_nothing_is_written_like_any_other(tmp_path: Path) -> None:
    empty = Design(Status.PROVEN, objective=-625.0, bound=-625.0)
    result = hand_result()
    result = replace(result, design=empty, bill=price(result.network, empty))
    write_design(result, tmp_path / "out", INPUTS)
    links = json.loads((tmp_path / "out" / "links.geojson").read_text("utf-8"))
    assert links == {"type": "FeatureCollection", "features": []}
    for to in FORMATS:
        export_gis(tmp_path / "out", to, tmp_path / to)


def test_a_design_without_a_fleet_and_without_coordinates_is_written_like_any_other(tmp_path: Path) -> None:
    write_design(placeless_result(), tmp_path / "out", INPUTS)
    assert (tmp_path / "out" / "vehicles.csv").read_text("utf-8").count("\n") == 1
    assert "bbox" not in json.loads((tmp_path / "out" / "links.geojson").read_text("utf-8"))
