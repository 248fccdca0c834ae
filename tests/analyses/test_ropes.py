"""Ropes as exact catenaries in whole structures: balance, shape, and what cannot take them."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from scipy.integrate import solve_ivp

import structures
from structures import held, member
from tautbar import InputError, Model, ModelError, find_modes, solve_history, solve_static
from tautbar.analyses.job import prepare
from tautbar.mechanics import catenary

G = 9.80665
LINE = 1.5


def rope(start, end, *, EA=5e5, cases=None, section=None, **given):
    """One rope in any direction of space, held at both ends."""
    return structures.words(
        {"A": start, "B": end},
        [member("rope", "A", "B", kind="hanging", section="rope", **given)],
        sections={"rope": {"axial_stiffness": EA, "mass_per_length": LINE, "expansion": 1.2e-5,
                           **(section or {})}},
        supports=[held("A", "B")],
        load_cases={"dead": {"self_weight": 1.0}} | (cases or {}),
    )  # fmt: skip


def integrated(start, pull, load, L0, EA, shares):
    """Points of a rope [m] from its start and its pull there, loaded per unstressed length by ``load`` [N/m].

    Equilibrium and strain along it, nothing else: T(s) = pull - load s, dx/ds = T/|T| (1 + |T|/EA).
    """

    def slope(s, _):
        T = pull - load * s
        size = np.sqrt(T @ T)
        return T / size * (1 + size / EA)

    # The direction turns quickly where the pull along the load changes sense: stop steps there.
    at = float(pull @ load / (load @ load))
    width = np.sqrt(max(pull @ pull - (pull @ load) ** 2 / (load @ load), 0.0)) / np.sqrt(load @ load)
    cuts = {0.0, L0} | {c for c in (at - 5 * width, at, at + 5 * width) if 0 < c < L0} | set(L0 * shares)
    found, last = {0.0: np.array(start, float)}, 0.0
    for s in sorted(cuts - {0.0}):
        done = solve_ivp(slope, (last, s), found[last], method="DOP853", rtol=1e-12, atol=1e-13 * L0)
        found[s], last = done.y[:, -1], s
    return np.array([found[s] for s in L0 * shares])


SHARES = np.linspace(0.0, 1.0, 33)
SPANS = {
    "level": ((0, 0, 0), (12, 16, 0), {"unstressed_length": 22.0}),
    "taut": ((1, 2, 3), (13, 18, 3), {"pretension": 9000.0}),
    "inclined": ((0, 0, 0), (9, -12, 11), {"slack": 1.5}),
    "downward": ((0, 0, 8), (9, 12, 0), {"sag": 0.7}),
    "steep": ((0, 0, 0), (0.2, -0.1, 12), {"unstressed_length": 12.3}),
    "doubled back": ((0, 0, 0), (0.3, 0.4, -2), {"unstressed_length": 20.0}),
}


@pytest.mark.parametrize("name", SPANS)
def test_the_curve_is_that_of_the_reactions(name):
    """From the reaction at its start the whole curve follows by integration, to 1e-9 of its length."""
    start, end, given = SPANS[name]
    a = solve_static(structures.build(rope(start, end, **given)), "dead")
    L0 = a.context.first_scene().structure.L0[0]
    load = np.array([0, 0, -LINE * G])
    curve = a["rope_curve/position"][0, 0]
    expected = integrated(start, -a.joint("reaction", "A")[0], load, L0, 5e5, SHARES)
    assert curve == pytest.approx(expected, abs=1e-9 * L0)
    assert curve[[0, -1]] == pytest.approx(np.array([start, end], float), abs=1e-10 * L0)
    total = a["reaction"][0].sum(axis=0)
    assert total == pytest.approx([0, 0, LINE * G * L0], abs=1e-9 * LINE * G * L0)
    ends = np.linalg.norm(a["reaction"][0], axis=1)
    assert a["end_tension"][0, 0] == pytest.approx(ends, rel=1e-12)
    assert a["axial_force"][0, 0] == a["end_tension"][0, 0].max()
    # Lowest where the pull is level, or at an end.
    level = np.clip(-a.joint("reaction", "A")[0, 2] / load[2] / L0, 0.0, 1.0)
    lowest = integrated(start, -a.joint("reaction", "A")[0], load, L0, 5e5, np.array([level]))[0]
    assert a["rope_curve/lowest_point"][0, 0] == pytest.approx(lowest, abs=1e-9 * L0)
    assert lowest[2] <= curve[:, 2].min() + 1e-12
    assert list(a["rope_curve/member"]) == [0]


def test_wind_swings_the_curve_out_of_its_vertical_plane():
    """Weight, ice, wind, cold and take-up together: the curve lies in the plane of weight and wind."""
    cases = {
        "gale": {"wind": [{"members": ["rope"], "toward": [3, 4, 0], "pressure": 900.0}]},
        "glaze": {"ice": [{"members": ["rope"], "thickness": 0.012, "density": 900.0}]},
        "cold": {"temperature_change": -35.0},
        "tight": {"take_up": [{"members": ["rope"], "length": 0.2}]},
    }
    start, end = np.array([0, 0, 0.0]), np.array([20.0, 0, 4.0])
    described = rope(start, end, cases=cases, section={"wind_width": 0.02}, unstressed_length=21.0)
    factors = {"dead": 1.0, "gale": 1.4, "glaze": 0.8, "cold": 1.0, "tight": 1.0}
    a = solve_static(structures.build(described), factors)
    chord = end - start
    l, n = np.linalg.norm(chord), chord / np.linalg.norm(chord)
    normal = np.array([0.6, 0.8, 0]) - np.array([0.6, 0.8, 0]) @ n * n
    ice = 0.8 * 900 * np.pi * 0.012 * 0.032 * G  # N/m of drawn length: a ring around the width
    wind = 1.4 * 900 * (0.02 + 2 * 0.012) * np.linalg.norm(normal) * normal
    # All of it per unstressed length of the model, 21 m; cut and cooled the rope carries the same.
    whole = np.array([0, 0, -LINE * G * 21.0 - ice * l]) + wind * l
    L0 = (21.0 - 0.2) * (1 - 35 * 1.2e-5)
    curve = a["rope_curve/position"][0, 0]
    R = a["reaction"][0]
    assert R.sum(axis=0) == pytest.approx(-whole, rel=1e-9)
    assert curve == pytest.approx(integrated(start, -R[0], whole / L0, L0, 5e5, SHARES), abs=1e-9 * L0)
    across = np.cross(chord, whole) / np.linalg.norm(np.cross(chord, whole))
    assert np.abs(curve @ across).max() < 1e-10 * L0
    assert np.abs(curve[16, 1]) > 0.5, "it swings out"


def lantern(P=0.0, pieces=None, **more):
    """A lantern on three unequal ropes, drawn where it does not hang."""
    given = {"kind": "hanging", "section": "rope"} | ({"pieces": pieces} if pieces else {})
    return structures.words(
        {"A": (0, 0, 6), "B": (10, 1, 7), "C": (4, 9, 5), "M": (4.5, 3.2, 3.0)},
        [
            member("a", "A", "M", unstressed_length=6.4, **given),
            member("b", "M", "B", unstressed_length=7.2, **given),
            member("c", "C", "M", unstressed_length=7.5, **given),
        ],
        sections={"rope": {"axial_stiffness": 3e5, "mass_per_length": LINE}},
        supports=[held("A", "B", "C")],
        masses=[{"joints": ["M"], "mass": 20.0}],
        load_cases={"dead": {"self_weight": 1.0},
                    "push": {"forces": [{"joints": ["M"], "force": [40, -25, 10]}]}},
        **more,
    )  # fmt: skip


def test_a_lantern_on_three_ropes_is_in_balance():
    """All three curves, integrated from the reactions of their hooks, end in one joint and balance there."""
    a = solve_static(structures.build(lantern()), {"dead": 1.0, "push": 1.0})
    at = a.context.first_scene().structure.position.T + a["displacement"][0]
    names = a.context.joint_names
    load, left = np.array([0, 0, -LINE * G]), np.array([40.0, -25, 10 - 20 * G])
    for hook, L0 in (("A", 6.4), ("B", 7.2), ("C", 7.5)):
        pull = -a.joint("reaction", hook)[0]
        end = integrated(at[names.index(hook)], pull, load, L0, 3e5, np.array([1.0]))[0]
        assert end == pytest.approx(at[names.index("M")], abs=1e-8)
        left -= pull - load * L0
    assert left == pytest.approx([0, 0, 0], abs=1e-6)
    # A rope may start or end at the joint: its points run from its own start.
    for i, (start, end) in enumerate((("A", "M"), ("M", "B"), ("C", "M"))):
        ends = a["rope_curve/position"][0, i][[0, -1]]
        assert ends == pytest.approx(at[[names.index(start), names.index(end)]], abs=1e-9)


def test_pieces_go_to_the_catenary_as_the_square_of_their_length():
    """Where the lantern hangs and what it pulls: halving the pieces leaves a quarter of the error."""
    loads = {"dead": 1.0, "push": 1.0}
    exact = solve_static(structures.build(lantern()), loads, tolerance=1e-12)
    errors = []
    for pieces in (16, 32, 64):
        a = solve_static(structures.build(lantern(pieces=pieces)), loads, tolerance=1e-11)
        gap = [a.displacement("M")[0] - exact.displacement("M")[0]]
        gap += [(a.joint("reaction", j)[0] - exact.joint("reaction", j)[0]) / 1e3 for j in "ABC"]
        errors.append(np.concatenate(gap))
    for coarse, fine in itertools.pairwise(errors):
        # Errors are h^2 (1 + c h^2): at 16 pieces the second term is some parts in a thousand.
        assert np.linalg.norm(coarse) / np.linalg.norm(fine) == pytest.approx(4.0, abs=0.02)
    assert np.linalg.norm(errors[-1]) > 1e-8, "above the rounding of both"


WAYS = {"unstressed_length": 20.9, "slack": 20.9 - np.hypot(20, 4), "sag": 2.5, "pretension": 2000.0}


@pytest.mark.parametrize("way", WAYS)
def test_each_way_of_giving_the_length(way):
    a = solve_static(structures.build(rope((0, 0, 0), (20, 0, 4), **{way: WAYS[way]})), "dead")
    L0 = a.context.first_scene().structure.L0[0]
    if way in ("unstressed_length", "slack"):
        assert pytest.approx(20.9, rel=1e-14) == L0
    if way == "sag":
        assert catenary.sag(L0, 5e5, LINE * G, 20, 4) == pytest.approx(2.5, rel=1e-9)
        x, _, z = a["rope_curve/position"][0, 0].T
        # Between 33 points straight lines run above the curve, by l^2 w/(8 H) of a piece: 3 mm here.
        assert 2.0 - np.interp(10.0, x, z) == pytest.approx(2.5, abs=4e-3)
    if way == "pretension":
        assert a["end_tension"][0, 0] == pytest.approx([2000.0, 2000.0 + 4 * LINE * G], rel=1e-3)
        assert a["end_tension"][0, 0, 0] == pytest.approx(2000.0, rel=1e-9)


def test_nothing_along_a_rope_makes_it_a_tie():
    """Weight not in the loading: straight and slack, or straight and taut, and no curve to show."""
    described = rope((0, 0, 0), (20, 0, 0), unstressed_length=19.9)
    described["load_cases"]["push"] = {"movements": [{"joints": ["B"], "move": [0.02, 0, 0]}]}
    a = solve_static(structures.build(described), "push")
    assert a.axial_force("rope")[0] == pytest.approx(5e5 * 0.12 / 19.9, rel=1e-11)
    assert "rope_curve/position" not in a.record.fields
    both = solve_static(structures.build(described), {"dead": 1e-9, "push": 1.0})
    assert both.axial_force("rope")[0] == pytest.approx(a.axial_force("rope")[0], rel=1e-9)


# ---- geometry = "small" ----


def test_small_geometry_is_the_linearisation_about_the_drawing():
    """Drawn in balance, a small push moves the lantern as the tangent says; the rest is of second order."""
    rest = solve_static(structures.build(lantern()), "dead")
    described = lantern()
    at = rest.context.first_scene().structure.position.T + rest["displacement"][0]
    described["joints"]["M"] = [float(c) for c in at[rest.context.joint_names.index("M")]]
    model = structures.build(described)
    small = {f: solve_static(model, {"dead": 1.0, "push": f}, geometry="small") for f in (0.0, 0.1, 0.2)}
    large = {f: solve_static(model, {"dead": 1.0, "push": f}) for f in (0.1, 0.2)}
    zero = small[0.0].displacement("M")[0]
    assert np.abs(zero).max() < 1e-6
    one, two = (small[f].displacement("M")[0] - zero for f in (0.1, 0.2))
    assert two == pytest.approx(2 * one, rel=1e-7, abs=1e-12)
    gaps = [np.linalg.norm(small[f].displacement("M")[0] - large[f].displacement("M")[0]) for f in (0.1, 0.2)]
    assert gaps[1] / gaps[0] == pytest.approx(4.0, rel=0.1)
    assert gaps[0] < 0.1 * np.linalg.norm(one)
    held_up = small[0.2]["reaction"][0].sum(axis=0)
    assert held_up == pytest.approx([-8, 5, -2 + (20 + LINE * (6.4 + 7.2 + 7.5)) * G], abs=1e-6)


# ---- what cannot take a curve ----


def test_modes_and_histories_refuse_a_curve_and_say_what_to_do():
    model = structures.build(lantern())
    state = solve_static(model, "dead")
    with pytest.raises(InputError, match=r"a, b, c hangs as one curve.* pieces = 16") as caught:
        find_modes(model, state)
    assert caught.value.exit_code == 2
    with pytest.raises(InputError, match="hangs as one curve"):
        solve_history(model, state, duration=0.1, time_step=0.01)
    for asked in (
        {"kind": "modes", "from": "s"},
        {"kind": "history", "from": "s", "duration": 1.0, "time_step": 0.01},
    ):
        with pytest.raises(ModelError, match="pieces = 16"):
            Model(
                **lantern(analyses=[{"name": "s", "kind": "static", "loads": "dead"}, {"name": "x"} | asked])
            )


def test_frequencies_with_pieces_converge_and_the_start_is_found_again():
    """Consistent masses on a polygon: error of second order, 4.00 between 16, 32 and 64 pieces."""
    model = structures.build(lantern())
    state = solve_static(model, "dead")
    by = {n: find_modes(model, state, pieces=n, count=6) for n in (16, 32, 64)}
    assert by[16].record.warnings[0] == ("the start state was found again with a, b, c in 16 straight pieces")
    assert by[16]["shape"].shape == (6, 4 + 3 * 15, 3)
    assert list(by[16]["joint_with_pieces"][:5]) == ["A", "B", "C", "M", "a@1"]
    assert list(by[16]["member_with_pieces"][:2]) == ["a.1", "a.2"]
    # The same as with the pieces in the model.
    given = structures.build(lantern(pieces=16))
    same = find_modes(given, solve_static(given, "dead"), count=6)
    assert by[16]["frequency"] == pytest.approx(same["frequency"], rel=1e-7)
    f = {n: a["frequency"] for n, a in by.items()}
    assert (f[16] - f[32]) / (f[32] - f[64]) == pytest.approx(np.full(6, 4.0), abs=0.1)


def test_a_history_with_pieces_rests_where_the_catenary_hung():
    model = structures.build(lantern())
    state = solve_static(model, {"dead": 1.0, "push": 1.0})
    h = solve_history(model, state, duration=0.2, time_step=0.01, pieces=32)
    assert any("found again with a, b, c in 32 straight pieces" in w for w in h.record.warnings)
    M = list(h["joint_with_pieces"]).index("M")
    u = h["displacement"][:, M]
    assert np.abs(u - u[0]).max() < 1e-7, "at rest"
    assert u[0] == pytest.approx(state.displacement("M")[0], abs=5e-3)
    assert "put on at once" not in " ".join(h.record.warnings)


def test_pieces_by_the_words_of_the_file():
    described = lantern(analyses=[
        {"name": "s", "kind": "static", "loads": "dead"},
        {"name": "m", "kind": "modes", "from": "s", "pieces": 4, "count": 3},
    ])  # fmt: skip
    job = prepare(Model(**described))
    job.run("s")
    record = job.run("m")
    assert record.status == "complete"
    assert record.settings["pieces"] == 4
    assert record["frequency"].size == 3
    assert len(record["member_with_pieces"]) == 12


def test_a_static_analysis_with_pieces_has_pieces():
    a = solve_static(structures.build(lantern()), "dead", pieces=8)
    assert a["axial_force"].shape == (1, 24)
