"""Back end for long, narrow structures: unknowns ordered to a small bandwidth, then LAPACK band routines."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.linalg import lapack

from tautbar.algebra.blocks import BlockFactor, BlockPlan
from tautbar.algebra.interface import NotPositiveDefinite, Singular, check_finite, check_pivots
from tautbar.algebra.ordering import Order, half_bandwidth, narrow_order
from tautbar.algebra.pattern import FloatArray, IntArray, SymmetricPattern

_BACKGROUND = 1e-40
"""Share of the largest diagonal entry put where the band is empty: far below rounding, and it keeps
products of decaying fill from becoming subnormal numbers, which cost two to five times the time."""


@dataclass(frozen=True, slots=True)
class _Cholesky:
    band: FloatArray
    order: Order

    def solve(self, b: FloatArray) -> FloatArray:
        if b.size == 0:
            return np.zeros(b.shape)
        solved, _ = lapack.dpbtrs(self.band, np.asfortranarray(b[self.order]), lower=1, overwrite_b=1)
        x = np.empty(b.shape)
        x[self.order] = solved.reshape(b.shape)
        return x


@dataclass(frozen=True, slots=True)
class _General:
    band: FloatArray
    pivots: IntArray
    order: Order

    def solve(self, b: FloatArray) -> FloatArray:
        if b.size == 0:
            return np.zeros(b.shape)
        half = (self.band.shape[0] - 1) // 3
        right = np.asfortranarray(b[self.order])
        solved, _ = lapack.dgbtrs(self.band, half, half, right, self.pivots, overwrite_b=1)
        x = np.empty(b.shape)
        x[self.order] = solved.reshape(b.shape)
        return x


class BandSolver:
    """LAPACK ``pbtrf`` and ``gbtrf`` (Anderson et al. 1999) after reverse Cuthill-McKee ordering.

    ``half_band`` is the half bandwidth reached; ``order`` the unknowns in order of elimination.
    """

    name = "band"

    def __init__(self, pattern: SymmetricPattern, order: Order | None = None) -> None:
        self.pattern = pattern
        self.order = narrow_order(pattern) if order is None else order
        self.half_band = half_bandwidth(pattern, self.order)

    @cached_property
    def _rank(self) -> Order:
        rank = np.empty_like(self.order)
        rank[self.order] = np.arange(self.order.size)
        return rank

    @cached_property
    def _lower_place(self) -> Order:
        """(nnz,) place of each lower entry in the flat band, columns of ``half_band + 1``."""
        r, c = self._rank[self.pattern.indices], self._rank[self.pattern.columns]
        place: Order = np.minimum(r, c) * (self.half_band + 1) + np.abs(r - c)
        return place

    @cached_property
    def _full_place(self) -> Order:
        """(nnz_full,) place of each entry in the flat band of ``gbtrf``, columns of ``3 half_band + 1``."""
        r, c = self._rank[self.pattern.full.indices], self._rank[self.pattern.full.columns]
        return c * (3 * self.half_band + 1) + 2 * self.half_band + r - c

    @cached_property
    def _block_plan(self) -> BlockPlan:
        return BlockPlan(self.pattern, self.order, self.half_band)

    def cholesky(self, lower_data: FloatArray) -> _Cholesky:
        """Factor of a positive definite matrix; raises NotPositiveDefinite."""
        n, height = self.pattern.n, self.half_band + 1
        diagonal = lower_data[self.pattern.diagonal]
        values = np.full(n * height, _BACKGROUND * np.abs(diagonal).max(initial=0.0))
        values[self._lower_place] = lower_data
        if n == 0:
            return _Cholesky(values.reshape(height, 0), self.order)
        band, info = lapack.dpbtrf(values.reshape(n, height).T, lower=1, overwrite_ab=1)
        if info > 0:
            raise NotPositiveDefinite(f"pivot of unknown {self.order[info - 1]} is not positive")
        check_pivots(band[0] ** 2, diagonal[self.order])
        return _Cholesky(band, self.order)

    def symmetric(self, lower_data: FloatArray) -> BlockFactor:
        """Block-tridiagonal L D L^T with pivoting inside the blocks; raises NotFinite."""
        return BlockFactor(self._block_plan, lower_data)

    def general(self, full_data: FloatArray) -> _General:
        """L U with row exchanges; raises Singular or NotFinite."""
        check_finite(full_data)
        n, half = self.pattern.n, self.half_band
        values = np.zeros(n * (3 * half + 1))
        values[self._full_place] = full_data
        if n == 0:
            return _General(values.reshape(1, 0), np.zeros(0, np.int32), self.order)
        band = values.reshape(n, 3 * half + 1).T
        lu, pivots, info = lapack.dgbtrf(band, half, half, overwrite_ab=1)
        if info > 0:
            raise Singular(f"column of unknown {self.order[info - 1]} depends on those before it")
        return _General(lu, pivots, self.order)
