"""Rank of a sparse rectangular matrix, and vectors of its two null spaces.

Few rows and columns: the singular values. Many: the normal matrix C^T C is factorised, which sees only
squares of singular values; so all that is below ``NEAR`` is collected by inertia and inverse iteration,
and judged by the singular values of C times those vectors, which squares nothing.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import ceil, log
from typing import Any

import numpy as np
from scipy.linalg import qr
from scipy.sparse import csr_array

from tautbar.algebra.interface import Factor, NotPositiveDefinite
from tautbar.algebra.pattern import FloatArray, SymmetricPattern
from tautbar.algebra.solver import choose_solver

ZERO = 1e-10
"""A singular value up to this is zero. Rows are made of unit vectors, so it is a stretch per move: rounding
gives 1e-15, the most slender lattice of 100,000 members 1e-9."""

NEAR = 1e-5
"""Singular values up to this are looked at one by one: their squares are near the rounding of C^T C."""

MOST = 48
"""Vectors of a null space that are computed for a large matrix; of more `SHOWN` samples."""

SHOWN = 12
_SURE = 1e-6  # its square is a hundred times what a factor loses to rounding
_WIDE = 1e-3  # its square leaves no doubtful pivots in a matrix with mechanisms, so it is counted quickly
_FEW = 400  # rows and columns up to which all singular values are computed
_EXTRA = 4  # vectors beside those wanted, for inverse iteration
_FEWEST_ROUNDS, _MOST_ROUNDS = 3, 200
_LEFT_OVER = 1e-9  # share of a vector that is not of the null space and stays after inverse iteration


@dataclass(frozen=True, slots=True)
class NullSpaces:
    """Counts, and orthonormal vectors of the null spaces of C (b, n) and of its transpose."""

    nullity: int
    null: FloatArray  # (n, k), k the nullity, or fewer samples where it is above MOST and C large
    left_nullity: int
    left: FloatArray  # (b, l), likewise
    nearly: FloatArray  # singular values from ZERO to NEAR, rising; not known where there are samples


def null_spaces(C: csr_array) -> NullSpaces:
    """Null spaces of a sparse matrix (b, n) whose entries are of the order of one."""
    if max(C.shape) <= _FEW:
        return _by_singular_values(C)
    return _by_normal_matrix(C)


def _by_singular_values(C: csr_array) -> NullSpaces:
    b, n = C.shape
    if not b or not n:
        return NullSpaces(n, np.eye(n), b, np.eye(b), np.zeros(0))
    U, s, Vt = np.linalg.svd(C.toarray())
    rank = int((s > ZERO).sum())
    nearly = s[:rank][s[:rank] <= NEAR][::-1]
    return NullSpaces(n - rank, Vt[rank:].T, b - rank, U[:, rank:], nearly)


def _by_normal_matrix(C: csr_array) -> NullSpaces:
    b, n = C.shape
    normal = _Normal(C)
    few, all_zero = normal.soft()
    if few > MOST:
        nullity = few if all_zero else normal.count_below(_SURE)
        null, beside, nearly = normal.sampled(), np.zeros((b, 0)), np.zeros(0)
    else:
        V, sigma = normal.softest(few)
        nullity = int((sigma <= ZERO).sum())
        null, beside, nearly = V[:, :nullity], C @ V[:, nullity:], sigma[nullity:]
        nearly = nearly[nearly <= NEAR]
    left_nullity = b - n + nullity
    left = normal.left(left_nullity, np.linalg.qr(beside)[0])
    return NullSpaces(nullity, null, left_nullity, left, nearly)


class _Normal:
    """C^T C on its own pattern, with a factor of it made positive definite by a little."""

    def __init__(self, C: csr_array) -> None:
        self.C, self.Ct = C, csr_array(C.T)
        product = csr_array(self.Ct @ C).tocoo()
        low = product.row >= product.col
        row, col = product.row[low], product.col[low]
        self.pattern = SymmetricPattern.from_entries(C.shape[1], row, col)
        self.lower = np.zeros(self.pattern.nnz)
        self.lower[self.pattern.position(row, col)] = product.data[low]
        self.solver = choose_solver(self.pattern)
        largest = float(self.lower[self.pattern.diagonal].max(initial=0.0))
        self.little = max(1e-11, 2e-12 * largest)  # more than a pivot that counts as zero
        self.gap = _WIDE  # singular values below it are looked at one by one
        self._factor: Factor | None = None

    def plus(self, shift: float) -> FloatArray:
        """Lower data of C^T C + shift I."""
        lower = self.lower.copy()
        lower[self.pattern.diagonal] += shift
        return lower

    def stiffer_than(self, sigma: float) -> bool:
        """Whether every singular value is surely larger."""
        try:
            self.solver.cholesky(self.plus(-sigma * sigma))
        except NotPositiveDefinite:
            return False
        return True

    def count_below(self, sigma: float) -> int:
        """Singular values below ``sigma``, by inertia (Sylvester 1852)."""
        factor = self.solver.symmetric(self.plus(-sigma * sigma))
        return factor.negative + factor.zero

    def soft(self) -> tuple[int, bool]:
        """How many singular values are soft enough to be looked at, and whether all are surely zero."""
        if self.stiffer_than(_SURE):
            self.little = 0.0
            return 0, True
        few = self.count_below(self.gap)
        if few <= MOST:
            return few, False
        # Random mixtures of all soft vectors: the stretch of each is about the root mean square of theirs.
        X = np.linalg.qr(_repeated(self.softer, _random(self.C.shape[1], _EXTRA), self.rounds))[0]
        stretch = float(np.sqrt(((self.C @ X) ** 2).sum(axis=0).max()))
        if stretch * np.sqrt(few) <= ZERO:
            return few, True
        self.gap = NEAR
        return self.count_below(NEAR), False

    @property
    def factor(self) -> Factor:
        if self._factor is None:
            self._factor = self.solver.cholesky(self.plus(self.little))
        return self._factor

    @property
    def rounds(self) -> int:
        """Steps until what has singular values above the gap has died out."""
        if self.little == 0.0:
            return _FEWEST_ROUNDS
        return max(_FEWEST_ROUNDS, ceil(log(_LEFT_OVER) / log(self.little / (self.gap**2 + self.little))))

    def softer(self, X: FloatArray) -> FloatArray:
        """A step of inverse iteration: X - K^-1 C^T (C X) = little K^-1 X, without its rounding."""
        return X - self.factor.solve(self.Ct @ (self.C @ X))

    def softest(self, count: int) -> tuple[FloatArray, FloatArray]:
        """Vectors (n, count) and singular values (count,) rising, by subspace iteration."""
        n = self.C.shape[1]
        X = _random(n, min(n, count + _EXTRA)) if count else np.zeros((n, 0))
        for _ in range(self.rounds if count else 0):
            X = np.linalg.qr(self.softer(X))[0]
        _, found, Vt = np.linalg.svd(np.linalg.qr(self.C @ X)[1])
        sigma = np.append(found, np.zeros(X.shape[1] - found.size))  # more vectors than rows: zeros
        V = X @ Vt[::-1].T
        return V[:, :count], sigma[::-1][:count]

    def sampled(self) -> FloatArray:
        """Some vectors of a large null space, each nearest to one unknown."""
        n, every = self.C.shape[1], self.rounds
        x = _repeated(self.softer, _random(n, 1), every)
        return _independent(_repeated(self.softer, _units(x), every))

    def left(self, count: int, beside: FloatArray) -> FloatArray:
        """Vectors (b, count) of the null space of C^T, at right angles to ``beside``; of many some."""
        if count == 0:
            return np.zeros((self.C.shape[0], 0))

        def off_range(Y: FloatArray) -> FloatArray:
            Y = Y - beside @ (beside.T @ Y)
            return np.asarray(Y - self.C @ self.factor.solve(self.Ct @ Y))

        b = self.C.shape[0]
        if count <= MOST:
            Y = _repeated(off_range, _random(b, min(b, count + _EXTRA)), self.rounds)
            return np.linalg.svd(Y, full_matrices=False)[0][:, :count]
        y = _repeated(off_range, _random(b, 1), self.rounds)
        return _independent(_repeated(off_range, _units(y), self.rounds))


def left_part(C: csr_array, y: FloatArray) -> FloatArray | None:
    """The part of y (b,) in the null space of C^T; None where iteration does not find it."""
    normal = _Normal(C)
    Y, size = y[:, None], float(np.abs(y).max(initial=0.0))
    for _ in range(_MOST_ROUNDS):
        rest = normal.Ct @ Y
        if np.abs(rest).max(initial=0.0) <= _LEFT_OVER * size:
            return np.asarray(Y[:, 0])
        Y = Y - C @ normal.factor.solve(rest)
    return None


def positive_definite(matrix: csr_array, zeros: int) -> bool:
    """Whether a symmetric matrix has no eigenvalue below zero and no more than so many that are zero."""
    coo = matrix.tocoo()
    low = coo.row >= coo.col
    pattern = SymmetricPattern.from_entries(matrix.shape[0], coo.row[low], coo.col[low])
    lower = np.zeros(pattern.nnz)
    lower[pattern.position(coo.row[low], coo.col[low])] = coo.data[low]
    solver = choose_solver(pattern)
    if zeros == 0:
        try:
            solver.cholesky(lower)
        except NotPositiveDefinite:
            return False
        return True
    factor = solver.symmetric(lower)
    return bool(factor.negative == 0 and factor.zero <= zeros)


def _random(rows: int, columns: int) -> FloatArray:
    return np.random.default_rng(1).standard_normal((rows, columns))


def _repeated(step: Any, X: FloatArray, times: int) -> FloatArray:
    for _ in range(times):
        X = step(X)
    return X


def _units(x: FloatArray) -> FloatArray:
    """Unit vectors of the unknowns at which a vector (n, 1) is largest."""
    top = np.argsort(-np.abs(x[:, 0]), kind="stable")[:SHOWN]
    out = np.zeros((len(x), top.size))
    out[top, np.arange(top.size)] = 1.0
    return out


def _independent(X: FloatArray) -> FloatArray:
    """Orthonormal basis of the columns, those that depend on others left out."""
    U, s, _ = np.linalg.svd(X, full_matrices=False)
    return np.asarray(U[:, s > 1e-6 * s.max(initial=0.0)])


def localised(V: FloatArray, rounding: float = 1e-9) -> FloatArray:
    """Another basis of the columns of V (n, k) in which each moves as few unknowns as may be.

    Each vector is one at an unknown of its own at which all others are zero: the unknowns are chosen by
    elimination with column exchanges (Golub & Van Loan 2013, section 5.4.2), and vectors come in their
    order. Largest entry 1; entries below ``rounding`` become zero.
    """
    if V.shape[1] == 0:
        return V
    pivot = np.sort(qr(V.T, mode="r", pivoting=True)[1][: V.shape[1]])
    B = np.linalg.solve(V[pivot].T, V.T).T
    B /= np.abs(B).max(axis=0)
    return np.where(np.abs(B) > rounding, B, 0.0)
