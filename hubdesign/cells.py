"""Text in CSV cells that a spreadsheet would take for a formula.

A cell that begins with ``=``, ``+``, ``-``, ``@``, a tab or a return is evaluated on opening (CSV injection,
OWASP), so it is written behind an apostrophe; reading takes that one apostrophe away. Text that begins with
apostrophes and such a character gets one more, so nothing is ever lost.
"""

from __future__ import annotations

import re

_FORMULA = re.compile(r"'*[=+\-@\t\r]")
_GUARDED = re.compile(r"'+[=+\-@\t\r]")


def guard_text(text: str) -> str:
    """Return `text` as a CSV cell holds it."""
    return f"'{text}" if _FORMULA.match(text) else text


def plain_text(cell: str) -> str:
    """Return the text of a cell written by :func:`guard_text`."""
    return cell[1:] if _GUARDED.match(cell) else cell
