"""Imports only go down the floors of DEVELOPERS.md, libraries stay in their rooms, start-up is light."""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parents[1] / "hubdesign"

#: Floor of each room; a room may import its own floor and those below.
FLOORS = {
    "errors": 0,
    "units": 0,
    "schema": 0,
    "cells": 0,
    "problem": 1,
    "distances": 2,
    "costs": 2,
    "network": 2,
    "answer": 2,
    "checks": 3,
    "inputs": 3,
    "pricing": 3,
    "rules": 3,
    "itineraries": 4,
    "model": 4,
    "solve": 5,
    "verification": 6,
    "diagnose": 6,
    "run": 7,
    "comparison": 7,
    "results": 7,
    "exports": 8,
    "verify_files": 8,
    "cli": 9,
}

#: Library -> rooms that may import it.
ROOMS_OF = {
    "pyscipopt": {"solve"},
    "highspy": {"solve"},
    "click": {"cli"},
    "rich": {"cli"},
    "geographiclib": {"distances", "exports"},
    "python_calamine": {"inputs"},
    "xlsxwriter": {"inputs", "exports"},
    "shapely": {"exports"},
    "pyogrio": {"exports"},
    "jinja2": {"exports"},
    "airportsdata": {"inputs"},
}


def room_of(path: Path) -> str:
    """Return the room of a module file: its first folder, or its own name."""
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def modules() -> list[Path]:
    """Return every module but the package's own front and its entry."""
    return sorted(
        p for p in PACKAGE.rglob("*.py") if p.name != "__main__.py" and p != PACKAGE / "__init__.py"
    )


def imported(path: Path) -> Iterator[str]:
    """Yield every module name a file imports, wherever in it; for type checking alone does not count."""
    tree = ast.parse(path.read_text("utf-8"))
    skipped = {
        id(inner)
        for node in ast.walk(tree)
        if isinstance(node, ast.If) and ast.unparse(node.test).endswith("TYPE_CHECKING")
        for inner in ast.walk(node)
    }
    for node in ast.walk(tree):
        if id(node) in skipped:
            continue
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module and node.level == 0:
            yield node.module
            if node.module == "hubdesign":
                yield from (f"hubdesign.{alias.name}" for alias in node.names)


@pytest.mark.parametrize("path", modules(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_imports_only_go_down(path: Path) -> None:
    floor = FLOORS[room_of(path)]
    for name in imported(path):
        parts = name.split(".")
        if parts[0] == "hubdesign" and len(parts) > 1 and parts[1] in FLOORS:
            assert FLOORS[parts[1]] <= floor, f"{path.name} imports {name}"
            assert parts[1] != "cli" or room_of(path) == "cli"


@pytest.mark.parametrize("path", modules(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_libraries_stay_in_their_rooms(path: Path) -> None:
    for name in imported(path):
        rooms = ROOMS_OF.get(name.split(".")[0])
        assert rooms is None or room_of(path) in rooms, f"{path.name} imports {name}"


def test_the_floors_stand_in_the_developers_page() -> None:
    page = (PACKAGE.parent / "DEVELOPERS.md").read_text("utf-8")
    for room in FLOORS:
        assert f"`{room}" in page, room


@pytest.mark.parametrize("start", ["import hubdesign", "import hubdesign.cli"])
def test_start_up_is_light(start: str) -> None:
    heavy = (
        "('pyscipopt', 'highspy', 'numpy', 'scipy', 'shapely', 'pandas', 'networkx', 'rich', 'xlsxwriter')"
    )
    script = f"import sys; {start}; print([name for name in {heavy} if name in sys.modules])"
    outcome = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, cwd=PACKAGE.parent
    )
    assert outcome.stdout.strip() == "[]", outcome.stdout + outcome.stderr
