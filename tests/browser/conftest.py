"""One browser and one set of pages for all tests of this room."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from hubdesign.exports.write import write_comparison, write_design
from hubdesign.inputs import read_case
from tests.browser.chrome import Chrome, started
from tests.exports.cases import INPUTS, comparison_of, hostile_result, solved_result
from tests.exports.report.cases import large_result, star_result

READY = Path(__file__).parents[2] / "inputs"


@pytest.fixture(scope="session")
def chrome(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Chrome]:
    """A headless browser."""
    with started(tmp_path_factory.mktemp("profile")) as browser:
        yield browser


class Folders:
    """Result folders, written when first asked for."""

    def __init__(self, place: Path) -> None:
        self._place = place

    def __call__(self, name: str) -> Path:
        """Return the folder of a result: a ready case, or solved, hostile, large, compared."""
        folder = self._place / name
        if not folder.exists():
            if name == "compared":
                write_comparison(comparison_of(), folder, INPUTS)
            elif name in ("solved", "hostile", "large"):
                make = {"solved": solved_result, "hostile": hostile_result, "large": large_result}[name]
                write_design(make(), folder, INPUTS)
            else:
                write_design(star_result(read_case(READY / name)), folder, READY / name)
        return folder


@pytest.fixture(scope="session")
def folders(tmp_path_factory: pytest.TempPathFactory) -> Folders:
    """The results that pages are shown of."""
    return Folders(tmp_path_factory.mktemp("results"))
