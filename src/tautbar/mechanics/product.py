"""A constant sparse matrix as something to multiply with, in the form that is quickest for its size."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array

Array = NDArray[np.float64]
DENSE = 40_000  # entries: below that a dense product costs less than the call into a sparse one


class Product:
    """``product @ x`` for x (n,) or (n, k), by elements for a diagonal matrix, dense for a tiny one."""

    def __init__(self, matrix: csr_array) -> None:
        self.matrix = matrix
        rows, cols = matrix.shape
        coo = matrix.tocoo()
        self._diagonal: Array | None = None
        self._form: Array | csr_array = matrix
        if rows == cols and (coo.row == coo.col).all():
            self._diagonal = np.asarray(matrix.diagonal())
        elif rows * cols <= DENSE:
            self._form = matrix.toarray()

    def __matmul__(self, x: Array) -> Array:
        if self._diagonal is not None:
            return (self._diagonal * x.T).T
        return np.asarray(self._form @ x)
