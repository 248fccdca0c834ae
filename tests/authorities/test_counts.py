"""States of self-stress and mechanisms as published: data/C29, its sources named there."""

from __future__ import annotations

import json
from itertools import permutations
from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import brentq

from tautbar import Model
from tautbar.analyses.context import Context
from tautbar.analyses.count import StaticalCount, statical_count
from tautbar.mechanics.lines import lines

CASE = json.loads((Path(__file__).parent / "data" / "C29_self_stress_counts.json").read_text("utf-8"))
ROWS = {row["quantity"]: row for row in CASE["values"]}
GAP = 1e10  # the case's own tolerance: least singular value that is not zero over the largest that is


def pairs(text: str) -> list[tuple[int, ...]]:
    return [tuple(int(n) for n in pair.split(",")) for pair in text.split()]


def wanted(quantity: str, which: int = 0) -> tuple[int, ...]:
    row = ROWS[quantity]
    return pairs(row["published"] or row["computed"])[which]


def model(joints, members, held=(), plane=None, kinds=None) -> Model:
    """Joints by name, members as pairs of them; without ``held`` it floats."""
    rows = [
        {"name": f"{a}:{b}", "from": a, "to": b, "section": "s", "kind": (kinds or {}).get((a, b), "bar")}
        for a, b in members
    ]
    words = {
        "joints": {name: [float(c) for c in at] for name, at in joints.items()},
        "members": rows,
        "sections": {"s": {"axial_stiffness": 1e6}},
        "unsupported": "allowed",
        "supports": [{"joints": list(held), "fixed": list(plane or "xyz")}] if held else [],
    }
    return Model(**words, **({"plane": plane} if plane else {}))


def count(built: Model) -> StaticalCount:
    context = Context(built.parts)
    scene = context.first_scene()
    C = lines(scene.structure, scene.system.freedom, ()).C
    s = np.linalg.svd(C.toarray(), compute_uv=False)
    smallest = s[s > 1e-10].min()
    assert smallest > GAP * s[s <= 1e-10].max(initial=smallest / (2 * GAP))
    return statical_count(context)


def counts(built: Model) -> tuple[int, int]:
    found = count(built)
    return found.states_of_self_stress, found.mechanisms


def test_two_collinear_bars() -> None:
    built = model({"A": (0, 0), "B": (1, 0), "C": (2, 0)}, [("A", "B"), ("B", "C")], "AC", "xz")
    assert counts(built) == wanted("two collinear bars 2D: s,m")


@pytest.mark.parametrize(
    ("diagonals", "quantity"),
    [(("ac", "bd"), "square, two diagonals: s,m"), ((), "square without diagonal")],
)
def test_squares(diagonals, quantity) -> None:
    corners = {"a": (0, 0), "b": (1, 0), "c": (1, 1), "d": (0, 1)}
    found = count(model(corners, [*map(tuple, ("ab", "bc", "cd", "da")), *map(tuple, diagonals)], plane="xz"))
    assert (found.states_of_self_stress, found.mechanisms) == wanted(quantity)
    assert found.rigid_motions == 3


def prism(n: int, more_twist: float = 0.0) -> Model:
    """Ties along both polygons and between them, one strut from each corner; radius 1, height 1.3."""
    joints = {}
    for i in range(n):
        for layer, twist in (("a", 0.0), ("b", np.pi / 2 - np.pi / n + more_twist)):
            angle = 2 * np.pi * i / n + twist
            joints[f"{layer}{i}"] = (np.cos(angle), np.sin(angle), 1.3 * (layer == "b"))
    ties = [(f"{layer}{i}", f"{layer}{(i + 1) % n}") for layer in "ab" for i in range(n)]
    ties += [(f"a{i}", f"b{i}") for i in range(n)]
    struts = [(f"a{i}", f"b{(i + 1) % n}") for i in range(n)]
    kinds = dict.fromkeys(ties, "tension-only") | dict.fromkeys(struts, "compression-only")
    return model(joints, [*ties, *struts], kinds=kinds)


@pytest.mark.parametrize("n", [3, 4, 5, 6])
def test_prisms_at_their_twist(n) -> None:
    quantity = "prism n=4 (45 deg), 5 (54), 6 (60): s,m" if n > 3 else "simplex prism n=3, 30 deg: s,m"
    found = count(prism(n))
    assert (found.states_of_self_stress, found.mechanisms) == wanted(quantity, max(n - 4, 0))
    assert found.rigid_motions == 6
    assert set(found.stiffening.answers) == {"yes"}  # one state stiffens them all (Calladine 1978)
    assert counts(prism(n, 0.05))[0] == 0  # the case's own counter-example


def test_force_densities_of_the_triangular_prism() -> None:
    built = prism(3)
    found = count(built)
    s = Context(built.parts).first_scene().structure
    densities = found.self_stress[0] / s.length
    ratio = ROWS["prism q_h/q_v n=3"]
    # Six published digits.
    assert densities[0] / densities[6] == pytest.approx(ratio["published"], rel=1e-5)
    assert densities[0] / densities[6] == pytest.approx(1 / np.sqrt(3), rel=1e-12)
    assert densities[9] / densities[6] == pytest.approx(-1.0, rel=1e-12)
    assert ROWS["prism twist n=3"]["published"] == 90 - 180 / 3


def octahedron() -> Model:
    """Six struts of length 4 in three pairs 2 apart, 24 ties between their ends."""
    ends = [(0, y, z) for y in (1, -1) for z in (2, -2)]
    points = [p[k:] + p[:k] for p in ends for k in range(3)]
    names = {f"j{i}": p for i, p in enumerate(points)}
    apart = {(a, b): np.subtract(names[a], names[b]) for a in names for b in names if a < b}
    square = {pair: int(d @ d) for pair, d in apart.items()}
    struts = [pair for pair, d in apart.items() if square[pair] == 16 and np.abs(d).max() == 4]
    ties = [pair for pair in apart if square[pair] == 6]
    kinds = dict.fromkeys(ties, "tension-only") | dict.fromkeys(struts, "compression-only")
    return model(names, [*ties, *struts], kinds=kinds)


def test_expanded_octahedron() -> None:
    built = octahedron()
    found = count(built)
    assert len(built.parts.members) == 30
    assert (found.states_of_self_stress, found.mechanisms) == wanted("expanded octahedron b=30 j=12")
    assert found.stiffening.answers == ("yes",)
    s = Context(built.parts).first_scene().structure
    densities = found.self_stress[0] / s.length
    ratio = ROWS["octahedron q_strut/q_cable"]["published"]
    np.testing.assert_allclose(densities[24:], ratio * densities[0], rtol=1e-12)
    # Ten published digits.
    assert s.length[0] / s.length[24] == pytest.approx(
        ROWS["octahedron cable/strut length"]["published"], rel=5e-10
    )


def tetrahedron() -> tuple[Model, float]:
    """The truncated tetrahedron, its shape from force densities: 1 in ties, and the one of the struts.

    Corners are the even permutations of four things; members are steps by a third of a turn (around
    the triangles), by a half turn (between them) and by another half turn (the struts).
    """
    group = [p for p in permutations(range(4)) if np.linalg.det(np.eye(4)[list(p)]) > 0]
    third, half, other = (1, 2, 0, 3), (1, 0, 3, 2), (2, 3, 0, 1)

    def steps(step):
        after = {g: tuple(g[i] for i in step) for g in group}
        found = {tuple(sorted((group.index(g), group.index(h)))) for g, h in after.items()}
        return [(f"j{a}", f"j{b}") for a, b in sorted(found)]

    def densities(members):
        D = np.zeros((12, 12))
        for a, b in members:
            v = np.zeros(12)
            v[int(a[1:])], v[int(b[1:])] = 1.0, -1.0
            D += np.outer(v, v)
        return D

    ties, struts = [*steps(third), *steps(half)], steps(other)
    D_ties, D_struts, same = densities(ties), densities(struts), np.full((12, 12), 1.0)
    q = brentq(lambda q: np.linalg.eigvalsh(D_ties + q * D_struts + same)[0], -0.7, -0.4, xtol=1e-15)
    places = np.linalg.eigh(D_ties + q * D_struts + same)[1][:, :3]
    kinds = dict.fromkeys(ties, "tension-only") | dict.fromkeys(struts, "compression-only")
    return model({f"j{i}": p for i, p in enumerate(places)}, [*ties, *struts], kinds=kinds), q


def test_truncated_tetrahedron() -> None:
    built, q = tetrahedron()
    assert f"q_strut={q:.10f}" in CASE["notes"]
    found = count(built)
    assert len(built.parts.members) == 24
    assert (found.states_of_self_stress, found.mechanisms) == wanted("truncated tetrahedron b=24 j=12")
    assert found.stiffening.answers == ("yes",) * 7  # "a single self-stress can stiffen many modes"


def net(rows: int, columns: int, height) -> Model:
    """``rows`` x ``columns`` free joints of a net on a surface, every line held at both ends."""
    joints, members = {}, []
    for i in range(rows + 2):
        for j in range(columns + 2):
            if 0 < i <= rows or 0 < j <= columns:
                x, y = i - (rows + 1) / 2, j - (columns + 1) / 2
                joints[f"{i},{j}"] = (x, y, height(x, y))
    for i in range(rows + 2):
        for j in range(columns + 2):
            if i <= rows and 0 < j <= columns:
                members.append((f"{i},{j}", f"{i + 1},{j}"))
            if j <= columns and 0 < i <= rows:
                members.append((f"{i},{j}", f"{i},{j + 1}"))
    edge = [name for name in joints if not _inside(name, rows, columns)]
    return model(joints, members, edge, kinds=dict.fromkeys(members, "tension-only"))


def _inside(name: str, rows: int, columns: int) -> bool:
    i, j = map(int, name.split(","))
    return 0 < i <= rows and 0 < j <= columns


@pytest.mark.parametrize(
    ("size", "height", "quantity", "stiffens"),
    [
        ((2, 2), lambda x, y: 0.0, "flat 2x2 net: s,m", {"yes"}),
        ((2, 2), lambda x, y: 0.1 * (x * x + y * y), "2x2 dish or saddle net: s,m", {"no"}),
        ((2, 2), lambda x, y: 0.1 * (x * x - y * y), "2x2 dish or saddle net: s,m", {"yes"}),
        ((3, 4), lambda x, y: 0.1 * x * y, "31-bar net along generators: s,m", {"yes"}),
        ((3, 4), lambda x, y: 0.1 * (x * x - y * y), "31-bar net across generators: s,m", {"yes"}),
    ],
)
def test_nets(size, height, quantity, stiffens) -> None:
    """A dish can only be in balance with one family of ropes in compression, which ropes cannot carry."""
    built = net(*size, height)
    found = count(built)
    assert (found.states_of_self_stress, found.mechanisms) == wanted(quantity)
    assert set(found.stiffening.answers) == stiffens


def test_every_published_row_is_used() -> None:
    text = Path(__file__).read_text("utf-8")
    assert all(f'"{quantity}"' in text for quantity in ROWS)
