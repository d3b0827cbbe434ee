"""HiGHS without a word on standard output."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

Floats = NDArray[np.float64]


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


def build_lp(
    matrix: sparse.csr_array, cost: Floats, columns: tuple[Floats, Floats], rows: tuple[Floats, Floats]
) -> Any:
    """Return a HighsLp that minimises `cost` over columns and rows within (lower, upper)."""
    import highspy

    lp: Any = highspy.HighsLp()
    lp.num_col_, lp.num_row_ = len(cost), matrix.shape[0]
    lp.col_cost_ = cost
    lp.col_lower_, lp.col_upper_ = (finite(side) for side in columns)
    lp.row_lower_, lp.row_upper_ = (finite(side) for side in rows)
    lp.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
    lp.a_matrix_.start_ = matrix.indptr.astype(np.int32)
    lp.a_matrix_.index_ = matrix.indices.astype(np.int32)
    lp.a_matrix_.value_ = matrix.data
    return lp


def finite(values: Floats) -> Floats:
    """Return `values` with infinity as HiGHS writes it."""
    import highspy

    return np.clip(values, -highspy.kHighsInf, highspy.kHighsInf)
