"""Figures as people read them."""

from __future__ import annotations

import pytest

from hubdesign.answer import Progress
from hubdesign.cli.progress import gap_line
from hubdesign.cli.words import amount, percent


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (None, "-"),
        (0.0, "0"),
        (7, "7"),
        (586.4735, "586.47"),
        (1009.9, "1,009.9"),
        (12345.678, "12,346"),
        (-98765.4, "-98,765"),
        (0.0123456, "0.01235"),
    ],
)
def test_amounts(value: float | None, text: str) -> None:
    assert amount(value) == text


@pytest.mark.parametrize(
    ("share", "text"),
    [(None, "-"), (0.0, "0 %"), (0.00001, "< 0.01 %"), (0.0206, "2.06 %"), (1.0, "100 %"), (12.3, "1,230 %")],
)
def test_percentages(share: float | None, text: str) -> None:
    assert percent(share) == text


def test_the_gap_line_falls_with_the_gap_and_names_both_ends() -> None:
    line = gap_line([Progress(0.0, None, 10.0), Progress(1.0, 5.0, 10.0), Progress(9.0, 9.9, 10.0)])
    bars = line.split("  ")[0]
    assert bars[0] > bars[-1]
    assert line.endswith("100 % -> 1.01 %")
    assert gap_line([Progress(0.0, None, 1.0)]) == ""
