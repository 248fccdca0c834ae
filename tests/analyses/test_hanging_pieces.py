"""Hanging members in pieces against the exact elastic catenary."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from tautbar import find_modes, solve_static
from tautbar.mechanics import catenary

G = 9.80665
SPAN, RISE, EA, LINE = 20.0, 4.0, 5e5, 2.0
CHORD = np.hypot(SPAN, RISE)
# One rope, its length said in four ways.
LENGTH = 20.9
EXACT = (LENGTH, EA, LINE * G, SPAN, RISE)
WAYS = {
    "unstressed_length": LENGTH,
    "slack": LENGTH - CHORD,
    "sag": catenary.sag(*EXACT),
    "pretension": 450.0,
}


def hung(pieces=32, **given):
    return solve_static(structures.build(structures.hanging(SPAN, RISE, pieces, EA, LINE, **given)), "dead")


def sag_of(a, pieces):
    """Vertical distance from the middle of the chord, between joints as a straight piece has it."""
    names = ["low", *(f"rope@{i}" for i in range(1, pieces)), "high"]
    s = a.context.first_scene().structure
    X = s.position.T + a["displacement"][0]
    X = X[[a.context.joint_names.index(n) for n in names]]
    return RISE / 2 - np.interp(SPAN / 2, X[:, 0], X[:, 2])


@pytest.mark.parametrize("way", WAYS)
def test_each_way_of_giving_the_length(way):
    """All pieces together have the length of the catenary, to rounding."""
    a = hung(**{way: WAYS[way]})
    wanted = catenary.length_for_tension(450.0, *EXACT[1:]) if way == "pretension" else LENGTH
    assert a.context.first_scene().structure.L0.sum() == pytest.approx(wanted, rel=1e-12)


def test_pretension_is_the_tension_at_the_lower_end_under_own_weight():
    """Half the weight of the first piece hangs on the hook: the error of a polygon, of second order."""
    a = hung(pieces=64, pretension=3000.0)
    assert a.axial_force("rope.1")[0] == pytest.approx(3000.0, rel=1e-3)


def test_a_drawn_rope_is_nearly_in_balance_and_hardly_moves():
    a = hung(pieces=32, sag=0.8)
    assert np.abs(a["displacement"]).max() < 2e-3
    assert sag_of(a, 32) == pytest.approx(0.8, rel=5e-3)


def reactions(a):
    return np.concatenate([a.joint("reaction", "low")[0], a.joint("reaction", "high")[0]])


@pytest.mark.parametrize(
    ("span", "rise", "stiffness", "length"),
    [
        (20.0, 0.0, 5e5, 22.0),  # level, slack
        (20.0, 0.0, 5e5, 19.98),  # level, taut
        (20.0, 12.0, 5e5, 24.0),  # inclined
        (20.0, 12.0, 800.0, 12.0),  # stretchy
        (2.0, 20.0, 5e5, 20.3),  # steep
        (6.0, 1.0, 5e5, 12.0),  # deep
    ],
)
def test_pieces_converge_to_the_catenary_with_second_order(span, rise, stiffness, length):
    """Pulls at both hooks, against end forces that an integrator has checked."""
    H, V = catenary.end_force(length, stiffness, LINE * G, span, rise)
    exact = np.array([-H, 0, -V, H, 0, V + LINE * G * length])
    errors = []
    for pieces in (32, 64, 128):
        described = structures.hanging(span, rise, pieces, stiffness, LINE, unstressed_length=length)
        found = reactions(solve_static(structures.build(described), "dead"))
        errors.append(np.abs(found - exact).max() / np.abs(exact).max())
    orders = np.log2(np.array(errors[:-1]) / np.array(errors[1:]))
    # A polygon's error is h^2 to leading order; at 32 pieces the next term shows, most where the rope
    # turns round within one piece.
    assert orders[-1] == pytest.approx(2.0, abs=0.25)
    assert errors[-1] < 5e-3


def test_a_rope_doubled_back_hangs_in_two_legs():
    """Ends close together: each hook carries its leg; either may carry the last piece of forty."""
    described = structures.hanging(0.5, 0.3, 40, EA, LINE, unstressed_length=10.0)
    found = reactions(solve_static(structures.build(described), "dead"))
    _, V = catenary.end_force(10.0, EA, LINE * G, 0.5, 0.3)
    assert found[[2, 5]] == pytest.approx([-V, V + LINE * G * 10.0], abs=LINE * G * 10.0 / 40)


def test_vertical_rope_carries_its_weight_below():
    """Hung straight down from the upper hook, held below: closed form by hand for every piece."""
    described = structures.words(
        {"low": (0, 0, 0), "high": (0, 0, 10)},
        [structures.member("rope", "low", "high", kind="hanging", pieces=8, unstressed_length=9.9)],
        supports=[structures.held("low", "high")],
    )
    a = solve_static(structures.build(described), "dead")
    N = a["axial_force"][0]
    piece = 9.9 / 8
    w = structures.LINE * G
    assert np.diff(N) == pytest.approx(np.full(7, w * piece), rel=1e-6)
    # Stretches of all pieces add up to what the hooks are too far apart.
    assert (N * piece / structures.EA).sum() == pytest.approx(0.1, rel=1e-6)


def test_weight_is_by_unstressed_length():
    a = hung(pieces=16, unstressed_length=15.0)
    assert reactions(a)[[2, 5]].sum() == pytest.approx(LINE * G * 15.0, rel=1e-8)


def test_frequencies_of_a_taut_rope_are_those_of_a_string():
    """f_k = k/(2 l) sqrt(T/m) out of plane, where sag plays no part; lumped or not, to the pieces' h^2.

    The mode across the plane is no longer quite a sine where tension varies: 1 % covers 40 pieces and
    the tension's spread of 2 %.
    """
    described = structures.hanging(20.0, 0.0, 40, EA, LINE, pretension=12_000.0)
    model = structures.build(described)
    state = solve_static(model, "dead")
    modes = find_modes(model, state, count=8)
    across = modes["effective_mass"][:, 1] > 0.9 * modes["effective_mass"].sum(axis=1)
    l = state.context.first_scene().structure.L0.sum()
    T = state["axial_force"][0].mean()
    assert modes["frequency"][across][0] == pytest.approx(np.sqrt(T / (LINE * l / 20)) / 40, rel=1e-2)


def test_a_rope_reversed_hangs_the_same():
    described = structures.hanging(SPAN, RISE, 12, EA, LINE, sag=1.0)
    there = solve_static(structures.build(described), "dead")
    described["members"][0]["from"], described["members"][0]["to"] = "high", "low"
    back = solve_static(structures.build(described), "dead")
    assert back["axial_force"][0][::-1] == pytest.approx(there["axial_force"][0], rel=1e-8)
