"""L D L^T of a symmetric indefinite band: block-tridiagonal, with pivoting inside each block."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from scipy.linalg import eigh, lapack
from scipy.linalg.blas import dtrsm

from tautbar.algebra.interface import DOUBTFUL_PIVOT, GROWTH_LIMIT, Singular, check_finite, zero_pivot
from tautbar.algebra.ordering import Order
from tautbar.algebra.pattern import FloatArray, IntArray, SymmetricPattern
from tautbar.algebra.scaling import equilibrated

_SMALLEST_BLOCK = 64
"""Below this the cost of a block is that of calling LAPACK."""

_MERGE_ABOVE = 30.0
"""Growth over one block from which it is joined with the next, so that pivots can come from both.
Growth magnifies rounding, and a zero pivot must stay below 1000 eps."""

_MOST_MERGES = 6


class _Split(Protocol):
    """A diagonal block S = F D F^T, and the eigenvalues of D."""

    @property
    def values(self) -> FloatArray: ...

    def forward(self, right: FloatArray) -> FloatArray:
        """F^-1 times the right-hand sides (size, k)."""
        ...

    def middle(self, y: FloatArray) -> FloatArray:
        """D^-1 y, pivots that are zero taken as the tolerance."""
        ...

    def backward(self, v: FloatArray) -> FloatArray:
        """F^-T v."""
        ...


@dataclass(frozen=True, slots=True)
class _Pivoted:
    """F = P^T L, D with pivots of one and two (Bunch & Kaufman 1977).

    ``inverse`` (size,) and ``beside`` (size - 1,) are diagonal and off-diagonal of D^-1.
    """

    lower: FloatArray
    order: IntArray
    inverse: FloatArray
    beside: FloatArray
    values: FloatArray

    def forward(self, right: FloatArray) -> FloatArray:
        y: FloatArray = dtrsm(1.0, self.lower, right[self.order], lower=1, diag=1)
        return y

    def middle(self, y: FloatArray) -> FloatArray:
        v = self.inverse[:, None] * y
        v[:-1] += self.beside[:, None] * y[1:]
        v[1:] += self.beside[:, None] * y[:-1]
        return v

    def backward(self, v: FloatArray) -> FloatArray:
        x = np.empty_like(v)
        x[self.order] = dtrsm(1.0, self.lower, v, lower=1, trans_a=1, diag=1)
        return x


@dataclass(frozen=True, slots=True)
class _Spectral:
    """F of orthonormal eigenvectors, D of eigenvalues: sure where pivots are nearly zero, and dearer."""

    vectors: FloatArray
    inverse: FloatArray
    values: FloatArray

    def forward(self, right: FloatArray) -> FloatArray:
        return self.vectors.T @ right

    def middle(self, y: FloatArray) -> FloatArray:
        return self.inverse[:, None] * y

    def backward(self, v: FloatArray) -> FloatArray:
        return self.vectors @ v


@dataclass(frozen=True, slots=True)
class _Block:
    """A factorised diagonal block; ``passed`` is D^-1 F^-1 C^T, C coupling it to the next (width, size)."""

    start: int
    stop: int
    split: _Split
    passed: FloatArray


def _exchange_order(pivots: IntArray) -> tuple[IntArray, IntArray]:
    """Order of the rows after the exchanges of ``sytrf`` (lower), and where its 2 x 2 pivots start."""
    order, pairs, k = list(range(pivots.size)), [], 0
    exchange = pivots.tolist()
    while k < len(exchange):
        double = exchange[k] < 0
        row, other = k + double, abs(exchange[k]) - 1
        order[row], order[other] = order[other], order[row]
        if double:
            pairs.append(k)
        k += 1 + double
    return np.array(order, np.intp), np.array(pairs, np.intp)


def _clipped(value: FloatArray, smallest: float) -> FloatArray:
    """Values moved away from zero to at least ``smallest`` in size, keeping their sign."""
    return np.where(np.abs(value) > smallest, value, np.where(value < 0.0, -smallest, smallest))


def _inverse_pivots(
    diagonal: FloatArray, beside: FloatArray, pairs: IntArray, tolerance: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Diagonal and off-diagonal of D^-1, zero pivots taken as the tolerance, and the eigenvalues of D."""
    values, inverse_beside = diagonal.copy(), np.zeros(max(0, diagonal.size - 1))
    inverse = 1.0 / _clipped(diagonal, tolerance)
    if pairs.size:
        two = np.empty((pairs.size, 2, 2))
        two[:, 0, 0], two[:, 1, 1] = diagonal[pairs], diagonal[pairs + 1]
        two[:, 0, 1] = two[:, 1, 0] = beside[pairs]
        value, vector = np.linalg.eigh(two)
        values[pairs], values[pairs + 1] = value[:, 0], value[:, 1]
        turned = (vector / _clipped(value, tolerance)[:, None, :]) @ vector.transpose(0, 2, 1)
        inverse[pairs], inverse[pairs + 1] = turned[:, 0, 0], turned[:, 1, 1]
        inverse_beside[pairs] = turned[:, 0, 1]
    return inverse, inverse_beside, values


def _split(matrix: FloatArray, tolerance: float) -> _Split:
    """Factor of a dense block (lower triangle); by eigenvalues where a pivot is nearly zero.

    Partial pivoting bounds the growth but not the multipliers (Higham 2002, section 11.1): one of 400
    was met in a free body of 36 unknowns, and its square magnified the rounding of a zero pivot.
    """
    lower, pivots, _ = lapack.dsytrf(matrix, lower=1, lwork=64 * len(matrix))
    order, pairs = _exchange_order(pivots)
    lower, beside, _ = lapack.dsyconv(lower, pivots, lower=1, overwrite_a=1)
    inverse, inverse_beside, values = _inverse_pivots(lower.diagonal(), beside, pairs, tolerance)
    if np.abs(values).min(initial=1.0) >= DOUBTFUL_PIVOT:
        return _Pivoted(lower, order, inverse, inverse_beside, values)
    values, vectors = eigh(matrix, lower=True, driver="evd")
    return _Spectral(vectors, 1.0 / _clipped(values, tolerance), values)


class BlockPlan:
    """What the block factors of one pattern share: its entries by column of the reordered lower triangle.

    Parameters
    ----------
    pattern : where the values stand
    order : (n,) unknowns in order of elimination
    half_band : half bandwidth in that order
    """

    def __init__(self, pattern: SymmetricPattern, order: Order, half_band: int) -> None:
        self.pattern, self.order, self.half_band = pattern, order, half_band
        rank = np.empty_like(order)
        rank[order] = np.arange(order.size)
        r, c = rank[pattern.indices], rank[pattern.columns]
        rows, cols = np.maximum(r, c), np.minimum(r, c)
        self.source = np.argsort(cols, kind="stable")
        self.rows, self.cols = rows[self.source], cols[self.source]
        self.first = np.searchsorted(self.cols, np.arange(order.size + 1))


class BlockFactor:
    """Block-tridiagonal L D L^T; Bunch-Kaufman pivoting (Bunch & Kaufman 1977) inside each block.

    The matrix is scaled to entries near one first. Blocks are as long as the half bandwidth, so each
    touches only the next one: S_0 = A_00, S_k+1 = A_k+1,k+1 - C_k S_k^-1 C_k^T. Where a block passes
    on much larger entries than it got, it is joined with the next and pivots are chosen from both.

    Attributes
    ----------
    negative, zero : pivots below zero; pivots that are zero by ``zero_pivot``
    growth : largest entry passed on, over the largest of the scaled matrix
    """

    def __init__(self, plan: BlockPlan, lower_data: FloatArray) -> None:
        check_finite(lower_data)
        self._plan, self._order, self._half = plan, plan.order, plan.half_band
        self._step = max(plan.half_band, _SMALLEST_BLOCK)
        self._tolerance = zero_pivot(plan.order.size)
        scaled, self._scale = equilibrated(plan.pattern, lower_data)
        self._values = scaled[plan.source]
        self.growth = 1.0
        self._blocks = self._eliminate()
        values = np.concatenate([np.zeros(0), *(block.split.values for block in self._blocks)])
        self.negative = int(np.count_nonzero(values < -self._tolerance))
        self.zero = int(np.count_nonzero(np.abs(values) <= self._tolerance))

    @property
    def trusted(self) -> bool:
        """Whether the counts can be believed: growth at most 1e8."""
        return self.growth <= GROWTH_LIMIT

    def _assemble(self, start: int, stop: int, passed: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Block (lower triangle) of unknowns start to stop, and its coupling (width, reach) to the rest.

        The coupling holds the next ``width`` rows and the last ``reach`` columns of the block.
        """
        plan, span = self._plan, slice(self._plan.first[start], self._plan.first[stop])
        r, c, value = plan.rows[span] - start, plan.cols[span] - start, self._values[span]
        size, inside = stop - start, r < stop - start
        block = np.zeros((size, size), order="F")
        block[r[inside], c[inside]] = value[inside]
        block[: len(passed), : len(passed)] -= passed
        width, reach = min(self._half, self._order.size - stop), min(self._half, size)
        coupling = np.zeros((width, reach))
        coupling[r[~inside] - size, c[~inside] - (size - reach)] = value[~inside]
        return block, coupling

    def _factorise(self, start: int, stop: int, got: FloatArray) -> tuple[_Block, FloatArray]:
        """One block, and what it passes to the next: C S^-1 C^T."""
        matrix, coupling = self._assemble(start, stop, got)
        split = _split(matrix, self._tolerance)
        right = np.zeros((stop - start, len(coupling)))
        right[len(right) - coupling.shape[1] :] = coupling.T
        y = split.forward(right)
        passed = split.middle(y)
        return _Block(start, stop, split, passed), y.T @ passed

    def _stop(self, stop: int) -> int:
        """Where a block ends; a rest shorter than half a block joins it."""
        n = self._order.size
        return n if n - stop < self._step // 2 else stop

    def _eliminate(self) -> list[_Block]:
        blocks: list[_Block] = []
        got, start, n = np.zeros((0, 0)), 0, self._order.size
        while start < n:
            for merged in range(_MOST_MERGES + 1):
                stop = self._stop(start + (1 + merged) * self._step)
                block, passes = self._factorise(start, stop, got)
                growth = float(np.abs(passes).max(initial=0.0))
                if growth <= _MERGE_ABOVE:
                    break
            blocks.append(block)
            self.growth = max(self.growth, growth)
            got, start = passes, stop
        return blocks

    def solve(self, b: FloatArray) -> FloatArray:
        """Solution for (n,) or (n, k); raises Singular if a pivot is zero."""
        if self.zero:
            raise Singular(f"{self.zero} pivots are zero")
        if b.size == 0:
            return np.zeros(b.shape)
        x = (self._scale[:, None] * b.reshape(self._order.size, -1))[self._order]
        middle = []
        for block in self._blocks:
            y = block.split.forward(x[block.start : block.stop])
            middle.append(block.split.middle(y))
            width = block.passed.shape[1]
            x[block.stop : block.stop + width] -= block.passed.T @ y
        for block, v in zip(reversed(self._blocks), reversed(middle), strict=True):
            after = x[block.stop : block.stop + block.passed.shape[1]]
            x[block.start : block.stop] = block.split.backward(v - block.passed @ after)
        out = np.empty_like(x)
        out[self._order] = x
        return (self._scale[:, None] * out).reshape(b.shape)
