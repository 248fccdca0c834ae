"""Back end for wide sparse structures: SuperLU, ordered once for little fill."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from scipy.sparse.linalg import splu

from tautbar.algebra.band import BandSolver
from tautbar.algebra.interface import (
    DOUBTFUL_PIVOT,
    GROWTH_LIMIT,
    NotPositiveDefinite,
    Singular,
    SymmetricFactor,
    check_finite,
    check_pivots,
)
from tautbar.algebra.ordering import Order, sparse_order
from tautbar.algebra.pattern import FloatArray, FullPattern, SymmetricPattern
from tautbar.algebra.scaling import equilibrated


@dataclass(frozen=True, slots=True)
class _Lu:
    lu: Any
    order: Order

    def solve(self, b: FloatArray) -> FloatArray:
        if b.size == 0:
            return np.zeros(b.shape)
        x = np.empty(b.shape)
        x[self.order] = self.lu.solve(b[self.order])
        return x


@dataclass(frozen=True, slots=True)
class _Symmetric:
    matrix: Any
    factor: _Lu
    scale: FloatArray
    negative: int
    growth: float
    zero: int = 0

    @property
    def trusted(self) -> bool:
        """Whether the counts can be believed."""
        return self.growth <= GROWTH_LIMIT

    def solve(self, b: FloatArray) -> FloatArray:
        """Solution for (n,) or (n, k), refined once."""
        x = self._once(b)
        return x + self._once(b - self.matrix @ x)

    def _once(self, b: FloatArray) -> FloatArray:
        scale = self.scale if b.ndim == 1 else self.scale[:, None]
        return scale * self.factor.solve(scale * b)


class SuperluSolver:
    """SuperLU (Li 2005) on the matrix reordered by minimum degree, in its symmetric mode.

    The order is found once for the pattern. Symmetric matrices keep their diagonal pivots; where that
    is not sound (growth, a pivot that is nearly zero) the block-tridiagonal factor with pivoting takes
    over.
    """

    name = "superlu"

    def __init__(self, pattern: SymmetricPattern) -> None:
        self.pattern = pattern
        self._order = sparse_order(pattern)
        self._full, self._source = _reordered(pattern.full, self._order)
        self._mirror = pattern.full.mirror[self._source]

    @cached_property
    def _blocks(self) -> BandSolver:
        return BandSolver(self.pattern)

    def _split(self, values: FloatArray, threshold: float, symmetric: bool) -> _Lu:
        """L U of values over the reordered full pattern."""
        matrix = self._full.to_csc(values)
        lu = splu(matrix, "NATURAL", threshold, options={"SymmetricMode": symmetric})
        return _Lu(lu, self._order)

    def _pivots(self, factor: _Lu) -> FloatArray | None:
        """(n,) pivot of each unknown, or None where rows were exchanged."""
        if not np.array_equal(factor.lu.perm_r, factor.lu.perm_c):
            return None
        pivots = np.empty(self.pattern.n)
        pivots[self._order] = factor.lu.U.diagonal()[factor.lu.perm_c]
        return pivots

    def cholesky(self, lower_data: FloatArray) -> _Lu:
        """Factor of a positive definite matrix, its pivots checked; raises NotPositiveDefinite."""
        if self.pattern.n == 0:
            return _Lu(None, self._order)
        diagonal = lower_data[self.pattern.diagonal]
        if not (np.isfinite(lower_data).all() and (diagonal > 0.0).all()):
            raise NotPositiveDefinite("a diagonal entry is not positive or a value is not finite")
        try:
            factor = self._split(lower_data[self._mirror], 0.0, True)
        except RuntimeError as error:
            raise NotPositiveDefinite("a pivot is zero") from error
        pivots = self._pivots(factor)
        if pivots is None:
            raise NotPositiveDefinite("a pivot is zero")
        check_pivots(pivots, diagonal)
        return factor

    def symmetric(self, lower_data: FloatArray) -> SymmetricFactor:
        """L D L^T without exchanges where that is sound, else in blocks; raises NotFinite."""
        check_finite(lower_data)
        factor = self._without_exchanges(lower_data)
        if factor is None or not factor.trusted:
            return self._blocks.symmetric(lower_data)
        return factor

    def _without_exchanges(self, lower_data: FloatArray) -> _Symmetric | None:
        scaled, scale = equilibrated(self.pattern, lower_data)
        try:
            factor = self._split(scaled[self._mirror], 0.0, True)
        except RuntimeError:
            return None
        pivots = self._pivots(factor)
        if pivots is None or np.abs(pivots).min(initial=1.0) < DOUBTFUL_PIVOT:
            return None
        negative = int(np.count_nonzero(pivots < 0.0))
        growth = float(np.abs(factor.lu.U.data).max(initial=1.0))
        matrix = self.pattern.to_csc(lower_data)
        return _Symmetric(matrix, factor, scale, negative, growth)

    def general(self, full_data: FloatArray) -> _Lu:
        """L U, the diagonal preferred as pivot; raises Singular or NotFinite."""
        check_finite(full_data)
        if self.pattern.n == 0:
            return _Lu(None, self._order)
        try:
            return self._split(full_data[self._source], 0.1, False)
        except RuntimeError as error:
            raise Singular("a column depends on those before it") from error


def _reordered(full: FullPattern, order: Order) -> tuple[FullPattern, Order]:
    """The full pattern with rows and columns in this order, and where each of its entries comes from."""
    rank = np.empty_like(order)
    rank[order] = np.arange(order.size)
    rows, cols = rank[full.indices], rank[full.columns]
    source = np.lexsort((rows, cols))
    indptr = np.searchsorted(cols[source], np.arange(full.n + 1)).astype(np.int32)
    return FullPattern(full.n, indptr, rows[source].astype(np.int32), full.mirror[source]), source
