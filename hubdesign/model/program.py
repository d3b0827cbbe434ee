"""A mixed-integer programme as numpy arrays: the one form that every solver is fed from.

Columns and rows come in families; a family knows how its members are called, so that a row can be read
in a test and a conflict told in words, but no name is made before somebody asks. Rows of the *pool* are
valid and strengthen the linear relaxation, and nothing is wrong without them: engines add those that a
relaxation violates.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]
Label = Callable[[int], str]


@dataclass(frozen=True, slots=True)
class Family:
    """A run of columns or rows: ``first <= index < first + count``."""

    name: str
    first: int
    count: int
    label: Label

    @property
    def indices(self) -> Ints:
        """Positions of the members."""
        return np.arange(self.first, self.first + self.count, dtype=np.int64)

    @property
    def members(self) -> slice:
        """The members as a slice."""
        return slice(self.first, self.first + self.count)

    def name_of(self, index: int) -> str:
        """Return ``family[key]`` of the column or row `index`."""
        return f"{self.name}[{self.label(index - self.first)}]"


@dataclass(slots=True)
class Rows:
    """Rows ``lower <= matrix @ columns <= upper`` under construction, in compressed form."""

    families: list[Family] = field(default_factory=list)
    _starts: list[Ints] = field(default_factory=list)
    _columns: list[Ints] = field(default_factory=list)
    _values: list[Floats] = field(default_factory=list)
    _lower: list[Floats] = field(default_factory=list)
    _upper: list[Floats] = field(default_factory=list)
    count: int = 0
    entries: int = 0

    def add(
        self,
        family: str,
        row: NDArray[np.integer],
        column: NDArray[np.integer],
        value: Floats,
        lower: Floats,
        upper: Floats,
        label: Label,
    ) -> Family:
        """Append a family given as triplets.

        Parameters
        ----------
        family, label
            Name of the family and of its members by their position in it.
        row, column, value
            Entries: position of the row within the family, column, coefficient; repeats add up.
        lower, upper
            Sides, shape (rows,); -inf and inf where there is none.
        """
        count = len(lower)
        matrix = sparse.coo_array(
            (value, (row, column)), shape=(count, max(1, int(column.max(initial=0)) + 1))
        )
        compressed = matrix.tocsr()
        compressed.sum_duplicates()
        result = Family(family, self.count, count, label)
        self.families.append(result)
        self._starts.append(compressed.indptr[:-1].astype(np.int64) + self.entries)
        self._columns.append(compressed.indices.astype(np.int64))
        self._values.append(compressed.data.astype(np.float64))
        self._lower.append(np.asarray(lower, dtype=np.float64))
        self._upper.append(np.asarray(upper, dtype=np.float64))
        self.count += count
        self.entries += compressed.nnz
        return result

    def matrix(self, column_count: int) -> sparse.csr_array:
        """Return the coefficients, shape (rows, `column_count`)."""
        starts = np.concatenate([*self._starts, np.array([self.entries], dtype=np.int64)])
        columns = np.concatenate(self._columns) if self._columns else np.zeros(0, dtype=np.int64)
        values = np.concatenate(self._values) if self._values else np.zeros(0)
        return sparse.csr_array((values, columns, starts), shape=(self.count, column_count))

    @property
    def lower(self) -> Floats:
        """Left-hand sides."""
        return np.concatenate(self._lower) if self._lower else np.zeros(0)

    @property
    def upper(self) -> Floats:
        """Right-hand sides."""
        return np.concatenate(self._upper) if self._upper else np.zeros(0)

    def name_of(self, index: int) -> str:
        """Return ``family[key]`` of row `index`."""
        return _family_at(self.families, index).name_of(index)


class Program:
    """Columns, rows, the pool of strong rows, and named linear expressions over the columns."""

    def __init__(self) -> None:
        self.columns: dict[str, Family] = {}
        self.rows = Rows()
        self.pool = Rows()
        self.expressions: dict[str, Floats] = {}
        self._lower: list[Floats] = []
        self._upper: list[Floats] = []
        self._integer: list[Bools] = []
        self.column_count = 0

    def add_columns(
        self,
        family: str,
        lower: Floats,
        upper: Floats,
        *,
        integer: bool | Bools,
        label: Label,
        expressions: dict[str, Floats] | None = None,
    ) -> Family:
        """Append a family of columns with its share of the named expressions (0 where not given)."""
        count = len(lower)
        result = Family(family, self.column_count, count, label)
        self.columns[family] = result
        self._lower.append(np.asarray(lower, dtype=np.float64))
        self._upper.append(np.array(upper, dtype=np.float64))
        self._integer.append(np.array(np.broadcast_to(np.asarray(integer, dtype=bool), count)))
        self.column_count += count
        for name in {*self.expressions, *(expressions or {})}:
            so_far = self.expressions.get(name, np.zeros(result.first))
            share = (expressions or {}).get(name, np.zeros(count))
            self.expressions[name] = np.concatenate((so_far, share))
        return result

    def close(self, columns: Ints) -> None:
        """Fix `columns` to 0."""
        for family, upper in zip(self.columns.values(), self._upper):
            inside = columns[(columns >= family.first) & (columns < family.first + family.count)]
            upper[inside - family.first] = 0.0

    @property
    def lower(self) -> Floats:
        """Lower bounds of the columns."""
        return np.concatenate(self._lower)

    @property
    def upper(self) -> Floats:
        """Upper bounds of the columns."""
        return np.concatenate(self._upper)

    @property
    def integer(self) -> Bools:
        """Which columns are integer."""
        return np.concatenate(self._integer)

    def name_of(self, column: int) -> str:
        """Return ``family[key]`` of a column."""
        return _family_at(list(self.columns.values()), column).name_of(column)

    def row_text(self, family: str) -> list[str]:
        """Return the rows of a family (of the rows or the pool) as readable lines, for tests and talks."""
        lines: list[str] = []
        for rows in (self.rows, self.pool):
            for member in rows.families:
                if member.name == family:
                    lines += self._texts(rows, member)
        return lines

    def _texts(self, rows: Rows, family: Family) -> list[str]:
        matrix, lower, upper = rows.matrix(self.column_count), rows.lower, rows.upper
        lines = []
        for index in family.indices.tolist():
            start, end = matrix.indptr[index], matrix.indptr[index + 1]
            terms = " ".join(
                f"{value:+g} {self.name_of(column)}"
                for column, value in zip(matrix.indices[start:end].tolist(), matrix.data[start:end].tolist())
            )
            left = "" if lower[index] == -np.inf or lower[index] == upper[index] else f"{lower[index]:g} <= "
            right = "" if upper[index] == np.inf else f" <= {upper[index]:g}"
            if lower[index] == upper[index]:
                right = f" = {upper[index]:g}"
            lines.append(f"{family.name_of(index)}: {left}{terms}{right}")
        return lines


def _family_at(families: Sequence[Family], index: int) -> Family:
    for family in families:
        if family.first <= index < family.first + family.count:
            return family
    raise IndexError(index)
