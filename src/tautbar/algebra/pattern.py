"""Where the entries of a sparse symmetric matrix stand; the values travel apart as one flat array.

A pattern is made once; every matrix on it is an array of values, so adding two matrices is adding two
arrays and an entry that happens to be zero keeps its place.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.sparse import csc_array

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.signedinteger[Any]]


def _keys(n: int, rows: npt.ArrayLike, cols: npt.ArrayLike) -> npt.NDArray[np.int64]:
    """One sortable number for each place, column after column."""
    key: npt.NDArray[np.int64] = np.asarray(cols, np.int64) * n + np.asarray(rows, np.int64)
    return key


def _columns(indptr: IntArray) -> npt.NDArray[np.int32]:
    return np.repeat(np.arange(indptr.size - 1, dtype=np.int32), np.diff(indptr))


def _find(keys: npt.NDArray[np.int64], wanted: npt.NDArray[np.int64]) -> npt.NDArray[np.intp]:
    at = np.searchsorted(keys, wanted)
    if wanted.size and not (keys.size and np.array_equal(keys[np.minimum(at, keys.size - 1)], wanted)):
        raise ValueError("an entry asked for is not in the pattern")
    return at


@dataclass(frozen=True, eq=False)
class FullPattern:
    """Both triangles of a symmetric pattern in compressed columns.

    Attributes
    ----------
    n : number of unknowns
    indptr : (n + 1,) start of each column
    indices : (nnz_full,) row of each entry, rising within a column
    mirror : (nnz_full,) place of each entry in the values of the lower triangle
    """

    n: int
    indptr: IntArray
    indices: IntArray
    mirror: npt.NDArray[np.intp]

    @cached_property
    def columns(self) -> IntArray:
        """(nnz_full,) column of each entry."""
        return _columns(self.indptr)

    @cached_property
    def _sorted_keys(self) -> npt.NDArray[np.int64]:
        return _keys(self.n, self.indices, self.columns)

    def position(self, rows: npt.ArrayLike, cols: npt.ArrayLike) -> npt.NDArray[np.intp]:
        """Place of each entry in the full values; ValueError for one that is not in the pattern."""
        return _find(self._sorted_keys, _keys(self.n, rows, cols))

    def to_csc(self, full_data: FloatArray) -> Any:
        """The matrix with these values, (n, n) scipy ``csc_array``; zeros stay stored."""
        return csc_array((full_data, self.indices, self.indptr), shape=(self.n, self.n))


@dataclass(frozen=True, eq=False)
class SymmetricPattern:
    """Lower triangle, with the whole diagonal, of a sparse symmetric matrix in compressed columns.

    Parameters
    ----------
    n : number of unknowns
    indptr : (n + 1,) int32, start of each column
    indices : (nnz,) int32, row of each entry; rising within a column, the diagonal entry first

    Raises
    ------
    ValueError
        if a column does not start with its diagonal entry or its rows do not rise.
    """

    n: int
    indptr: IntArray
    indices: IntArray

    def __post_init__(self) -> None:
        filled = self.indptr.size == self.n + 1 and bool(np.all(np.diff(self.indptr) > 0))
        if not filled or not np.array_equal(self.indices[self.indptr[:-1]], np.arange(self.n)):
            raise ValueError("each column of a lower pattern starts with its diagonal entry")
        if np.any(np.diff(self._sorted_keys) <= 0):
            raise ValueError("the rows of a column of a lower pattern rise")

    @classmethod
    def from_entries(cls, n: int, rows: npt.ArrayLike, cols: npt.ArrayLike) -> SymmetricPattern:
        """The pattern that holds these entries (repeated and of either triangle) and the diagonal."""
        r, c = np.asarray(rows, np.int64).ravel(), np.asarray(cols, np.int64).ravel()
        if r.size and (min(r.min(), c.min()) < 0 or max(r.max(), c.max()) >= n):
            raise ValueError(f"an entry lies outside a matrix of {n} unknowns")
        diagonal = np.arange(n, dtype=np.int64)
        keys = np.concatenate((_keys(n, np.maximum(r, c), np.minimum(r, c)), _keys(n, diagonal, diagonal)))
        keys.sort()
        keys = keys[np.concatenate((np.ones(min(1, n), bool), np.diff(keys) > 0))]
        indptr = np.searchsorted(keys, np.arange(n + 1, dtype=np.int64) * n) if n else np.zeros(1)
        return cls(n, indptr.astype(np.int32), (keys % max(n, 1)).astype(np.int32))

    @cached_property
    def _sorted_keys(self) -> npt.NDArray[np.int64]:
        return _keys(self.n, self.indices, self.columns)

    @cached_property
    def columns(self) -> IntArray:
        """(nnz,) column of each entry."""
        return _columns(self.indptr)

    @property
    def nnz(self) -> int:
        """Number of entries of the lower triangle."""
        return int(self.indices.size)

    @property
    def diagonal(self) -> IntArray:
        """(n,) place of each diagonal entry in the lower values."""
        return self.indptr[:-1]

    def position(self, rows: npt.ArrayLike, cols: npt.ArrayLike) -> npt.NDArray[np.intp]:
        """Place of each entry, of either triangle, in the lower values; ValueError if not there."""
        return _find(self._sorted_keys, _keys(self.n, np.maximum(rows, cols), np.minimum(rows, cols)))

    @cached_property
    def full(self) -> FullPattern:
        """Both triangles: each column is its part above the diagonal, then its lower column."""
        n, lower = self.n, np.arange(self.nnz)
        places = csc_array((lower, self.indices, self.indptr), shape=(n, n)).tocsr()
        above_count = np.diff(places.indptr) - 1
        indptr = np.concatenate(([0], np.cumsum(above_count + np.diff(self.indptr)))).astype(np.int32)
        indices = np.empty(int(indptr[-1]), np.int32)
        mirror = np.empty(int(indptr[-1]), np.intp)
        shift = np.repeat(indptr[:-1] + above_count - self.indptr[:-1], np.diff(self.indptr))
        indices[lower + shift], mirror[lower + shift] = self.indices, lower
        row = _columns(places.indptr)
        above = np.flatnonzero(places.indices != row)
        to = above + (indptr[:-1] - places.indptr[:-1])[row[above]]
        indices[to], mirror[to] = places.indices[above], places.data[above]
        return FullPattern(n, indptr, indices, mirror)

    def to_csc(self, lower_data: FloatArray) -> Any:
        """The whole symmetric matrix, (n, n) scipy ``csc_array``; zeros stay stored."""
        return self.full.to_csc(lower_data[self.full.mirror])
