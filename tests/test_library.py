"""The public face, used as the README says, printing nothing."""

from __future__ import annotations

import logging
from pathlib import Path

import pytest

import hubdesign
from hubdesign import check, compare, design, read_case, verify, write
from hubdesign.inputs import new_case


def test_a_case_goes_through_the_six_functions(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    new_case(tmp_path / "case", blank=False, workbook=False)
    handlers = list(logging.getLogger().handlers)
    assert check(tmp_path / "case").faults == ()
    problem = read_case(tmp_path / "case")
    before = repr(problem)
    result = design(problem.with_settings(structure="hub-and-spoke", threads=1))
    assert result.gap is not None
    assert result.bill.total_cost > 0
    write(result, tmp_path / "one", inputs=tmp_path / "case")
    assert verify(tmp_path / "one").breaches == ()
    write(compare(problem), tmp_path / "all", inputs=tmp_path / "case")
    assert verify(tmp_path / "all").breaches == ()
    assert repr(problem) == before
    assert logging.getLogger().handlers == handlers
    told = capfd.readouterr()
    assert told.out == ""
    assert told.err == ""


def test_every_public_name_is_callable_and_told() -> None:
    for name in hubdesign.__all__:
        assert name == "__version__" or callable(getattr(hubdesign, name))
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        _ = hubdesign.nothing
