"""Modes about states of small geometry, and states that ties exactly at their length hold up."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar import AnalysisFailed, find_modes, solve_static

E_TIE = 4e6


def panel(pretension=None):
    """A stiff panel on X ties that carries mass on top; sway is held by the ties alone."""
    tie = {"kind": "tension-only", "section": "tie"} | ({"pretension": pretension} if pretension else {})
    return structures.words(
        {"A": (0, 0), "B": (3, 0), "C": (0, 2), "D": (3, 2)},
        [
            member("left", "A", "C"),
            member("right", "B", "D"),
            member("top", "C", "D"),
            member("up", "A", "D", **tie),
            member("down", "B", "C", **tie),
        ],
        sections={
            "s": {"axial_stiffness": 1e12, "mass_per_length": 0.0},
            "tie": {"axial_stiffness": E_TIE, "mass_per_length": 0.0},
        },
        supports=[{"joints": ["A", "B"], "fixed": ["x", "y"]}],
        masses=[{"joints": ["C", "D"], "mass": 150.0}],
        plane="xy",
        load_cases={"H": {"forces": [{"joints": ["C", "D"], "force": [40.0, 0]}]}},
    )


def sway(ties, tension=0.0, posts=0.0, strain=0.0):
    """Frequency of the sway by hand: ties along it, forces across; ``posts`` is the force in both [N]."""
    l, c2 = np.sqrt(13.0), 9 / 13
    k = ties * E_TIE * (1 + strain) / l * c2 + tension / l * (1 - c2) + posts / 2.0
    return np.sqrt(k / 300.0) / (2 * np.pi)


@pytest.mark.parametrize("geometry", ["small", "large"])
def test_modes_know_which_ties_of_the_state_are_slack(geometry):
    """Swayed east one tie holds: the frequency is that of one, not of the two that the drawing shows.

    Forces of the state change it by 1e-5 (80 N beside 4 MN), sway of 0.1 mm turns the ties by as much.
    """
    model = structures.build(panel())
    state = solve_static(model, "H", geometry=geometry)
    assert state["taut"][0].tolist() == [1, 1, 1, 1, 0]
    f = find_modes(model, state, count=1)["frequency"][0]
    assert f == pytest.approx(sway(1), rel=1e-4)
    assert abs(f / sway(2) - 1) > 0.25


def test_modes_about_a_small_state_have_the_stiffness_of_its_forces():
    """Tight ties and heavy top: pretension over l stiffens, the push in the posts softens, by hand.

    The small state has its forces on the drawing, so the closed form is exact for it.
    """
    described = panel(pretension=9e4)
    described["load_cases"]["heavy"] = {"forces": [{"joints": ["C", "D"], "force": [0, -6e5]}]}
    model = structures.build(described)
    state = solve_static(model, "heavy", geometry="small")
    N = state["axial_force"][0]
    tension, posts = N[3] + N[4], N[0] + N[1]
    assert posts == pytest.approx(-1.2e6 - tension * 2 / np.sqrt(13), rel=1e-6)
    f = find_modes(model, state, count=1)["frequency"][0]
    exact = sway(2, tension, posts, 9e4 / E_TIE)  # L0 is shorter than l by the pretension
    assert f == pytest.approx(exact, rel=1e-5)
    assert abs(f / sway(2) - 1) > 0.1, "the forces must matter"
    large = find_modes(model, solve_static(model, "heavy"), count=1)["frequency"][0]
    assert large == pytest.approx(exact, rel=1e-2)


def test_a_string_of_small_geometry_rings_by_its_tension():
    """Two ties and a mass between them: nothing but T/l holds it sideways."""
    model = structures.build(structures.words(
        {"A": (0, 0, 0), "M": (1.5, 0, 0), "B": (4, 0, 0)},
        [member(n, a, b, kind="tension-only", pretension=6000.0) for n, a, b in
         (("l", "A", "M"), ("r", "M", "B"))],
        sections={"s": {"axial_stiffness": 2e6, "mass_per_length": 0.0}},
        supports=[held("A", "B")],
        masses=[{"joints": ["M"], "mass": 7.0}],
        load_cases={"nothing": {"forces": [{"joints": ["M"], "force": [0, 0, 0.0]}]}},
    ))  # fmt: skip
    state = solve_static(model, {"nothing": 1.0}, geometry="large")
    f = find_modes(model, state, count=3)["frequency"]
    across = np.sqrt(6000 * (1 / 1.5 + 1 / 2.5) / 7.0) / (2 * np.pi)
    assert f[:2] == pytest.approx([across, across], rel=1e-9)


# ---- ties exactly at their length ----

W, POST, H = 500.0, 1e9, 5.0  # N on top, N axial stiffness and height [m] of the mast


def mast(left, right, EA=2e6):
    """A pinned mast with a weight on top between two guys in a plane, each given its own length."""
    guy = {"kind": "tension-only", "section": "guy"}
    return structures.words(
        {"foot": (0, 0), "top": (0, H), "L": (-4, 0), "R": (4, 0)},
        [member("mast", "foot", "top"), member("left", "L", "top", **guy, **left),
         member("right", "R", "top", **guy, **right)],
        sections={"s": {"axial_stiffness": POST, "mass_per_length": 0.0},
                  "guy": {"axial_stiffness": EA, "mass_per_length": 0.0}},
        supports=[{"joints": ["foot", "L", "R"], "fixed": ["x", "y"]}],
        plane="xy",
        load_cases={"W": {"forces": [{"joints": ["top"], "force": [0, -W]}]}},
    )  # fmt: skip


# A guy that is exactly as long as it must be under the weight, and one as drawn: longer by two microns.
EXACTLY = {"unstressed_length": float(np.hypot(4, H * (1 - W / POST)))}
AS_DRAWN = {"unstressed_length": float(np.hypot(4, H))}


def test_two_ties_at_their_length_hold_a_mast_up_either_way():
    """Whichever way it leans one of them tightens: k cos^2 against W/h, a thousand times as much."""
    a = solve_static(structures.build(mast(EXACTLY, EXACTLY)), "W")
    assert a["taut"][0].tolist() == [1, 1, 1]
    assert abs(a.displacement("top")[0, 0]) < 1e-10
    assert a["audit/negative_pivots"][0] == 0
    assert a.axial_force("mast")[0] == pytest.approx(-W, rel=1e-6)
    assert not any("unstable" in w for w in a.record.warnings)


SOFT = W / H * np.sqrt(41.0) * 41 / 16  # EA of a guy whose k cos^2 is W/h


def test_ties_too_soft_for_the_weight_do_not():
    """Below k cos^2 = W/h upright is a saddle even with both ties taken as taut, and the mast folds."""
    with pytest.raises(AnalysisFailed, match="NOT A RESULT"):
        solve_static(structures.build(mast(EXACTLY, EXACTLY, EA=0.8 * SOFT)), "W")
    held_up = solve_static(structures.build(mast(EXACTLY, EXACTLY, EA=1.3 * SOFT)), "W")
    assert abs(held_up.displacement("top")[0, 0]) < 1e-9


@pytest.mark.parametrize("times", [1.3, 3.0, 200.0, 1000.0])
def test_a_mast_between_ties_as_drawn_leans_by_microns_until_one_holds_it(times):
    """Shortened by d = W h/EA it stands between two ties a little loose: x = 1.25 d/(1 - W/(h k cos^2)).

    A saddle upright, and valleys a few microns to either side: one of them is the answer, and said.
    """
    a = solve_static(structures.build(mast(AS_DRAWN, AS_DRAWN, EA=times * SOFT)), "W")
    lean = abs(a.displacement("top")[0, 0])
    assert lean == pytest.approx(1.25 * H * W / POST / (1 - 1 / times), rel=1e-3)
    assert sorted(a["taut"][0]) == [0, 1, 1]
    assert any("the balance reached first was unstable" in w for w in a.record.warnings)


@pytest.mark.parametrize("loose", ["left", "right"])
def test_a_tie_at_its_length_on_one_side_alone_does_not_hold_the_other(loose):
    """The mast leans away from it until the slack one catches, and that is said."""
    slack = {"slack": 0.05}
    given = (slack, EXACTLY) if loose == "left" else (EXACTLY, slack)
    a = solve_static(structures.build(mast(*given)), "W")
    lean = (1.0 if loose == "left" else -1.0) * a.displacement("top")[0, 0]
    # From its anchor to the top on its circle about the foot the guy is as long as it is: closed form.
    angle = np.arcsin(((np.hypot(4, H) + 0.05) ** 2 - 16 - H * H) / (8 * H))
    assert lean == pytest.approx(H * np.sin(angle), rel=1e-3)
    assert a.axial_force(loose)[0] > 0
    assert a.axial_force("right" if loose == "left" else "left")[0] == 0.0
    assert any("the balance reached first was unstable" in w for w in a.record.warnings)
