"""Matrices to try the algebra on, built entry by entry."""

from __future__ import annotations

import numpy as np

from tautbar.algebra.pattern import FloatArray, SymmetricPattern

Matrix = tuple[SymmetricPattern, FloatArray]


def matrix_of(n: int, rows, cols, values) -> Matrix:
    """Sum of the entries given, one triangle of them."""
    pattern = SymmetricPattern.from_entries(n, rows, cols)
    lower = np.zeros(pattern.nnz)
    np.add.at(lower, pattern.position(rows, cols), values)
    return pattern, lower


def from_dense(dense: FloatArray) -> Matrix:
    rows, cols = np.nonzero(np.tril(dense))
    return matrix_of(len(dense), rows, cols, dense[rows, cols])


def dense_of(matrix: Matrix) -> FloatArray:
    pattern, lower = matrix
    dense = np.zeros((pattern.n, pattern.n))
    for value, i, j in zip(lower, pattern.indices, pattern.columns, strict=True):
        dense[i, j] = dense[j, i] = value
    return dense


def chain(n: int, diagonal: float = 2.0, beside: float = -1.0) -> Matrix:
    i = np.arange(n)
    rows, cols = np.concatenate((i, i[1:])), np.concatenate((i, i[:-1]))
    return matrix_of(n, rows, cols, np.concatenate((np.full(n, diagonal), np.full(max(n - 1, 0), beside))))


def free_chain(n: int) -> Matrix:
    pattern, lower = chain(n)
    lower[pattern.diagonal[[0, -1]]] = 1.0
    return pattern, lower


def net_links(rows: int, cols: int) -> np.ndarray:
    """(E, 2) pairs of neighbours on a rectangular net."""
    at = np.arange(rows * cols).reshape(rows, cols)
    along = np.column_stack((at[:, 1:].ravel(), at[:, :-1].ravel()))
    across = np.column_stack((at[1:].ravel(), at[:-1].ravel()))
    return np.concatenate((along, across))


def net(rows: int, cols: int) -> Matrix:
    """Taut net with held edges, moving out of its plane: eigenvalues are sums of two chains'."""
    n, links, i = rows * cols, net_links(rows, cols), np.arange(rows * cols)
    values = np.concatenate((np.full(n, 4.0), np.full(len(links), -1.0)))
    return matrix_of(n, np.concatenate((i, links[:, 0])), np.concatenate((i, links[:, 1])), values)


def chain_eigenvalues(n: int) -> FloatArray:
    """Of ``chain(n)``; textbook result for the second difference matrix."""
    return 2.0 - 2.0 * np.cos(np.pi * np.arange(1, n + 1) / (n + 1))


def net_eigenvalues(rows: int, cols: int) -> FloatArray:
    return np.sort(np.add.outer(chain_eigenvalues(rows), chain_eigenvalues(cols)).ravel())


def unit(pattern: SymmetricPattern, value: float = 1.0) -> FloatArray:
    """Lower values of a multiple of the identity."""
    lower = np.zeros(pattern.nnz)
    lower[pattern.diagonal] = value
    return lower


def members(positions: FloatArray, links: np.ndarray) -> Matrix:
    """Stiffness of elastic members of unit axial stiffness between free joints in space."""
    n = positions.size
    dense = np.zeros((n, n))
    for a, b in links:
        r = positions[b] - positions[a]
        block = np.outer(r, r) / np.linalg.norm(r) ** 3
        for p, q, sign in ((a, a, 1), (b, b, 1), (a, b, -1), (b, a, -1)):
            dense[3 * p : 3 * p + 3, 3 * q : 3 * q + 3] += sign * block
    return from_dense(dense)


def free_body(joints: int = 12, seed: int = 4) -> tuple[Matrix, FloatArray]:
    """A rigidly braced body held nowhere, and the positions of its joints.

    Each joint is tied to the four before it in a row along x, so the body is a mast if it is long.
    """
    positions = np.random.default_rng(seed).uniform(0.0, 10.0, (joints, 3))
    positions = positions[np.argsort(positions[:, 0])]
    links = np.array([(a, b) for a in range(joints) for b in range(max(0, a - 4), a)])
    return members(positions, links), positions


def skew_chain(joints: int, stiff: float, soft: float = 1.0) -> Matrix:
    """Taut chain along (3, 4)/5, stiff along itself and soft across; whole numbers, so nothing is rounded.

    Its eigenvalues are 25 ``stiff`` and 25 ``soft`` times those of ``chain(joints)``.
    """
    link = stiff * np.array([[9.0, 12.0], [12.0, 16.0]]) + soft * np.array([[16.0, -12.0], [-12.0, 9.0]])
    return from_dense(np.kron(dense_of(chain(joints)), link))


def random_matrix(n: int, seed: int, links: float = 2.0) -> Matrix:
    """Random sparse symmetric matrix of either sign, a random graph with ``links`` entries an unknown."""
    rng = np.random.default_rng(seed)
    rows, cols = rng.integers(0, n, (2, int(links * n))) if n else np.zeros((2, 0), int)
    i = np.arange(n)
    values = rng.normal(size=rows.size + n)
    return matrix_of(n, np.concatenate((rows, i)), np.concatenate((cols, i)), values)


def dominant(matrix: Matrix) -> Matrix:
    """The matrix with a diagonal that makes it positive definite."""
    pattern, lower = matrix
    lower = lower.copy()
    rows = np.abs(dense_of(matrix)).sum(axis=1)
    lower[pattern.diagonal] = rows + 0.5
    return pattern, lower
