"""From the drawing to equilibrium without help: braced towers, guyed masts, slack nets.

Numbers of our own. Where stiffness is graded up, towers and masts are known to end upside down in a
perfectly stable balance; nothing but where the joints are shows it.
"""

from __future__ import annotations

import numpy as np
import pytest
from published import HELD, Array

import tautbar
from tautbar.analyses.memory import Answer

G = 9.80665


def greatest_turn(model: tautbar.Model, answer: Answer) -> float:
    """Greatest angle [deg] between a bar drawn and loaded, from joint positions alone."""
    parts = model.parts
    drawn = np.array([parts.joints.x, parts.joints.y, parts.joints.z]).T
    now = drawn + answer["displacement"][0]
    worst = 0.0
    for start, end, kind in zip(parts.members.start, parts.members.end, parts.members.kind, strict=True):
        if kind == 0:
            a, b = drawn[end] - drawn[start], now[end] - now[start]
            worst = max(worst, float(np.arctan2(np.linalg.norm(np.cross(a, b)), a @ b)))
    return float(np.rad2deg(worst))


def out_of_balance(model: tautbar.Model, answer: Answer, load: dict[str, Array]) -> float:
    """Largest force [N] that is not balanced at a joint that is free, from positions alone.

    ``load``: what acts on each joint (3,). Written apart from the program: N = EA (l - L0)/L0.
    """
    parts = model.parts
    now = np.array([parts.joints.x, parts.joints.y, parts.joints.z]).T + answer["displacement"][0]
    force = np.array([load.get(n, np.zeros(3)) for n in parts.joints.names])
    for i, (a, b) in enumerate(zip(parts.members.start, parts.members.end, strict=True)):
        l0 = parts.members.unstressed_length[i]
        r = now[b] - now[a]
        l = np.linalg.norm(r)
        EA = parts.sections[parts.members.section[i]].axial_stiffness
        assert EA is not None
        N = EA * max(l - l0, 0.0) / l0
        force[a] += N * r / l
        force[b] -= N * r / l
    held = {j for support in parts.supports for j in support.joints}
    free = [j for j in range(len(parts.joints)) if j not in held]
    return float(np.abs(force[free]).max())


# ---------------------------------------------------------------- towers

STOREYS, RISE, WIDE = 6, 2.0, 1.5
CORNERS = [(0, 0), (1, 0), (1, 1), (0, 1)]
STEEL = 210e9
LEG, ROD = 12e-4, 1.1e-4  # m2
WIND = np.array([900.0, 500.0, 0.0])  # N on each joint


def tower(lean: float) -> tautbar.Model:
    """A square tower: legs, rings and plan bars of angle, crossed rods without pretension in all faces.

    ``lean`` [m] of the top against the foot, in x, grows with the height.
    """
    height = STOREYS * RISE
    joints = {
        f"{k}{c}": [WIDE * x + lean * k / STOREYS, WIDE * y, k * height / STOREYS]
        for k in range(STOREYS + 1)
        for c, (x, y) in enumerate(CORNERS)
    }
    bars, rods = [], []
    for k in range(1, STOREYS + 1):
        bars += [(f"{k - 1}{c}", f"{k}{c}") for c in range(4)]
        bars += [(f"{k}{c}", f"{k}{(c + 1) % 4}") for c in range(4)] + [(f"{k}0", f"{k}2")]
        rods += [(f"{k - 1}{c}", f"{k}{(c + 1) % 4}") for c in range(4)]
        rods += [(f"{k - 1}{(c + 1) % 4}", f"{k}{c}") for c in range(4)]
    moved = [j for j in joints if not j.startswith("0")]
    return tautbar.Model(
        materials={"steel": {"modulus": STEEL, "density": 7850}},
        sections={"angle": {"material": "steel", "area": LEG}, "rod": {"material": "steel", "area": ROD}},
        joints=joints,
        members=[
            {"name": "bars", "pairs": bars, "section": "angle"},
            {"name": "rods", "pairs": rods, "section": "rod", "kind": "tension-only"},
        ],
        supports=[{"joints": [f"0{c}" for c in range(4)], "fixed": HELD}],
        load_cases={
            "dead": {"self_weight": 1.0, "masses": [{"joints": moved, "mass": 120}]},
            "wind": {"forces": [{"joints": moved, "force": WIND.tolist()}]},
        },
    )


def works(drawn: Array, start: int, end: int) -> bool:
    """Is a rod of the tower pulled by the wind: does its upper end lie downwind of its lower one?"""
    r = drawn[end] - drawn[start]
    return bool(np.sign(r[2]) * (r @ WIND) > 0)


def linear_drift(model: tautbar.Model) -> Array:
    """Displacements (J, 3) by linear statics of the drawing, the rods that work being plain bars.

    An estimate apart from the program, without any second order.
    """
    parts = model.parts
    x = np.array([parts.joints.x, parts.joints.y, parts.joints.z]).T
    K, F = np.zeros((3 * len(x), 3 * len(x))), np.zeros((len(x), 3))
    for a, b, kind in zip(parts.members.start, parts.members.end, parts.members.kind, strict=True):
        r = x[b] - x[a]
        l = np.linalg.norm(r)
        A = LEG if kind == 0 else ROD
        F[[a, b], 2] -= 0.5 * 7850 * A * l * G
        if kind == 0 or works(x, a, b):
            block = STEEL * A / l * np.outer(r, r) / l**2
            at = np.r_[3 * a : 3 * a + 3, 3 * b : 3 * b + 3]
            K[np.ix_(at, at)] += np.block([[block, -block], [-block, block]])
    held = np.array([n.startswith("0") for n in parts.joints.names])
    F[~held] += WIND + np.array([0, 0, -120 * G])
    free = np.repeat(~held, 3)
    u = np.zeros(3 * len(x))
    u[free] = np.linalg.solve(K[np.ix_(free, free)], F.ravel()[free])
    return u.reshape(-1, 3)


@pytest.mark.parametrize("lean", [0.0, 0.03])
@pytest.mark.parametrize("loads", [{"dead": 1}, {"dead": 1, "wind": 1}], ids=["dead", "dead and wind"])
def test_braced_tower_stands(lean: float, loads: dict[str, float]) -> None:
    """No bar turns by 2 degrees, no joint moves by 1/300 of the height, and it is where it was drawn."""
    model = tower(lean)
    answer = tautbar.solve_static(model, loads)
    assert greatest_turn(model, answer) < 2.0
    assert np.abs(answer["displacement"]).max() < STOREYS * RISE / 300
    # Under dead load alone the legs shorten and let the rods go: it may lean on them, by what they are loose.
    if "wind" not in loads:
        assert np.abs(answer["displacement"]).max() < STOREYS * RISE / 10_000
    feet = answer["reaction"][0, :, 2].sum()
    weight = 120 * G * 4 * STOREYS + own_weight(model)
    assert feet == pytest.approx(weight, rel=1e-8)  # the residual asked for is 1e-9 of the largest force


def own_weight(model: tautbar.Model) -> float:
    """Weight [N] of all members as drawn."""
    parts = model.parts
    x = np.array([parts.joints.x, parts.joints.y, parts.joints.z]).T
    of = zip(parts.members.start, parts.members.end, parts.members.kind, strict=True)
    return sum(7850 * G * (LEG if k == 0 else ROD) * float(np.linalg.norm(x[b] - x[a])) for a, b, k in of)


@pytest.mark.parametrize("lean", [0.0, 0.03])
def test_drift_of_a_braced_tower(lean: float) -> None:
    """Linear statics with the rods that the wind pulls: 1 %, the weight on the drift (second order) being
    0.4 % of the wind's moment. The other rods carry exactly nothing."""
    model = tower(lean)
    answer = tautbar.solve_static(model, {"dead": 1, "wind": 1})
    found, estimate = answer["displacement"][0, -4:, :2], linear_drift(model)[-4:, :2]
    np.testing.assert_allclose(found, estimate, rtol=0.01)
    parts = model.parts
    drawn = np.array([parts.joints.x, parts.joints.y, parts.joints.z]).T
    for i in parts.members.groups["rods"]:
        works_here = works(drawn, parts.members.start[i], parts.members.end[i])
        assert (answer["axial_force"][0, i] > 0) == works_here


# ---------------------------------------------------------------- masts

LEVELS, LIFT, REACH = 5, 6.0, 20.0
GUY_EA, LOOSE = 6e6, 5e-4
SIDE = 1500.0  # N of wind on each joint


def mast(lean: float) -> tautbar.Model:
    """A line of five bars on one hinge, each joint held four ways by guys 0.05 % too long to be taut."""
    joints: dict[str, list[float]] = {
        f"m{k}": [lean * k / LEVELS, 0.6 * lean * k / LEVELS, k * LIFT] for k in range(LEVELS + 1)
    }
    anchors = {"w": [-REACH, 0, 0], "e": [REACH, 0, 0], "s": [0, -REACH, 0], "n": [0, REACH, 0]}
    guys = []
    for k in range(1, LEVELS + 1):
        for side, foot in anchors.items():
            length = float(np.linalg.norm(np.array(joints[f"m{k}"]) - foot))
            guys.append(
                {"name": f"guy {side}{k}", "from": side, "to": f"m{k}", "section": "guy",
                 "kind": "tension-only", "slack": LOOSE * length}
            )  # fmt: skip
    top = [f"m{k}" for k in range(1, LEVELS + 1)]
    return tautbar.Model(
        sections={
            "tube": {"axial_stiffness": 4e8, "mass_per_length": 15},
            "guy": {"axial_stiffness": GUY_EA, "mass_per_length": 0.3},
        },
        joints=joints | anchors,
        members=[
            {"name": "mast", "chain": [f"m{k}" for k in range(LEVELS + 1)], "section": "tube"},
            *guys,
        ],
        supports=[{"joints": ["m0", *anchors], "fixed": HELD}],
        load_cases={
            "dead": {"self_weight": 1.0},
            "wind": {"forces": [{"joints": top, "force": [SIDE, 0, 0]}]},
        },
    )


@pytest.mark.parametrize("lean", [0.0, 0.02])
@pytest.mark.parametrize("loads", [{"dead": 1}, {"dead": 1, "wind": 1}], ids=["dead", "dead and wind"])
def test_loosely_guyed_mast_stands(lean: float, loads: dict[str, float]) -> None:
    """Between guys 0.05 % loose a joint can move by LOOSE length^2/reach (33 mm at the top) before one pulls;
    upright it is a saddle, to be left for the guys on one side. No bar turns by 2 degrees."""
    model = mast(lean)
    answer = tautbar.solve_static(model, loads)
    assert greatest_turn(model, answer) < 2.0
    play = LOOSE * ((LEVELS * LIFT) ** 2 + REACH**2) / REACH
    level = np.abs(answer["displacement"][0, :, :2]).max()
    assert level < (1.2 * play if "wind" not in loads else 3 * play)
    assert -answer["displacement"][0, :, 2].min() < 0.01


@pytest.mark.parametrize("lean", [0.0, 0.02])
def test_drift_of_a_guyed_mast(lean: float) -> None:
    """A hinged line of bars hands nothing on: at each joint the windward guy alone takes the wind. Drift from
    its looseness and stretch; 5 %, the mast's own shortening and the weight on the drift being left out."""
    answer = tautbar.solve_static(mast(lean), {"dead": 1, "wind": 1})
    for k in range(1, LEVELS + 1):
        length = np.hypot(REACH, k * LIFT)
        stretch = SIDE * length / REACH / GUY_EA * length
        estimate = (LOOSE * length + stretch) * length / REACH
        assert answer.displacement(f"m{k}")[0, 0] == pytest.approx(estimate, rel=0.05)
        assert answer.axial_force(f"guy w{k}")[0] == pytest.approx(SIDE * length / REACH, rel=0.05)
        assert answer.axial_force(f"guy e{k}")[0] == 0.0


# ---------------------------------------------------------------- nets


def net(seed: int) -> tuple[tautbar.Model, dict[str, Array]]:
    """A net of 5 x 5 joints hung by its corners, every string 2 to 30 % longer than drawn, random loads."""
    rng = np.random.default_rng(seed)
    name = [[f"j{i}{k}" for k in range(5)] for i in range(5)]
    at = {name[i][k]: np.array([i, k, 0]) + rng.uniform(-0.1, 0.1, 3) for i in range(5) for k in range(5)}
    pairs = [(name[i][k], name[i][k + 1]) for i in range(5) for k in range(4)]
    pairs += [(name[i][k], name[i + 1][k]) for i in range(4) for k in range(5)]
    strings = [
        {
            "name": f"s{i}", "from": a, "to": b, "kind": "tension-only", "section": "string",
            "unstressed_length": float(np.linalg.norm(at[a] - at[b]) * (1 + rng.uniform(0.02, 0.3))),
        }
        for i, (a, b) in enumerate(pairs)
    ]  # fmt: skip
    corners = [name[i][k] for i in (0, -1) for k in (0, -1)]
    load = {n: np.array([*rng.uniform(-20, 20, 2), -rng.uniform(20, 200)]) for n in at if n not in corners}
    model = tautbar.Model(
        sections={"string": {"axial_stiffness": 2e5}},
        joints={n: x.tolist() for n, x in at.items()},
        members=strings,
        supports=[{"joints": corners, "fixed": HELD}],
        load_cases={"load": {"forces": [{"joints": [n], "force": F.tolist()} for n, F in load.items()]}},
    )
    return model, load


@pytest.mark.parametrize("seed", range(6))
def test_slack_net_from_cold(seed: int) -> None:
    """In balance at every joint by a force check of a few lines: 1e-8 of the largest force, ten times the
    tolerance asked for, for the check forms lengths anew and loses digits to it."""
    model, load = net(seed)
    answer = tautbar.solve_static(model, "load")
    N = answer["axial_force"][0]
    assert out_of_balance(model, answer, load) < 1e-8 * N.max()
    assert (N >= 0).all()
    total = np.sum(list(load.values()), axis=0)
    np.testing.assert_allclose(answer["reaction"][0].sum(axis=0), -total, atol=1e-8 * N.max() * 25)
    assert answer["displacement"][0, :, 2].min() < -0.5  # it hangs
