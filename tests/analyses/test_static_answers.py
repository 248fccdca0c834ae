"""Static answers against hand statics and closed forms."""

from __future__ import annotations

import copy

import numpy as np
import pytest

import structures
from structures import EA, held, member
from tautbar import AnalysisFailed, InputError, Model, solve_static
from tautbar.analyses.job import prepare

# Equilibrium is asked to 1e-9 of the forces; closed forms are compared to ten times that.
BALANCE = 1e-8


def single(kind="bar", loads=None, axis=(1, 0, 0), **given):
    """One member from a hook along an axis, its far end free along it and loaded."""
    end = 2.0 * np.array(axis) / np.linalg.norm(axis)
    return structures.words(
        {"A": (0, 0, 0), "B": end},
        [member("m", "A", "B", kind=kind, **given)],
        supports=[held("A"), *_across(axis)],
        load_cases=loads or {"pull": {"forces": [{"joints": ["B"], "force": [1000.0, 0, 0]}]}},
    )


def _across(axis):
    return [{"joints": ["B"], "fixed": [a for a, c in zip("xyz", axis, strict=True) if c == 0]}]


def test_bar_pulled_and_pushed():
    for P in (1000.0, -1000.0):
        a = solve_static(structures.build(single()), {"pull": P / 1000})
        assert a.axial_force("m")[0] == pytest.approx(P, rel=BALANCE)
        assert a.displacement("B")[0, 0] == pytest.approx(P * 2 / EA, rel=BALANCE)
        assert a.joint("reaction", "A")[0, 0] == pytest.approx(-P, rel=BALANCE)


@pytest.mark.parametrize(("kind", "sign"), [("tension-only", 1), ("compression-only", -1)])
def test_slack_is_taken_up_first(kind, sign):
    described = single(kind, slack=0.01) if sign > 0 else single(kind, slack=0.0)
    described["joints"]["B"] = [2.0, 0, 0]
    a = solve_static(structures.build(described), {"pull": float(sign)})
    L0 = 2.01 if sign > 0 else 2.0
    assert a.axial_force("m")[0] == pytest.approx(sign * 1000, rel=BALANCE)
    assert 2 + a.displacement("B")[0, 0] == pytest.approx(L0 * (1 + sign * 1000 / EA), rel=1e-10)


def clamped(**case):
    """A bar held at both ends, under what its lengths do."""
    return structures.build(
        structures.words(
            {"A": (0, 0, 0), "B": (3, 4, 0)},
            [member("m", "A", "B")],
            supports=[held("A", "B")],
            load_cases={"it": case},
        )
    )


def test_temperature_of_a_clamped_bar():
    """N = EA (l - L0)/L0 with L0 = l (1 + alpha dT): a warm bar is pushed."""
    a = solve_static(clamped(temperature_change=40.0), "it")
    heat = 1.2e-5 * 40
    assert a.axial_force("m")[0] == pytest.approx(-EA * heat / (1 + heat), rel=1e-12)
    assert a.joint("reaction", "B")[0] == pytest.approx(
        -EA * heat / (1 + heat) * np.array([0.6, 0.8, 0]), rel=1e-12
    )


def test_take_up_of_a_clamped_bar():
    a = solve_static(clamped(take_up=[{"members": ["m"], "length": 0.004}]), "it")
    assert a.axial_force("m")[0] == pytest.approx(EA * 0.004 / 4.996, rel=1e-11)


def test_movement_of_a_support():
    move = np.array([0.02, -0.05, 0.3])
    a = solve_static(clamped(movements=[{"joints": ["B"], "move": list(move)}]), "it")
    r = np.array([3, 4, 0]) + move
    l = np.sqrt(r @ r)
    assert a.displacement("B")[0] == pytest.approx(move, rel=1e-13)
    assert a.axial_force("m")[0] == pytest.approx(EA * (l - 5) / 5, rel=1e-12)
    assert a.joint("reaction", "B")[0] == pytest.approx(EA * (l - 5) / 5 * r / l, rel=1e-12)


def test_factors_multiply_what_acts():
    a = solve_static(clamped(take_up=[{"members": ["m"], "length": 0.004}]), {"it": 2.5})
    assert a.axial_force("m")[0] == pytest.approx(EA * 0.01 / 4.99, rel=1e-11)


def test_a_free_bar_moves_with_its_temperature_without_force():
    model = structures.build(single(loads={"hot": {"temperature_change": 25.0}}))
    a = solve_static(model, "hot")
    assert a.displacement("B")[0, 0] == pytest.approx(2 * 1.2e-5 * 25, rel=1e-10)
    assert abs(a.axial_force("m")[0]) < 1e-9 * EA * 1.2e-5 * 25


# A tripod on three different footings, statically determinate at its top: forces by hand.
def tripod(**more):
    joints = {"A": (0, 0, 0), "B": (4, 0, 0), "C": (1, 3, 0), "T": (1.5, 1, 4)}
    out = structures.words(
        joints,
        [member(n.lower(), n, "T") for n in "ABC"],
        supports=[held("A", "B", "C")],
        load_cases={"load": {"forces": [{"joints": ["T"], "force": [10.0, -20.0, -30.0]}]}},
    )
    return out | more


def hand_forces(joints, load):
    """Axial forces of three bars meeting in T, from the equilibrium of T."""
    T = np.array(joints["T"])
    n = np.stack([(T - np.array(joints[a])) / np.linalg.norm(T - np.array(joints[a])) for a in "ABC"], axis=1)
    return np.linalg.solve(n, load), n


def test_tripod_by_hand():
    """Geometry as drawn, so the answer is exact; large displacements of 1e-5 change it by as much."""
    described = tripod()
    N, n = hand_forces(described["joints"], np.array([10.0, -20.0, -30.0]))
    a = solve_static(structures.build(described), "load", geometry="small")
    assert a["axial_force"][0] == pytest.approx(N, rel=BALANCE)
    for i, foot in enumerate("ABC"):
        assert a.joint("reaction", foot)[0] == pytest.approx(-N[i] * n[:, i], rel=BALANCE)
    large = solve_static(structures.build(described), "load")
    assert large["axial_force"][0] == pytest.approx(N, rel=1e-4)


def test_an_inclined_roller_reacts_along_its_direction_only():
    """Foot C slides at right angles to (2, 1, 2): its reaction is along that, and T's balance gives it."""
    described = tripod()
    along = np.array([2.0, 1.0, 2.0]) / 3
    other = np.array([0.0, 2.0, -1.0])
    described["supports"] = [
        held("A", "B"),
        {"joints": ["C"], "along": [2, 1, 2]},
        {"joints": ["C"], "along": list(other)},
        {"joints": ["T"], "fixed": ["y"]},
    ]
    a = solve_static(structures.build(described), "load", geometry="small")
    R = a.joint("reaction", "C")[0]
    third = np.cross(along, other)
    assert abs(R @ third) <= BALANCE * np.abs(R).max()
    assert abs(a.displacement("C")[0] @ along) < 1e-15
    moved = a.displacement("C")[0]
    assert np.abs(moved).max() > 1e-7
    assert moved == pytest.approx((moved @ third) * third / (third @ third), rel=1e-9)
    total = sum(a.joint("reaction", j)[0] for j in "ABCT")
    assert total == pytest.approx([-10.0, 20.0, 30.0], rel=BALANCE)
    # The bar at C runs along (0.5, -2, 4); in balance at C it carries nothing the roller cannot.
    axis = np.array([0.5, -2.0, 4.0]) / np.linalg.norm([0.5, -2.0, 4.0])
    assert pytest.approx(-a.axial_force("c")[0] * axis, rel=1e-7, abs=1e-7) == R


def test_springs_react_against_their_displacement():
    described = tripod()
    described["supports"] = [held("A", "B"), {"joints": ["C"], "springs": {"x": 5e4, "y": 6e4, "z": 7e4}}]
    N, n = hand_forces(described["joints"], np.array([10.0, -20.0, -30.0]))
    a = solve_static(structures.build(described), "load", geometry="small")
    assert a["axial_force"][0] == pytest.approx(N, rel=1e-7)
    R = a.joint("reaction", "C")[0]
    assert pytest.approx(-N[2] * n[:, 2], rel=1e-7) == R
    assert a.displacement("C")[0] == pytest.approx(-R / np.array([5e4, 6e4, 7e4]), rel=1e-7)


# ---- several loadings, start states ----


def cross_braced(**more):
    """A panel with X ties under sway from either side."""
    out = structures.words(
        {"A": (0, 0), "B": (3, 0), "C": (0, 2), "D": (3, 2)},
        [
            member("left", "A", "C"),
            member("right", "B", "D"),
            member("top", "C", "D"),
            member("x1", "A", "D", kind="tension-only"),
            member("x2", "B", "C", kind="tension-only"),
        ],
        supports=[{"joints": ["A", "B"], "fixed": ["x", "y"]}],
        load_cases={
            "east": {"forces": [{"joints": ["D"], "force": [900.0, -500.0]}]},
            "west": {"forces": [{"joints": ["C"], "force": [-1500.0, -500.0]}]},
        },
        combinations={"sway": {"always": {}, "in_turn": [{"east": 1.0, "west": 1.0}]}},
        plane="xy",
    )
    return out | more


def test_envelope_and_governing_loading():
    described = cross_braced()
    described["combinations"] = {"sway": {"in_turn": [{"east": 1.0, "west": 1.0}]}}
    a = solve_static(structures.build(described), "sway")
    N = a["axial_force"]
    assert N.shape == (2, 5)
    assert (a["envelope/max"] == N.max(axis=0)).all()
    assert (a["envelope/min"] == N.min(axis=0)).all()
    names = list(a.context.member_names)
    # Sway to the east pulls x1, to the west x2; only one of them is taut at a time.
    assert a["envelope/argmax"][names.index("x1")] == 0
    assert a["envelope/argmax"][names.index("x2")] == 1
    assert N[0, names.index("x2")] == 0 == N[1, names.index("x1")]
    assert (a["taut"] == [[1, 1, 1, 1, 0], [1, 1, 1, 0, 1]]).all()
    diagonal = np.sqrt(13) / 3  # the tie's pull has the sway for its level part
    assert N[1, names.index("x2")] == pytest.approx(1500 * diagonal, rel=2e-3)
    assert "governing: tension" in str(a)
    assert "in x2 under" in str(a).split("governing")[1]


def test_loads_are_all_that_acts_never_on_top():
    described = structures.guyed_mast(pretension=3000.0)
    described["load_cases"]["wind"] = {"forces": [{"joints": ["top"], "force": [2000.0, 300.0, 0]}]}
    model = structures.build(described)
    first = solve_static(model, "dead")
    again = solve_static(model, "wind", start=first)
    fresh = solve_static(model, "wind")
    # Two roads to one equilibrium, each to 1e-9 of its forces (15 kN) over the stiffness.
    assert again["axial_force"] == pytest.approx(fresh["axial_force"], abs=1e-7 * 15e3)
    assert again["displacement"] == pytest.approx(fresh["displacement"], abs=1e-8)
    assert np.abs(first["axial_force"] - again["axial_force"]).max() > 100


def test_from_hands_over_positions():
    """A shallow arch that has snapped through stays there when its load is taken away."""
    described = structures.words(
        {"A": (-1, 0, 0), "B": (1, 0, 0), "C": (0, 0, 0.1)},
        [member("l", "A", "C"), member("r", "C", "B")],
        supports=[held("A", "B"), {"joints": ["C"], "fixed": ["x", "y"]}],
        load_cases={
            "push": {"forces": [{"joints": ["C"], "force": [0, 0, -5000.0]}]},
            "rest": {"self_weight": 1e-9},
        },
    )
    model = structures.build(described)
    with pytest.raises(AnalysisFailed, match=r"snaps through at 0\.15"):
        solve_static(model, "push")
    pushed = solve_static(model, "push", folding=True)
    assert pushed.displacement("C")[0, 2] < -0.2
    left = solve_static(model, "rest", start=pushed)
    assert left.displacement("C")[0, 2] == pytest.approx(-0.2, abs=1e-6)
    assert solve_static(model, "rest").displacement("C")[0, 2] == pytest.approx(0.0, abs=1e-6)


def test_a_start_with_several_loadings_must_be_named():
    described = cross_braced()
    described["combinations"] = {"sway": {"in_turn": [{"east": 1.0, "west": 1.0}]}}
    model = structures.build(described)
    both = solve_static(model, "sway")
    with pytest.raises(InputError, match="holds several loadings"):
        solve_static(model, "east", start=both)


def test_an_analysis_without_loads_keeps_those_of_its_start():
    described = structures.mixed()
    described["analyses"] = [
        {"name": "first", "kind": "static", "loads": "all"},
        {"name": "kept", "kind": "static", "from": "first"},
        {"name": "one of two", "kind": "static", "loads": ["dead", "all"]},
        {"name": "picked", "kind": "static", "from": {"analysis": "one of two", "loads": "all"}},
    ]
    job = prepare(Model(**copy.deepcopy(described)))
    records = {name: job.run(name) for name in ("first", "kept", "one of two", "picked")}
    for name in ("kept", "picked"):
        assert records[name]["axial_force"][0] == pytest.approx(records["first"]["axial_force"][0], abs=1e-4)
        assert records[name].acting == records["first"].acting


def test_a_model_without_any_free_direction_runs():
    described = structures.words(
        {"A": (0, 0, 0), "B": (2, 0, 0)}, [member("m", "A", "B", pretension=700.0)], supports=[held("A", "B")]
    )
    model = structures.build(described)
    a = solve_static(model, "dead")
    assert a.axial_force("m")[0] == pytest.approx(700.0, rel=1e-12)
    weight = structures.LINE * 9.80665 * 2 / (1 + 700 / EA)
    assert a.joint("reaction", "A")[0] == pytest.approx([-700.0, 0, weight / 2], rel=1e-12)


def test_load_steps_reach_the_same_equilibrium():
    model = structures.build(structures.mixed())
    at_once, stepped = solve_static(model, "all"), solve_static(model, "all", steps=7)
    assert stepped["axial_force"] == pytest.approx(at_once["axial_force"], abs=1e-4)


def test_every_balance_adds_up():
    """Reactions and loads of the mixed structure, springs and roller included, in force and in moment."""
    model = structures.build(structures.mixed())
    a = solve_static(model, "all")
    s = a.context.first_scene().structure
    load = a.context.first_scene().acting(model.parts.loadings["all"][0]).force.T
    total = a["reaction"][0] + load
    assert np.abs(total.sum(axis=0)).max() < 1e-9 * np.abs(load).max() * 10
    X = s.position.T + a["displacement"][0]
    moment = np.cross(X, total).sum(axis=0)
    assert np.abs(moment).max() < 1e-8 * np.abs(load).max() * s.size
    assert a["audit/reaction_sum_error"][0] < 1e-9
