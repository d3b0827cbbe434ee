"""Codes that name a record of another table."""

from __future__ import annotations

from hubdesign.checks.findings import nearest
from hubdesign.checks.places import Case
from hubdesign.errors import Fault

#: Two codes of three characters that share two are this alike.
_CODE_LIKENESS = 0.6
_MOST_SUGGESTIONS = 200


def unknown_code(
    case: Case, table: str, index: int, column: str, code: str, target: str
) -> tuple[Fault, ...]:
    """Return the fault of a code that the table `target` (stations or fleet) does not hold.

    Silent where that table could not be read, or where the code stands in a row of it that is at fault.
    """
    known = case.station_codes if target == "stations" else case.vehicle_codes
    if code in known or target in case.places.unread or code in case.places.stray.get(target, ()):
        return ()
    cure = _suggestion(case, code, known, target)
    return case.row(table, index, column, f"{code} is not in {case.places.label(target)}", cure)


def _suggestion(case: Case, code: str, known: frozenset[str], target: str) -> str:
    """Return the cure for an unknown code: the station of that name, the nearest code, or to add it."""
    found = case.suggestions.get((target, code))
    if found is None and len(case.suggestions) < _MOST_SUGGESTIONS:
        named = [row.station for row in case.problem.stations if target == "stations" and row.name == code]
        found = f"write its code {named[0]}" if named else nearest(code, known, _CODE_LIKENESS)
        case.suggestions[target, code] = found
    return found or "add it there"
