"""Modes: closed forms, completeness, participation, and what the state they hold about does to them."""

from __future__ import annotations

import re

import numpy as np
import pytest
from scipy.linalg import eigh

import plain
import structures
from structures import EA, LINE, held, member
from tautbar import AnalysisFailed, find_modes, solve_static

ALL = 10_000


def rod(pieces=12, **more):
    """A bar clamped at one end, in pieces that move along it only."""
    joints = {f"J{i}": (2.0 * i / pieces, 0, 0) for i in range(pieces + 1)}
    bars = [{"name": "rod", "chain": list(joints), "section": "s"}]
    return structures.words(
        joints, bars, supports=[held("J0"), {"joints": ["J*"], "fixed": ["y", "z"]}], **more
    )


@pytest.mark.parametrize(("mass", "sign", "order"), [("consistent", 1, 2), ("lumped", -1, 2)])
def test_axial_frequencies_of_a_rod(mass, sign, order):
    """f_1 = c/(4 L): consistent mass from above, lumped from below, each with h^2."""
    exact = np.sqrt(EA / LINE) / (4 * 2.0)
    errors = []
    for pieces in (8, 16, 32):
        f = find_modes(structures.build(rod(pieces)), count=1, mass=mass)["frequency"][0]
        errors.append(f / exact - 1)
    assert (np.sign(errors) == sign).all()
    orders = np.log2(np.array(errors[:-1]) / np.array(errors[1:]))
    assert orders == pytest.approx(np.full(2, float(order)), abs=0.05)
    # Leading terms by Taylor: +-(pi h/(2 L))^2/24 with h = L/pieces.
    assert errors[-1] == pytest.approx(sign * (np.pi / 64) ** 2 / 24, rel=0.01)


def test_the_mean_of_both_masses_is_of_fourth_order():
    """The h^2 terms are equal and opposite, so half of either leaves h^4; a slip in 1/6 or 1/3 would not."""
    exact = np.sqrt(EA / LINE) / (4 * 2.0)
    errors = []
    for pieces in (4, 8, 16):
        model = structures.build(rod(pieces))
        both = [find_modes(model, count=1, mass=m)["eigenvalue"][0] for m in ("consistent", "lumped")]
        errors.append(abs(2 / (1 / both[0] + 1 / both[1]) / (2 * np.pi * exact) ** 2 - 1))
    assert np.log2(errors[0] / errors[1]) == pytest.approx(4.0, abs=0.1)
    assert np.log2(errors[1] / errors[2]) == pytest.approx(4.0, abs=0.1)


@pytest.mark.parametrize("mass", ["consistent", "lumped"])
def test_all_modes_against_a_dense_solution_of_plain_matrices(mass):
    model = structures.build(structures.mixed())
    state = solve_static(model, "all")
    found = find_modes(model, state, count=ALL, mass=mass)
    parts, system = model.parts, state.context.first_scene().system
    loading = parts.loadings["all"][0]
    X = system.structure.position.T + state["displacement"][0]
    J, n = system.structure.joints, system.n
    T = system.freedom.T.toarray().reshape(3, J, n).transpose(1, 0, 2).reshape(3 * J, n)
    K = T.T @ plain.stiffness(parts, plain.in_loading(parts, loading), X.tolist()) @ T
    M = T.T @ np.kron(plain.mass_matrix(parts, loading, mass == "lumped"), np.eye(3)) @ T
    expected = eigh(K, M, eigvals_only=True)
    # The state is known to 1e-9 of its forces, so its tangent and these values to some 1e-7.
    assert found["eigenvalue"] == pytest.approx(expected, rel=1e-6)
    assert found["frequency"] == pytest.approx(np.sqrt(expected) / (2 * np.pi), rel=1e-6)
    assert found["audit/sturm_count"] == n
    assert found["audit/residual"].max() < 1e-8


@pytest.mark.parametrize("mass", ["consistent", "lumped"])
def test_effective_masses_of_all_modes_sum_to_the_free_mass(mass):
    model = structures.build(structures.mixed())
    state = solve_static(model, "all")
    modes = find_modes(model, state, count=ALL, mass=mass)
    assert modes["effective_mass"].sum(axis=0) == pytest.approx(modes["free_mass"], rel=1e-9)
    M = plain.mass_matrix(model.parts, model.parts.loadings["all"][0], mass == "lumped")
    free = plain.free_projector(model.parts)
    for axis in range(3):
        d = free @ np.tile(np.eye(3)[axis], len(M))
        assert modes["free_mass"][axis] == pytest.approx(d @ np.kron(M, np.eye(3)) @ d, rel=1e-10)


@pytest.mark.parametrize("mass", ["consistent", "lumped"])
def test_energy_shares_sum_to_one(mass):
    """All members are in one of two groups here, masses in the last column."""
    described = structures.guyed_mast(pretension=3000.0)
    described["members"] = [
        {"name": "mast", "chain": ["foot", "top"], "section": "mast"},
        {"name": "guys", "pairs": [[f"anchor{i}", "top"] for i in range(3)], "kind": "tension-only",
         "section": "guy", "pretension": 3000.0},
    ]  # fmt: skip
    model = structures.build(described)
    modes = find_modes(model, solve_static(model, "dead"), mass=mass)
    share = modes["kinetic_energy_share"]
    assert list(modes["group"]) == ["mast", "guys", "masses"]
    assert share.sum(axis=1) == pytest.approx(np.ones(len(share)), rel=1e-12)
    third = 1 / 3 if mass == "consistent" else 1 / 2
    moving = {"mast": 20.0 * 10 * third, "guys": 3 * 0.5 * np.sqrt(164) * third, "masses": 300.0}
    expected = np.array(list(moving.values())) / sum(moving.values())
    assert share[0] == pytest.approx(expected, rel=1e-3)


def test_masses_of_acting_cases_count_once_whatever_the_factor():
    described = structures.guyed_mast(pretension=4000.0)
    described["load_cases"]["lamp"] = {"masses": [{"joints": ["top"], "mass": 100.0}]}
    model = structures.build(described)
    free = {
        f: find_modes(model, solve_static(model, {"dead": 1.0, "lamp": f}))["free_mass"]
        for f in (0.0, 0.5, 1.5)
    }
    assert free[0.5] == pytest.approx(free[0.0] + 100, rel=1e-12)
    assert free[1.5] == pytest.approx(free[0.0] + 100, rel=1e-12)


def test_tension_raises_and_compression_lowers_frequencies():
    """A weight on a bar pinned below, held sideways by springs: omega^2 = (k - N/l)/m and the reverse."""
    m, l, k = 50.0, 4.0, 3000.0
    for way in (1, -1):
        described = structures.words(
            {"pin": (0, 0, 0), "tip": (0, 0, way * l)},
            [member("post", "pin", "tip", section="post")],
            sections={"post": {"axial_stiffness": 1e9, "mass_per_length": 0.0}},
            supports=[held("pin"), {"joints": ["tip"], "springs": {"x": k, "y": 2 * k}}],
            masses=[{"joints": ["tip"], "mass": m}],
        )
        model = structures.build(described)
        f = find_modes(model, solve_static(model, "dead"), count=2)["frequency"]
        stiff = np.array([k, 2 * k]) - way * m * 9.80665 / l
        # Axial shortening of 2e-6 changes the lever arm by as much.
        assert f == pytest.approx(np.sqrt(stiff / m) / (2 * np.pi), rel=1e-5)


def test_modes_hold_about_their_state_not_about_the_drawing():
    described = structures.guyed_mast(slack=0.05)
    described["load_cases"]["blow"] = {"forces": [{"joints": ["top"], "force": [3000.0, 0, 0]}]}
    model = structures.build(described)
    blown = find_modes(model, solve_static(model, {"dead": 1.0, "blow": 1.0}))
    assert blown["frequency"][0] > 0.5
    assert blown["audit/zero_modes"] == 0
    drawn = find_modes(model)
    assert drawn["audit/zero_modes"] == 2, "all guys slack, nothing on the mast: it may lean either way"
    assert (drawn["frequency"][:2] == 0).all()
    assert drawn["effective_mass"][:2, :2].sum(axis=0) == pytest.approx(drawn["free_mass"][:2], rel=1e-9)


def test_zero_modes_are_counted_and_named():
    """A free triangle of bars in a plane: three rigid motions at 0 Hz, three that deform."""
    described = structures.words(
        {"A": (0, 0), "B": (2, 0), "C": (0.7, 1.5)},
        [member("ab", "A", "B"), member("bc", "B", "C"), member("ca", "C", "A")],
        plane="xy",
        unsupported="allowed",
    )
    modes = find_modes(structures.build(described), count=6)
    assert modes["audit/zero_modes"] == 3
    assert (modes["frequency"][:3] == 0).all()
    assert (modes["frequency"][3:] > 10).all()
    rows = str(modes).splitlines()
    assert rows[0].split()[:2] == ["mode", "Hz"]
    assert [row.split()[1] for row in rows[1:4]] == ["0", "0", "0"]
    assert float(rows[4].split()[1]) > 10
    assert any("3 modes at 0 Hz" in w and re.search(r"\([ABC] in ", w) for w in modes.record.warnings)
    # Rigid motions carry all of the mass in x and y between them.
    assert modes["effective_mass"][:3, :2].sum(axis=0) == pytest.approx(modes["free_mass"][:2], rel=1e-9)


def test_slack_members_give_no_stiffness_and_it_is_said():
    described = structures.guyed_mast(pretension=200.0)
    described["load_cases"]["blow"] = {"forces": [{"joints": ["top"], "force": [4000.0, 0, 0]}]}
    model = structures.build(described)
    state = solve_static(model, {"dead": 1.0, "blow": 1.0})
    slack = [n for n, t in zip(state.context.member_names, state["taut"][0], strict=True) if not t]
    assert slack == ["guy0"]
    modes = find_modes(model, state)
    assert any("slack members give no stiffness: guy0" in w for w in modes.record.warnings)


def test_an_unstable_state_fails_with_nan_beside_its_eigenvalue():
    described = structures.words(
        {"pin": (0, 0, 0), "tip": (0, 0, 2)},
        [member("post", "pin", "tip", pretension=-900.0)],
        supports=[held("pin"), {"joints": ["tip"], "fixed": ["y", "z"]}],
    )
    with pytest.raises(AnalysisFailed, match="the state is unstable") as caught:
        find_modes(structures.build(described))
    record = caught.value.record
    assert np.isnan(record["frequency"][0])
    mass = LINE * 2 / (1 - 900 / EA) / 3
    assert record["eigenvalue"][0] == pytest.approx(-900 / 2 / mass, rel=1e-9)


def test_up_to_gives_every_mode_below():
    model = structures.build(structures.mixed())
    state = solve_static(model, "all")
    every = find_modes(model, state, count=ALL)["frequency"]
    limit = 0.5 * (every[4] + every[5])
    assert find_modes(model, state, up_to=limit)["frequency"] == pytest.approx(every[:5], rel=1e-9)


def test_shapes_are_mass_normalised_with_their_largest_part_positive():
    model = structures.build(structures.mixed())
    state = solve_static(model, "all")
    shape = find_modes(model, state, count=ALL)["shape"]
    M = plain.mass_matrix(model.parts, model.parts.loadings["all"][0], False)
    gram = np.einsum("ajc,jk,bkc->ab", shape, M, shape)
    assert gram == pytest.approx(np.eye(len(gram)), abs=1e-9)
    for U in shape:
        assert U.ravel()[np.abs(U).argmax()] > 0
