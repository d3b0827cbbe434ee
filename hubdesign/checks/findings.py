"""Faults and warnings as they are gathered, and as they are listed."""

from __future__ import annotations

import difflib
from collections.abc import Collection, Iterable

from hubdesign.errors import Fault

#: Faults of one rule that are listed; the rest is counted.
LISTED_PER_RULE = 20


class Findings:
    """Gathers faults, warnings and what was said of file formats."""

    def __init__(self) -> None:
        self.faults: list[Fault] = []
        self.warnings: list[Fault] = []
        self._formats: dict[str, list[str]] = {}

    def fault(self, where: str, what: str, cure: str, rule: str) -> None:
        """Note something that must be put right."""
        self.faults.append(Fault(where, what, cure, rule))

    def warn(self, where: str, what: str, cure: str, rule: str) -> None:
        """Note something suspicious."""
        self.warnings.append(Fault(where, what, cure, rule))

    def note_format(self, what: str, label: str) -> None:
        """Note a habit of a file that was read right; files of one habit are said together."""
        self._formats.setdefault(what, []).append(label)

    def all_warnings(self) -> list[Fault]:
        """Return what was said of the formats, then the warnings."""
        said = [Fault(", ".join(labels), what, "", "file format") for what, labels in self._formats.items()]
        return said + self.warnings


def listed(faults: Iterable[Fault]) -> list[str]:
    """Return the sentences by rule in order of appearance, at most 20 a rule, then how many more."""
    by_rule: dict[str, list[Fault]] = {}
    for fault in faults:
        by_rule.setdefault(fault.rule, []).append(fault)
    lines: list[str] = []
    for rule, group in by_rule.items():
        lines += [str(fault) for fault in group[:LISTED_PER_RULE]]
        if len(group) > LISTED_PER_RULE:
            lines.append(f"... and {len(group) - LISTED_PER_RULE:,} more like these ({rule or 'same rule'})")
    return lines


def nearest(name: str, known: Collection[str], likeness: float = 0.7) -> str:
    """Return `did you mean X?` for the nearest known name, "" where none is near (`likeness` 0..1)."""
    lowered = {entry.lower(): entry for entry in known}
    found = difflib.get_close_matches(name.lower()[:64], lowered, 1, likeness)
    return f"did you mean {lowered[found[0]]}?" if found else ""


def some(names: Iterable[str], at_most: int = 5) -> str:
    """Return names in a row, at most `at_most`, then how many more."""
    names = list(names)
    text = ", ".join(names[:at_most])
    return text if len(names) <= at_most else f"{text} and {len(names) - at_most:,} more"
