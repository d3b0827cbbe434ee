"""From files to a Problem: a folder of tables or one workbook, every fault at once."""

from hubdesign.inputs.new import new_case
from hubdesign.inputs.reference import reference_markdown
from hubdesign.inputs.report import CheckReport, check, listed_faults, listed_warnings, read_case
from hubdesign.inputs.source import input_files

__all__ = [
    "CheckReport",
    "check",
    "input_files",
    "listed_faults",
    "listed_warnings",
    "new_case",
    "read_case",
    "reference_markdown",
]
