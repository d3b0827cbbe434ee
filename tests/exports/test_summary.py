"""summary.json and comparison.json keep the schemas that document them."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import jsonschema
import pytest

from hubdesign.answer import Status
from hubdesign.exports.summary import (
    Seconds,
    comparison_seconds,
    comparison_summary,
    design_summary,
    read_schema,
    tabulate_comparison,
    write_json,
)
from hubdesign.results import COST_COLUMNS, INVESTMENT_COLUMNS, TOTAL_COLUMNS
from tests.exports.cases import comparison_of, hand_result, hostile_result, results_of, solved_result
from tests.results.cases import random_case, solved

SECONDS = Seconds(1.0, 2.0, 3.0, 4.0)


def validate(content: dict[str, Any], name: str) -> None:
    jsonschema.validate(json.loads(json.dumps(content)), read_schema(name))


@pytest.mark.parametrize("name", ["summary", "comparison"])
def test_a_schema_is_one_and_says_what_everything_means(name: str) -> None:
    schema = read_schema(name)
    jsonschema.Draft202012Validator.check_schema(schema)

    def undescribed(node: Any, path: str = "") -> list[str]:
        found = []
        for key, part in node.get("properties", {}).items():
            if "description" not in part and not {"const", "enum"} & set(part):
                found.append(f"{path}/{key}")
            found += undescribed(part, f"{path}/{key}")
        return found

    assert undescribed(schema) == []


def test_the_schema_lists_the_figures_of_the_tables() -> None:
    known = read_schema("summary")["properties"]
    for part, columns in (
        ("costs", COST_COLUMNS),
        ("investment", INVESTMENT_COLUMNS),
        ("totals", TOTAL_COLUMNS),
    ):
        assert list(known[part]["properties"]) == [column.name for column in columns]
        for column in columns:
            assert (
                known[part]["properties"][column.name]["description"] == f"{column.meaning} ({column.unit})"
            )


@pytest.mark.parametrize("make", [hand_result, solved_result, hostile_result])
def test_a_summary_keeps_its_schema(make: Any) -> None:
    result = make()
    content = design_summary(result, results_of(result), SECONDS, ["a note"])
    validate(content, "summary")
    assert list(content["totals"]) == [column.name for column in TOTAL_COLUMNS]
    assert (content["seconds"], content["read_seconds"], content["solve_cpu_seconds"]) == (7.0, 1.0, 3.0)
    assert content["warnings"][0] == "a note"
    assert content["settings"]["goal"]["goal"] == "most-profit"
    assert content["versions"]["hubdesign"]
    assert content["seed"] == 1


def test_a_most_volume_summary_tells_the_cost_with_the_volume_held() -> None:
    network, design, bill = solved(random_case(5, goal="most-volume", cost_limit=150_000.0))
    result = replace(solved_result(), problem=network.problem, network=network, design=design, bill=bill)
    content = design_summary(result, results_of(result), SECONDS)
    validate(content, "summary")
    assert content["objective_unit"] == "units"
    assert content["objective"] == pytest.approx(content["totals"]["volume_carried"])
    assert content["cost_with_volume_held"]["objective"] == pytest.approx(content["costs"]["total"])


def test_a_schema_refuses_what_it_does_not_know() -> None:
    content = design_summary(hand_result(), results_of(hand_result()), SECONDS)
    for broken in (
        {**content, "extra": 1},
        {**content, "status": "optimal"},
        {key: value for key, value in content.items() if key != "bound"},
        {**content, "gap": -1.0},
    ):
        with pytest.raises(jsonschema.ValidationError):
            validate(broken, "summary")


def test_a_gap_of_an_objective_of_zero_is_null() -> None:
    result = hand_result()
    result = replace(result, design=result.design.replace(objective=0.0, bound=5.0))
    content = design_summary(result, results_of(result), SECONDS)
    validate(content, "summary")
    assert content["gap"] is None
    assert content["difference"] == 5.0


def test_a_comparison_keeps_its_schema_and_tells_every_difference() -> None:
    comparison = comparison_of()
    results = {entry.structure: results_of(entry.result) for entry in comparison.entries if entry.result}
    content = comparison_summary(comparison, results, comparison_seconds(comparison, 1.0, 2.0))
    validate(content, "comparison")
    assert content["solve_seconds"] == 3.0
    assert [entry["structure"] for entry in content["entries"]] == [
        "current",
        "point-to-point",
        "hub-and-spoke",
        "mixed",
    ]
    assert [entry["folder"] for entry in content["entries"]][:2] == [None, "point-to-point"]
    assert len(content["differences"]) == 3
    for row in content["differences"]:
        ends = {entry["structure"]: entry["interval"] for entry in content["entries"]}
        (a, above_a), (b, above_b) = ends[row["first"]], ends[row["second"]]
        assert (row["low"], row["high"]) == (a - above_b, above_a - b)
        assert row["decided"] == (row["low"] > 0 or row["high"] < 0)
        assert (row["better"] is None) != row["decided"]


def test_the_table_of_a_comparison_has_every_total_side_by_side() -> None:
    comparison = comparison_of()
    results = {entry.structure: results_of(entry.result) for entry in comparison.entries if entry.result}
    rows = {row["structure"]: row for row in tabulate_comparison(comparison, results).records()}
    assert rows["current"]["note"] == "no station may be a hub"
    assert rows["current"]["total_cost"] is None
    assert (rows["current"]["comparable"], rows["mixed"]["comparable"]) == ("no", "yes")
    for structure, told in results.items():
        assert rows[structure]["total_cost"] == told.costs["total"]
        assert rows[structure]["cost_operating"] == told.costs["operating"]
        assert rows[structure]["total_investment"] == told.investment["total"]
        assert {name: rows[structure][name] for name in told.totals} == told.totals
        assert rows[structure]["status"] in (Status.PROVEN.value, Status.FEASIBLE.value)


def test_no_figure_that_json_does_not_know_is_ever_written(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="not JSON compliant"):
        write_json(tmp_path / "a.json", {"a": float("nan")})
