"""Common practice, no source: what every engineer expects of bars, with numbers of our own."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from published import HELD, Array

import tautbar
from tautbar.analyses.context import Context
from tautbar.errors import ModelError


def stiffness(model: tautbar.Model) -> Array:
    """The assembled matrix over the free unknowns, dense [N/m]."""
    drawn = Context(model.parts).drawn()
    potential = drawn.scene.potential(drawn.acting, small=True)
    lower = potential.curvature(potential.look(drawn.q))
    return np.asarray(drawn.scene.system.pattern.to_csc(lower).toarray())


def truss(joints: dict[str, list[float]], pairs: list[tuple[str, str]], **more: Any) -> tautbar.Model:
    return tautbar.Model(
        sections={"bar": {"axial_stiffness": 3e6}},
        joints=joints,
        members=[{"name": "bar", "pairs": [list(p) for p in pairs], "section": "bar"}],
        **more,
    )


def test_matrix_of_one_member() -> None:
    """EA/L times [[1, -1], [-1, 1]] along the member; to rounding."""
    model = tautbar.Model(
        sections={"bar": {"axial_stiffness": 3e6}},
        joints={"A": [0, 0, 0], "B": [2.5, 0, 0]},
        members=[{"name": "bar", "from": "A", "to": "B", "section": "bar"}],
        supports=[{"joints": ["A", "B"], "fixed": ["y", "z"]}],
        unsupported="allowed",
    )
    np.testing.assert_allclose(stiffness(model), 3e6 / 2.5 * np.array([[1, -1], [-1, 1]]), rtol=1e-15)


def test_matrix_of_a_member_in_space() -> None:
    """The same between the components along the member: EA/L n nT in four blocks; to rounding."""
    n = np.array([2.0, -1.0, 2.0]) / 3
    joints = {"A": [1.0, 1.0, 1.0], "B": list(1 + 1.5 * n)}
    model = truss(joints, [("A", "B")], unsupported="allowed")
    K = stiffness(model)
    block = 3e6 / 1.5 * np.outer(n, n)
    np.testing.assert_allclose(K, np.block([[block, -block], [-block, block]]), atol=1e-15 * 3e6)


CUBE = {f"{x}{y}{z}": [1.0 * x, 1.2 * y, 0.9 * z] for x in (0, 1) for y in (0, 1) for z in (0, 1)}
TETRAHEDRON = {"A": [0, 0, 0], "B": [1, 0, 0], "C": [0.2, 1.1, 0], "D": [0.4, 0.3, 0.9]}
ALL_PAIRS = [(a, b) for i, a in enumerate(TETRAHEDRON) for b in list(TETRAHEDRON)[i + 1 :]]


def rank(K: Array) -> int:
    return int(np.linalg.matrix_rank(K, tol=1e-10 * np.abs(K).max()))


def test_free_structure_is_singular_by_its_six_rigid_motions() -> None:
    """Symmetric, no negative eigenvalue, and as many zero ones as ways to move rigidly: 3 + 3."""
    K = stiffness(truss(TETRAHEDRON, ALL_PAIRS, unsupported="allowed"))
    assert np.array_equal(K, K.T)
    assert K.shape == (12, 12)
    assert rank(K) == 6
    assert np.linalg.eigvalsh(K).min() > -1e-10 * np.abs(K).max()
    rigid = [np.tile(d, 4) for d in np.eye(3)]
    rigid += [np.cross(d, np.array(list(TETRAHEDRON.values()))).ravel() for d in np.eye(3)]
    assert np.abs(K @ np.array(rigid).T).max() < 1e-12 * np.abs(K).max()


# Supports of a tetrahedron: three ways held at A, two at B, one at C hold it in place, no fewer do.
@pytest.mark.parametrize(
    ("held", "left"),
    [
        ([], 6),
        ([("A", ["x", "y", "z"])], 3),
        ([("A", ["x", "y", "z"]), ("B", ["y", "z"])], 1),
        ([("A", ["x", "y", "z"]), ("B", ["y", "z"]), ("C", ["z"])], 0),
    ],
)
def test_supports_take_rigid_motions_away(held: list[tuple[str, list[str]]], left: int) -> None:
    supports = [{"joints": [j], "fixed": axes} for j, axes in held]
    K = stiffness(truss(TETRAHEDRON, ALL_PAIRS, supports=supports, unsupported="allowed"))
    assert len(K) - rank(K) == left
    if not left:
        np.linalg.cholesky(K)


def test_structure_that_is_not_held_is_refused() -> None:
    """Linear statics of a body that can still turn: the joint and the direction are named."""
    supports = [{"joints": ["A"], "fixed": HELD}, {"joints": ["B"], "fixed": ["y", "z"]}]
    push = {"push": {"forces": [{"joints": ["D"], "force": [0, 1, 0]}]}}
    model = truss(TETRAHEDRON, ALL_PAIRS, supports=supports, load_cases=push)
    with pytest.raises(ModelError, match="mechanism"):
        tautbar.solve_static(model, "push", geometry="small")


def test_cube_of_twelve_edges_counts_its_mechanisms() -> None:
    """Maxwell: 3 x 8 unknowns less 12 bars leave 12 free ways, 6 of them rigid; no state of self-stress."""
    edges = [
        (a, b) for a in CUBE for b in CUBE if a < b and sum(x != y for x, y in zip(a, b, strict=True)) == 1
    ]
    K = stiffness(truss(CUBE, edges, unsupported="allowed"))
    assert len(K) - rank(K) == 12


@pytest.mark.parametrize(("left", "right"), [(1.0, 3.0), (2.0, 2.0), (0.4, 1.7)])
@pytest.mark.parametrize("geometry", ["small", "large"])
def test_two_bars_share_the_load_at_their_joint(left: float, right: float, geometry: str) -> None:
    """Like springs side by side: shares inversely as the lengths, the shorter bar being the stiffer.

    To 1e-12 in both geometries, for the bars stay in one line.
    """
    EA, P = 3e6, 1500.0
    model = tautbar.Model(
        sections={"bar": {"axial_stiffness": EA}},
        joints={"A": [-left, 0, 0], "M": [0, 0, 0], "B": [right, 0, 0]},
        members=[{"name": "bar", "chain": ["A", "M", "B"], "section": "bar"}],
        supports=[{"joints": ["A", "B"], "fixed": HELD}, {"joints": ["M"], "fixed": ["y", "z"]}],
        load_cases={"push": {"forces": [{"joints": ["M"], "force": [P, 0, 0]}]}},
    )
    answer = tautbar.solve_static(model, "push", geometry=geometry, tolerance=1e-13)
    pulled, pushed = answer["axial_force"][0]
    assert pulled - pushed == pytest.approx(P, rel=1e-12)
    assert pulled / -pushed == pytest.approx(right / left, rel=1e-12)
    assert answer.displacement("M")[0, 0] == pytest.approx(P / (EA / left + EA / right), rel=1e-12)
    assert answer.joint("reaction", "A")[0, 0] == pytest.approx(-pulled, rel=1e-12)


def test_bars_end_to_end_add_their_flexibilities() -> None:
    """A line of unlike bars pulled at its end: the same force in all, elongations P L/EA; 1e-12."""
    lengths, EA, P = [1.0, 0.5, 2.0], [1e6, 4e6, 2.5e6], 800.0
    at = np.concatenate([[0.0], np.cumsum(lengths)])
    names = [f"p{i}" for i in range(4)]
    model = tautbar.Model(
        sections={f"s{i}": {"axial_stiffness": k} for i, k in enumerate(EA)},
        joints={n: [x, 0, 0] for n, x in zip(names, at, strict=True)},
        members=[
            {"name": f"b{i}", "from": a, "to": b, "section": f"s{i}"}
            for i, (a, b) in enumerate(pairwise(names))
        ],
        supports=[{"joints": names[:1], "fixed": HELD}, {"joints": names[1:], "fixed": ["y", "z"]}],
        load_cases={"pull": {"forces": [{"joints": names[-1:], "force": [P, 0, 0]}]}},
    )
    answer = tautbar.solve_static(model, "pull", geometry="small", tolerance=1e-13)
    np.testing.assert_allclose(answer["axial_force"][0], P, rtol=1e-12)
    moves = P * np.cumsum(np.array(lengths) / EA)
    np.testing.assert_allclose(answer["displacement"][0, 1:, 0], moves, rtol=1e-12)
