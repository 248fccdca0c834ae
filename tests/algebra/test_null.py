"""Directions without stiffness, against rigid motions written down by hand."""

from __future__ import annotations

import numpy as np
import pytest
from matrices import chain, free_body, net, unit

from tautbar.algebra.null import null_vectors
from tautbar.algebra.pattern import SymmetricPattern


def rigid_motions(positions):
    """(3 joints, 6) moves along and turns about the axes."""
    moves = np.tile(np.eye(3), (len(positions), 1))
    turns = np.concatenate([np.cross(np.eye(3), p).T for p in positions])
    return np.column_stack((moves, turns))


@pytest.mark.parametrize("joints", [5, 12, 40])
def test_null_vectors_of_a_free_body_are_its_rigid_motions(joints):
    (pattern, lower), positions = free_body(joints)
    basis = null_vectors(lower, pattern, 6, lower.max())
    # Orthonormal to rounding; the motions lie in the span to rounding over the softest mode (1e-3).
    assert np.allclose(basis.T @ basis, np.eye(6), atol=1e-12)
    rigid, _ = np.linalg.qr(rigid_motions(positions))
    assert np.allclose(basis @ (basis.T @ rigid), rigid, atol=1e-9)


def test_a_held_structure_has_none_however_many_are_asked_for():
    pattern, lower = net(10, 10)
    assert null_vectors(lower, pattern, 4, 4.0).shape == (100, 0)
    assert null_vectors(lower, pattern, 0, 4.0).shape == (100, 0)


def test_a_loose_joint_is_named_alone():
    pattern, lower = chain(80)
    lower[(pattern.indices == 33) | (pattern.columns == 33)] = 0.0
    basis = null_vectors(lower, pattern, 3, 2.0)
    assert basis.shape == (80, 1)
    assert np.allclose(basis[:, 0], np.eye(80)[33], atol=1e-14)


def test_unstable_directions_count_and_come_first():
    pattern, lower = net(10, 11)
    lower = lower - unit(pattern, 0.3)
    basis = null_vectors(lower, pattern, 5, 4.0)
    value = np.einsum("im,im->m", basis, pattern.to_csc(lower) @ basis)
    assert basis.shape[1] == int(np.sum(np.linalg.eigvalsh(pattern.to_csc(lower).toarray()) < 0.0))
    assert np.all(value < 0.0)
    assert np.all(np.diff(value) > 0.0)


def test_no_unknowns():
    pattern = SymmetricPattern.from_entries(0, [], [])
    assert null_vectors(np.zeros(0), pattern, 2, 1.0).shape == (0, 0)
