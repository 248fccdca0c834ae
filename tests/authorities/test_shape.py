"""Shapes by force densities and cable polygons, against closed forms and printed examples."""

from __future__ import annotations

import re

import numpy as np
import published
import pytest
from published import values

import structures
from structures import held, member
from tautbar.analyses.job import Job

EXACT = float(published.case("C28")["tolerance"])  # of the size: the shape is one linear solve
PRINTED = 1e-8  # C13: "1e-8 statics", of numbers printed to ten digits
STIFF = 2e-5  # C13: "2e-5 with EA = 1e9 kN bars", against numbers printed to six digits


def shape(joints, ties, fixed, densities, loads=None, EA=1e6):
    """Positions found, by joint; ``densities`` one a tie."""
    given = [{"members": [name], "value": float(q)} for (name, *_), q in zip(ties, densities, strict=True)]
    words = structures.words(
        joints,
        [member(*tie, kind="tension-only", section="tie") for tie in ties],
        sections={"tie": {"axial_stiffness": EA, "mass_per_length": 0.0}},
        supports=[held(*fixed)],
        load_cases={"it": loads or {}},
        analyses=[{"name": "f", "kind": "form-finding", "loads": "it", "force_densities": given}],
    )
    del words["load_cases"]["dead"]
    record = Job(structures.build(words).parts).run("f")
    assert record.status == "complete", record.outcome
    return dict(zip(joints, record["position"], strict=True)), record


def numbers(text: str) -> list[float]:
    return [float(n) for n in re.findall(r"-?\d+(?:\.\d+)?", text)]


def test_one_joint_between_four_corners():
    """C28 a: the mean of the corners weighed by the force densities."""
    corners = {"A": (0, 0, 0), "B": (4, 0, 3), "C": (4, 4, 0), "D": (0, 4, 3)}
    ties = [(f"t{n}", n, "P") for n in corners]
    at, _ = shape(corners | {"P": (1, 1, 1)}, ties, corners, [1, 2, 3, 4])
    np.testing.assert_allclose(at["P"], numbers(values("C28")["a node"]["published"]), atol=4 * EXACT)


def test_the_chain_of_ten():
    """C28 b: sag p n^2/(8 q) in the middle."""
    joints = {f"j{i}": (i, 0, 0.1 * (i % 2)) for i in range(11)} | {"j10": (10, 0, 0)}
    ties = [(f"t{i}", f"j{i}", f"j{i + 1}") for i in range(10)]
    push = {"forces": [{"joints": [f"j{i}" for i in range(1, 10)], "force": [0, 0, -1.0]}]}
    at, _ = shape(joints, ties, ["j0", "j10"], [5] * 10, push)
    assert -at["j5"][2] == pytest.approx(values("C28")["b mid sag p n^2/(8q)"]["published"], abs=10 * EXACT)


def mesh(count, height):
    """Joints of a square mesh of ``count`` fields, and its ties; ``height`` (x, y) of the drawing."""
    joints = {f"n{i}-{k}": (i, k, height(i, k)) for i in range(count + 1) for k in range(count + 1)}
    ties = [(f"x{i}-{k}", f"n{i}-{k}", f"n{i + 1}-{k}") for i in range(count) for k in range(count + 1)]
    ties += [(f"y{i}-{k}", f"n{i}-{k}", f"n{i}-{k + 1}") for i in range(count + 1) for k in range(count)]
    return joints, ties


def test_the_saddle():
    """C28 c: z = 0.2 x y is harmonic on the mesh, so equal force densities hold it."""
    n = 5
    rim = {f"n{i}-{k}" for i in range(n + 1) for k in range(n + 1) if i in (0, n) or k in (0, n)}
    joints, ties = mesh(n, lambda i, k: 0.2 * i * k)
    drawn = {name: at if name in rim else (at[0], at[1], 1.3) for name, at in joints.items()}
    at, _ = shape(drawn, ties, sorted(rim), [7.0] * len(ties))
    assert values("C28")["c max error"]["published"] == "0"
    for name, (x, y, z) in joints.items():
        np.testing.assert_allclose(at[name], (x, y, z), atol=n * EXACT)


def test_the_four_point_sail():
    """C28 d, with edges five times as strong as the net: computed independently to eight decimals."""
    n = 4
    corner = {(0, 0): 0.0, (n, 0): 2.0, (n, n): 0.0, (0, n): 2.0}
    joints, ties = mesh(n, lambda i, k: corner.get((i, k), 1.0))
    edge = {f"x{i}-{k}" for i in range(n) for k in (0, n)} | {f"y{i}-{k}" for i in (0, n) for k in range(n)}
    fixed = [f"n{i}-{k}" for i, k in corner]
    at, _ = shape(joints, ties, fixed, [5.0 if name in edge else 1.0 for name, *_ in ties])
    rows, half = values("C28"), 0.5e-8
    assert at["n2-0"][1] == pytest.approx(rows["d edge mid y, ratio 5"]["computed"], abs=half)
    for axis in (0, 1):
        assert at["n1-1"][axis] == pytest.approx(rows["d node(1,1) x=y, ratio 5"]["computed"], abs=half)
    # By symmetry the middle of the sail is at half height.
    np.testing.assert_allclose(at["n2-2"], (2, 2, 1), atol=n * EXACT)


def test_the_funicular_of_three_loads():
    """C13 A: loads 400, 600, 400 N at 2 m spacing; equal spacing means one force density, H/2 m."""
    rows = values("C13")
    H = rows["A H"]["published"]
    joints = {"A": (0, 0, -2), "C": (2, 0, -3), "D": (4, 0, -3), "E": (6, 0, -2), "B": (8, 0, 0)}
    ties = [(a + b, a, b) for a, b in zip("ACDE", "CDEB", strict=True)]
    loads = zip("CDE", (400.0, 600.0, 400.0), strict=True)
    pushed = {"forces": [{"joints": [joint], "force": [0, 0, -P]} for joint, P in loads]}
    at, record = shape(joints, ties, ["A", "B"], [H / 2] * 4, pushed, EA=1e9)
    assert -at["D"][2] == pytest.approx(2.25, abs=PRINTED)
    assert -at["E"][2] == pytest.approx(rows["A depth of E"]["published"], abs=PRINTED)
    N = record["axial_force"][0]
    assert N[0] == pytest.approx(rows["A T_CA"]["published"], rel=PRINTED)
    assert N.max() == pytest.approx(rows["A T_max"]["published"], rel=PRINTED)
    B = list(joints).index("B")
    assert record["reaction"][0, B, 2] == pytest.approx(rows["A V_B"]["published"], rel=PRINTED)


def test_the_cable_with_one_load_tuned_to_its_sag():
    """C13 B: 50 kN at 5 m of a span of 20 m, 1 m below the hooks; lengths by tuning to that place."""
    rows = values("C13")
    words = structures.words(
        {"A": (0, 0, 0), "C": (5, 0, -0.4), "D": (20, 0, 0)},
        [member("ac", "A", "C", kind="tension-only"), member("cd", "C", "D", kind="tension-only")],
        sections={"s": {"axial_stiffness": 1e12, "mass_per_length": 0.0}},
        supports=[held("A", "D"), {"joints": ["C"], "fixed": ["y"]}],
        load_cases={"it": {"forces": [{"joints": ["C"], "force": [0, 0, -50e3]}]}},
        analyses=[
            {
                "name": "t", "kind": "tune", "loads": "it", "adjust": ["ac", "cd"],
                "targets": [
                    {"joint": "C", "direction": "x", "position": 5.0},
                    {"joint": "C", "direction": "z", "position": -1.0},
                ],
            }
        ],
    )  # fmt: skip
    record = Job(structures.build(words).parts).run("t")
    assert record.status == "complete", record.outcome
    N = record["axial_force"][0]
    assert N[1] / 1e3 == pytest.approx(rows["B T_CD"]["published"], rel=STIFF)
    assert record["reaction"][0, 2, 0] / 1e3 == pytest.approx(rows["B H"]["published"], rel=STIFF)
    length = record["unstressed_length"].sum()
    assert length == pytest.approx(rows["B total length"]["published"], rel=STIFF)
