"""Which matrix entry takes which member value: the plan from which one fixed pattern is assembled.

A matrix over the free unknowns is K = sum over members of GT_m^T B_m GT_m, with B_m a 3x3 block and
GT_m the member's three rows of GT. Every entry is therefore a fixed linear combination of the block
values of all members; only those values change from one iteration to the next.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array

Array = NDArray[np.float64]
Index = NDArray[np.intp]
SYMMETRIC = np.array([[0, 3, 4], [3, 1, 5], [4, 5, 2]])  # where a block keeps xx, yy, zz, xy, xz, yz
GENERAL = np.arange(9).reshape(3, 3)


class Entries(NamedTuple):
    """Entry ``row, col`` of the matrix takes ``coefficient`` times value ``source`` (flat over blocks)."""

    row: Index
    col: Index
    source: Index
    coefficient: Array


def member_entries(GT: csr_array, layout: NDArray[np.int_]) -> Entries:
    """Entries of all members.

    Parameters
    ----------
    GT : (3N, n) sparse
        Relative displacement of the member ends from the free unknowns.
    layout : (3, 3) int
        Position of block value (c, d) in the member's values: `SYMMETRIC` (6) or `GENERAL` (9).
    """
    N = GT.shape[0] // 3
    unknowns, factors = zip(*(_padded(GT[c * N : (c + 1) * N]) for c in range(3)), strict=True)
    parts = []
    for c in range(3):
        for d in range(3):
            source = layout[c, d] * N + np.arange(N)
            for a in range(unknowns[c].shape[1]):
                for b in range(unknowns[d].shape[1]):
                    row, col = unknowns[c][:, a], unknowns[d][:, b]
                    there = np.flatnonzero((row >= 0) & (col >= 0))
                    product = factors[c][there, a] * factors[d][there, b]
                    parts.append((row[there], col[there], source[there], product))
    if not parts:
        nothing = np.zeros(0, dtype=np.intp)
        return Entries(nothing, nothing, nothing, np.zeros(0))
    return Entries(*(np.concatenate(p) for p in zip(*parts, strict=True)))


def _padded(rows: csr_array) -> tuple[Index, Array]:
    """Columns and values of each row of a sparse matrix, as wide as the widest; -1 where there is none."""
    count = np.diff(rows.indptr)
    width = int(count.max(initial=0))
    column = np.full((rows.shape[0], width), -1, dtype=np.intp)
    value = np.zeros((rows.shape[0], width))
    row = np.repeat(np.arange(rows.shape[0]), count)
    place = np.arange(rows.nnz) - np.repeat(rows.indptr[:-1], count)
    column[row, place] = rows.indices
    value[row, place] = rows.data
    return column, value
