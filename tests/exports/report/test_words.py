"""Figures in words: enough digits, none that says more than is known."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from hubdesign.exports.report.answer import say_bound
from hubdesign.exports.report.words import (
    Format,
    format_for,
    heading,
    say_number,
    say_share,
    unit_words,
)
from hubdesign.problem import Settings
from hubdesign.results import Column
from tests.exports.report.reading import shows

NUMBER = Column("volume", "number", "volume per period", "")


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (-0.0, "0"),
        (20.0, "20"),
        (1234.5, "1,234"),
        (-1234.6, "−1,235"),
        (0.17838, "0.1784"),
        (119.72, "119.7"),
        (1e-12, "1e-12"),
        (2.5e18, "2.5e+18"),
        (1e6, "1,000,000"),
    ],
)
def test_a_figure_shows_about_four_digits(value: float, text: str) -> None:
    assert say_number(value) == text


@pytest.mark.parametrize(
    ("value", "text"),
    [(0.0, "0 %"), (0.0206, "2.06 %"), (1.0, "100 %"), (0.68467, "68.5 %"), (0.0004, "0.0400 %")],
)
def test_a_share_is_shown_in_per_cent(value: float, text: str) -> None:
    assert say_share(value) == text


@given(st.floats(-1e14, 1e14, allow_nan=False))
def test_what_is_shown_is_the_figure_rounded(value: float) -> None:
    assert shows(say_number(value), value)


@given(st.lists(st.floats(-1e9, 1e9, allow_nan=False), min_size=1, max_size=9))
def test_a_column_is_rounded_alike_and_rightly(values: list[float]) -> None:
    style = format_for(NUMBER, values)
    texts = [style(value) for value in values]
    for text, value in zip(texts, values):
        assert shows(text, value)
    assert len({len(text.partition(".")[2]) for text in texts if "e" not in text}) <= 1


@given(st.floats(-1e12, 1e12, allow_nan=False), st.booleans())
def test_a_bound_is_never_rounded_to_promise_more(value: float, maximise: bool) -> None:
    shown = float(say_bound(value, maximise).replace(",", "").replace("−", "-"))
    slack = 1e-6 * abs(value) + 1e-9
    assert shown >= value - slack if maximise else shown <= value + slack


def test_whole_figures_have_no_decimals_and_shares_are_per_cent() -> None:
    assert format_for(NUMBER, [16.0, 8.0, None]) == Format(0)
    assert format_for(Column("share", "number", "share", ""), [0.5])(0.8234) == "82.3"


def test_units_stand_in_the_planners_words() -> None:
    settings = Settings(currency="crowns", volume_unit="seats", period="day")
    assert unit_words("money per period", settings) == "crowns per day"
    assert unit_words("volume-km per period", settings) == "seats-km per day"
    assert unit_words("money per volume-km", settings) == "crowns per seats-km"


def test_a_heading_does_not_say_its_unit_twice() -> None:
    assert heading("distance_km", "km") == "distance"
    assert heading("volume_km", "volume-km per period") == "volume km"
    assert heading("co2_kg", "kg per period") == "CO2"
