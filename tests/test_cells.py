"""Text in CSV cells is inert and comes back as it was."""

from __future__ import annotations

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from hubdesign.cells import guard_text, plain_text


@given(st.text() | st.text(alphabet="'=+-@\t\ra"))
@example("'=1")
@example("''=1")
def test_any_text_comes_back_and_starts_no_formula(text: str) -> None:
    cell = guard_text(text)
    assert plain_text(cell) == text
    assert not cell.startswith(("=", "+", "-", "@", "\t", "\r"))


@pytest.mark.parametrize("text", ["NRT", "O'Hare", "'s-Gravenhage", "1-2", "", "a=b", "007"])
def test_ordinary_text_is_left_alone(text: str) -> None:
    assert guard_text(text) == text


@pytest.mark.parametrize("text", ["=1+1", "+cmd", "-2", "@SUM(A1)", "\tx"])
def test_what_looks_like_a_formula_stands_behind_an_apostrophe(text: str) -> None:
    assert guard_text(text) == "'" + text
