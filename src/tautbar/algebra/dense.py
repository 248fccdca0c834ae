"""Back end for few unknowns: LAPACK on the whole matrix."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.linalg import lapack

from tautbar.algebra.blocks import BlockFactor, BlockPlan
from tautbar.algebra.interface import NotPositiveDefinite, Singular, check_finite, check_pivots
from tautbar.algebra.pattern import FloatArray, IntArray, SymmetricPattern


@dataclass(frozen=True, slots=True)
class _Cholesky:
    lower: FloatArray

    def solve(self, b: FloatArray) -> FloatArray:
        if b.size == 0:
            return np.zeros(b.shape)
        x: FloatArray = lapack.dpotrs(self.lower, b, lower=1)[0]
        return x.reshape(b.shape)


@dataclass(frozen=True, slots=True)
class _General:
    lu: FloatArray
    pivots: IntArray

    def solve(self, b: FloatArray) -> FloatArray:
        if b.size == 0:
            return np.zeros(b.shape)
        x: FloatArray = lapack.dgetrs(self.lu, self.pivots, b)[0]
        return x.reshape(b.shape)


class DenseSolver:
    """LAPACK ``potrf``, ``sytrf`` and ``getrf`` (Anderson et al. 1999) on the full matrix."""

    name = "dense"

    def __init__(self, pattern: SymmetricPattern) -> None:
        self.pattern = pattern
        self._place = pattern.columns.astype(np.intp) * pattern.n + pattern.indices

    @cached_property
    def _one_block(self) -> BlockPlan:
        return BlockPlan(self.pattern, np.arange(self.pattern.n), self.pattern.n)

    def cholesky(self, lower_data: FloatArray) -> _Cholesky:
        """Factor of a positive definite matrix; raises NotPositiveDefinite."""
        n = self.pattern.n
        if n == 0:
            return _Cholesky(np.zeros((0, 0)))
        values = np.zeros(n * n)
        values[self._place] = lower_data
        lower, info = lapack.dpotrf(values.reshape(n, n).T, lower=1, clean=0, overwrite_a=1)
        if info > 0:
            raise NotPositiveDefinite(f"pivot of unknown {info - 1} is not positive")
        check_pivots(lower.diagonal() ** 2, lower_data[self.pattern.diagonal])
        return _Cholesky(lower)

    def symmetric(self, lower_data: FloatArray) -> BlockFactor:
        """L D L^T as one block (Bunch & Kaufman 1977); raises NotFinite."""
        return BlockFactor(self._one_block, lower_data)

    def general(self, full_data: FloatArray) -> _General:
        """L U with row exchanges; raises Singular or NotFinite."""
        check_finite(full_data)
        n, full = self.pattern.n, self.pattern.full
        if n == 0:
            return _General(np.zeros((0, 0)), np.zeros(0, np.int32))
        matrix = np.zeros((n, n), order="F")
        matrix[full.indices, full.columns] = full_data
        lu, pivots, info = lapack.dgetrf(matrix, overwrite_a=1)
        if info > 0:
            raise Singular(f"column {info - 1} depends on those before it")
        return _General(lu, pivots)
