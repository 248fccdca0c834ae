"""From block values to matrix entries: one sparse product with a plan made once per pattern."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array

Array = NDArray[np.float64]
Index = NDArray[np.intp]


class ScatterPlan:
    """Matrix data as a fixed linear map of block values.

    Parameters
    ----------
    position : (E,) int
        Position in the matrix data of each contribution.
    source, coefficient : (E,)
        Block value it comes from, and its factor.
    size, sources : int
        Number of matrix data and of block values.
    """

    def __init__(self, position: Index, source: Index, coefficient: Array, size: int, sources: int) -> None:
        self._map = coo_array((coefficient, (position, source)), shape=(size, sources)).tocsr()

    def __call__(self, values: Array) -> Array:
        """Matrix data (size,) from block values of any shape holding ``sources`` numbers in order."""
        return np.asarray(self._map @ values.ravel())
