"""Ctrl-C and SIGTERM keep the best plan so far, with its honest gap."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from hubdesign import errors
from tests.cli.test_commands import change

ROOT = Path(__file__).resolve().parents[2]


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM], ids=["ctrl-c", "sigterm"])
def test_an_interrupted_solve_writes_its_best_plan(number: signal.Signals, tmp_path: Path) -> None:
    from shutil import copytree

    case = tmp_path / "case"
    copytree(ROOT / "inputs/us40", case)
    change(case, "settings.toml", "time_limit_s = 30", "time_limit_s = 600")
    change(case, "settings.toml", "gap = 0.05", "gap = 0.0")
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    command = [sys.executable, "-m", "hubdesign", "design", str(case), "-o", str(tmp_path / "result")]
    process = subprocess.Popen(
        command, stderr=subprocess.PIPE, stdout=subprocess.PIPE, text=True, env=environment
    )
    assert process.stderr is not None
    for line in process.stderr:
        if "best plan" in line and "best plan none yet" not in line:
            break
    started = time.monotonic()
    process.send_signal(number)
    _, told = process.communicate(timeout=120)
    assert process.returncode == errors.EXIT_LIMIT_WITH_DESIGN, told
    assert "keeping the best plan" in told
    assert time.monotonic() - started < 60
    summary = json.loads((tmp_path / "result/summary.json").read_text("utf-8"))
    assert summary["status"] == "feasible"
    assert summary["bound"] >= summary["objective"]
