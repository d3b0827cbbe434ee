"""`check` on 100 stations and 9,900 O-D rows, and 4,950 geodesics: CPU seconds of a fresh process.

Run it with ``pytest -m benchmark tests/benchmarks/test_check_speed.py -s``; it prints the medians of 3.
"""

from __future__ import annotations

import csv
import random
import resource
import statistics
import subprocess
import sys
from pathlib import Path

import pytest

_DISTANCES = """
import numpy as np
from hubdesign.distances import distance_matrix_km
rng = np.random.default_rng(1)
distance_matrix_km("geodesic", rng.uniform(-60, 60, 100), rng.uniform(-180, 180, 100))
"""


def _cpu_s(*command: str) -> float:
    """Return the CPU seconds of a process from start to end, the interpreter's own included."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL)
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return after.ru_utime - before.ru_utime + after.ru_stime - before.ru_stime


def _write_case(folder: Path) -> None:
    rng = random.Random(1)
    codes = [f"S{i:02d}" for i in range(100)]
    folder.mkdir()

    def write(name: str, header: str, rows: list[list[object]]) -> None:
        with (folder / name).open("w", newline="") as file:
            csv.writer(file).writerows([header.split(), *rows])

    places = [[c, round(rng.uniform(25, 49), 5), round(rng.uniform(-124, -70), 5)] for c in codes]
    write(
        "stations.csv",
        "station lat lon may_be_hub",
        [[*p, "yes" if i < 10 else "no"] for i, p in enumerate(places)],
    )
    od = [
        [a, b, round(rng.uniform(1, 300), 2), round(rng.uniform(40, 300), 2)]
        for a in codes
        for b in codes
        if a != b
    ]
    write("demand.csv", "origin destination volume revenue", od)
    write(
        "fleet.csv",
        "vehicle capacity range_km speed_kmh cost_per_hour",
        [["a-72", 72, 2400, 720, 2400], ["b-220", 220, 7800, 840, 7100]],
    )
    (folder / "settings.toml").write_text(
        '[network]\nmax_transfers = 2\nmax_circuity = 1.4\n[goal]\ngoal = "most-profit"\n'
    )


@pytest.mark.benchmark
def test_check_takes_under_three_seconds(tmp_path: Path) -> None:
    _write_case(tmp_path / "case")
    seconds = [_cpu_s(sys.executable, "-m", "hubdesign", "check", str(tmp_path / "case")) for _ in range(3)]
    print(f"check, 100 stations, 9,900 O-D rows: median {statistics.median(seconds):.2f} s CPU of {seconds}")
    assert statistics.median(seconds) < 3.0


@pytest.mark.benchmark
def test_4950_geodesics_take_under_two_seconds() -> None:
    seconds = [_cpu_s(sys.executable, "-c", _DISTANCES) for _ in range(3)]
    print(f"4,950 geodesics: median {statistics.median(seconds):.2f} s CPU of {seconds}")
    assert statistics.median(seconds) < 2.0
