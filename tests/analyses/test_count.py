"""Statical count: closed forms, names, stiffening, invariance, ropes as lines, agreement of both roads."""

from __future__ import annotations

import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from structures import build, held, member, words
from tautbar.algebra import rank
from tautbar.analyses.context import Context
from tautbar.analyses.count import count_fields, statical_count
from tautbar.analyses.count_words import count_lines, count_warnings
from tautbar.analyses.job import prepare
from tautbar.summary import summarise

CORNERS = {"a": (0, 0), "b": (4, 0), "c": (4, 3), "d": (0, 3)}


def count_of(model):
    return statical_count(Context(model.parts))


def told(model) -> list[str]:
    return count_lines(count_of(model), model.parts)


def numbers(found) -> tuple[int, int, int]:
    return found.states_of_self_stress, found.mechanisms, found.rigid_motions


def plane(joints, members, supports=(), **more):
    return build(words(joints, members, plane="xz", supports=list(supports), **more))


def bars(names: str, kind: str = "bar", **more):
    return [member(pair, pair[0], pair[1], kind, **more) for pair in names.split()]


PIN, ROLLER = {"joints": ["a"], "fixed": ["x", "z"]}, {"joints": ["b"], "fixed": ["z"]}


@pytest.mark.parametrize(
    ("members", "wanted"),
    [
        ("ab bc cd da", (0, 1, 0)),
        ("ab bc cd da ac", (0, 0, 0)),
        ("ab bc cd da ac bd", (1, 0, 0)),
    ],
)
def test_a_square_with_and_without_diagonals(members, wanted) -> None:
    assert numbers(count_of(plane(CORNERS, bars(members), [PIN, ROLLER]))) == wanted


@pytest.mark.parametrize(
    ("supports", "wanted"),
    [
        ([PIN, ROLLER], (0, 0, 0)),
        ([PIN], (0, 0, 1)),
        ([], (0, 0, 3)),
        ([PIN, {"joints": ["b"], "along": [1, 2]}], (0, 0, 0)),
        ([PIN, {"joints": ["b"], "along": [1, 0]}], (1, 0, 1)),  # towards the pin: holds nothing more
        ([PIN, {"joints": ["c"], "springs": {"x": 5e3}}], (0, 0, 0)),
        ([PIN, {"joints": ["c"], "springs": {"x": 5e3, "z": 5e3}}], (1, 0, 0)),
        ([PIN, {"joints": ["b"], "fixed": ["x", "z"]}], (1, 0, 0)),
    ],
)
def test_what_holds_a_rigid_panel(supports, wanted) -> None:
    model = plane(CORNERS, bars("ab bc cd da ac"), supports, unsupported="allowed")
    assert numbers(count_of(model)) == wanted


def test_free_bodies_have_their_rigid_motions_each() -> None:
    """A straight bar cannot be turned about itself: five in space; a triangle has six."""
    joints = {"a": (0, 0, 0), "b": (1, 2, 3), "c": (5, 0, 0), "d": (6, 1, 0), "e": (5, 2, 1)}
    model = build(words(joints, bars("ab cd de ec"), unsupported="allowed"))
    found = count_of(model)
    assert numbers(found) == (0, 0, 11)
    assert "motion 1: 2 joints in x" in count_lines(found, model.parts)
    assert count_warnings(found, model.parts) == ()
    # No rigid motion stretches a member.
    s = Context(model.parts).first_scene().structure
    du = found.rigid_motion[:, s.end] - found.rigid_motion[:, s.start]
    assert np.abs(np.einsum("klc,cl->kl", du, s.r0)).max() < 1e-12


def two_links(**more):
    """A straight line of two links between walls, joint B half way."""
    joints = {"A": (0, 0, 0), "B": (1, 0, 0), "C": (2, 0, 0)}
    members = [member("left", "A", "B", "tension-only", **more), member("right", "B", "C", "tension-only")]
    return words(joints, members, supports=[held("A", "C")])


def test_a_line_of_two_links_in_space_and_in_a_plane() -> None:
    assert numbers(count_of(build(two_links()))) == (1, 2, 0)
    flat = plane({"A": (0, 0), "B": (1, 0), "C": (2, 0)}, bars("AB BC"), [
        {"joints": ["A", "C"], "fixed": ["x", "z"]}
    ])  # fmt: skip
    found = count_of(flat)
    assert numbers(found) == (1, 1, 0)
    np.testing.assert_allclose(found.self_stress, [[1.0, 1.0]], rtol=1e-12)
    np.testing.assert_allclose(found.mechanism, [[[0, 0, 0], [0, 0, 1], [0, 0, 0]]], atol=1e-12)
    assert "mechanism 1: B in z; pretension could stiffen it, none is given" in count_lines(found, flat.parts)


def test_pretension_of_one_link_is_shared_by_both_and_stiffens() -> None:
    model = build(two_links(pretension=1000.0))
    found = count_of(model)
    assert found.stiffening.answers == ("yes", "yes")
    # The left link was stretched by N L/EA; the joint moves until both share it: half each, to the
    # first order in the strain of 5e-4.
    np.testing.assert_allclose(found.stiffening.force, [500.0, 500.0], rtol=1e-3)
    (first, second) = count_warnings(found, model.parts)
    assert first == "mechanism: no member resists B in y; the pretension given stiffens it"
    assert second.startswith("mechanism: no member resists B in z; ")


def test_pretension_that_leaves_ties_slack_decides_nothing() -> None:
    model = build(two_links(slack=0.01))
    found = count_of(model)
    assert found.stiffening.by == "self-stress"  # nothing pulls: a slack tie is no pretension
    struts = words({"A": (0, 0, 0), "B": (1, 0, 0), "C": (2, 0, 0)}, [
        member("left", "A", "B", "bar", pretension=-500.0), member("right", "B", "C", "tension-only"),
    ], supports=[held("A", "C")])  # fmt: skip
    found = count_of(build(struts))
    assert found.stiffening.answers == ("not decided", "not decided")
    assert any("would leave right slack" in line for line in told(build(struts)))


def test_compression_in_a_straight_line_does_not_stiffen() -> None:
    joints = {"A": (0, 0, 0), "B": (1, 0, 0), "C": (2, 0, 0)}
    for kind, answer in (("compression-only", "no"), ("bar", "yes")):
        found = count_of(build(words(joints, bars("AB BC", kind), supports=[held("A", "C")])))
        assert found.stiffening.answers == (answer, answer)
    pushed = count_of(build(words(joints, bars("AB BC", pretension=-100.0), supports=[held("A", "C")])))
    assert pushed.stiffening.by == "pretension"
    assert pushed.stiffening.answers == ("no", "no")


def test_a_mechanism_without_self_stress_is_warned_of() -> None:
    model = plane(CORNERS, bars("ab bc cd da"), [PIN, ROLLER])
    (said,) = count_warnings(count_of(model), model.parts)
    assert said == (
        "mechanism: no member resists c in x, d in x; no self-stress is possible that could stiffen it; "
        "else only large displacements"
    )


def test_one_of_two_mechanisms_is_stiffened() -> None:
    """A prestressable line and a loose square side by side: each has its own answer."""
    joints = {"A": (0, 9), "B": (1, 9), "C": (2, 9), **CORNERS}
    walls = {"joints": ["A", "C"], "fixed": ["x", "z"]}
    model = plane(joints, bars("AB BC ab bc cd da"), [walls, PIN, ROLLER])
    found = count_of(model)
    assert numbers(found) == (1, 2, 0)
    assert dict(zip(map(moved_most(model), found.mechanism), found.stiffening.answers, strict=True)) == {
        "B": "yes", "c": "no",
    }  # fmt: skip


def moved_most(model):
    return lambda U: model.parts.joints.names[int(np.linalg.norm(U, axis=1).round(6).argmax())]


ROPE = member("rope", "A", "C", "hanging", sag=0.4)


@pytest.mark.parametrize("pieces", [None, 8])
def test_a_hanging_member_is_one_line(pieces) -> None:
    more = {} if pieces is None else {"pieces": pieces}
    joints = {"A": (0, 0), "C": (6, 0), "D": (6, 4), "E": (3, 9)}
    members = [{**ROPE, **more}, member("CD", "C", "D"), member("DE", "D", "E"), member("EC", "E", "C")]
    supports = [{"joints": ["A"], "fixed": ["x", "z"]}, {"joints": ["D", "E"], "fixed": ["x"]}]
    model = plane(joints, members, supports)
    found = count_of(model)
    assert (found.lines, found.directions) == (4, 4)
    # The rope has no part: D and E slide, C hangs on three lines at the corner of a rigid triangle.
    assert numbers(found) == numbers(count_of(plane(joints, bars("AC CD DE EC"), supports)))
    said = any(
        "one straight line for each hanging member in pieces (rope); 7 joints" in t for t in told(model)
    )
    assert said == (pieces is not None)


def test_joints_between_pieces_move_in_line_and_carry_what_the_line_carries() -> None:
    joints = {"A": (0, 0), "B": (3, 0), "C": (6, 0)}
    members = [member("r", "A", "B", "hanging", slack=0.01, pieces=4), member("BC", "B", "C", "tension-only")]
    model = plane(joints, members, [{"joints": ["A", "C"], "fixed": ["x", "z"]}])
    found = count_of(model)
    assert numbers(found) == (1, 1, 0)
    np.testing.assert_allclose(found.self_stress, np.ones((1, 5)), rtol=1e-12)
    at = [model.parts.joints.names.index(f"r@{k}") for k in (1, 2, 3)]
    np.testing.assert_allclose(found.mechanism[0, at, 2], [0.25, 0.5, 0.75], atol=1e-12)
    assert any("self-stress 1: " in line and "r +1.00" in line for line in count_lines(found, model.parts))


def test_a_rope_hanging_between_walls_counts_as_pretension() -> None:
    """Its own weight tightens it, and it tightens the tie it hangs in line with."""
    joints = {"A": (0, 0), "B": (3, 0), "C": (6, 0)}
    members = [member("r", "A", "B", "hanging", sag=0.01), member("BC", "B", "C", "tension-only")]
    found = count_of(plane(joints, members, [{"joints": ["A", "C"], "fixed": ["x", "z"]}]))
    assert found.stiffening.by == "pretension"
    assert found.stiffening.answers == ("yes",)


def test_absent_members_and_supports_do_not_count() -> None:
    model = plane(CORNERS, [*bars("ab bc cd da"), *bars("ac", absent=True)], [PIN, ROLLER])
    found = count_of(model)
    assert numbers(found) == (0, 1, 0)
    assert found.lines == 4


def test_near_mechanisms_are_told() -> None:
    joints = {"A": (0, 0), "B": (1, 1e-7), "C": (2, 0)}
    model = plane(joints, bars("AB BC"), [{"joints": ["A", "C"], "fixed": ["x", "z"]}])
    assert numbers(count_of(model)) == (0, 0, 0)
    assert "1 direction nearly free: members stretch 1e-07 m or more per metre of move" in told(model)


def random_words(seed: int, joints: int, members: int):
    rng = np.random.default_rng(seed)
    names = [f"j{i}" for i in range(joints)]
    at = dict(zip(names, rng.integers(0, 4, (200, 3)).tolist(), strict=False))
    unique = {tuple(p): n for n, p in at.items()}
    at = {n: p for p, n in unique.items()}
    names = list(at)
    ends = [(names[i], names[i + 1]) for i in range(len(names) - 1)]
    ends += [tuple(rng.choice(names, 2, replace=False).tolist()) for _ in range(members)]
    ends = sorted({tuple(sorted(pair)) for pair in ends})
    return words(at, [member(f"{a}-{b}", a, b) for a, b in ends], supports=[held(*names[:2])])


@settings(max_examples=25, deadline=None)
@given(st.integers(0, 10_000), st.integers(8, 20), st.integers(0, 40))
def test_both_roads_and_the_closed_identities_agree(seed, joints, members) -> None:
    """On lattice points many members are in line: rank is often lost, by both roads alike."""
    model = build(random_words(seed, joints, members))
    found = count_of(model)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(rank, "_FEW", 0)
        other = count_of(model)
    assert numbers(found) == numbers(other)
    total = found.mechanisms + found.rigid_motions
    assert found.states_of_self_stress - total == found.lines + found.springs - found.directions
    s = Context(model.parts).first_scene().structure
    for one in (found, other):
        du = one.mechanism[:, s.end] - one.mechanism[:, s.start]
        assert np.abs(np.einsum("klc,cl->kl", du, s.r0 / s.length)).max(initial=0.0) < 1e-10


@settings(max_examples=15, deadline=None)
@given(st.integers(0, 10_000), st.integers(0, 30))
def test_turned_moved_and_renumbered_the_count_is_the_same(seed, members) -> None:
    description = random_words(seed, 14, members)
    rng = np.random.default_rng(seed)
    Q = np.linalg.qr(rng.standard_normal((3, 3)))[0]
    order = rng.permutation(len(description["joints"]))
    names = list(description["joints"])
    turned = {names[i]: (Q @ description["joints"][names[i]] + [5.0, -3.0, 2.0]).tolist() for i in order}
    other = {**description, "joints": turned, "members": description["members"][::-1]}
    one, two = count_of(build(description)), count_of(build(other))
    assert numbers(one) == numbers(two)
    assert one.stiffening.overall == two.stiffening.overall


def test_fields_are_there_only_where_there_is_something() -> None:
    model = build(two_links(pretension=1000.0))
    fields = prepare(model).model_fields
    assert int(fields["statical_count/states_of_self_stress"].values) == 1
    assert int(fields["statical_count/mechanisms"].values) == 2
    assert int(fields["statical_count/rigid_motions"].values) == 0
    assert fields["statical_count/mechanism"].axes == ("mechanism_number", "joint", "direction")
    assert fields["statical_count/self_stress"].axes == ("self_stress_number", "member")
    assert fields["statical_count/stiffened"].values.tolist() == ["yes", "yes"]
    assert "statical_count/rigid_motion" not in fields
    sound = count_fields(count_of(plane(CORNERS, bars("ab bc cd da ac"), [PIN, ROLLER])))
    assert {path.rpartition("/")[2] for path in sound} == {
        "states_of_self_stress", "mechanisms", "rigid_motions", "lines", "springs", "directions",
    }  # fmt: skip


def test_check_prints_the_count_and_warns() -> None:
    text = summarise(build(two_links()))
    assert "statics     1 state of self-stress, 2 mechanisms, no motions as rigid bodies" in text
    assert "self-stress 1: left +1.00, right +1.00" in text
    assert "warnings" in text.partition("mechanism: no member resists B in y")[0]


def tower(bays: int):
    """A square lattice tower with both diagonals in every face."""
    joints = {f"{i}{c}": (x, y, i) for i in range(bays + 1) for c, x, y in
              (("a", 0, 0), ("b", 1, 0), ("c", 1, 1), ("d", 0, 1))}  # fmt: skip
    members = []
    for i in range(bays):
        for a, b in ("ab", "bc", "cd", "da"):
            ends = [(f"{i}{a}", f"{i + 1}{a}"), (f"{i}{a}", f"{i + 1}{b}"), (f"{i}{b}", f"{i + 1}{a}")]
            members += [member(f"{p}-{q}", p, q) for p, q in [*ends, (f"{i + 1}{a}", f"{i + 1}{b}")]]
    return words(joints, members, supports=[held("0a", "0b", "0c", "0d")])


@pytest.mark.parametrize("bays", [40, 1100])
def test_long_towers_are_no_mechanisms(bays) -> None:
    """b = 16 a bay, n = 12 a bay: 4 states a bay. The softest sway of 1100 bays stretches members by
    1e-6 of its size, whose square the normal matrix hardly sees; it is no mechanism."""
    found = count_of(build(tower(bays)))
    assert numbers(found) == (4 * bays, 0, 0)


@pytest.mark.slow
def test_a_hundred_thousand_members(capsys) -> None:
    model = build(tower(6250))
    context = Context(model.parts)
    context.first_scene()
    start = time.perf_counter()
    found = statical_count(context)
    with capsys.disabled():
        print(f"\nstatical count of {found.lines} members: {time.perf_counter() - start:.1f} s")
    assert numbers(found) == (25_000, 0, 0)
