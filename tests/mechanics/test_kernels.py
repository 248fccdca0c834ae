"""The vectorised kernels against the plain twins, member by member, to rounding."""

from __future__ import annotations

import numpy as np
import pytest

import plain
import structures
from tautbar.analyses.context import Context
from tautbar.mechanics import members
from tautbar.mechanics.loads import acting, nothing
from tautbar.mechanics.mass import kinetic_energy_by_member
from tautbar.model.parts import Loading

# Sums of some ten products of doubles: 1e-13 of the largest entry is rounding with a margin of 100.
ROUNDING = 1e-13


def close(found, expected):
    found, expected = np.asarray(found, float), np.asarray(expected, float)
    assert np.abs(found - expected).max() <= ROUNDING * max(np.abs(expected).max(), 1e-300)


@pytest.fixture(scope="module")
def parts():
    return structures.build(structures.mixed()).parts


@pytest.fixture(scope="module")
def scene(parts):
    return Context(parts).first_scene()


@pytest.fixture(scope="module", params=["nothing", "dead", "all"])
def loading(parts, request):
    return Loading("nothing", {}) if request.param == "nothing" else parts.loadings[request.param][0]


@pytest.fixture(params=[0, 1, 2])
def look(scene, parts, loading, request):
    """The structure pulled about at random, far enough that members go slack and taut."""
    q = 0.05 * np.random.default_rng(request.param).normal(size=scene.system.n)
    return scene.potential(scene.acting(loading)).look(q)


def displaced(scene, loading, q):
    """Positions of all joints, joint by joint."""
    U = scene.displacement(q, scene.acting(loading))
    return (scene.structure.position + U).T


def flat(joint_vectors):
    return np.asarray(joint_vectors, float).ravel()


def test_lengths_and_stiffnesses_are_what_each_way_of_giving_them_says(scene, parts):
    s, rods = scene.structure, plain.rods(parts)
    close(s.L0, [r.L0 for r in rods])
    close(s.EA, [r.EA for r in rods])
    close(s.stretch0, [plain.drawn_length(parts, i) - r.L0 for i, r in enumerate(rods)])
    close(s.tau, [r.tau for r in rods])


def test_member_forces_and_energy(scene, parts, loading, look):
    rods, X = plain.in_loading(parts, loading), displaced(scene, loading, look.q)
    lengths = [np.sqrt(plain.dot(r, r)) for r in (plain.vector_of(rod, X) for rod in rods)]
    close(look.axial, [plain.axial_force(rod, l) for rod, l in zip(rods, lengths, strict=True)])
    grounded = 0.5 * flat(displaced(scene, loading, look.q) - scene.structure.position.T)
    springs = grounded @ (plain.stiffness(parts, [], X) @ grounded) * 2
    close(look.strain_energy, plain.strain_energy(rods, X) + springs)
    assert 0 < (look.axial == 0).sum() < len(rods), "the case must have slack members and taut ones"


def test_forces_on_the_free_directions(scene, parts, loading, look):
    """Members' pulls, springs to ground and loads, projected on what supports leave free."""
    rods, X = plain.in_loading(parts, loading), displaced(scene, loading, look.q)
    force, _ = plain.load_vector(parts, loading)
    U = X - scene.structure.position.T
    springs = plain.stiffness(parts, [], X) @ flat(U)
    expected = plain.free_projector(parts) @ (flat(force) - flat(plain.internal_force(rods, X)) - springs)
    close(flat(scene.system.freedom.spread(look.residual).T), expected)


def test_free_directions_are_orthonormal_and_complete(scene, parts):
    T = scene.system.freedom.T.toarray()
    close(T.T @ T, np.eye(T.shape[1]))
    J = len(parts.joints)
    by_joint = T.reshape(3, J, -1).transpose(1, 0, 2).reshape(3 * J, -1)
    close(by_joint @ by_joint.T, plain.free_projector(parts))


def dense(scene, lower):
    return scene.system.pattern.to_csc(lower).toarray()


def by_joint(scene):
    """T with its rows joint by joint, as the plain twin has them."""
    J = scene.structure.joints
    return scene.system.freedom.T.toarray().reshape(3, J, -1).transpose(1, 0, 2).reshape(3 * J, -1)


def test_assembled_tangent(scene, parts, loading, look):
    rods, X = plain.in_loading(parts, loading), displaced(scene, loading, look.q)
    T = by_joint(scene)
    expected = T.T @ plain.stiffness(parts, rods, X) @ T
    found = dense(scene, scene.potential(scene.acting(loading)).curvature(look))
    close(found, expected)


def test_tangent_is_the_derivative_of_the_forces(scene, parts, loading, look):
    """Complex step through the plain forces: no difference of near numbers, so rounding is the limit."""
    rods, X = plain.in_loading(parts, loading), displaced(scene, loading, look.q)

    def force(x):
        return [f for joint in plain.internal_force(rods, plain.as_joints(x)) for f in joint]

    K = plain.jacobian(force, flat(X)) + plain.stiffness(parts, [], X)
    T = by_joint(scene)
    found = dense(scene, scene.potential(scene.acting(loading)).curvature(look))
    close(found, T.T @ K @ T)


def test_blocks_outside_the_pattern_do_not_exist(scene):
    """The unsymmetric assembly of symmetric blocks is the symmetric one mirrored."""
    rng = np.random.default_rng(8)
    values = rng.normal(size=(6, scene.structure.members))
    xx, yy, zz, xy, xz, yz = values
    nine = np.stack([xx, xy, xz, xy, yy, yz, xz, yz, zz])
    full = scene.system.member_full(nine)
    close(full, scene.system.member_lower(values)[scene.system.pattern.full.mirror])


@pytest.mark.parametrize("lumped", [True, False])
def test_mass_matrix(scene, parts, loading, lumped):
    found = scene.system.joint_mass(scene.acting(loading), lumped).toarray()
    close(found, plain.mass_matrix(parts, loading, lumped))


@pytest.mark.parametrize("lumped", [True, False])
def test_every_rigid_translation_has_the_true_mass(scene, parts, lumped):
    rods = plain.rods(parts)
    true = sum(r.m * r.L0 for r in rods) + sum(plain.own_masses(parts))
    M = scene.system.joint_mass(nothing(scene.structure), lumped).toarray()
    close(M.sum(), true)


def test_kinetic_energy_by_member_sums_to_the_whole(scene, parts):
    V = np.random.default_rng(3).normal(size=(3, len(parts.joints)))
    s = scene.structure
    for lumped in (True, False):
        by_member = kinetic_energy_by_member(s, np.zeros(s.members), V, lumped).sum()
        M = scene.system.joint_mass(nothing(scene.structure), lumped).toarray()
        at_joints = np.array(plain.own_masses(parts))
        close(by_member + (at_joints * V * V).sum(), np.einsum("cj,jk,ck->", V, M, V))


def test_load_vector(scene, parts, loading):
    now = acting(parts, scene.structure, loading)
    force, move = plain.load_vector(parts, loading)
    close(now.force.T, force)
    close(now.move.T, move)


def test_unstressed_lengths_under_a_loading(scene, parts, loading):
    now = scene.acting(loading)
    found = members.springs(scene.structure, now.take_up, now.heating)
    rods = plain.in_loading(parts, loading)
    close(found.L0, [r.L0 for r in rods])
    close(found.k, [r.EA / r.L0 for r in rods])
    close(found.e0, [plain.drawn_length(parts, i) - r.L0 for i, r in enumerate(rods)])


def test_elongation_keeps_its_digits_where_lengths_lose_them():
    """A kilometre of stiff rod stretched by a nanometre: l - L0 knows it to 1e-4, the kernel to rounding."""
    model = structures.build(
        structures.words(
            {"A": (0, 0, 0), "B": (600.0, 800.0, 0)},
            [structures.member("rod", "A", "B")],
            supports=[structures.held("A")],
            unsupported="allowed",
        )
    )
    sp = members.springs(Context(model.parts).first_scene().structure)
    for size in (1e-9, 1e-3, 3.0):
        du = size * np.array([[0.6], [0.8], [0.0]])
        assert members.stretch(sp, du).e[0] == pytest.approx(size, rel=1e-15 * 4)


def test_a_tie_at_its_length_is_taut_by_state_but_carries_nothing():
    model = structures.build(
        structures.words(
            {"A": (0, 0, 0), "B": (1.0, 0, 0)},
            [structures.member("tie", "A", "B", kind="tension-only")],
            supports=[structures.held("A", "B")],
        )
    )
    sp = members.springs(Context(model.parts).first_scene().structure)
    for e, taut, firmly in (
        (-1e-13, True, False),
        (1e-13, True, False),
        (-1e-11, False, False),
        (1e-11, True, True),
    ):
        e = np.array([e])
        assert members.taut(sp, e)[0] == taut
        assert members.firmly_taut(sp, e)[0] == firmly
        assert members.force(sp, e)[0] == pytest.approx(structures.EA * max(e[0], 0.0), rel=1e-15)
