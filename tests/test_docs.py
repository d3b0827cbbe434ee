"""README, help and code cannot drift apart."""

from __future__ import annotations

import re
from pathlib import Path

import click

from hubdesign import errors
from hubdesign.cli import main
from hubdesign.inputs import reference_markdown

ROOT = Path(__file__).resolve().parents[1]
README = (ROOT / "README.md").read_text("utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text("utf-8")


def test_the_input_reference_is_the_schema() -> None:
    assert reference_markdown().strip() in README


def test_every_command_stands_in_the_readme_and_the_other_way_round() -> None:
    told = set(re.findall(r"^\| `([a-z]+) [A-Z]", README, flags=re.MULTILINE))
    assert told == set(main.commands)


def test_every_option_of_the_readme_exists() -> None:
    known = {option for command in main.commands.values() for p in command.params for option in p.opts}
    ours = [line for line in README.splitlines() if line.startswith(("hubdesign ", "| `"))]
    for option in re.findall(r"(?<![\w-])(--[a-z-]+)", "\n".join(ours)):
        assert option in known, option


def test_exit_codes_of_the_readme_are_those_of_the_code() -> None:
    told = {int(code) for code in re.findall(r"^\| (\d+) \|", README, flags=re.MULTILINE)}
    assert told == {value for name, value in vars(errors).items() if name.startswith("EXIT_")}


def test_every_file_of_a_result_stands_in_the_readme() -> None:
    from hubdesign.results import TABLE_COLUMNS

    for name in (
        *(f"{table}.csv" for table in TABLE_COLUMNS),
        "summary.json",
        "links.geojson",
        "tables.xlsx",
    ):
        assert name in README, name


def test_the_two_first_commands_are_one_line_each() -> None:
    lines = [line for line in README.splitlines() if line.startswith("python3 -m venv")]
    assert len(lines) == 2
    assert "hubdesign design inputs/islands -o outputs/islands" in lines[0]
    assert "pytest" in lines[1]


def test_the_ci_script_runs_the_test_command_of_the_readme() -> None:
    script = (ROOT / ".ci/run").read_text("utf-8")
    line = next(
        line for line in README.splitlines() if line.startswith("python3 -m venv") and "pytest" in line
    )
    for step in line.split(" && "):
        assert step in script, step


def test_every_dependency_is_explained() -> None:
    project = (ROOT / "pyproject.toml").read_text("utf-8")
    block = project[project.index("dependencies = [") : project.index("[project.scripts]")]
    for name in re.findall(r'^    "([a-z0-9-]+)', block, flags=re.MULTILINE | re.IGNORECASE):
        assert f"| {name} " in DEVELOPERS, name


def test_help_of_each_command_fits_and_explains_its_options() -> None:
    for name, command in main.commands.items():
        assert isinstance(command, click.Command)
        assert command.help, name
        for parameter in command.params:
            if isinstance(parameter, click.Option):
                assert parameter.help, f"{name} {parameter.name}"
