"""What every back end offers, the errors it raises, and the one rule for a pivot that counts as zero."""

from __future__ import annotations

from typing import Protocol

import numpy as np

from tautbar.algebra.pattern import FloatArray

GROWTH_LIMIT = 1e8
"""Above this growth of the entries half the digits of a pivot are rounding: the count is not trusted."""

DOUBTFUL_PIVOT = 1e-8
"""A pivot smaller than this share of its scale may be a zero with magnified rounding, or the reverse:
its block is counted by eigenvalues."""


class NotPositiveDefinite(ValueError):
    """A pivot of a Cholesky factor is negative, zero by :func:`zero_pivot`, or not a number."""


class Singular(ValueError):
    """The matrix has no inverse, so nothing can be solved with it."""


class NotFinite(ValueError):
    """The matrix holds an infinite value or one that is not a number."""


class Factor(Protocol):
    """A factorised matrix."""

    def solve(self, b: FloatArray) -> FloatArray:
        """Solution for one right-hand side (n,) or several (n, k); ``b`` is left as it is."""
        ...


class SymmetricFactor(Factor, Protocol):
    """L D L^T of a symmetric matrix; the signs of D count its eigenvalues (Sylvester 1852)."""

    @property
    def negative(self) -> int:
        """Number of negative pivots."""
        ...

    @property
    def zero(self) -> int:
        """Number of pivots that are zero by :func:`zero_pivot`; ``solve`` raises Singular if any."""
        ...

    @property
    def growth(self) -> float:
        """Largest entry met during the elimination over the largest of the matrix."""
        ...

    @property
    def trusted(self) -> bool:
        """Whether the counts can be believed: growth at most :data:`GROWTH_LIMIT`."""
        ...


class Solver(Protocol):
    """One way to factorise all matrices of one pattern. Values given are never changed."""

    @property
    def name(self) -> str:
        """Word for this back end."""
        ...

    def cholesky(self, lower_data: FloatArray) -> Factor:
        """Factor of a positive definite matrix; raises NotPositiveDefinite."""
        ...

    def symmetric(self, lower_data: FloatArray) -> SymmetricFactor:
        """L D L^T of any symmetric matrix, also a singular one; raises NotFinite."""
        ...

    def general(self, full_data: FloatArray) -> Factor:
        """L U of values over ``pattern.full``; raises Singular or NotFinite."""
        ...


def zero_pivot(n: int) -> float:
    """Share of its column's scale up to which a pivot counts as zero: n eps, n taken as 1000 to 3000.

    A pivot is its diagonal entry less a sum of products; rounding leaves about (number of terms) eps of
    the column's scale (Higham 2002, theorem 10.3), times the square of how much a null vector moves
    other unknowns more than the last: hence at least 1000. The cap keeps long stiff chains apart from
    mechanisms: their pivots are honest down to (tension / axial stiffness), 1e-10 and less, whatever
    n is; rounding in a null vector spread over a million unknowns leaves root n eps, 1000 eps again.
    """
    return min(max(n, 1000), 3000) * float(np.finfo(float).eps)


def check_pivots(pivots: FloatArray, diagonal: FloatArray) -> None:
    """Raise NotPositiveDefinite unless each pivot exceeds its share of its own diagonal entry.

    A value that is not finite anywhere in the matrix reaches a pivot, so this finds those too.
    """
    sound = (pivots > zero_pivot(pivots.size) * diagonal) & (pivots < np.inf)
    if not sound.all():
        first = int(np.argmin(sound))
        raise NotPositiveDefinite(f"a pivot is {pivots[first]:.3g}, its diagonal entry {diagonal[first]:.3g}")


def check_finite(data: FloatArray) -> None:
    """Raise NotFinite if a value is infinite or not a number."""
    if not np.isfinite(data).all():
        raise NotFinite("the matrix holds a value that is not finite")
