"""Null spaces of sparse matrices: counts and vectors against singular values of the whole matrix."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.sparse import csr_array, random_array

from tautbar.algebra import rank
from tautbar.algebra.rank import left_part, localised, null_spaces, positive_definite


@pytest.fixture
def always_sparse(monkeypatch):
    """Small matrices by the road of large ones."""
    monkeypatch.setattr(rank, "_FEW", 0)


def sparse(values) -> csr_array:
    return csr_array(np.asarray(values, dtype=float))


def with_singular_values(b: int, n: int, values, seed: int) -> csr_array:
    rng = np.random.default_rng(seed)
    U, V = (np.linalg.qr(rng.standard_normal((k, len(values))))[0] for k in (b, n))
    return sparse(U @ np.diag(values) @ V.T)


def check(C: csr_array, nullity: int) -> None:
    b, n = C.shape
    found = null_spaces(C)
    assert (found.nullity, found.left_nullity) == (nullity, nullity + b - n)
    for vectors, matrix in ((found.null, C), (found.left, C.T)):
        # Both bases are orthonormal and nothing of them is seen by the matrix, to rounding of its size.
        np.testing.assert_allclose(vectors.T @ vectors, np.eye(vectors.shape[1]), atol=1e-12)
        assert np.abs(matrix @ vectors).max(initial=0.0) < 1e-12


@pytest.mark.parametrize("seed", range(8))
@pytest.mark.parametrize(("b", "n"), [(30, 25), (25, 30), (40, 40), (9, 18)])
def test_random_sparse_matrices_by_both_roads(always_sparse, monkeypatch, seed, b, n) -> None:
    C = csr_array(random_array((b, n), density=0.06, rng=np.random.default_rng(seed)))
    nullity = n - int(np.linalg.matrix_rank(C.toarray(), tol=1e-10))
    assert nullity > 0
    check(C, nullity)
    monkeypatch.setattr(rank, "_FEW", 400)
    check(C, nullity)


@pytest.mark.parametrize("smallest", [1e-4, 1e-6, 1e-8, 1e-9])
@pytest.mark.parametrize("zeros", [0, 3])
def test_nearly_singular_is_not_singular(always_sparse, smallest, zeros) -> None:
    # Squared, 1e-9 is below the rounding of the normal matrix: only the unsquared judgement sees it.
    values = np.concatenate([np.linspace(2.0, 0.5, 20), [smallest, 3 * smallest], np.zeros(zeros)])
    C = with_singular_values(30, values.size, values, seed=3)
    check(C, zeros)
    wanted = [v for v in (smallest, 3 * smallest) if v <= rank.NEAR]
    if zeros or smallest < 1e-6:  # else the matrix is known to be stiffer than that at once
        np.testing.assert_allclose(null_spaces(C).nearly, wanted, rtol=1e-5)


def test_large_null_spaces_are_counted_and_sampled(always_sparse) -> None:
    values = np.concatenate([np.linspace(2.0, 0.5, 40), np.zeros(rank.MOST + 20)])
    found = null_spaces(with_singular_values(150, values.size, values, seed=4))
    assert (found.nullity, found.left_nullity) == (rank.MOST + 20, 110)
    assert 0 < found.null.shape[1] <= rank.SHOWN
    assert 0 < found.left.shape[1] <= rank.SHOWN


def test_large_soft_spaces_with_stiff_ones_among_them(always_sparse) -> None:
    soft = np.full(5, 1e-5)
    values = np.concatenate([np.linspace(2.0, 0.5, 40), soft, np.zeros(rank.MOST + 1)])
    found = null_spaces(with_singular_values(150, values.size, values, seed=4))
    assert found.nullity == rank.MOST + 1


@pytest.mark.parametrize("shape", [(0, 4), (4, 0), (0, 0)])
def test_nothing_at_all(shape) -> None:
    found = null_spaces(csr_array(shape))
    assert (found.nullity, found.left_nullity) == shape[::-1]


def test_localised_vectors_span_the_same_and_move_little() -> None:
    blocks = np.zeros((9, 3))
    blocks[[0, 1], 0], blocks[[3, 4, 5], 1], blocks[8, 2] = (1.0, -0.5), (0.2, 1.0, 0.4), 1.0
    mixed = np.linalg.qr(blocks @ np.random.default_rng(2).standard_normal((3, 3)))[0]
    found = localised(mixed)
    np.testing.assert_allclose(np.abs(found), np.abs(blocks), atol=1e-12)
    assert localised(np.zeros((5, 0))).shape == (5, 0)


def test_the_left_part_is_the_projection() -> None:
    C = with_singular_values(30, 12, np.concatenate([np.linspace(2.0, 1e-3, 10), [0.0, 0.0]]), seed=5)
    y = np.random.default_rng(6).standard_normal(30)
    range_of = np.linalg.svd(C.toarray())[0][:, :10]
    # It stops when C^T sees 1e-9 of the vector: along the softest direction that is 1e-9 over 1e-3 of it.
    reached = 1e-9 * np.abs(y).max() * np.sqrt(12) / 1e-3
    np.testing.assert_allclose(left_part(C, y), y - range_of @ (range_of.T @ y), atol=reached)


def test_positive_definite_up_to_known_zeros() -> None:
    assert positive_definite(sparse([[2.0, 1.0], [1.0, 2.0]]), 0)
    assert not positive_definite(sparse([[1.0, 2.0], [2.0, 1.0]]), 0)
    assert not positive_definite(sparse([[1.0, 1.0], [1.0, 1.0]]), 0)
    assert positive_definite(sparse([[1.0, 1.0], [1.0, 1.0]]), 1)
