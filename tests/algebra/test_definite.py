"""Combinations of forms: found where there is one, proved absent where there is none."""

from __future__ import annotations

import numpy as np
import pytest

from tautbar.algebra.definite import held_by, most_positive

NO_SIDES = np.zeros((0, 2))


def of(*forms) -> np.ndarray:
    return np.array(forms, dtype=float)


def test_a_combination_that_no_single_form_gives() -> None:
    forms = of([[1.0, 0.0], [0.0, -0.4]], [[-0.4, 0.0], [0.0, 1.0]])
    found = most_positive(forms, NO_SIDES)
    assert found.positive == (True, True)
    assert np.linalg.eigvalsh(np.einsum("i,ijk->jk", found.factors, forms))[0] > 0.0


def test_no_combination_of_indefinite_forms() -> None:
    # Traceless: every combination has eigenvalues of both signs.
    assert most_positive(of([[1.0, 0.0], [0.0, -1.0]], [[0.0, 1.0], [1.0, 0.0]]), NO_SIDES).positive == (
        False,
        False,
    )


def test_sides_forbid_what_would_hold() -> None:
    forms = of([[1.0, 0.0], [0.0, 1.0]], [[1.0, 0.0], [0.0, 0.0]])
    assert most_positive(forms, np.array([[-1.0, 0.0]])).positive == (True, False)
    assert most_positive(forms, np.array([[1.0, 0.0]])).positive == (True, True)


def test_what_can_be_held_is_told_from_what_cannot() -> None:
    forms = of(np.diag([1.0, 0.0, 0.0]), np.diag([0.0, 1.0, 0.0]))
    assert most_positive(forms, NO_SIDES).positive == (True, True, False)
    assert most_positive(0.0 * forms, NO_SIDES).positive == (False, False, False)


@pytest.mark.parametrize("seed", range(10))
def test_random_forms_with_a_hidden_answer(seed) -> None:
    """Forms spanning a random definite one: it is found in any mixture of itself with others."""
    rng = np.random.default_rng(seed)
    m, s = 6, 4
    root = rng.standard_normal((m, m))
    others = rng.standard_normal((s, m, m))
    forms = others + others.transpose(0, 2, 1)
    mixture = rng.standard_normal(s)
    forms[-1] = (root @ root.T + np.eye(m) - np.einsum("i,ijk->jk", mixture[:-1], forms[:-1])) / mixture[-1]
    found = most_positive(forms, np.zeros((0, s)))
    assert found.positive == (True,) * m
    assert np.linalg.eigvalsh(np.einsum("i,ijk->jk", found.factors, forms))[0] > 0.0


def test_held_are_those_outside_every_weak_direction() -> None:
    assert held_by(np.diag([2.0, 1.0, 0.0])).tolist() == [True, True, False]
    assert held_by(np.array([[1.0, 1.0], [1.0, 1.0]])).tolist() == [False, False]
    assert held_by(np.array([[0.0, 1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, 3.0]])).tolist() == [
        False,
        False,
        True,
    ]
