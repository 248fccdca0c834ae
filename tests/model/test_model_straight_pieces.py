"""Catenaries replaced by straight pieces: every index of the model follows."""

from __future__ import annotations

import math
from collections import Counter

import pytest
from footbridge_text import FOOTBRIDGE

from tautbar.model.parts import Hanging, Parts
from tautbar.model.pieces import places_with_pieces, with_pieces
from tautbar.model.reading import model_from_text

RAIL, HOIST, STERN = 6, 7, range(8, 12)


@pytest.fixture(scope="module")
def parts() -> Parts:
    """The footbridge with more on its handrail, and ropes in pieces before and after it."""
    text = FOOTBRIDGE.replace(
        "[load_cases.frost]",
        'line_loads = [ { members = ["handrail", "post.2"], per_length = [0, "-0.1 kN/m"] } ]\n'
        "[load_cases.frost]",
    )
    return model_from_text(
        text.replace('members = ["carrier"]\nper_length', 'members = ["*"]\nper_length')
    ).parts


@pytest.fixture(scope="module")
def pieced(parts: Parts) -> Parts:
    return with_pieces(parts, 4, {RAIL: 21.25}, {RAIL})


def test_members_move_up_and_pieces_follow(parts: Parts, pieced: Parts) -> None:
    m = pieced.members
    others = [name for name in parts.members.names if name != "handrail"]
    assert m.names == (*others, "handrail.1", "handrail.2", "handrail.3", "handrail.4")
    assert list(m.index.values()) == list(range(len(m)))
    for name in others:
        old, new = parts.members.index[name], m.index[name]
        for column in ("start", "end", "kind", "section"):
            assert getattr(m, column)[new] == getattr(parts.members, column)[old], (name, column)
        for column in ("pretension", "unstressed_length", "slack", "sag"):
            assert getattr(m, column)[new] == pytest.approx(getattr(parts.members, column)[old], nan_ok=True)
    assert places_with_pieces(parts, 4, {RAIL})[5:9] == ((5,), (11, 12, 13, 14), (6,), (7,))


def test_pieces_are_ties_in_a_line_with_the_length_of_now(parts: Parts, pieced: Parts) -> None:
    m, j = pieced.members, pieced.joints
    assert m.hanging[-1] == Hanging(
        "handrail", 2, 4, range(11, 15), range(10, 13), "unstressed_length", 21.25
    )
    assert [j.names[m.start[i]] for i in range(11, 15)] == ["top-1", "handrail@1", "handrail@2", "handrail@3"]
    assert [j.names[m.end[i]] for i in range(11, 15)] == ["handrail@1", "handrail@2", "handrail@3", "top-2"]
    assert set(list(m.kind)[11:]) == {1}
    assert set(list(m.section)[11:]) == {0}
    assert all(
        math.isnan(c[i])
        for c in (m.pretension, m.unstressed_length, m.slack, m.sag)
        for i in m.hanging[-1].members
    )
    assert m.groups["handrail"] == (11, 12, 13, 14)
    assert j.names[: len(parts.joints)] == parts.joints.names
    assert [(j.x[i], j.z[i]) for i in range(10, 13)] == [(5.25, 4.0), (10.5, 4.0), (15.75, 4.0)]
    assert j.index["handrail@3"] == 12


def test_a_rope_that_was_in_pieces_stays_whole(parts: Parts, pieced: Parts) -> None:
    stern = pieced.members.hanging[0]
    assert (stern.members, stern.joints) == (range(7, 11), parts.members.hanging[0].joints)
    assert [pieced.members.names[i] for i in stern.members] == [f"stern-line.{k}" for k in range(1, 5)]


def test_what_acts_follows_its_members(parts: Parts, pieced: Parts) -> None:
    rail = (11, 12, 13, 14)
    case = pieced.load_cases
    assert [w.members for w in case["gale"].wind] == [(0, 1, *rail), (4, 5)]
    assert case["gale"].wind[0].pressures == (500.0, 800.0)
    assert case["gale"].line_loads == (((*rail, 1), (0.0, 0.0, -100.0)),)
    assert case["frost"].ice[0].members == (4, 5, *rail)
    ((everyone, change),) = case["frost"].temperature_change
    assert Counter(everyone) == Counter(range(15))
    assert change == pytest.approx(-35)
    assert case["tightening"].take_up[:2] == parts.load_cases["tightening"].take_up[:2]
    assert case["tightening"].take_up[2:] == ((rail, 0.03 / 4),)
    assert Counter(pieced.masses[1].members) == Counter(range(15))
    assert pieced.masses[0] == parts.masses[0]
    assert case["crowd"] == parts.load_cases["crowd"]


def test_ropes_that_are_not_there_stay_as_they_are(pieced: Parts) -> None:
    assert pieced.members.absent == (6,)
    assert pieced.members.names[6] == "hoist-line"
    assert pieced.members.kind[6] == 3


def test_several_ropes_each_have_their_own(parts: Parts) -> None:
    both = with_pieces(parts, 3, {HOIST: 9.7, RAIL: 21.25}, [HOIST, RAIL])
    m, j = both.members, both.joints
    assert m.names[10:] == (*(f"handrail.{k}" for k in (1, 2, 3)), *(f"hoist-line.{k}" for k in (1, 2, 3)))
    assert [(h.name, h.members, h.joints, h.value) for h in m.hanging[1:]] == [
        ("handrail", range(10, 13), range(10, 12), 21.25),
        ("hoist-line", range(13, 16), range(12, 14), 9.7),
    ]
    assert j.names[10:] == ("handrail@1", "handrail@2", "hoist-line@1", "hoist-line@2")
    assert m.absent == (13, 14, 15)
    assert both.analyses == ()


def test_a_take_up_given_to_several_at_once_keeps_each_its_own(parts: Parts) -> None:
    text = FOOTBRIDGE.replace('["carrier", "handrail"], length', '["back", "handrail"], length')
    given = model_from_text(text).parts
    assert given.load_cases["tightening"].take_up == (((2, 3, 6), 0.03),)
    took = with_pieces(given, 4, {RAIL: 21.25}, {RAIL}).load_cases["tightening"].take_up
    assert took == (((2, 3), 0.03), ((11, 12, 13, 14), 0.0075))


def test_the_model_itself_does_not_change(parts: Parts) -> None:
    before = model_from_text(FOOTBRIDGE).parts.joints.names
    with_pieces(parts, 5, {RAIL: 21.25}, {RAIL})
    assert parts.joints.names == before
    assert len(parts.joints.x) == len(before)


def test_no_ropes_to_part_gives_the_same_members(parts: Parts) -> None:
    same = with_pieces(parts, 4, {}, ())
    assert same.members == parts.members
    assert same.joints == parts.joints
    assert same.load_cases == parts.load_cases
