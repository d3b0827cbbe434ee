"""HiGHS without a word on standard output."""

from __future__ import annotations

from typing import Any


def new_highs(*, threads: int = 1, seed: int = 1) -> Any:
    """Return a silent HiGHS instance.

    Its constructor prints a banner while it enables callbacks, before any option can be set; silencing
    first keeps standard output for results.
    """
    import highspy

    class Silent(highspy.Highs):
        def enableCallbacks(self) -> None:
            self.setOptionValue("output_flag", False)
            super().enableCallbacks()  # type: ignore[no-untyped-call]

    highs: Any = Silent()  # type: ignore[no-untyped-call]
    highs.setOptionValue("threads", threads)
    highs.setOptionValue("random_seed", seed)
    return highs
