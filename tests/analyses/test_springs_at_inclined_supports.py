"""Springs to ground at joints held along an inclined direction, and springs that come later."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import brentq

import structures
from structures import member
from tautbar import Model, find_modes, solve_history, solve_static
from tautbar.analyses.job import prepare

EA, SPRING = 1e6, 5e5  # N, N/m
A, B, C = np.array([0.0, 0.0]), np.array([2.0, 0.0]), np.array([0.0, 2.0])
NORMAL, SLIDE = np.array([1.0, 1.0]) / np.sqrt(2), np.array([-1.0, 1.0]) / np.sqrt(2)
CASES = {"push": (np.array([0.0, -1e4]), 0.0), "both": (np.array([3e3, -1e4]), 0.008)}


def slope():
    """Two bars to a joint on an inclined slide, with an upright spring at the same joint."""
    return structures.build(structures.words(
        {"A": A, "B": B, "C": C},
        [member("a", "A", "B", section="bar"), member("c", "C", "B", section="bar")],
        sections={"bar": {"axial_stiffness": EA, "mass_per_length": 0.0}},
        supports=[{"joints": ["A", "C"], "fixed": ["x", "z"]}, {"joints": ["B"], "along": [1, 1]},
                  {"joints": ["B"], "springs": {"z": SPRING}}],
        masses=[{"joints": ["B"], "mass": 40.0}],
        plane="xz",
        load_cases={"push": {"forces": [{"joints": ["B"], "force": [0, -1e4]}]},
                    "both": {"forces": [{"joints": ["B"], "force": [3e3, -1e4]}],
                             "movements": [{"joints": ["B"], "move": list(0.008 * NORMAL)}]}},
    ))  # fmt: skip


def pulls(u):
    """Force that the two bars need at B where it is displaced by ``u`` [N], and their own forces."""
    total, forces = np.zeros(2), []
    for at in (A, C):
        r, L0 = B + u - at, np.linalg.norm(B - at)
        l = np.linalg.norm(r)
        forces.append(EA * (l - L0) / L0)
        total += forces[-1] * r / l
    return total, np.array(forces)


def linear_pulls(u):
    n = np.array([(B - at) / np.linalg.norm(B - at) for at in (A, C)])
    forces = np.array([EA / np.linalg.norm(B - at) for at in (A, C)]) * (n @ u)
    return forces @ n, forces


def by_hand(geometry, force, moved):
    """Displacement of B, what all supports give it (spring and slide), and bar forces.

    The only unknown is how far it slides: there the forces along the slide are in balance.
    """
    bars = pulls if geometry == "large" else linear_pulls

    def place(s):
        return moved * NORMAL + s * SLIDE

    def along(s):
        u = place(s)
        return SLIDE @ (bars(u)[0] + np.array([0, SPRING * u[1]]) - force)

    u = place(brentq(along, -0.2, 0.2, xtol=1e-15))
    need, forces = bars(u)
    return u, need - force, forces


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("geometry", ["small", "large"])
def test_displacement_reactions_and_their_sum(geometry, case):
    """Against balance along the slide; 1e-7 beside the tolerance of 1e-9 of the largest force."""
    force, moved = CASES[case]
    u, given, forces = by_hand(geometry, force, moved)
    found = solve_static(slope(), case, geometry=geometry)
    assert found.displacement("B")[0, [0, 2]] == pytest.approx(u, rel=1e-7)
    assert found["axial_force"][0] == pytest.approx(forces, rel=1e-7)
    assert found.joint("reaction", "B")[0, [0, 2]] == pytest.approx(given, rel=1e-7)
    assert found["reaction"][0].sum(axis=0)[[0, 2]] == pytest.approx(-force, abs=1e-4)
    assert found["audit/reaction_sum_error"][0] < 1e-7


def test_what_the_slide_and_the_spring_give_is_told_apart_by_hand():
    """Less the force of the spring, the reaction at the joint is along the slide's normal alone."""
    found = solve_static(slope(), "both")
    u, R = found.displacement("B")[0, [0, 2]], found.joint("reaction", "B")[0, [0, 2]]
    slide_alone = R + np.array([0, SPRING * u[1]])
    assert abs(SLIDE @ slide_alone) < 1e-7 * np.linalg.norm(R)
    assert abs(SLIDE @ R) > 0.01 * np.linalg.norm(R), "the spring must have a part along the slide"


def test_frequency_has_the_part_of_the_spring_along_the_slide():
    """Unloaded, one mass that can only slide: w^2 m = s K s; half of the spring counts at 45 degrees."""
    k = SLIDE @ linear_pulls(SLIDE)[0] + SPRING * SLIDE[1] ** 2
    assert find_modes(slope(), count=1)["frequency"][0] == pytest.approx(
        np.sqrt(k / 40.0) / (2 * np.pi), rel=1e-9
    )


@pytest.mark.parametrize("case", CASES)
def test_a_history_that_only_rests_keeps_the_reactions_of_the_state(case):
    """Nothing happens: the greatest and least reactions are those of the static state."""
    model = slope()
    state = solve_static(model, case)
    rests = solve_history(model, state, duration=0.02, time_step=1e-3)
    for extreme in ("min", "max"):
        assert rests[f"peaks/reaction/{extreme}"] == pytest.approx(state["reaction"][0], abs=1e-3)


@pytest.mark.parametrize("seed", range(6))
def test_in_space_against_a_constrained_solve(seed):
    """Random tripods on a random inclined slide with unequal springs: K u = f - springs, n u given."""
    rng = np.random.default_rng(seed)
    feet = rng.normal(size=(3, 3)) + np.array([0, 0, -2.0]) + 2 * np.eye(3)
    n, k, f = rng.normal(size=3), rng.uniform(1e4, 1e6, 3), 5e3 * rng.normal(size=3)
    n, moved = n / np.linalg.norm(n), rng.uniform(-0.01, 0.01)
    model = structures.build(structures.words(
        {"T": (0, 0, 0)} | {f"F{i}": at for i, at in enumerate(feet)},
        [member(f"m{i}", f"F{i}", "T", section="bar") for i in range(3)],
        sections={"bar": {"axial_stiffness": EA, "mass_per_length": 0.0}},
        supports=[structures.held("F0", "F1", "F2"), {"joints": ["T"], "along": n.tolist()},
                  {"joints": ["T"], "springs": dict(zip("xyz", k.tolist(), strict=True))}],
        load_cases={"P": {"forces": [{"joints": ["T"], "force": f.tolist()}],
                          "movements": [{"joints": ["T"], "move": (moved * n).tolist()}]}},
    ))  # fmt: skip
    l = np.linalg.norm(feet, axis=1)
    bars = sum(EA / length**3 * np.outer(at, at) for at, length in zip(feet, l, strict=True))
    whole = np.block([[bars + np.diag(k), n[:, None]], [n[None], np.zeros((1, 1))]])
    u = np.linalg.solve(whole, [*f, moved])[:3]
    found = solve_static(model, "P", geometry="small")
    assert found.displacement("T")[0] == pytest.approx(u, rel=1e-8)
    assert found.joint("reaction", "T")[0] == pytest.approx(bars @ u - f, rel=1e-8, abs=1e-5)
    assert found["reaction"][0].sum(axis=0) == pytest.approx(-f, abs=1e-5)


K_ROD = EA / 4.0  # N/m
FIRST, MORE = 3e4, 1.2e4  # N


def jacked(own=0.0):
    """A load on one rod, up and down only; a spring under it that comes later, ``own`` one from the start."""
    at_start = [{"joints": ["B"], "springs": {"z": own}}] if own else []
    return Model(**structures.words(
        {"T": (0, 0, 4), "B": (0, 0, 0)},
        [member("rod", "T", "B", section="rod")],
        sections={"rod": {"axial_stiffness": EA, "mass_per_length": 0.0}},
        supports=[structures.held("T"), {"joints": ["B"], "fixed": ["x", "y"]}, *at_start,
                  {"name": "jack", "joints": ["B"], "springs": {"z": SPRING}, "absent": True}],
        load_cases={"P": {"forces": [{"joints": ["B"], "force": [0, 0, -FIRST]}]},
                    "more": {"forces": [{"joints": ["B"], "force": [0, 0, -FIRST - MORE]}]}},
        analyses=[{"name": "first", "kind": "static", "loads": "P"},
                  {"name": "in", "kind": "static", "from": "first", "with": ["jack"], "loads": "P"},
                  {"name": "loaded", "kind": "static", "from": "in", "loads": "more"},
                  {"name": "direct", "kind": "static", "from": "first", "with": ["jack"], "loads": "more"},
                  {"name": "out", "kind": "static", "from": "loaded", "without": ["jack"], "loads": "more"}],
    ))  # fmt: skip


def run_all(own):
    job = prepare(jacked(own))
    found = {a.name: job.run(a.name) for a in job.context.parts.analyses}
    for record in found.values():
        assert record.status == "complete", record.outcome
    return found


@pytest.mark.parametrize("own", [0.0, 8e4])
def test_a_spring_put_in_later_pulls_to_where_the_joint_was(own):
    """It carries its share of what comes after, and nothing of what was there before."""
    found = run_all(own)
    first, rise = FIRST / (K_ROD + own), MORE / (K_ROD + own + SPRING)
    wanted = {
        "first": (first, own * first),
        "in": (first, own * first),
        "loaded": (first + rise, own * (first + rise) + SPRING * rise),
        "direct": (first + rise, own * (first + rise) + SPRING * rise),
    }
    for name, (down, reaction) in wanted.items():
        record = found[name]
        assert record["displacement"][0, 1, 2] == pytest.approx(-down, rel=1e-8), name
        assert record["reaction"][0, 1, 2] == pytest.approx(reaction, rel=1e-7, abs=1e-4), name


@pytest.mark.parametrize("own", [0.0, 8e4])
def test_a_spring_taken_out_leaves_the_others_as_they_were(own):
    """Without the jack, rod and own spring carry all of the load, both from the drawing."""
    out = run_all(own)["out"]
    whole = (FIRST + MORE) / (K_ROD + own)
    assert out["displacement"][0, 1, 2] == pytest.approx(-whole, rel=1e-8)
    assert out["reaction"][0, 1, 2] == pytest.approx(own * whole, rel=1e-7, abs=1e-4)
