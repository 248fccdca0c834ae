"""Sensitivities of lengths against differences of the full nonlinear solve, and the corrections."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar.analyses.context import Context
from tautbar.analyses.job import Job
from tautbar.analyses.tune_problem import beyond_reach, pose
from tautbar.model.parts import Loading, PositionTarget, TensionTarget, Tune
from tautbar.solvers import lengths, pretension, tuning


def hung_net():
    """Three ropes that hang and a tie at one joint, with all that sets a length or a load along it."""
    return structures.words(
        {"A": (0, 0, 0), "B": (10, 1, 2), "C": (5, 4, 6), "D": (4, -6, 0), "E": (9, 6, 0.5)},
        [
            member("ac", "A", "C", kind="hanging", section="rope", slack=0.05),
            member("bc", "B", "C", kind="hanging", section="rope", unstressed_length=7.2),
            member("cd", "C", "D", kind="tension-only", pretension=800.0),
            member("ce", "C", "E", kind="hanging", section="rope", slack=0.3),
        ],
        sections={
            "s": {"axial_stiffness": 2e6, "mass_per_length": 1.5, "expansion": 1.2e-5, "wind_width": 0.01},
            "rope": {
                "axial_stiffness": 1e6, "mass_per_length": 3.0, "expansion": 1.2e-5, "wind_width": 0.03
            },
        },
        supports=[held("A", "B", "D", "E")],
        masses=[{"joints": ["C"], "mass": 50.0}],
        load_cases={
            "dead": {"self_weight": 1.1},
            "rest": {
                "wind": [{"members": ["*"], "toward": [0.6, 0.8, 0], "pressure": 300.0}],
                "temperature_change": 30.0,
                "take_up": [{"members": ["bc", "cd"], "length": 0.02}],
                "line_loads": [{"members": ["ce"], "per_length": [0, 3.0, -5.0]}],
                "forces": [{"joints": ["C"], "force": [0, 0, 900.0]}],
            },
        },
    )  # fmt: skip


def case_of(words, factors, signed=True):
    """The first case of a tuning of every member, its lengths, and where it starts."""
    context = Context(structures.build(words).parts)
    count = len(context.member_names)
    adjust = tuple(range(count)) if signed else ()
    problem = pose(Tune("t", (Loading("all", factors),), adjust), context.start(None))
    return problem.cases[0], problem.rest.scene.structure.L0, problem.q[0]


MIXED = {"dead": 1.2, "lamps": 0.8, "line": 1.0, "cold": 0.7, "tight": 0.9, "moved": 1.1}


@pytest.mark.parametrize(
    ("words", "factors"),
    [(hung_net(), {"dead": 1.0, "rest": 1.0}), (hung_net(), {"dead": 1.0}), (structures.mixed(), MIXED)],
    ids=["ropes in wind", "ropes", "bars, ties and struts"],
)
def test_slopes_are_those_of_the_nonlinear_state(words, factors):
    case, L0, q = case_of(words, factors)
    state = lengths.balance(case, L0, q, patient=True)
    slopes = lengths.slopes(case, state, np.diag(L0))
    h = 1e-5
    for a in range(L0.size):
        change = h * np.eye(L0.size)[a]
        up, down = (
            lengths.balance(case, L0 * (1 + s * change), state.look.q + s * h * slopes.q[:, a])
            for s in (1, -1)
        )
        by_difference = (up.tension - down.tension) / (2 * h)
        # Forces are balanced to 1e-11 of the largest, over 2 h; the difference itself errs by h^2
        # times a curvature of about (EA/T)^2 = 1e6.
        assert np.abs(slopes.tension[:, :, a] - by_difference).max() < 1e-5 * np.abs(by_difference).max()
        moved = (up.look.q - down.look.q) / (2 * h)
        assert np.abs(slopes.q[:, a] - moved).max() < 1e-6 * np.abs(moved).max()


def test_a_slack_tie_pushes_inside_but_not_outside():
    words = structures.words(
        {"A": (0, 0, 0), "B": (4, 0, 0)},
        [member("tie", "A", "B", kind="tension-only", unstressed_length=4.01)],
        supports=[held("A"), {"joints": ["B"], "fixed": ["y", "z"], "springs": {"x": 1e5}}],
    )
    case, L0, q = case_of(words, {})
    k = structures.EA / 4.01
    inside = lengths.balance(case, L0, q)
    assert inside.tension[0, 0] == pytest.approx(-k * 0.01 * 1e5 / (k + 1e5), rel=1e-9)
    outside, *_ = case_of(words, {}, signed=False)
    assert lengths.balance(outside, L0, q).tension[0, 0] == 0.0


def test_a_joint_that_nothing_holds_has_slopes_all_the_same():
    """A bar that hangs free may turn about its own axis of pull; lengths still have an effect."""
    words = structures.words(
        {"A": (0, 0, 3), "B": (0, 0, 0), "C": (2, 0, 0)},
        [member("ab", "A", "B"), member("bc", "B", "C")],
        supports=[held("A")],
        masses=[{"joints": ["B"], "mass": 10.0}],
        sections={"s": {"axial_stiffness": structures.EA, "mass_per_length": 0.0}},
        unsupported="allowed",
    )
    case, L0, q = case_of(words, {"dead": 1.0})
    state = lengths.balance(case, L0, q)
    slopes = lengths.slopes(case, state, np.diag(L0))
    assert slopes.q[2, 0] == pytest.approx(-L0[0] * (1 + 10 * 9.80665 / structures.EA), rel=1e-6)


def test_the_step_ends_nearest_to_the_start():
    J, miss = np.array([[1.0, 1.0, 0.0]]), np.array([-0.02])
    wide = np.full(3, 10.0)
    step, null = tuning._step(J, miss, np.array([0.0, 0.0, 0.05]), np.zeros(3), -wide, wide)
    np.testing.assert_allclose(step, [0.01, 0.01, -0.05], atol=1e-15)
    assert null == pytest.approx(0.05)


def test_the_step_leaves_what_is_at_its_limit_to_the_others():
    J, miss = np.array([[1.0, 1.0]]), np.array([-0.02])
    step, _ = tuning._step(J, miss, np.zeros(2), np.zeros(2), np.full(2, -1.0), np.array([0.004, 1.0]))
    np.testing.assert_allclose(step, [0.004, 0.016], atol=1e-15)


def random_mast(seed):
    """Two lengths of mast on six guys, about half of them slack as drawn."""
    rng = np.random.default_rng(seed)
    height = rng.uniform(8, 14)
    joints = {"foot": (0, 0, 0), "m0": (0, 0, height / 2), "m1": (0, 0, height)}
    guys = []
    for k in range(3):
        angle, reach = 2 * np.pi * k / 3 + rng.uniform(-0.3, 0.3), rng.uniform(0.5, 0.9) * height
        joints[f"a{k}"] = (reach * np.cos(angle), reach * np.sin(angle), rng.uniform(-0.5, 0.5))
        for i in range(2):
            slack = rng.random() < 0.5
            given = {"slack": rng.uniform(0.01, 0.05)} if slack else {"pretension": rng.uniform(500, 5000)}
            guys.append(member(f"g{i}{k}", f"a{k}", f"m{i}", kind="tension-only", section="guy", **given))
    wanted = float(rng.uniform(2e3, 6e3))
    upright = [
        {"joint": joint, "direction": axis, "position": 0.0} for joint in ("m0", "m1") for axis in "xy"
    ]
    return structures.words(
        joints,
        [member("mast0", "foot", "m0", section="mast"), member("mast1", "m0", "m1", section="mast"), *guys],
        sections={
            "mast": {"axial_stiffness": 2e8, "mass_per_length": 20.0},
            "guy": {"axial_stiffness": 5e6, "mass_per_length": 0.5},
        },
        supports=[held("foot", "a0", "a1", "a2")],
        analyses=[
            {
                "name": "t", "kind": "tune", "loads": "dead", "adjust": ["g*"],
                "targets": [{"members": ["g00", "g10"], "tension": wanted}, *upright],
            }
        ],
    ), wanted  # fmt: skip


@pytest.mark.parametrize("seed", range(20))
def test_masts_come_upright_and_tense_in_three_corrections(seed):
    words, wanted = random_mast(seed)
    model = structures.build(words)
    record = Job(model.parts).run("t")
    assert record.status == "complete", record.outcome
    names = model.parts.members.names
    for guy in ("g00", "g10"):
        assert record["axial_force"][0, names.index(guy)] == pytest.approx(wanted, rel=1e-7)
    tops = [model.parts.joints.index[j] for j in ("m0", "m1")]
    assert np.abs(record["position"][tops, :2]).max() < 1e-7
    assert np.abs(record["target_miss"]).max() < tuning.MET
    corrections = int(record.audit_lines[0].split("(")[1].split()[0])
    assert corrections <= 3


def test_what_no_length_can_reach():
    """Held joints pass nothing on: the second tie and its free joint are out of reach of the first."""
    words = structures.words(
        {"A": (0, 0, 3), "B": (0, 0, 0), "C": (2, 0, 3), "D": (2, 0, 0)},
        [member("ab", "A", "B"), member("cd", "C", "D"), member("ac", "A", "C")],
        supports=[held("A", "C")],
    )
    context = Context(structures.build(words).parts)
    targets = (
        TensionTarget((0, 1), 100.0), PositionTarget(3, 2, 0.1), PositionTarget(0, 2, 3.1),
        PositionTarget(1, 2, 0.1),
    )  # fmt: skip
    analysis = Tune("t", (Loading("dead", {"dead": 1.0}),), (0,), targets=targets)
    assert [what for what, _ in beyond_reach(analysis, context.first_scene())] == [
        "no adjusted member can influence the tension of cd",
        "no adjusted member can influence the position of D in z",
        "position of A in z: it is held there",
    ]


def test_levels_are_what_their_lengths_carry_in_the_start_shape():
    L0, EA, l = np.array([3.0, 4.0]), np.array([1e6, 2e6]), np.array([3.1, 4.2])
    levels = pretension.Levels(L0, EA, ((0, 1),), l)
    lengths_at = levels.lengths(np.array([5e3]))
    np.testing.assert_allclose(EA * (l / lengths_at - 1), 5e3, rtol=1e-10)
    step = levels.lengths(np.array([5e3 + 1.0])) - levels.lengths(np.array([5e3 - 1.0]))
    np.testing.assert_allclose(levels.directions(np.array([5e3]))[:, 0], step / 2, rtol=1e-7)
