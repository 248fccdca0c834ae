"""Directions a stiffness matrix does not hold."""

from __future__ import annotations

import numpy as np

from tautbar.algebra.eigen import lowest_modes
from tautbar.algebra.pattern import FloatArray, SymmetricPattern

_LOOSE = 1e-9
"""Share of the scale up to which an eigenvalue is no stiffness: it holds to rounding (1e-16) times the
spread of a null vector over a large structure, and is below any tension stiffness in use."""


def null_vectors(
    stiffness_lower: FloatArray, pattern: SymmetricPattern, count: int, scale: float
) -> FloatArray:
    """Orthonormal basis of the directions with no stiffness or a negative one.

    Parameters
    ----------
    stiffness_lower : (nnz,) lower values of K
    pattern : where they stand
    count : most vectors to return, e.g. the number of pivots of K that are zero or negative
    scale : a large stiffness of the structure, e.g. its largest diagonal entry

    Returns
    -------
    (n, m) eigenvectors of K, m <= ``count``, whose eigenvalue is below 1e-9 of the scale; the lowest first
    """
    unit = np.zeros(pattern.nnz)
    unit[pattern.diagonal] = 1.0
    modes = lowest_modes(stiffness_lower, unit, pattern, count=count)
    return modes.shape[:, modes.eigenvalue <= _LOOSE * scale]
