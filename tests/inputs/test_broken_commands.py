"""Every broken case through the commands: exit 1, the faults on stderr, no traceback, nothing written."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from click.testing import CliRunner

from hubdesign.cli import main
from hubdesign.errors import EXIT_BAD_INPUT
from tests.inputs.broken import BROKEN, Broken


def _names(place: Path) -> list[str]:
    return sorted(str(path.relative_to(place)) for path in place.rglob("*"))


@pytest.mark.parametrize("case", BROKEN)
def test_a_broken_case_ends_a_command_with_1_and_writes_nothing(case: Broken, tmp_path: Path) -> None:
    path = case.make(tmp_path)
    before = _names(tmp_path)
    outcome = CliRunner().invoke(main, ["design", str(path), "-o", str(tmp_path / "result"), "--json"])
    assert outcome.exit_code == EXIT_BAD_INPUT, outcome.output
    assert isinstance(outcome.exception, SystemExit)
    for fault in case.faults:
        assert fault in outcome.stderr
    assert "Traceback" not in outcome.output
    assert json.loads(outcome.stdout)["exit_code"] == EXIT_BAD_INPUT
    assert _names(tmp_path) == before


@pytest.mark.parametrize("case", BROKEN[::12])
@pytest.mark.parametrize("command", ["check", "compare"])
def test_every_command_refuses_alike(case: Broken, command: str, tmp_path: Path) -> None:
    path = case.make(tmp_path)
    before = _names(tmp_path)
    target = ["-o", str(tmp_path / "result")] if command == "compare" else []
    outcome = CliRunner().invoke(main, [command, str(path), *target])
    assert outcome.exit_code == EXIT_BAD_INPUT
    for fault in case.faults:
        assert fault in outcome.stderr
    assert _names(tmp_path) == before
