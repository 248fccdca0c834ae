"""Roads from a cold start: the right equilibrium, not just any balance."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import minimize

import structures
from tautbar.analyses.context import Context
from tautbar.solvers.equilibrium import descend, find_equilibrium
from tautbar.solvers.stability import count_pivots, leave_saddle

TOLERANCE = 1e-9


def potential_of(described, loads="dead"):
    parts = structures.build(described).parts
    scene = Context(parts).first_scene()
    return scene, scene.potential(scene.acting(parts.loadings[loads][0]))


def slack_net(seed):
    described = structures.tumbling_net(n=4, slack=0.05 + 0.05 * seed)
    described["gravity"] = 9.81
    described["supports"] = [structures.held("J00", "J30", "J03", "J33")]
    described["sections"]["s"]["axial_stiffness"] = 10.0 ** (3 + seed)
    return described


@pytest.mark.parametrize("seed", [0, 1, 2, 3])
def test_a_slack_net_finds_the_one_minimum_of_its_energy(seed):
    """Ties alone are convex: an outside minimiser from another start must find the same energy.

    It is asked for 1e-9 of the gradient and stops where energies of some 10 J stop to differ.
    """
    scene, potential = potential_of(slack_net(seed))
    found = find_equilibrium(potential, np.zeros(scene.system.n), TOLERANCE)
    assert found.converged
    assert count_pivots(potential, found.look).negative == 0
    away = found.q + 0.1 * np.random.default_rng(seed).normal(size=found.q.size)

    def energy(q):
        look = potential.look(q)
        return look.energy, -look.residual

    other = minimize(energy, away, jac=True, method="L-BFGS-B", options={"maxiter": 20000, "maxfun": 50000,
                     "gtol": 1e-7, "ftol": 1e-16, "maxcor": 40})  # fmt: skip
    assert other.fun == pytest.approx(found.look.energy, rel=1e-6)
    assert found.look.energy <= other.fun + 1e-9 * abs(other.fun)


def test_chains_of_all_stiffnesses_are_found_from_cold():
    """EA/load from 1e2 to 1e8, 10 % too long, drawn level: the straight line is a singular start."""
    for power in (3, 5, 7, 9):
        joints = {f"J{i}": (1.0 * i, 0, 0) for i in range(11)}
        ties = [
            structures.member(f"t{i}", f"J{i}", f"J{i + 1}", kind="tension-only", unstressed_length=1.1)
            for i in range(10)
        ]
        described = structures.words(
            joints,
            ties,
            sections={"s": {"axial_stiffness": 10.0**power, "mass_per_length": 1.0}},
            supports=[structures.held("J0", "J10")],
        )
        scene, potential = potential_of(described)
        found = find_equilibrium(potential, np.zeros(scene.system.n), TOLERANCE)
        assert found.converged
        # Hand statics of the half chain: level pull constant, upward pull the weight of what hangs on it.
        ends = found.look.axial * found.look.stretch.n
        assert ends[0] == pytest.approx(ends[0, 0], rel=1e-6)
        assert np.diff(ends[2]) == pytest.approx(1.1 * 9.80665, rel=1e-6)


def braced_tower(storeys=4):
    joints, members, feet = {}, [], []
    for i in range(storeys + 1):
        for k, (x, y) in enumerate(((0, 0), (1, 0), (1, 1), (0, 1))):
            joints[f"J{i}{k}"] = (x, y, 1.5 * i)
    for i in range(storeys):
        for k in range(4):
            m = (k + 1) % 4
            loose = {"kind": "tension-only", "slack": 0.004}
            members += [
                structures.member(f"post{i}{k}", f"J{i}{k}", f"J{i + 1}{k}"),
                structures.member(f"ring{i}{k}", f"J{i + 1}{k}", f"J{i + 1}{m}"),
                structures.member(f"x{i}{k}", f"J{i}{k}", f"J{i + 1}{m}", **loose),
                structures.member(f"y{i}{k}", f"J{i}{m}", f"J{i + 1}{k}", **loose),
            ]
    for k in range(4):
        feet.append(f"J0{k}")
    members += [structures.member(f"deck{i}", f"J{i}0", f"J{i}2") for i in range(1, storeys + 1)]
    return structures.words(
        joints,
        members,
        supports=[structures.held(*feet)],
        load_cases={
            "wind": {"self_weight": 1.0, "forces": [{"joints": [f"J{storeys}0"], "force": [400.0, 90, -500]}]}
        },
    )


def test_a_braced_tower_stays_a_tower():
    """Graded stiffness ends upside down here in a stable balance (measured 20 of 20); this road must not."""
    scene, potential = potential_of(braced_tower(), "wind")
    found = find_equilibrium(potential, np.zeros(scene.system.n), TOLERANCE)
    assert found.converged
    assert count_pivots(potential, found.look).negative == 0
    moved = scene.system.greatest_joint_move(found.q)
    # Slack of 4 mm in four storeys of diagonals at 34 degrees lets the top sway by some 4 x 4.8 mm.
    assert 0.005 < moved < 0.1


def two_storey_mast():
    """A crooked mast of two bars on slack guys that cannot hold it: it falls until some of them do."""
    rng = np.random.default_rng(6)
    joints = {
        "foot": (0, 0, 0),
        "mid": (0.1 * rng.normal(), 0.1 * rng.normal(), 5),
        "top": (0.2 * rng.normal(), 0.2 * rng.normal(), 10),
    }
    members = [structures.member("m1", "foot", "mid"), structures.member("m2", "mid", "top")]
    for i in range(4):
        angle = 2 * np.pi * (i + 0.3 * rng.random()) / 4
        joints[f"k{i}"] = (7 * np.cos(angle), 7 * np.sin(angle), 0)
        for j in ("mid", "top"):
            slack = float(rng.uniform(0.0, 0.3))
            members.append(structures.member(f"g{i}{j}", f"k{i}", j, kind="tension-only", slack=slack))
    return structures.words(
        joints,
        members,
        supports=[structures.held("foot", "k0", "k1", "k2", "k3")],
        masses=[{"joints": ["mid", "top"], "mass": 200.0}],
    )


def test_what_must_fall_falls_by_creep_to_the_nearest_rest():
    """Newton alone fails here; graded stiffness flings the top by twice its height to a stable balance.

    An over-damped fall lays it over by its own height, which later audits call folded.
    """
    scene, potential = potential_of(two_storey_mast())
    found = find_equilibrium(potential, np.zeros(scene.system.n), TOLERANCE)
    assert found.converged
    assert found.road == "creep, then Newton"
    assert count_pivots(potential, found.look).negative == 0
    assert scene.system.greatest_joint_move(found.q) < 12.0


def test_the_energy_never_rises_on_the_way():
    scene, potential = potential_of(braced_tower(), "wind")
    q, energies = np.zeros(scene.system.n), []
    for _ in range(25):
        down = descend(potential, q, TOLERANCE, cap=0.02, limit=1)
        q = down.q
        energies.append(down.look.energy)
    assert (np.diff(energies) <= 1e-9 * abs(energies[-1])).all()


def test_no_joint_moves_farther_than_the_cap_in_one_iteration():
    scene, potential = potential_of(slack_net(3))
    down = descend(potential, np.zeros(scene.system.n), TOLERANCE, cap=0.05, limit=1)
    size = scene.structure.size
    assert scene.system.greatest_joint_move(down.q) <= 0.05 * size * (1 + 1e-9)


def test_newton_is_quadratic_near_equilibrium():
    """By the steps, not the residuals, whose first one is all axial: each step is the square of the last."""
    scene, potential = potential_of(structures.mixed(), "all")
    q = find_equilibrium(potential, np.zeros(scene.system.n), 1e-12).q
    near, steps = q + 1e-2 * np.cos(np.arange(q.size)), []
    for _ in range(7):
        look = potential.look(near)
        step = scene.system.solver.cholesky(potential.curvature(look)).solve(look.residual)
        steps.append(np.abs(step).max())
        near = near + step
    tail = [s for s in steps if s > 1e-12][-3:]
    assert np.log(tail[2] / tail[1]) / np.log(tail[1] / tail[0]) > 1.7
    assert near == pytest.approx(q, abs=1e-11)


def test_a_saddle_is_left_to_both_sides_downhill():
    """Two bars in a shallow V pressed flat: in line they balance at a saddle, valleys lie up and down."""
    described = structures.words(
        {"A": (-1, 0, 0), "B": (1, 0, 0), "C": (0, 0, 0)},
        [
            structures.member("l", "A", "C", pretension=-2e4),
            structures.member("r", "C", "B", pretension=-2e4),
        ],
        sections={"s": {"axial_stiffness": 2e6, "mass_per_length": 0.0}},
        supports=[structures.held("A", "B"), {"joints": ["C"], "fixed": ["y"]}],
        load_cases={"rest": {"forces": [{"joints": ["C"], "force": [0, 0, 0]}]}},
    )
    scene, potential = potential_of(described, "rest")
    look = potential.look(np.zeros(2))
    assert look.imbalance == 0
    assert count_pivots(potential, look).negative == 1
    sides = leave_saddle(potential, look, TOLERANCE)
    assert len(sides) == 2
    height = np.sqrt((1 / (1 - 0.01)) ** 2 - 1)  # where both bars have their unstressed length
    rise = sorted(float(scene.system.freedom.spread(n.descent.q)[2, 2]) for n in sides)
    assert rise == pytest.approx([-height, height], rel=1e-6)
    stored = 2 * 2e4**2 / (2 * 2e6 * 0.99) * 0.99**2 / 0.99
    assert [n.energy_below for n in sides] == pytest.approx([stored] * 2, rel=0.02)
