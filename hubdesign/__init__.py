"""Design a carrier's network: which links to operate, which stations act as hubs, with a proven bound.

The whole public face, usable from a notebook::

    from hubdesign import read_case, check, design, compare, verify, write

    problem = read_case("inputs/islands")
    result = design(problem)
    write(result, "outputs/islands", inputs="inputs/islands")

Nothing here prints, configures logging or changes what it is given. Importing is light: the solvers are
loaded by the first call that needs them.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"

if TYPE_CHECKING:
    from hubdesign.comparison import compare
    from hubdesign.exports.write import write
    from hubdesign.inputs import check, read_case
    from hubdesign.run import design
    from hubdesign.verify_files import verify_folder as verify

__all__ = ["__version__", "check", "compare", "design", "read_case", "verify", "write"]

_HOMES = {
    "check": ("hubdesign.inputs", "check"),
    "compare": ("hubdesign.comparison", "compare"),
    "design": ("hubdesign.run", "design"),
    "read_case": ("hubdesign.inputs", "read_case"),
    "verify": ("hubdesign.verify_files", "verify_folder"),
    "write": ("hubdesign.exports.write", "write"),
}


def __getattr__(name: str) -> Any:
    """Load a public function on first use (PEP 562)."""
    if name not in _HOMES:
        raise AttributeError(f"module 'hubdesign' has no attribute {name!r}")
    module, function = _HOMES[name]
    return getattr(import_module(module), function)
