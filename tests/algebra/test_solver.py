"""Every back end against numpy on the dense matrix, and against each other."""

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
    matrix_of,
    net,
    random_matrix,
    skew_chain,
    unit,
)

from tautbar.algebra import solver as solvers
from tautbar.algebra.band import BandSolver
from tautbar.algebra.ordering import half_bandwidth, narrow_order
from tautbar.algebra.solver import NotFinite, NotPositiveDefinite, Singular, cheapest, choose_solver
from tautbar.algebra.superlu import SuperluSolver

BACK_ENDS = ("dense", "band", "superlu")
EPS = np.finfo(float).eps

every_back_end = pytest.mark.parametrize("name", BACK_ENDS)


def solver_of(matrix, name):
    return choose_solver(matrix[0], prefer=name)


def signs(matrix, name):
    factor = solver_of(matrix, name).symmetric(matrix[1])
    assert factor.trusted
    return factor.negative, factor.zero


def true_signs(matrix):
    """From numpy; an eigenvalue within n eps of the greatest is zero, its own rounding."""
    value = np.linalg.eigvalsh(dense_of(matrix))
    width = len(value) * EPS * np.abs(value).max(initial=0.0)
    return int(np.sum(value < -width)), int(np.sum(np.abs(value) <= width))


def assert_solves(factor, dense, condition):
    """One and several right-hand sides, to n eps x condition: what backward stability promises."""
    n = len(dense)
    rng = np.random.default_rng(0)
    exact = rng.normal(size=(n, 3))
    right = dense @ exact
    kept = right.copy()
    tolerance = 10.0 * max(n, 1) * EPS * condition
    several, one = factor.solve(right), factor.solve(right[:, 0])
    assert np.abs(several - exact).max(initial=0.0) <= tolerance
    assert (several.shape, one.shape, factor.solve(right[:, :0]).shape) == ((n, 3), (n,), (n, 0))
    assert np.abs(one - exact[:, 0]).max(initial=0.0) <= tolerance
    assert np.array_equal(right, kept)


@every_back_end
@pytest.mark.parametrize("n", [0, 1, 2, 7, 60, 150])
def test_cholesky_solves(name, n):
    matrix = dominant(random_matrix(n, seed=n))
    given_values = matrix[1].copy()
    factor = solver_of(matrix, name).cholesky(matrix[1])
    dense = dense_of(matrix)
    assert_solves(factor, dense, np.linalg.cond(dense) if n else 1.0)
    assert np.array_equal(matrix[1], given_values)


@every_back_end
@pytest.mark.parametrize("n", [0, 1, 2, 7, 60, 150])
def test_symmetric_solves_and_counts(name, n):
    matrix = random_matrix(n, seed=n + 100)
    dense, given_values = dense_of(matrix), matrix[1].copy()
    factor = solver_of(matrix, name).symmetric(matrix[1])
    assert (factor.negative, factor.zero) == true_signs(matrix)
    # Growth multiplies the rounding of an elimination.
    assert_solves(factor, dense, factor.growth * np.linalg.cond(dense) if n else 1.0)
    assert np.array_equal(matrix[1], given_values)


@every_back_end
@pytest.mark.parametrize("n", [0, 1, 2, 7, 60, 150])
def test_general_solves(name, n):
    pattern, lower = random_matrix(n, seed=n + 200)
    full_data = lower[pattern.full.mirror] * np.random.default_rng(n).uniform(
        0.5, 2.0, pattern.full.indices.size
    )
    dense = pattern.full.to_csc(full_data).toarray()
    factor = choose_solver(pattern, prefer=name).general(full_data)
    # Pivots may be a tenth of the largest entry of their column: growth of some hundreds.
    assert_solves(factor, dense, 100.0 * np.linalg.cond(dense) if n else 1.0)


@every_back_end
def test_refactoring_gives_the_same_bits(name):
    first, second = dominant(net(9, 9)), random_matrix(81, 3)
    solver = choose_solver(first[0], prefer=name)
    right = np.arange(81.0)
    before = solver.cholesky(first[1])
    x = before.solve(right)
    solver.cholesky(3.0 * first[1])
    solver.symmetric(first[1] - 2.0 * unit(first[0]))
    assert np.array_equal(before.solve(right), x), "an older factor stays what it was"
    assert np.array_equal(solver.cholesky(first[1]).solve(right), x)
    assert second[0].n == first[0].n


@settings(deadline=None, max_examples=60)
@given(st.integers(1, 40), st.integers(0, 10**6), st.floats(0.3, 3.0))
def test_counts_agree_between_back_ends_and_with_eigenvalues(n, seed, links):
    matrix = random_matrix(n, seed, links)
    expected = true_signs(matrix)
    assert [signs(matrix, name) for name in BACK_ENDS] == [expected] * 3


@settings(deadline=None, max_examples=60)
@given(st.integers(2, 30), st.integers(0, 10**6))
def test_counts_of_singular_matrices_of_whole_numbers(n, seed):
    # A signed sum of outer products of whole-number links: its signs follow from eigenvalues that are
    # either zero or far from it, and hardly any diagonal pivot order is safe.
    rng = np.random.default_rng(seed)
    dense = np.zeros((n, n))
    for a, b in rng.integers(0, n, (n, 2)):
        link = np.zeros(n)
        link[a] += 1.0
        link[b] -= 1.0
        dense += rng.choice([-1.0, 1.0]) * np.outer(link, link)
    matrix = from_dense(dense)
    value = np.linalg.eigvalsh(dense)
    expected = int(np.sum(value < -1e-8)), int(np.sum(np.abs(value) <= 1e-8))
    for name in BACK_ENDS:
        assert signs(matrix, name) == expected


@every_back_end
@pytest.mark.parametrize("n", [2, 3, 130, 131])
def test_a_diagonal_of_zeros_needs_pivots_of_two(name, n):
    # Eigenvalues 2 cos(k pi / (n + 1)): half of them negative, one zero if n is odd.
    assert signs(chain(n, diagonal=0.0, beside=1.0), name) == (n // 2, n % 2)


def test_blocks_that_are_singular_alone_are_joined():
    # Unknowns 0..63 are coupled to 64..127 only: the first block of the band is all zeros.
    i = np.arange(64)
    pattern, lower = matrix_of(128, i + 64, i, np.linspace(1.0, 2.0, 64))
    solver = BandSolver(pattern, order=np.arange(128))
    factor = solver.symmetric(lower)
    assert (factor.negative, factor.zero, factor.trusted) == (64, 0, True)
    assert_solves(factor, dense_of((pattern, lower)), 2.0)


def test_a_factor_that_grew_says_so(monkeypatch):
    monkeypatch.setattr("tautbar.algebra.blocks._MOST_MERGES", 0)
    i = np.arange(64)
    pattern, lower = matrix_of(128, i + 64, i, np.linspace(1.0, 2.0, 64))
    factor = BandSolver(pattern, order=np.arange(128)).symmetric(lower)
    assert factor.growth > 1e8
    assert not factor.trusted


@every_back_end
def test_a_body_held_nowhere_has_six_zero_pivots(name):
    matrix, _ = free_body()
    factor = solver_of(matrix, name).symmetric(matrix[1])
    assert (factor.negative, factor.zero) == (0, 6)
    with pytest.raises(Singular, match="6 pivots are zero"):
        factor.solve(np.ones(matrix[0].n))


@settings(deadline=None, max_examples=40)
@given(st.integers(4, 40), st.integers(0, 10**6))
def test_zero_pivots_of_bodies_are_found_wherever_elimination_ends(joints, seed):
    # The last unknowns may hardly move in some rigid motions, which magnifies rounding in the pivots.
    matrix, _ = free_body(joints, seed)
    value = np.linalg.eigvalsh(dense_of(matrix))
    if value[6] < 1e-9 * value[-1]:
        return  # nearly flat: no clear number of zeros
    for name in BACK_ENDS:
        assert signs(matrix, name) == (0, 6)
        with pytest.raises(NotPositiveDefinite):
            solver_of(matrix, name).cholesky(matrix[1])


@every_back_end
def test_counts_do_not_depend_on_units(name):
    # Unknowns measured in units from 1e-6 to 1e6: a congruence, so the signs stay.
    pattern, lower = free_body()[0]
    unit_of = 10.0 ** np.random.default_rng(0).uniform(-6.0, 6.0, pattern.n)
    scaled = lower * unit_of[pattern.indices] * unit_of[pattern.columns]
    assert signs((pattern, scaled), name) == (0, 6)
    assert signs((pattern, 1e-9 * lower - unit(pattern, 1e-14)), name) == (6, 0)


@every_back_end
def test_a_stiff_taut_chain_is_not_taken_for_a_mechanism(name):
    # Tension 1e-9 of the axial stiffness: a pivot of 1e-9 of its diagonal is stiffness, not rounding.
    matrix = skew_chain(150, stiff=1e9)
    solver = solver_of(matrix, name)
    solver.cholesky(matrix[1])
    assert signs(matrix, name) == (0, 0)


@every_back_end
@pytest.mark.parametrize(
    "matrix",
    [
        (free_chain(40)),
        (free_chain(3)),
        (free_body()[0]),
        (chain(1, diagonal=0.0)),
        (chain(1, diagonal=-1.0)),
        (chain(90, diagonal=1.9)),
        (random_matrix(90, 5)),
    ],
    ids=["free chain", "three", "free body", "nothing", "negative", "one negative", "random"],
)
def test_what_is_not_positive_definite_is_refused(name, matrix):
    with pytest.raises(NotPositiveDefinite):
        solver_of(matrix, name).cholesky(matrix[1])


@every_back_end
@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf])
@pytest.mark.parametrize("n", [1, 5, 200])
def test_values_that_are_not_finite_are_refused_wherever_they_are(name, bad, n):
    pattern, lower = chain(n)
    solver = choose_solver(pattern, prefer=name)
    for at in {0, pattern.nnz // 2, pattern.nnz - 1}:
        spoilt = lower.copy()
        spoilt[at] = bad
        with pytest.raises(NotPositiveDefinite):
            solver.cholesky(spoilt)
        with pytest.raises(NotFinite):
            solver.symmetric(spoilt)
        with pytest.raises(NotFinite):
            solver.general(spoilt[pattern.full.mirror])


@every_back_end
@pytest.mark.parametrize("n", [1, 5, 200])
def test_an_unsymmetric_matrix_without_an_inverse_is_refused(name, n):
    pattern, lower = chain(n)
    full_data = lower[pattern.full.mirror]
    full_data[pattern.full.columns == n // 2] = 0.0
    with pytest.raises(Singular):
        choose_solver(pattern, prefer=name).general(full_data)


def shuffled(matrix, seed=0):
    pattern, lower = matrix
    to = np.random.default_rng(seed).permutation(pattern.n)
    return matrix_of(pattern.n, to[pattern.indices], to[pattern.columns], lower)


@pytest.mark.parametrize("n", [2, 500])
def test_the_numbering_given_does_not_widen_the_band(n):
    pattern, _ = shuffled(chain(n))
    assert half_bandwidth(pattern, narrow_order(pattern)) == 1


def test_unknowns_of_a_joint_are_ordered_together():
    pattern, _ = from_dense(np.kron(dense_of(chain(100)), np.ones((3, 3))))
    assert half_bandwidth(pattern, narrow_order(pattern)) == 5


def test_superlu_is_never_left_with_the_numbering_given():
    # Natural order on a shuffled net fills it almost wholly: more than ten times these entries.
    given_order, mixed = net(30, 30), shuffled(net(30, 30))
    fill = [SuperluSolver(p).cholesky(lower).lu.L.nnz for p, lower in (given_order, mixed)]
    assert max(fill) < 20 * given_order[0].n
    assert max(fill) < 1.3 * min(fill)


def test_decaying_fill_does_not_change_the_band_solution():
    # Mass much larger than stiffness: entries of the inverse fall by 1e-12 a joint, past the least
    # double. The background put under them is far below rounding.
    pattern, lower = dominant(net(12, 12))
    lower = lower + unit(pattern, 1e12)
    x = choose_solver(pattern, prefer="band").cholesky(lower).solve(np.ones(144))
    reference = np.linalg.solve(dense_of((pattern, lower)), np.ones(144))
    assert np.allclose(x, reference, rtol=1e-14, atol=0.0)


@pytest.mark.parametrize(
    ("n", "half_band", "best"),
    [(0, 0, "dense"), (12, 5, "dense"), (300, 23, "band"), (9831, 245, "band"), (10**6, 5, "band")],
)
def test_cheapest_back_end_for_sizes_measured(n, half_band, best):
    assert cheapest(n, half_band) == best


def test_a_band_too_wide_or_too_large_goes_to_superlu():
    assert cheapest(20_000, 2000) == "superlu"
    assert cheapest(10**6, 1000) == "superlu", "8 GB of band"


def test_choose_solver_takes_the_cheapest_or_the_one_asked_for():
    assert choose_solver(chain(5)[0]).name == "dense"
    assert choose_solver(chain(500)[0]).name == "band"
    assert choose_solver(chain(5)[0], prefer="superlu").name == "superlu"
    with pytest.raises(ValueError, match="no back end 'best'; there are dense, band, superlu"):
        choose_solver(chain(5)[0], prefer="best")
    assert set(BACK_ENDS) == set(solvers._CHOICES)


def test_chain_inertia_follows_its_known_eigenvalues():
    # Between two eigenvalues of a chain of 400, six back-end counts along the spectrum.
    values = chain_eigenvalues(400)
    pattern, lower = chain(400)
    for k in (1, 57, 200, 333, 399):
        middle = 0.5 * (values[k - 1] + values[k])
        for name in BACK_ENDS:
            assert signs((pattern, lower - unit(pattern, middle)), name) == (k, 0)
