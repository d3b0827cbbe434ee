"""Published instances through the front door, within 0.5 of the values their list gives."""

from __future__ import annotations

from pathlib import Path

import pytest

from hubdesign.answer import Status
from hubdesign.inputs import read_case
from hubdesign.run import design
from tests.benchmarks.convert import bench_folder, convert_canad

BENCH = bench_folder()

VALUES = {"c33": 423848, "c41": 429398, "c25_100_10_V_L_5": 14712, "c25_100_30_V_T_5": 365272}


@pytest.mark.skipif(BENCH is None, reason="the published instances are not here (HUBDESIGN_BENCH)")
@pytest.mark.parametrize("name", VALUES)
def test_published_optima_are_proven(name: str, tmp_path: Path) -> None:
    assert BENCH is not None
    problem = read_case(convert_canad(BENCH / "canad" / f"{name}.dow", tmp_path / name))
    result = design(problem).design
    assert result.status is Status.PROVEN
    assert result.objective == pytest.approx(VALUES[name], abs=0.5)
