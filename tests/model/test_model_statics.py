"""What the words of the full static side become, worked out by hand beside each, for the footbridge."""

from __future__ import annotations

import math

import pytest
from footbridge_text import FOOTBRIDGE

from tautbar.errors import ModelError
from tautbar.model.parts import (
    KINDS,
    Buckling,
    Change,
    CutList,
    EquilibriumPath,
    FormFinding,
    Loading,
    Modes,
    Parts,
    PositionTarget,
    StartFrom,
    Static,
    StopAt,
    TensionTarget,
    Tune,
)
from tautbar.model.presence import presences
from tautbar.model.reading import model_from_text


@pytest.fixture(scope="module")
def parts() -> Parts:
    return model_from_text(FOOTBRIDGE).parts


def analysis(text: str, name: str):
    return next(a for a in model_from_text(text).parts.analyses if a.name == name)


def test_a_hanging_member_without_pieces_is_one_curve(parts: Parts) -> None:
    m = parts.members
    rail, hoist = m.index["handrail"], m.index["hoist-line"]
    assert [KINDS[m.kind[i]] for i in (rail, hoist)] == ["hanging", "hanging"]
    assert (m.sag[rail], m.slack[hoist]) == (1.2, 0.2)
    assert all(math.isnan(c[rail]) for c in (m.pretension, m.unstressed_length, m.slack))
    assert m.absent == (hoist,)
    assert [h.name for h in m.hanging] == ["stern-line"]


@pytest.mark.parametrize("key", ["pretension", "unstressed_length", "slack", "sag"])
def test_a_curve_may_say_in_four_ways_how_long_it_is(key: str) -> None:
    value = {"pretension": 9, "unstressed_length": 21.3, "slack": 0.3, "sag": 1.2}[key]
    m = model_from_text(FOOTBRIDGE.replace('sag = "1.2 m"', f"{key} = {value}")).parts.members
    assert getattr(m, key)[m.index["handrail"]] == value * (1000 if key == "pretension" else 1)


def test_a_rope_clamped_at_its_joints_shares_its_length(parts: Parts) -> None:
    """Spans of sqrt(9^2 + 3^2) and sqrt(12^2 + 3^2) m; 24 mm of slack and 30 mm of take-up go by them."""
    first, second = math.sqrt(90), math.sqrt(153)
    m = parts.members
    slack = [m.slack[m.index[f"carrier.{k}"]] for k in (1, 2)]
    share = first / (first + second)
    assert slack == pytest.approx([0.024 * share, 0.024 * (1 - share)], rel=1e-14)
    take_up = parts.load_cases["tightening"].take_up
    assert [members for members, _ in take_up] == [(4,), (5,), (6,)]
    assert [v for _, v in take_up] == pytest.approx([0.03 * share, 0.03 * (1 - share), 0.03], rel=1e-14)


def test_a_rope_has_one_pretension_or_the_length_of_all() -> None:
    one = model_from_text(FOOTBRIDGE.replace('slack = "24 mm"', "pretension = 12")).parts.members
    assert list(one.pretension)[4:6] == [12e3, 12e3]
    whole = model_from_text(FOOTBRIDGE.replace('slack = "24 mm"', "unstressed_length = 21.8")).parts.members
    lengths = list(whole.unstressed_length)[4:6]
    assert sum(lengths) == pytest.approx(21.8, rel=1e-15)
    assert lengths[0] / lengths[1] == pytest.approx(math.sqrt(90 / 153), rel=1e-14)
    loose = FOOTBRIDGE.replace("rope = true\n", "")  # then each span has the slack, and each the take-up
    plain = model_from_text(loose).parts
    assert list(plain.members.slack)[4:6] == [0.024, 0.024]
    assert plain.load_cases["tightening"].take_up == (((4, 5, 6), 0.03),)


def test_a_clamped_rope_in_pieces_shares_twice() -> None:
    text = FOOTBRIDGE.replace(
        'kind = "tension-only"\nsection = "rope"\nrope = true',
        'kind = "hanging"\nsection = "rope"\nrope = true',
    )
    parts = model_from_text(text.replace('slack = "24 mm"', 'slack = "24 mm"\npieces = 3')).parts
    spans = [h for h in parts.members.hanging if h.name.startswith("carrier")]
    share = math.sqrt(90) / (math.sqrt(90) + math.sqrt(153))
    assert [h.value for h in spans] == pytest.approx([0.024 * share, 0.024 * (1 - share)], rel=1e-14)
    took = parts.load_cases["tightening"].take_up
    assert [len(members) for members, _ in took] == [3, 3, 1]
    assert took[0][1] == pytest.approx(0.03 * share / 3, rel=1e-14)


def test_supports_that_only_push_and_things_that_come_later(parts: Parts) -> None:
    anchors, feet, prop = parts.supports
    assert (feet.fixed, feet.only_pushes, feet.absent) == ((0,), 2, False)
    assert (anchors.only_pushes, prop.absent) == (None, True)
    assert [(m.name, m.absent) for m in parts.masses] == [("deck", False), ("mass 2", True)]


def test_wind_and_ice(parts: Parts) -> None:
    along, down = parts.load_cases["gale"].wind
    assert (along.members, along.toward) == ((0, 1, 6), (1.0, 0.0, 0.0))
    assert (along.heights, along.pressures) == ((0.0, 4.0), (500.0, 800.0))
    assert (down.toward, down.heights, down.pressures) == ((0.0, 0.0, -1.0), (0.0,), (300.0,))
    (ice,) = parts.load_cases["frost"].ice
    assert (ice.members, ice.thickness, ice.density) == ((4, 5, 6), 0.02, 900.0)
    ((everyone, change),) = parts.load_cases["frost"].temperature_change
    assert (len(everyone), change) == (12, pytest.approx(-35))


def test_members_supports_and_masses_come_and_go(parts: Parts) -> None:
    bare, built = (a.change for a in parts.analyses[1:3])
    assert bare == Change(without_members=(3,), with_supports=("prop",))
    assert built == Change((), ("prop",), ("deck",), (7, 3), (), ("mass 2",))
    there = presences(parts)
    assert there["bare"].members == {3, 7}
    assert there["built"].members == set()
    assert (there["built"].supports, there["built"].masses) == ({"prop"}, {"deck"})
    assert there["one rope lost"] == there["built"] == there["collapse"] == there["after"]
    assert there["tensions"].supports == {"prop"}  # starts from the drawing again
    assert there["tensions"].masses == {"mass 2"}


def test_starts_of_every_kind(parts: Parts) -> None:
    start = {a.name: a.start for a in parts.analyses}
    assert start["built"] == StartFrom("bare")
    assert start["one rope lost"] == StartFrom("built", each=True)
    assert start["collapse"] == StartFrom("built", "service")
    assert start["after"] == StartFrom("collapse", at="limit point 1")
    assert start["swing"] == StartFrom("tensions", "dead")
    text = FOOTBRIDGE.replace('{ analysis = "collapse", at = "limit point 1" }', '"collapse"')
    assert analysis(text, "after").start == StartFrom("collapse", at="end")
    text = FOOTBRIDGE.replace('{ analysis = "tensions", loads = "dead" }\npieces = 8', '"shape"')
    assert analysis(text, "swing").start == StartFrom("shape")  # without its handrail nothing hangs


def test_losing_members_in_turn_names_a_state_each(parts: Parts) -> None:
    lost = parts.analyses[3]
    assert isinstance(lost, Static)
    assert (lost.lose_in_turn, lost.pieces, lost.loads) == ((2, 3, 6), 8, None)
    more = """
[[analyses]]
name = "on"
kind = "static"
from = { analysis = "one rope lost", loads = "weather: gale 1, without back.2" }
pieces = 8
"""
    on = analysis(FOOTBRIDGE + more, "on")
    assert on.start == StartFrom("one rope lost", "weather: gale 1, without back.2")


def test_a_state_named_twice_cannot_be_meant_by_its_name() -> None:
    more = """
[[analyses]]
name = "again"
kind = "static"
from = { analysis = "built", loads = "each" }
loads = "dead"
[[analyses]]
name = "on"
kind = "static"
from = { analysis = "again", loads = "dead" }
"""
    with pytest.raises(ModelError, match="'again' has 3 states under 'dead'"):
        model_from_text(FOOTBRIDGE + more)
    each = FOOTBRIDGE + more.replace('"again", loads = "dead"', '"again", loads = "each"')
    assert analysis(each, "on").start == StartFrom("again", each=True)


def test_paths_and_buckling(parts: Parts) -> None:
    path, buckling = parts.analyses[6:8]
    assert isinstance(path, EquilibriumPath)
    assert (path.loads, path.constant) == (parts.loadings["crowd"][0], parts.loadings["dead"][0])
    assert (path.stop_at, path.step) == (StopAt(joint=3, axis=2, displacement=-0.4), 0.1)
    assert isinstance(buckling, Buckling)
    assert (buckling.loads, buckling.constant) == (Loading("2 crowd", {"crowd": 2.0}), None)
    assert buckling.count == 3


@pytest.mark.parametrize(
    ("words", "stop"),
    [
        ("load_factor = 3", StopAt(load_factor=3.0)),
        ("limit_points = 2", StopAt(limit_points=2)),
        ("steps = 200", StopAt(steps=200)),
    ],
)
def test_the_other_ends_of_a_path(words: str, stop: StopAt) -> None:
    text = FOOTBRIDGE.replace('joint = "low", direction = "z", displacement = "-0.4 m"', words)
    assert analysis(text, "collapse").stop_at == stop


def test_what_stays_must_be_said_only_where_something_was_carried() -> None:
    none = FOOTBRIDGE.replace('constant = "dead"', 'constant = "none"')
    assert analysis(none, "collapse").constant is None
    unloaded = FOOTBRIDGE.replace('from = { analysis = "built", loads = "service" }\n', "")
    assert analysis(unloaded.replace('constant = "dead"\n', ""), "collapse").constant is None
    idle = FOOTBRIDGE.replace('loads = ["service", "weather"]\nwith', "loads = { dead = 0 }\nwith")
    idle = idle.replace('"built", loads = "service"', '"built", loads = "0 dead"')
    assert analysis(idle.replace('constant = "dead"\n', ""), "collapse").constant is None


def test_tuning_for_tensions_and_positions(parts: Parts) -> None:
    tune = parts.analyses[4]
    assert isinstance(tune, Tune)
    assert [loading.name for loading in tune.loads] == ["dead", "service"]
    assert tune.adjust == (2, 3, 4, 5, 8, 9, 10, 11, 6)
    # the list given, then the pieces of a rope and the spans of a clamped one
    assert tune.together == ((2, 3), (8, 9, 10, 11), (4, 5))
    assert tune.targets == (
        TensionTarget((2,), 25e3),
        TensionTarget((6,), 9e3, "to end", "service"),
        TensionTarget((11,), 3e3),  # the greatest tension is in the piece at the higher end
        PositionTarget(3, 2, 0.9),
    )
    assert tune.cut_list == CutList(2e3, pytest.approx(288.15), 0.06)


@pytest.mark.parametrize(("at", "piece"), [("from end", 8), ("to end", 11), ("greatest", 11)])
def test_a_tension_of_a_rope_in_pieces_is_that_of_one_of_them(at: str, piece: int) -> None:
    text = FOOTBRIDGE.replace('["stern-line"], tension = 3', f'["stern-line"], tension = 3, at = "{at}"')
    assert analysis(text, "tensions").targets[2] == TensionTarget((piece,), 3e3, at)
    turned = text.replace('from = "anchor-1"\nto = "top-1"', 'from = "top-1"\nto = "anchor-1"')
    assert analysis(turned, "tensions").targets[2].members == (8 if at == "greatest" else piece,)


def test_tuning_for_the_least_pretension(parts: Parts) -> None:
    least = parts.analyses[5]
    assert (least.keep_taut, least.margin, least.targets, least.cut_list) == ((2, 3, 4, 5), 500.0, (), None)
    assert len(least.loads) == 3


def test_form_finding_takes_those_that_are_there(parts: Parts) -> None:
    shape = parts.analyses[0]
    assert isinstance(shape, FormFinding)
    assert shape.force_densities == (((4, 5), 4e3), ((2, 3, 8, 9, 10, 11), 3e3), ((0, 1), -5e3))
    assert shape.loads.name == "dead"


def test_modes_say_into_how_many_pieces_curves_go(parts: Parts) -> None:
    swing = parts.analyses[-1]
    assert isinstance(swing, Modes)
    assert swing.pieces == 8
