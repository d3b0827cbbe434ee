"""Exceptions and exit codes.

Every error a user can meet derives from :class:`HubdesignError` and carries the exit code of the command
line; each is also the built-in exception a Python caller would expect.
"""

from __future__ import annotations

from dataclasses import dataclass

EXIT_PROVEN = 0
EXIT_BAD_INPUT = 1
EXIT_USAGE = 2
EXIT_INFEASIBLE = 3
EXIT_LIMIT_WITH_DESIGN = 4
EXIT_LIMIT_WITHOUT_DESIGN = 5
EXIT_INTERNAL = 70


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing wrong with the inputs, in words a planner can act on.

    Attributes
    ----------
    where
        File or sheet, with row (as a spreadsheet numbers it) and column where there are any:
        ``stations.csv row 7, lat (station KLO)``.
    what
        The original value and what is wrong with it: ``151.2 is outside -90..90``.
    cure
        What to do about it; may be empty.
    rule
        Short name of the rule that was broken; faults of one rule are listed together.
    """

    where: str
    what: str
    cure: str = ""
    rule: str = ""

    def __str__(self) -> str:
        return f"{self.where}: {self.what}" + (f"; {self.cure}" if self.cure else "")


class HubdesignError(Exception):
    """Root of the tree."""

    exit_code = EXIT_INTERNAL


class InputError(HubdesignError, ValueError):
    """The inputs hold faults; all of them are in `faults`."""

    exit_code = EXIT_BAD_INPUT

    def __init__(self, faults: list[Fault] | tuple[Fault, ...]) -> None:
        self.faults = tuple(faults)
        super().__init__("\n".join(str(fault) for fault in self.faults))


class OutputError(HubdesignError, OSError):
    """The result folder cannot or must not be written (or is not a result of ours)."""

    exit_code = EXIT_BAD_INPUT


class ExtraMissingError(HubdesignError, ImportError):
    """An optional dependency is not installed."""

    exit_code = EXIT_USAGE


class UnsolvedError(HubdesignError, RuntimeError):
    """There is no design to give: `reasons` say why, in planner's words."""

    def __init__(self, reasons: list[str] | tuple[str, ...]) -> None:
        self.reasons = tuple(reasons)
        super().__init__("\n".join(self.reasons))


class InfeasibleError(UnsolvedError):
    """No design obeys every rule."""

    exit_code = EXIT_INFEASIBLE


class NoPlanError(UnsolvedError):
    """A limit was reached before any design was found."""

    exit_code = EXIT_LIMIT_WITHOUT_DESIGN


class InternalError(HubdesignError, RuntimeError):
    """A fault of the program itself; nothing is written."""

    exit_code = EXIT_INTERNAL


class VerificationError(InternalError):
    """A plan failed its own recomputation; `breaches` say where."""

    def __init__(self, breaches: list[str] | tuple[str, ...]) -> None:
        self.breaches = tuple(breaches)
        super().__init__("\n".join(self.breaches))
