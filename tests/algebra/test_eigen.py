"""Modes against closed forms and scipy's dense solution, and the proof against modes left out."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from matrices import (
    chain,
    chain_eigenvalues,
    dense_of,
    dominant,
    free_body,
    free_chain,
    from_dense,
    net,
    net_eigenvalues,
    random_matrix,
    skew_chain,
    unit,
)
from scipy.linalg import eigh

from tautbar.algebra import eigen
from tautbar.algebra.eigen import lowest_modes
from tautbar.algebra.pattern import SymmetricPattern
from tautbar.algebra.pencil import Pencil
from tautbar.algebra.solver import Singular, choose_solver

EPS = np.finfo(float).eps
every_back_end = pytest.mark.parametrize("name", ["dense", "band", "superlu"])


def modes_of(matrix, mass, name=None, **wanted):
    pattern, lower = matrix
    solver = None if name is None else choose_solver(pattern, prefer=name)
    modes = lowest_modes(lower, mass, pattern, solver=solver, **wanted)
    assert_sound(modes, dense_of(matrix), dense_of((pattern, mass)))
    return modes


def assert_sound(modes, stiffness, mass):
    """What must hold of any answer, worked out again from dense matrices."""
    x, value = modes.shape, modes.eigenvalue
    assert modes.complete
    assert np.all(np.diff(value) >= 0.0)
    # Rounding of sums of n terms of order one; 1e-12 leaves room for n of some thousands.
    gram = x.T @ mass @ x
    assert np.abs(gram - np.eye(len(value))).max(initial=0.0) <= 1e-12
    assert modes.orthogonality == pytest.approx(np.abs(gram - np.eye(len(value))).max(initial=0.0), abs=1e-14)
    # Backward error of each pair: a hundred times the rounding of (K + s M) x, s up to 10 |lowest|.
    left = np.linalg.norm(stiffness @ x - mass @ x * value, axis=0)
    shift = 10.0 * np.abs(value).max(initial=0.0)
    allowed = np.linalg.norm((np.abs(stiffness) + shift * np.abs(mass)) @ np.abs(x), axis=0)
    assert np.all(left <= 100.0 * EPS * allowed)
    assert np.all(modes.residual_floor >= EPS)
    for column in x.T:
        assert column.max() >= (1.0 - 1e-5) * np.abs(column).max()


@every_back_end
@pytest.mark.parametrize("n", [1, 2, 3, 40, 49, 60, 400])
def test_chain_modes_are_the_textbook_ones(name, n):
    pattern, lower = chain(n)
    modes = modes_of((pattern, 1e6 * lower), unit(pattern, 3.0), name, count=5)
    exact = 1e6 / 3.0 * chain_eigenvalues(n)[:5]
    assert modes.shape.shape == (n, min(n, 5))
    # Rounding of K itself moves the lowest eigenvalue by eps (greatest / lowest), 1e-11 at n = 400.
    assert np.allclose(modes.eigenvalue, exact, rtol=20.0 * EPS * 4e6 / 3.0 / exact[0], atol=0.0)
    assert (modes.zero, modes.negative, modes.count_below) == (0, 0, min(n, 5))


@settings(deadline=None, max_examples=30)
@given(st.integers(2, 90), st.integers(0, 10**6), st.integers(1, 12))
def test_random_pencils_agree_with_a_dense_solution(n, seed, count):
    stiffness, (pattern, mass) = random_matrix(n, seed), dominant(random_matrix(n, seed))
    modes = modes_of(stiffness, mass, count=count)
    exact = eigh(dense_of(stiffness), dense_of((pattern, mass)), eigvals_only=True)
    # Both err by eps x the greatest eigenvalue in size (x condition of M, below 1e3 here).
    assert np.abs(modes.eigenvalue - exact[:count]).max() <= 1e-11 * np.abs(exact).max()
    assert modes.negative == int(np.sum(exact < 0.0))


@every_back_end
@pytest.mark.parametrize("count", [1, 10, 11, 12, 30])
def test_equal_eigenvalues_of_a_square_net_are_all_found(name, count):
    # Modes (i, j) and (j, i) are equal; counts 11 and 12 end inside and after such pairs.
    matrix, exact = net(20, 20), net_eigenvalues(20, 20)
    modes = modes_of(matrix, unit(matrix[0]), name, count=count)
    assert np.allclose(modes.eigenvalue, exact[:count], rtol=1e-12, atol=0.0)  # 8 eps / lowest, x 10
    assert modes.count_below == int(np.sum(exact < exact[count - 1] * (1.0 + 1e-6)))


def copies(matrix, number):
    """The same structure several times over, not connected: every eigenvalue ``number`` times."""
    return from_dense(np.kron(np.eye(number), dense_of(matrix)))


@every_back_end
def test_five_equal_structures_have_every_mode_five_times(name):
    matrix = copies(chain(30), 5)
    modes = modes_of(matrix, unit(matrix[0]), name, count=15)
    exact = np.repeat(chain_eigenvalues(30)[:3], 5)
    assert np.allclose(modes.eigenvalue, exact, rtol=1e-12, atol=0.0)
    assert modes.count_below == 15


@every_back_end
def test_a_count_that_cuts_a_large_family_of_equals_is_proven_from_below(name):
    # 300 single masses on equal springs, one softer: finding all 299 equals is not needed.
    pattern = SymmetricPattern.from_entries(300, [], [])
    lower = np.full(300, 7.0)
    lower[123] = 1.0
    modes = modes_of((pattern, lower), np.full(300, 2.0), name, count=4)
    assert np.allclose(modes.eigenvalue, [0.5, 3.5, 3.5, 3.5], rtol=1e-14, atol=0.0)
    assert modes.count_below == 300
    assert modes.shape[123, 0] == pytest.approx(np.sqrt(0.5), rel=1e-14)


@every_back_end
@pytest.mark.parametrize("joints", [5, 12, 60])
def test_a_body_held_nowhere_has_six_zero_modes(name, joints):
    matrix, _ = free_body(joints)
    mass = unit(matrix[0], 2.5)
    modes = modes_of(matrix, mass, name, count=8)
    greatest = np.linalg.eigvalsh(dense_of(matrix))[-1] / 2.5
    assert (modes.zero, modes.negative) == (6, 0)
    assert np.abs(modes.eigenvalue[:6]).max() <= 1e-13 * greatest
    assert modes.eigenvalue[6] > 1e-9 * greatest
    # Rigid motions are exactly those: moving along an axis has no part outside the six.
    moved = np.tile([1.0, 0.0, 0.0], joints)
    six = modes.shape[:, :6]
    assert np.allclose(six @ (six.T @ moved) * 2.5, moved, atol=1e-9)


@every_back_end
def test_a_free_chain_of_consistent_mass(name):
    pattern, lower = free_chain(200)
    mass = unit(pattern, 2.0 / 3.0)
    mass[pattern.diagonal[[0, -1]]] = 1.0 / 3.0
    mass[pattern.position(np.arange(1, 200), np.arange(199))] = 1.0 / 6.0
    modes = modes_of((pattern, lower), mass, name, count=4)
    # Archer's consistent mass: lambda = 6 (1 - cos a) / (2 + cos a), a = k pi / (joints - 1).
    a = np.pi * np.arange(4) / 199
    exact = 6.0 * (1.0 - np.cos(a)) / (2.0 + np.cos(a))
    assert np.allclose(modes.eigenvalue[1:], exact[1:], rtol=1e-10, atol=0.0)  # eps x 12 / 2.5e-4, x 10
    assert abs(modes.eigenvalue[0]) < 1e-14
    assert (modes.zero, modes.negative) == (1, 0)


@every_back_end
def test_a_structure_without_any_stiffness(name):
    pattern, lower = net(8, 8)
    modes = modes_of((pattern, 0.0 * lower), unit(pattern), name, count=3)
    assert np.abs(modes.eigenvalue).max() < 1e-12
    assert (modes.zero, modes.negative, modes.count_below) == (64, 0, 64)


@every_back_end
@pytest.mark.parametrize("drop", [0.1, 0.5])
def test_unstable_states_give_negative_eigenvalues(name, drop):
    pattern, lower = net(20, 20)
    modes = modes_of((pattern, lower - unit(pattern, drop)), unit(pattern), name, count=16)
    exact = net_eigenvalues(20, 20) - drop
    assert np.abs(modes.eigenvalue - exact[:16]).max() < 1e-13  # eps x greatest (8), x 50
    assert (modes.zero, modes.negative) == (0, int(np.sum(exact < 0.0)))


@every_back_end
def test_low_modes_of_a_stiff_chain_keep_their_digits(name):
    # Along an axis, 2^24 times as stiff along as across. Lowest over greatest is 1.4e-11, so dense
    # solution and Rayleigh quotient lose all but 5 digits; the inverse keeps them but for those that
    # the chain of 100 loses by itself (eps x 4 / 1e-3).
    matrix = from_dense(np.kron(dense_of(chain(100)), np.diag([2.0**24, 1.0])))
    modes = modes_of(matrix, unit(matrix[0]), name, count=5)
    assert np.allclose(modes.eigenvalue, chain_eigenvalues(100)[:5], rtol=1e-11, atol=0.0)
    assert modes.zero == 0


@every_back_end
def test_a_skew_stiff_chain_is_as_good_as_its_matrix_allows(name):
    # Stiff and soft share every entry here: rounding moves eigenvalues by eps x greatest (1e-9).
    matrix = skew_chain(100, stiff=2.0**20)
    modes = modes_of(matrix, unit(matrix[0], 25.0), name, count=5)
    assert np.abs(modes.eigenvalue - chain_eigenvalues(100)[:5]).max() < 1e-9
    assert modes.zero == 0


def test_massless_unknowns_follow_the_others():
    rng = np.random.default_rng(3)
    pattern, lower = net(12, 12)
    mass = unit(pattern)
    mass[pattern.diagonal[rng.permutation(144)[:70]]] = 0.0
    inverse = eigh(dense_of((pattern, mass)), dense_of((pattern, lower)), eigvals_only=True)
    exact = np.sort(1.0 / inverse[inverse > 1e-9])
    for name in ("dense", "band", "superlu"):
        few = modes_of((pattern, lower), mass, name, count=6)
        every = modes_of((pattern, lower), mass, name, count=1000)
        assert np.allclose(few.eigenvalue, exact[:6], rtol=1e-13, atol=0.0)
        assert every.eigenvalue.shape == (74,), "only as many modes as unknowns with mass"
        assert np.allclose(every.eigenvalue, exact, rtol=1e-12, atol=0.0)


def test_an_unknown_with_neither_mass_nor_stiffness_is_refused():
    pattern, lower = chain(4)
    lower[:] = 0.0
    lower[pattern.diagonal[1:]] = 1.0
    mass = unit(pattern)
    mass[0] = 0.0
    with pytest.raises(Singular, match="without mass"):
        lowest_modes(lower, mass, pattern, count=1)


@every_back_end
def test_all_modes_up_to_a_value(name):
    matrix, exact = net(20, 20), net_eigenvalues(20, 20)
    mass = unit(matrix[0])
    for limit in (0.9 * exact[0], 0.5, 0.5 * (exact[5] + exact[6])):
        modes = modes_of(matrix, mass, name, up_to=limit)
        assert modes.eigenvalue.shape == (int(np.sum(exact < limit)),)
    assert modes_of(matrix, mass, name, up_to=0.5, count=3).eigenvalue.shape == (3,)


def test_nothing_to_find():
    pattern = SymmetricPattern.from_entries(0, [], [])
    modes = lowest_modes(np.zeros(0), np.zeros(0), pattern, count=3)
    assert (modes.shape.shape, modes.complete, modes.zero, modes.negative) == ((0, 0), True, 0, 0)
    pattern, lower = chain(3)
    assert lowest_modes(lower, unit(pattern), pattern, count=0).shape.shape == (3, 0)
    with pytest.raises(ValueError, match="count of modes or a highest"):
        lowest_modes(lower, unit(pattern), pattern)


def test_the_same_question_has_the_same_answer_to_the_bit():
    matrix = net(15, 15)
    first, again = (modes_of(matrix, unit(matrix[0]), count=9) for _ in range(2))
    assert np.array_equal(first.eigenvalue, again.eigenvalue)
    assert np.array_equal(first.shape, again.shape)


def forgetful(times):
    """A Lanczos search that loses its second pair the first ``times`` times."""
    search, calls = eigen._lanczos, []

    def lossy(inverse, known, count):
        pairs = search(inverse, known, count)
        calls.append(count)
        if len(calls) > times:
            return pairs
        keep = np.arange(len(pairs.value)) != 1
        return eigen._Pairs(pairs.value[keep], pairs.shape[:, keep])

    return lossy


def test_a_mode_the_search_missed_is_noticed_and_found(monkeypatch):
    monkeypatch.setattr(eigen, "_lanczos", forgetful(times=1))
    matrix = net(20, 21)
    modes = modes_of(matrix, unit(matrix[0]), count=6)
    assert np.allclose(modes.eigenvalue, net_eigenvalues(20, 21)[:6], rtol=1e-12, atol=0.0)


def test_modes_that_cannot_be_completed_are_not_called_complete(monkeypatch):
    full = eigen._lanczos

    def blind(inverse, known, count):
        pairs = full(inverse, np.zeros((inverse.pencil.n, 0)), count + 1)
        return eigen._Pairs(pairs.value[1:], pairs.shape[:, 1:]) if known.shape[1] == 0 else pairs_of(known)

    def pairs_of(known):
        return eigen._Pairs(np.zeros(0), known[:, :0])

    monkeypatch.setattr(eigen, "_lanczos", blind)
    pattern, lower = net(20, 21)
    modes = lowest_modes(lower, unit(pattern), pattern, count=6)
    assert not modes.complete
    assert modes.count_below == 7, "one more than the six found"


def test_counts_that_cannot_be_trusted_are_not_called_complete(monkeypatch):
    monkeypatch.setattr("tautbar.algebra.blocks.GROWTH_LIMIT", 0.0)
    pattern, lower = free_chain(100)
    modes = lowest_modes(lower, unit(pattern), pattern, count=3, solver=choose_solver(pattern, prefer="band"))
    assert (modes.complete, modes.count_below, modes.zero, modes.negative) == (False, -1, -1, -1)


def test_residual_and_orthogonality_measure_what_is_wrong():
    pattern, lower = free_chain(6)
    mass = unit(pattern, 2.0)
    pencil = Pencil(lower, mass, pattern, choose_solver(pattern), greatest=2.0)
    right = lowest_modes(lower, mass, pattern, count=3)
    wrong = right.shape + np.outer(np.arange(6.0), [1e-3, 0.0, 1e-2])
    value = right.eigenvalue + np.array([0.0, 1e-3, 0.0])
    judged = eigen._judged(pencil, eigen._Pairs(value, wrong), 3, 3, True, 0.0)
    stiffness = dense_of((pattern, lower))
    x = wrong / np.sqrt(2.0 * np.sum(wrong**2, axis=0))
    force, inertia = stiffness @ x, 2.0 * x
    left = np.linalg.norm(force - value * inertia, axis=0)
    scale = np.linalg.norm(force, axis=0)
    scale[0] = 2.0 * np.linalg.norm(inertia[:, 0])  # the zero mode: greatest eigenvalue x |M x|
    assert np.allclose(judged.residual, left / scale, rtol=1e-12)
    assert judged.residual.min() > 1e-4
    assert judged.orthogonality == pytest.approx(np.abs(2.0 * x.T @ x - np.eye(3)).max(), rel=1e-12)
