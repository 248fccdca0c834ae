"""Symmetric scaling to entries of at most one, so that one number says which pivots are zero."""

from __future__ import annotations

import numpy as np

from tautbar.algebra.pattern import FloatArray, SymmetricPattern

_PASSES = 3


def equilibrated(pattern: SymmetricPattern, lower_data: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Values of D A D and the diagonal of D, with the largest entry of every row near one.

    Each pass divides row and column by the root of their largest entry (Ruiz 2001). A congruence keeps
    the signs of the eigenvalues (Sylvester 1852). Powers of two, so nothing is rounded; empty rows
    keep the factor one.

    Returns
    -------
    scaled : (nnz,) values of the lower triangle, none above 2 in size
    factor : (n,) powers of two
    """
    factor, scaled, full = np.ones(pattern.n), lower_data, pattern.full
    for _ in range(_PASSES if pattern.n else 0):
        largest = np.maximum.reduceat(np.abs(scaled)[full.mirror], full.indptr[:-1])
        exponent = np.frexp(np.where(largest > 0.0, largest, 1.0))[1] // 2
        factor = np.ldexp(factor, -exponent)
        scaled = lower_data * factor[pattern.indices] * factor[pattern.columns]
    return scaled, factor
