"""Wind, ice, temperature and ropes clamped along their way, by hand."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import EA, held, member
from tautbar import find_modes, solve_history, solve_static

G = 9.80665
WIDTH, THICK, ICE = 0.08, 0.03, 870.0  # m, m, kg/m3
BLOWN = {"axial_stiffness": EA, "mass_per_length": structures.LINE, "wind_width": WIDTH}


def stick(end, wind, plane=None, ice=None, **more):
    """One bar from the origin, held at both ends, in a wind; unstressed as drawn."""
    out = structures.words(
        {"A": (0, 0, 0)[: len(end)], "B": end},
        [member("m", "A", "B")],
        sections={"s": BLOWN},
        supports=[{"joints": ["A", "B"], "fixed": list("xyz") if plane is None else list(plane)}],
        load_cases={"wind": {"wind": [{"members": ["m"], **wind}]}},
        **({"plane": plane} if plane else {}),
        **more,
    )
    if ice:
        out["load_cases"]["ice"] = {"ice": [{"members": ["m"], **ice}]}
    return structures.build(out)


def blown(end, loads="wind", **arguments):
    """The force of the wind on the whole member [N]: minus the sum of the reactions."""
    return -solve_static(stick(end, **arguments), loads)["reaction"][0].sum(axis=0)


@pytest.mark.parametrize("degrees", [0, 17, 45, 80, 90])
def test_wind_goes_with_the_square_of_the_sine_normal_to_the_member(degrees):
    """Level wind in x on members at an angle to it: p b L sin^2 towards the side it comes from not."""
    angle = np.deg2rad(degrees)
    n = np.array([np.cos(angle), np.sin(angle), 0.0])
    F = blown(tuple(6 * n), wind={"toward": [1, 0, 0], "pressure": 700.0})
    normal = np.array([np.sin(angle), -np.cos(angle), 0.0])
    assert pytest.approx(700 * WIDTH * 6 * np.sin(angle) ** 2 * normal, abs=1e-9) == F
    assert abs(F @ n) < 1e-9


def test_wind_in_space_turns_with_its_sense_and_not_with_its_length():
    end, toward = np.array([2.0, -3.0, 6.0]), np.array([1.0, 2.0, -2.0])
    n, w = end / 7.0, toward / 3.0
    normal = w - (w @ n) * n
    expected = 700 * WIDTH * 7 * np.linalg.norm(normal) * normal
    one = blown(tuple(end), wind={"toward": list(toward), "pressure": 700.0})
    assert one == pytest.approx(expected, rel=1e-9)
    other = blown(tuple(end), wind={"toward": list(-5 * toward), "pressure": 700.0})
    assert other == pytest.approx(-expected, rel=1e-9)


HEIGHTS = [[2.0, 300.0], [6.0, 500.0], [10.0, 900.0]]


@pytest.mark.parametrize(
    ("low", "high", "expected"),
    [(0, 2, 300), (2, 6, 400), (4, 8, 500), (6, 10, 700), (8, 12, 900), (20, 30, 900), (-5, -1, 300)],
)
def test_pressure_is_that_of_the_height_of_the_middle(low, high, expected):
    """Linear between the heights given, constant beyond them; heights are coordinates, drawn."""
    model = structures.build(structures.words(
        {"A": (0, 0, low), "B": (0, 0, high)},
        [member("m", "A", "B")],
        sections={"s": BLOWN},
        supports=[held("A", "B")],
        load_cases={"wind": {"wind": [{"members": ["m"], "toward": [0, 1, 0], "pressure": HEIGHTS}]}},
    ))  # fmt: skip
    R = solve_static(model, {"wind": 1.5})["reaction"][0]
    assert R[:, 1] == pytest.approx(np.full(2, -1.5 * expected * WIDTH * (high - low) / 2), rel=1e-12)


def test_height_is_along_up_in_a_plane_model():
    F = blown((0, 8), wind={"toward": [1, 0], "pressure": [[0, 0.0], [8, 800.0]]}, plane="xy")
    assert F[0] == pytest.approx(400 * WIDTH * 8, rel=1e-12)
    lying = blown((0, 8, 0), wind={"toward": [1, 0, 0], "pressure": [[0, 0.0], [8, 800.0]]}, up="y")
    assert lying[0] == pytest.approx(400 * WIDTH * 8, rel=1e-12)


RING = np.pi * THICK * (WIDTH + THICK) * ICE  # kg/m: a coat around the width


def test_ice_weighs_and_widens_by_twice_its_thickness():
    """Its weight takes the factor of its case; its thickness does not: it is there or it is not."""
    arguments = {
        "wind": {"toward": [1, 0, 0], "pressure": 700.0},
        "ice": {"thickness": THICK, "density": ICE},
    }
    alone = blown((0, 5, 0), {"ice": 1.3}, **arguments)
    assert alone == pytest.approx([0, 0, -1.3 * RING * 5 * G], rel=1e-12)
    both = blown((0, 5, 0), {"wind": 0.9, "ice": 1.3}, **arguments)
    assert both == pytest.approx([0.9 * 700 * (WIDTH + 2 * THICK) * 5, 0, -1.3 * RING * 5 * G], rel=1e-12)
    without = blown((0, 5, 0), {"wind": 0.9, "ice": 0.0}, **arguments)
    assert without == pytest.approx([0.9 * 700 * WIDTH * 5, 0, 0], rel=1e-12, abs=1e-12)
    other_way = blown((0, 5, 0), {"ice": 1.3, "wind": 0.9}, **arguments)
    assert other_way == pytest.approx(both, rel=1e-14), "whichever case is named first"


def icy_spring(**more):
    """A mass on a guided spring beside an icy bar: the ice moves with its joint."""
    return structures.words(
        {"A": (0, 0, 0), "B": (2, 0, 0)},
        [member("m", "A", "B", section="k")],
        sections={"k": {"axial_stiffness": 8000.0, "mass_per_length": 1.5, "wind_width": WIDTH}},
        supports=[held("A"), {"joints": ["B"], "fixed": ["y", "z"]}],
        masses=[{"joints": ["B"], "mass": 3.0}],
        load_cases={"ice": {"ice": [{"members": ["m"], "thickness": THICK, "density": ICE}]},
                    "dead": {"self_weight": 1.0},
                    "pull": {"forces": [{"joints": ["B"], "force": [40.0, 0, 0]}]}},
        **more,
    )  # fmt: skip


@pytest.mark.parametrize(("mass", "share"), [("consistent", 1 / 3), ("lumped", 1 / 2)])
def test_ice_counts_once_in_the_mass_whatever_its_factor(mass, share):
    model = structures.build(icy_spring())
    for loads, ice in (({"dead": 1.0}, 0.0), ({"dead": 1.0, "ice": 0.4}, RING), ({"ice": 1.6}, RING)):
        f = find_modes(model, solve_static(model, loads), count=1, mass=mass)
        moving = 3.0 + share * 2.0 * (1.5 + ice)
        assert f["frequency"][0] == pytest.approx(np.sqrt(4000 / moving) / (2 * np.pi), rel=1e-9)
        assert f["kinetic_energy_share"][0, -1] == pytest.approx(3.0 / moving, rel=1e-9), "masses at joints"


def test_ice_moves_in_histories():
    model = structures.build(icy_spring())
    start = solve_static(model, {"ice": 0.5})
    h = solve_history(model, start, loads={"ice": 0.5, "pull": 1.0}, duration=0.01, time_step=1e-3)
    moving = 3.0 + 2.0 * (1.5 + RING) / 3  # Newmark, consistent: nothing here can go slack
    assert h["acceleration"][0, 1, 0] == pytest.approx(40 / moving, rel=1e-6)


def test_what_is_not_there_is_not_blown_upon_nor_iced():
    model = stick(
        (0, 5, 0), {"toward": [1, 0, 0], "pressure": 700.0}, ice={"thickness": THICK, "density": ICE}
    )
    words = dict(model.words)
    words["members"] = [*words["members"], member("n", "A", "B", absent=True)]
    for case, key in (("wind", "wind"), ("ice", "ice")):
        words["load_cases"][case][key][0]["members"] = ["*"]
    held_by = solve_static(structures.build(words), {"wind": 1.0, "ice": 1.0})["reaction"][0].sum(axis=0)
    assert held_by == pytest.approx([-700 * (WIDTH + 2 * THICK) * 5, 0, RING * 5 * G], rel=1e-12)


# ---- temperature ----


def test_an_absolute_temperature_is_the_change_from_the_models():
    """Lengths hold at 10 degC: at -25 degC a clamped bar pulls as under a change of -35 K."""
    described = structures.words(
        {"A": (0, 0, 0), "B": (3, 4, 0)},
        [member("m", "A", "B")],
        supports=[held("A", "B")],
        temperature="10 degC",
        load_cases={"cold": {"temperature": "-25 degC"}, "same": {"temperature_change": -35.0}},
    )
    model = structures.build(described)
    heat = -35 * 1.2e-5
    for case in ("cold", "same"):
        N = solve_static(model, case).axial_force("m")[0]
        assert pytest.approx(-EA * heat / (1 + heat), rel=1e-12) == N
    half = -17.5 * 1.2e-5
    assert solve_static(model, {"cold": 0.5}).axial_force("m")[0] == pytest.approx(
        -EA * half / (1 + half), rel=1e-12
    )


# ---- ropes clamped along their way ----


def clothes_line(**given):
    """A rope over a joint a third along, clamped there; a joint of mass hangs in it."""
    return structures.words(
        {"A": (0, 0, 0), "M": (3, 0, -0.5), "B": (9, 0, 0)},
        [{"name": "line", "chain": ["A", "M", "B"], "kind": "tension-only", "section": "s", "rope": True}
         | given],
        supports=[held("A", "B"), {"joints": ["M"], "fixed": ["y"]}],
        load_cases={
            "P": {"forces": [{"joints": ["M"], "force": [60.0, 0, -400.0]}]},
            "tight": {"take_up": [{"members": ["line"], "length": 0.05}]},
        },
    )  # fmt: skip


DRAWN = np.array([np.hypot(3, 0.5), np.hypot(6, 0.5)])


def by_hand(L0, load):
    """Where the joint of two ties hangs: the least of their energy, by Newton on both coordinates."""
    x = np.array([3.0, -1.0])
    for _ in range(200):
        r = np.stack([x, x - [9.0, 0.0]])
        l = np.linalg.norm(r, axis=1)
        N = EA * np.maximum(l - L0, 0) / L0
        n = r / l[:, None]
        K = sum(
            EA / L0[i] * np.outer(n[i], n[i]) * (N[i] > 0) + N[i] / l[i] * (np.eye(2) - np.outer(n[i], n[i]))
            for i in (0, 1)
        )
        gap = load - (N[:, None] * n).sum(axis=0)
        step = np.linalg.solve(K + 1e-3 * np.eye(2), gap)
        x = x + step * min(1.0, 0.1 / np.linalg.norm(step))
    return x, N


@pytest.mark.parametrize(
    ("given", "whole"),
    [
        ({"unstressed_length": 9.2}, 9.2),
        ({"slack": 0.03}, DRAWN.sum() + 0.03),
        ({"pretension": 900.0}, DRAWN.sum() / (1 + 900 / EA)),
        ({}, DRAWN.sum()),
    ],
)
def test_a_clamped_rope_has_one_length_shared_by_drawn_lengths(given, whole):
    """Clamped it does not slip: each part keeps its share, and the two pull differently."""
    model = structures.build(clothes_line(**given))
    a = solve_static(model, "P")
    shares = whole * DRAWN / DRAWN.sum()
    assert pytest.approx(shares, rel=1e-12) == a.context.first_scene().structure.L0
    x, N = by_hand(shares, np.array([60.0, -400.0]))
    assert [3 + a.displacement("M")[0, 0], -0.5 + a.displacement("M")[0, 2]] == pytest.approx(x, abs=1e-8)
    assert [a.axial_force("line.1")[0], a.axial_force("line.2")[0]] == pytest.approx(N, rel=1e-6)


def test_take_up_of_a_clamped_rope_is_of_the_whole():
    a = solve_static(structures.build(clothes_line(unstressed_length=9.2)), {"P": 1.0, "tight": 1.0})
    x, N = by_hand((9.2 - 0.05) * DRAWN / DRAWN.sum(), np.array([60.0, -400.0]))
    assert -0.5 + a.displacement("M")[0, 2] == pytest.approx(x[1], abs=1e-8)
    assert [a.axial_force("line.1")[0], a.axial_force("line.2")[0]] == pytest.approx(N, rel=1e-6)
