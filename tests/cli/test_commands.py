"""Commands end to end: exit codes, what stands on stdout and stderr, and that failures write nothing."""

from __future__ import annotations

import json
import shutil
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from hubdesign import errors
from hubdesign.answer import Design, Status
from hubdesign.cli import main
from hubdesign.inputs import new_case
from hubdesign.solve.dispatch import solve


def run(*arguments: object) -> Result:
    """Return the outcome of the command line in this process."""
    return CliRunner().invoke(main, [str(argument) for argument in arguments])


@pytest.fixture
def case(tmp_path: Path) -> Path:
    """Return the small case that `new` writes, one thread, a quick limit."""
    folder = tmp_path / "case"
    new_case(folder, blank=False, workbook=False)
    change(folder, "settings.toml", "[solve]", "[solve]\nthreads = 1")
    return folder


def change(folder: Path, name: str, old: str, new: str) -> None:
    """Replace text in a file of a case; it must be there."""
    path = folder / name
    text = path.read_text("utf-8")
    assert old in text
    path.write_text(text.replace(old, new, 1), "utf-8")


def test_design_writes_a_sound_result_and_exits_0(case: Path, tmp_path: Path) -> None:
    outcome = run("design", case, "-o", tmp_path / "result")
    assert outcome.exit_code == 0, outcome.output
    told = " ".join(outcome.stdout.split())
    assert "proven within" in told or "proven: no plan is better" in told
    assert "not an operational approval" in " ".join(outcome.stdout.split())
    assert "gap" in outcome.stderr
    assert max(len(line) for line in outcome.stdout.splitlines()) <= 80
    checked = run("verify", tmp_path / "result")
    assert checked.exit_code == 0, checked.output
    assert "sound" in checked.stdout
    assert "not rechecked" in checked.stdout


def test_json_on_stdout_is_the_summary_as_written(case: Path, tmp_path: Path) -> None:
    outcome = run("design", case, "-o", tmp_path / "result", "--json")
    assert json.loads(outcome.stdout) == json.loads((tmp_path / "result/summary.json").read_text("utf-8"))


def test_a_workbook_gives_the_same_design_as_the_folder(tmp_path: Path) -> None:
    new_case(tmp_path / "case", blank=False, workbook=False)
    new_case(tmp_path / "case.xlsx", blank=False, workbook=True)
    for name in ("case", "case.xlsx"):
        assert run("design", tmp_path / name, "-o", tmp_path / f"{name}-result").exit_code == 0
    first, second = ((tmp_path / f"{n}-result/links.csv").read_text("utf-8") for n in ("case", "case.xlsx"))
    assert first == second


def test_bad_input_exits_1_lists_faults_and_writes_nothing(case: Path, tmp_path: Path) -> None:
    change(case, "stations.csv", "-44.12", "-144.12")
    outcome = run("design", case, "-o", tmp_path / "result")
    assert outcome.exit_code == errors.EXIT_BAD_INPUT
    assert "stations.csv row 2, lat (station BRK)" in outcome.stderr
    assert "Traceback" not in outcome.output
    assert not (tmp_path / "result").exists()
    told = json.loads(run("design", case, "-o", tmp_path / "result", "--json").stdout)
    assert told["status"] == "bad input"
    assert any("lat" in reason for reason in told["reasons"])


def test_usage_exits_2(case: Path) -> None:
    assert run("design", case).exit_code == errors.EXIT_USAGE
    assert run("export", case, "--to", "dxf").exit_code == errors.EXIT_USAGE


def test_infeasible_exits_3_with_the_reason_in_words(case: Path, tmp_path: Path) -> None:
    change(case, "settings.toml", "[goal]", '[goal]\ncost_limit = 10\nunserved = "forbidden"')
    outcome = run("design", case, "-o", tmp_path / "result", "--json")
    assert outcome.exit_code == errors.EXIT_INFEASIBLE, outcome.output
    told = json.loads(outcome.stdout)
    assert told["status"] == "infeasible"
    assert "cost_limit" in " ".join(told["reasons"])
    assert not (tmp_path / "result").exists()


def test_a_reached_limit_with_a_design_exits_4_and_prints_the_gap(
    case: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def cut_short(*arguments: Any, **named: Any) -> Design:
        answer = solve(*arguments, **named)
        assert answer.objective is not None
        return answer.replace(status=Status.FEASIBLE, bound=1.05 * answer.objective)

    monkeypatch.setattr("hubdesign.run.solve", cut_short)
    outcome = run("design", case, "-o", tmp_path / "result")
    assert outcome.exit_code == errors.EXIT_LIMIT_WITH_DESIGN, outcome.output
    assert "proven within 5 % only (asked: 1 %)" in " ".join(outcome.stdout.split())
    assert run("verify", tmp_path / "result").exit_code == 0


def test_our_own_fault_exits_70_and_leaves_the_old_result(
    case: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    target = tmp_path / "result"
    assert run("design", case, "-o", target).exit_code == 0
    before = {path.name: path.read_bytes() for path in target.glob("*.csv")}

    def broken(*arguments: object, **named: object) -> None:
        raise ZeroDivisionError("made to fail")

    monkeypatch.setattr("hubdesign.run.solve", broken)
    outcome = run("design", case, "-o", target)
    assert outcome.exit_code == errors.EXIT_INTERNAL
    assert "made to fail" in outcome.stderr
    assert "Traceback" not in outcome.output
    assert {path.name: path.read_bytes() for path in target.glob("*.csv")} == before


def test_a_plan_that_fails_its_verification_is_never_written(
    case: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def tampered(*arguments: Any, **named: Any) -> Design:
        answer = solve(*arguments, **named)
        assert answer.objective is not None
        return answer.replace(objective=1.01 * answer.objective)

    monkeypatch.setattr("hubdesign.run.solve", tampered)
    outcome = run("design", case, "-o", tmp_path / "result")
    assert outcome.exit_code == errors.EXIT_INTERNAL
    assert "does not come out" in outcome.stderr
    assert not (tmp_path / "result").exists()


def test_check_says_what_it_read_and_solves_nothing(case: Path) -> None:
    outcome = run("check", case)
    assert outcome.exit_code == 0
    assert "no faults (8 stations" in outcome.stdout
    told = json.loads(run("check", case, "--json").stdout)
    assert told["status"] == "ok"
    assert told["counts"]["stations"] == 8


def test_compare_sets_structures_side_by_side(case: Path, tmp_path: Path) -> None:
    outcome = run("compare", case, "-o", tmp_path / "result")
    assert outcome.exit_code in (0, errors.EXIT_LIMIT_WITH_DESIGN), outcome.output
    assert max(len(line) for line in outcome.stdout.splitlines()) <= 80
    summary = json.loads((tmp_path / "result/comparison.json").read_text("utf-8"))
    entries = {row["structure"]: row for row in summary["entries"]}
    assert list(entries) == ["current", "point-to-point", "hub-and-spoke", "mixed"]
    best = max(row["objective"] for name, row in entries.items() if name != "current")
    assert entries["mixed"]["objective"] >= best - 1e-6 * abs(best)
    for row in summary["differences"]:
        (a, above_a), (b, above_b) = entries[row["first"]]["interval"], entries[row["second"]]["interval"]
        assert row["low"] == pytest.approx(a - above_b)
        assert row["high"] == pytest.approx(above_a - b)
        assert row["decided"] == (row["low"] > 0 or row["high"] < 0)
    assert run("verify", tmp_path / "result").exit_code == 0


def test_verify_names_a_figure_that_was_changed(case: Path, tmp_path: Path) -> None:
    assert run("design", case, "-o", tmp_path / "result").exit_code == 0
    links = tmp_path / "result/links.csv"
    links.write_text(links.read_text("utf-8").replace(",air,", ",sea,", 1), "utf-8")
    outcome = run("verify", tmp_path / "result")
    assert outcome.exit_code == errors.EXIT_BAD_INPUT
    assert "links.csv" in outcome.stdout


def test_verify_refuses_a_folder_that_is_no_result(tmp_path: Path) -> None:
    outcome = run("verify", tmp_path)
    assert outcome.exit_code == errors.EXIT_BAD_INPUT
    assert "Traceback" not in outcome.output


def test_one_thread_and_a_finished_solve_repeat_to_the_byte(case: Path, tmp_path: Path) -> None:
    for name in ("first", "second"):
        assert run("design", case, "-o", tmp_path / name).exit_code == 0
    first, second = tmp_path / "first", tmp_path / "second"
    for name in (
        "links.csv",
        "stations.csv",
        "itineraries.csv",
        "unserved.csv",
        "vehicles.csv",
        "links.geojson",
    ):
        assert (first / name).read_bytes() == (second / name).read_bytes(), name
    told = [json.loads((place / "summary.json").read_text("utf-8")) for place in (first, second)]
    for summary in told:
        for name in [name for name in summary if name.endswith("seconds")]:
            del summary[name]
    assert told[0] == told[1]


def test_new_writes_a_case_that_designs_and_never_overwrites(tmp_path: Path) -> None:
    assert run("new", tmp_path / "fresh").exit_code == 0
    assert run("check", tmp_path / "fresh").exit_code == 0
    before = (tmp_path / "fresh/stations.csv").read_bytes()
    assert run("new", tmp_path / "fresh").exit_code == errors.EXIT_BAD_INPUT
    assert (tmp_path / "fresh/stations.csv").read_bytes() == before


def test_targets_that_are_not_ours_are_refused(case: Path, tmp_path: Path) -> None:
    foreign = tmp_path / "foreign"
    foreign.mkdir()
    (foreign / "letter.txt").write_text("mine")
    for target in (foreign, case, case / "inside", case.parent):
        outcome = run("design", case, "-o", target)
        assert outcome.exit_code == errors.EXIT_BAD_INPUT, target
    assert (foreign / "letter.txt").read_text() == "mine"
    shutil.rmtree(foreign)


@pytest.mark.parametrize("command", ["new", "check", "design", "compare", "verify", "view", "export"])
def test_every_command_has_an_example_in_its_help(command: str) -> None:
    for flag in ("-h", "--help"):
        outcome = run(command, flag)
        assert outcome.exit_code == 0
        assert "Example:" in outcome.stdout
        assert f"hubdesign {command}" in outcome.stdout


def test_view_opens_the_page_or_prints_its_path(
    case: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert run("design", case, "-o", tmp_path / "result").exit_code == 0
    asked: list[str] = []
    monkeypatch.setattr("webbrowser.open", lambda address: bool(asked.append(address)))
    outcome = run("view", tmp_path / "result")
    assert outcome.exit_code == 0
    assert str(tmp_path / "result/report.html") in outcome.stdout
    assert "no browser" in outcome.stdout
    assert asked == [(tmp_path / "result/report.html").as_uri()]
    assert run("view", tmp_path).exit_code == errors.EXIT_BAD_INPUT
