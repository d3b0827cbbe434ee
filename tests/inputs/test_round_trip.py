"""Random sound cases come back from a folder, from a European folder and from a workbook as they were."""

from __future__ import annotations

import random
from pathlib import Path
from typing import Any

import pytest

from hubdesign.checks.rules import check_problem
from hubdesign.inputs import check
from hubdesign.inputs.records import field_names
from hubdesign.network import build_network
from hubdesign.problem import CurrentLink, Demand, ListedLink, Problem, Settings, Station, Vehicle
from hubdesign.schema import SETTINGS, TABLES
from tests.inputs.workbooks import save

RECORDS = {
    "stations": "stations",
    "demand": "demands",
    "fleet": "vehicles",
    "links": "links",
    "current": "current",
}


def random_problem(seed: int) -> Problem:
    """Return a case that breaks no rule."""
    rng = random.Random(seed)
    codes = rng.sample(["AAL", "007", "NA", "TRUE", "1E5", "Ålesund", "b-1", "x_y", "=z"], rng.randint(2, 7))
    fleet = rng.random() < 0.7
    modes = ("air", "road") if rng.random() < 0.5 else ("air",)

    def uniform(low: float, high: float) -> float:
        return round(rng.uniform(low, high), 9)  # a workbook keeps 15 digits

    def maybe(value: Any) -> Any:
        return value if rng.random() < 0.5 else None

    def money() -> float:
        return rng.choice([0.0, 12.0, 0.125, 1234.5, 1e-3, 7e6])

    stations = tuple(
        Station(
            code,
            name=rng.choice([code, "Old Town, north", "<b>bold</b>", "semi; colon"]),
            lat=uniform(-80, 80),
            lon=uniform(-180, 180),
            may_be_hub=place == 0 or rng.random() < 0.5,
            hub_fixed_cost=money(),
            hub_capacity=maybe(500.0),
            transfer_minutes=maybe(45.0),
            max_departures=maybe(90.0) if fleet else None,
            max_links=maybe(rng.randint(3, 9)),
            modes=maybe(modes),
            current_hub=rng.random() < 0.3,
        )
        for place, code in enumerate(codes)
    )
    vehicles = tuple(
        Vehicle(
            f"type-{mode}",
            capacity=uniform(1, 300),
            speed_kmh=uniform(20, 900),
            mode=mode,
            available=rng.randint(2, 9),
            owned=rng.randint(0, 2),
            hours_per_vehicle=uniform(20, 160),
            cost_per_hour=money(),
            fuel_kg_per_km=money(),
            co2_per_fuel_kg=3.1,
        )
        for mode in modes
        if fleet
    )
    pairs = [(a, b) for a in codes for b in codes if a != b]
    demands = tuple(
        Demand(
            a,
            b,
            rng.choice([0.0, 7.0, uniform(0.01, 900)]),
            maybe(money()),
            maybe(0.5),
            min_share=rng.choice([0.0, 0.25]),
        )
        for a, b in rng.sample(pairs, rng.randint(1, len(pairs)))
    ) + (Demand(codes[0], codes[0], 5.0),)
    links = tuple(
        ListedLink(
            a,
            b,
            rng.choice(modes),
            rng.choice(["both", "one-way"]),
            maybe(uniform(5, 900)),
            maybe(money()),  # type: ignore[arg-type]
            decision=rng.choice(["may", "never"]),
            capacity=None if fleet else maybe(50.0),  # type: ignore[arg-type]
            max_frequency=maybe(14.0) if fleet else None,
        )
        for a, b in rng.sample([p for p in pairs if p[0] < p[1]], rng.randint(0, len(pairs) // 2))
    )
    current = tuple(
        CurrentLink(
            row.from_, row.to, f"type-{row.mode}" if fleet else None, rng.randint(1, 9) if fleet else None
        )
        for row in links
    )
    settings = Settings(
        title="Größe",
        currency="€",
        fill_coordinates=rng.random() < 0.5,
        structure=rng.choice(["mixed", "hub-and-spoke"]),  # type: ignore[arg-type]
        hubs_max=maybe(3),
        max_circuity=maybe(1.75),
        max_transfers=maybe(2),
        local_volume="via-hub",
        unit_cost_per_km=money(),
        goal="most-profit",
        cost_limit=maybe(1e9),
        seed=rng.randint(0, 99),
        threads=maybe(2),
        mode_distance_factor=tuple((mode, uniform(1, 2)) for mode in modes if fleet and rng.random() < 0.5),
    )
    return Problem(stations, demands, vehicles, links, current, settings)


def _rows(problem: Problem) -> dict[str, list[list[Any]]]:
    tables: dict[str, list[list[Any]]] = {}
    for table, name in RECORDS.items():
        records = getattr(problem, name)
        columns = [column.name for column in TABLES[table].columns]
        if not records:
            continue
        fields = dict(zip(field_names(type(records[0])), records[0].__dataclass_fields__))
        rows = [[getattr(record, fields[column]) for column in columns] for record in records]
        tables[table] = [
            columns,
            *([" ".join(c) if isinstance(c, tuple) else c for c in row] for row in rows),
        ]
    return tables


def _csv(rows: list[list[Any]], separator: str, comma: bool) -> str:
    def text(cell: Any) -> str:
        if cell is None:
            return ""
        if isinstance(cell, bool):
            return "yes" if cell else "no"
        if isinstance(cell, float):
            return repr(cell).replace(".", ",") if comma else repr(cell)
        return '"' + str(cell).replace('"', '""') + '"'

    return "\n".join(separator.join(text(cell) for cell in row) for row in rows) + "\n"


def _toml(settings: Settings) -> str:
    lines = []
    for section in dict.fromkeys(setting.section for setting in SETTINGS):
        lines.append(f"[{section}]")
        for setting in SETTINGS:
            value = getattr(settings, setting.name)
            if setting.section == section and value is not None:
                shown = str(value).lower() if isinstance(value, bool) else repr(value).replace("'", '"')
                lines.append(f"{setting.name} = {shown}")
    lines += [
        f"[mode.{mode}]\ndistance_factor = {factor!r}" for mode, factor in settings.mode_distance_factor
    ]
    return "\n".join(lines)


def _write_folder(place: Path, problem: Problem, separator: str, comma: bool, encoding: str) -> Path:
    place.mkdir()
    for table, rows in _rows(problem).items():
        (place / f"{table}.csv").write_bytes(_csv(rows, separator, comma).encode(encoding))
    (place / "settings.toml").write_text(_toml(problem.settings), encoding="utf-8")
    return place


@pytest.mark.parametrize("seed", range(60))
def test_a_case_comes_back_as_it_was(seed: int, tmp_path: Path) -> None:
    problem = random_problem(seed)
    assert check_problem(problem) == []
    settings = [["section", "setting", "value"]]
    settings += [[s.section, s.name, getattr(problem.settings, s.name)] for s in SETTINGS]  # type: ignore[list-item]
    settings += [
        [f"mode.{mode}", "distance_factor", factor] for mode, factor in problem.settings.mode_distance_factor
    ]  # type: ignore[list-item]
    paths = [
        _write_folder(tmp_path / "plain", problem, ",", False, "utf-8"),
        _write_folder(tmp_path / "european", problem, ";", True, "cp1252"),
        _write_folder(tmp_path / "tabs", problem, "\t", True, "utf-8-sig"),
    ]
    if not any(row.station.startswith("=") for row in problem.stations):  # openpyxl would write a formula
        paths.append(save(tmp_path / "case.xlsx", {**_rows(problem), "settings": settings}))
    for path in paths:
        report = check(path)
        assert [str(fault) for fault in report.faults] == []
        assert report.problem == problem
        build_network(problem)
