"""Patterns against dense arrays filled one entry at a time."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from matrices import dense_of, random_matrix

from tautbar.algebra.pattern import SymmetricPattern

ENTRIES = st.integers(0, 9).flatmap(
    lambda n: st.tuples(
        st.just(n),
        st.lists(st.tuples(*[st.integers(0, max(n - 1, 0))] * 2), max_size=30 if n else 0),
    )
)


@given(ENTRIES)
def test_pattern_holds_the_entries_and_the_diagonal_once(entries):
    n, places = entries
    pattern = SymmetricPattern.from_entries(n, [r for r, _ in places], [c for _, c in places])
    held = list(zip(pattern.columns.tolist(), pattern.indices.tolist(), strict=True))
    assert held == sorted({(min(p), max(p)) for p in places} | {(i, i) for i in range(n)})
    assert pattern.indices.dtype == pattern.indptr.dtype == np.int32
    assert pattern.indices[pattern.diagonal].tolist() == list(range(n))


@given(ENTRIES)
def test_full_pattern_mirrors_the_lower_one(entries):
    n, places = entries
    pattern = SymmetricPattern.from_entries(n, [r for r, _ in places], [c for _, c in places])
    lower = np.arange(1.0, pattern.nnz + 1)
    full, dense = pattern.full, dense_of((pattern, lower))
    assert np.array_equal(pattern.to_csc(lower).toarray(), dense)
    assert np.array_equal(lower[full.mirror], dense[full.indices, full.columns])
    order = full.columns.astype(int) * max(n, 1) + full.indices
    assert np.all(np.diff(order) > 0), "rows rise within a column and no entry comes twice"
    assert np.array_equal(full.position(full.indices, full.columns), np.arange(full.indices.size))


def test_positions_find_entries_of_either_triangle():
    pattern, lower = random_matrix(40, seed=1)
    dense = dense_of((pattern, lower))
    rows, cols = np.nonzero(dense)
    assert np.array_equal(lower[pattern.position(rows, cols)], dense[rows, cols])
    full_data = lower[pattern.full.mirror]
    assert np.array_equal(full_data[pattern.full.position(rows, cols)], dense[rows, cols])


def test_an_entry_that_is_zero_keeps_its_place():
    # Adding sparse matrices drops such entries, and every plan made on the pattern with them.
    pattern, lower = random_matrix(20, seed=2)
    lower[::2] = 0.0
    matrix = pattern.to_csc(lower)
    assert matrix.nnz == pattern.full.indices.size
    assert np.array_equal(matrix.indices, pattern.full.indices)


def test_no_unknowns():
    pattern = SymmetricPattern.from_entries(0, [], [])
    assert (pattern.nnz, pattern.full.indices.size) == (0, 0)
    assert pattern.to_csc(np.zeros(0)).shape == (0, 0)
    assert pattern.position([], []).size == 0


@pytest.mark.parametrize(("rows", "cols"), [([2], [0]), ([0, 1], [1, 2])])
def test_a_place_outside_the_pattern_is_refused(rows, cols):
    pattern = SymmetricPattern.from_entries(3, [1], [0])
    with pytest.raises(ValueError, match="not in the pattern"):
        pattern.position(rows, cols)
    with pytest.raises(ValueError, match="not in the pattern"):
        pattern.full.position(rows, cols)


@pytest.mark.parametrize("place", [(3, 0), (0, 3), (-1, 0)])
def test_an_entry_outside_the_matrix_is_refused(place):
    with pytest.raises(ValueError, match="outside a matrix of 3"):
        SymmetricPattern.from_entries(3, [place[0]], [place[1]])


@pytest.mark.parametrize(
    ("indptr", "indices", "message"),
    [
        ([0, 1, 1], [0], "starts with its diagonal"),
        ([0, 1, 2], [1, 1], "starts with its diagonal"),
        ([0, 3, 4, 5], [0, 2, 1, 1, 2], "rise"),
    ],
)
def test_columns_that_are_not_sorted_lower_columns_are_refused(indptr, indices, message):
    with pytest.raises(ValueError, match=message):
        SymmetricPattern(len(indptr) - 1, np.array(indptr, np.int32), np.array(indices, np.int32))
