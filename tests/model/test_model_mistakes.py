"""Every kind of mistake: its exact place, its path in words, and what the message says."""

from __future__ import annotations

from pathlib import Path

import pytest
from footbridge_text import FOOTBRIDGE
from planted import IN_LOADS, IN_STRUCTURE
from planted_in_analyses import IN_ANALYSES, IN_TYPES
from planted_statics import IN_STATICS

from tautbar.errors import Mistake, ModelError
from tautbar.model import Model, read_model
from tautbar.model.reading import model_from_text


def mistakes_in(text: str) -> tuple[Mistake, ...]:
    with pytest.raises(ModelError) as caught:
        model_from_text(text, file="gantry.toml")
    return caught.value.mistakes


MISTAKES = IN_STRUCTURE | IN_LOADS | IN_ANALYSES | IN_TYPES


@pytest.mark.parametrize(("old", "new", "caret", "path", "says"), MISTAKES.values(), ids=MISTAKES.keys())
def test_a_mistake_is_told_with_its_place(
    gantry: str, old: str, new: str, caret: str, path: str, says: str
) -> None:
    assert_told(gantry, old, new, caret, path, says)


@pytest.mark.parametrize(("old", "new", "caret", "path", "says"), IN_STATICS.values(), ids=IN_STATICS.keys())
def test_a_mistake_in_the_footbridge_is_told_with_its_place(
    old: str, new: str, caret: str, path: str, says: str
) -> None:
    assert_told(FOOTBRIDGE, old, new, caret, path, says)


def assert_told(good: str, old: str, new: str, caret: str, path: str, says: str) -> None:
    """The mistake is told once, and its line and column are where it was planted."""
    assert old in good, "the good file has changed"
    text = good.replace(old, new, 1)
    found = mistakes_in(text)
    told = [m for m in found if m.path == path and says in f"{m.what} ({m.hint})"]
    assert told, "\n".join(map(str, found))
    (mistake,) = told
    assert mistake.file == "gantry.toml"
    assert text.splitlines()[mistake.line - 1] == mistake.source_line
    shown = mistake.source_line[mistake.column - 1 :]
    assert shown.startswith(caret), f"the caret points at: {shown}"


def test_all_planted_mistakes_are_told_at_once_in_the_order_of_the_file(gantry: str) -> None:
    planted = (
        "dimension",
        "key",
        "joint",
        "joint in chain",
        "hanging without length",
        "unit",
        "named twice",
        "movement across",
        "plain pattern",
        "shape",
        "from later",
        "analysis kind",
        "ratio of one",
        "lonely joint",
    )
    text = gantry
    for name in planted:
        old, new, *_ = MISTAKES[name]
        assert old in text
        text = text.replace(old, new, 1)
    found = mistakes_in(text)
    for name in planted:
        *_, path, says = MISTAKES[name]
        assert any(m.path == path and says in f"{m.what} ({m.hint})" for m in found), name
    assert [m.line for m in found] == sorted(m.line for m in found)


def test_a_message_shows_the_line_and_a_caret(gantry: str) -> None:
    (mistake,) = mistakes_in(gantry.replace('area = "12.0 cm^2"', 'area = "12 mm"'))
    assert str(mistake) == (
        "gantry.toml:19:1: section \"chord\": area: '12 mm': a length was given, an area is wanted, "
        'for example "12 cm^2"\n'
        '     19 | area = "12 mm"\n'
        "        | ^"
    )


BARE = """
joints = { A = [0, 0, 0], B = [1, 0, 0], E = [5, 0, 0], F = [6, 0, 0] }
sections.s = { axial_stiffness = 1e6 }
members = [
    { name = "m", from = "A", to = "B", section = "s" }, { name = "n", from = "E", to = "F", section = "s" }
]
"""


def test_unsupported_parts_are_named_unless_they_may_float() -> None:
    (mistake,) = mistakes_in(BARE)
    assert "nothing is supported" in mistake.what
    held = BARE + 'supports = [ { joints = ["A"], fixed = ["x", "y", "z"] } ]'
    (mistake,) = mistakes_in(held)
    assert mistake.path == 'joint "E"'
    assert "the part of joints 'E', 'F' is not connected to any support" in mistake.what
    assert len(model_from_text('unsupported = "allowed"' + BARE).parts.members) == 2


def test_an_empty_model_is_told_what_it_lacks() -> None:
    said = " ".join(m.what for m in mistakes_in('title = "nothing yet"'))
    assert "no joints" in said
    assert "no members" in said


def test_dynamics_without_any_mass_are_refused() -> None:
    text = 'unsupported = "allowed"' + BARE.replace("1e6 }", "1e6, mass_per_length = 0 }")
    assert model_from_text(text).parts.sections[0].mass_per_length == 0
    (mistake,) = mistakes_in(text + '[[analyses]]\nname = "f"\nkind = "modes"\n')
    assert "nothing in the model has mass" in mistake.what


def test_weight_needs_mass_unless_none_is_meant() -> None:
    text = 'unsupported = "allowed"' + BARE + "load_cases.dead.self_weight = 1\n"
    (mistake,) = mistakes_in(text)
    assert mistake.path == 'section "s"'
    assert "it has no mass, but load case 'dead' has self_weight" in mistake.what


def test_pretensioned_bars_need_a_state_for_their_modes() -> None:
    text = 'unsupported = "allowed"' + BARE.replace("1e6 }", "1e6, mass_per_length = 1 }").replace(
        'section = "s" }, {', 'section = "s", slack = "0 m" }, {'
    )
    (mistake,) = mistakes_in(text + '[[analyses]]\nname = "f"\nkind = "modes"\n')
    assert mistake.what.startswith("members are pretensioned: `from` must say")
    assert "add a static analysis before it" in mistake.hint


def test_a_spring_cannot_be_stretched_by_its_whole_length() -> None:
    text = 'unsupported = "allowed"' + BARE.replace(
        "axial_stiffness = 1e6", "stiffness = 1e6, mass_per_length = 1"
    )
    good = text.replace('section = "s" }, {', 'section = "s", pretension = 0.99e6 }, {')
    assert model_from_text(good).parts.members.pretension[0] == 0.99e6
    (mistake,) = mistakes_in(good.replace("0.99e6", "1e6"))
    assert "an elongation of its whole length" in mistake.what


def test_bars_cannot_be_pressed_beyond_their_stiffness() -> None:
    text = 'unsupported = "allowed"' + BARE.replace(
        'section = "s" }, {', 'section = "s", pretension = -1e6 }, {'
    )
    (mistake,) = mistakes_in(text)
    assert "more than its axial stiffness: no length gives it" in mistake.what


def test_a_rope_that_hangs_straight_down_has_no_sag(gantry: str) -> None:
    text = gantry.replace('from = "D"\nto = "B"', 'from = "D"\nto = "A"')
    (mistake,) = mistakes_in(text.replace('unstressed_length = "7.3 m"', 'sag = "1 m"'))
    assert "its ends are above each other" in mistake.what


def test_a_hanging_member_needs_weight(gantry: str) -> None:
    (mistake,) = mistakes_in(gantry.replace('mass_per_length = "1.1 kg/m"', "mass_per_length = 0"))
    assert mistake.path == 'member "main-rope": unstressed_length'
    assert "needs weight" in mistake.what


def test_events_may_wait_in_a_model_without_analyses(gantry: str) -> None:
    model = model_from_text(gantry[: gantry.index("[[analyses]]")])
    assert list(model.parts.events) == ["drop"]
    assert not [w for w in model.warnings if "used by no" in w]


def test_models_from_python_tell_paths_without_a_file() -> None:
    with pytest.raises(ModelError) as caught:
        Model(joints={"A": [0, 0, "1 kg"]}, members=[], sections={}, supports=3, speling=1)
    text = str(caught.value)
    assert "joint \"A\": [3]: '1 kg': a mass was given, a length is wanted" in text
    assert "supports: a list is wanted, not the number 3" in text
    assert "speling: there is no key 'speling' here" in text


SLIPS = {
    "unquoted unit": ('area = "12.0 cm^2"', "area = 12 cm^2", "put a quantity with a unit in quotes"),
    "decimal comma": ("self_weight = 1.0", "self_weight = 1,0", "decimals with a point"),
    "no digit before": ("self_weight = 1.0", "self_weight = .5", "a digit before the point"),
    "no digit after": ("self_weight = 1.0", "self_weight = 5.", "a digit after the point"),
    "no digit after in a list": ("A = [0, 0]", "A = [0., 0]", "a digit after the point"),
    "True": ("count = 12", "folding = True", "true or false in lower case"),
    "backslash": ("count = 12", 'note = "C:\\data\\x"', "single quotes"),
    "bare text": ('kind = "modes"', "kind = modes", "put text in quotes"),
    "colon": ("count = 12", "count: 12", "write = between key and value"),
    "open quote": ('kind = "modes"', 'kind = "modes', ""),
    "round brackets": ("A = [0, 0]", "A = (0, 0)", "square brackets"),
    "semicolon": ("A = [0, 0]", "A = [0; 0]", "with commas"),
    "curly quotes": ('kind = "modes"', "kind = “modes”", "straight quotes"),
    "open bracket": ("[combinations]", "[combinations", "close the brackets"),
    "open brackets": ("[[masses]]", "[[masses]", "close the brackets"),
    "last comma": ("lanterns = 1.0 }", "lanterns = 1.0, }", "comma before the closing brace"),
}


@pytest.mark.parametrize(("old", "new", "says"), SLIPS.values(), ids=SLIPS.keys())
def test_slips_in_toml_get_their_own_hint(gantry: str, old: str, new: str, says: str) -> None:
    text = gantry.replace(old, new, 1)
    (mistake,) = mistakes_in(text)
    assert says in mistake.hint
    assert mistake.line == text[: text.index(new)].count("\n") + 1
    assert new in mistake.source_line


ONE_TABLE = "put its keys into one table, or give one of them another name"
TWICE = {  # what, instead of what, the line of the second, what is said, and the hint
    "table": (
        "[load_cases.cold]",
        "[load_cases.dead]",
        "[load_cases.dead]",
        "[load_cases.dead] is there twice, first in line 80",
        ONE_TABLE,
    ),
    "inline table": (
        "[load_cases.dead]",
        "[load_cases]\ncold = {}\n[load_cases.dead]",
        "[load_cases.cold]",
        "[load_cases.cold] is there twice, first in line 81",
        ONE_TABLE,
    ),
    "key": (
        'name = "top"',
        'name = "top"\n  name = "roof"',
        '  name = "roof"',
        "'name' is there twice, first in line 50",
        "leave one out, or begin another [[members]] before it",
    ),
    "long value": (
        "D = [0,",
        "B = [\n 0,",
        "B = [",
        "'B' is there twice, first in line 32",
        "leave one out",
    ),
    "key in braces": (
        "{ dead = 1.0, lanterns = 1.0 }",
        "{ dead = 1.0, dead = 2 }",
        "service = { dead = 1.0, dead = 2 }",
        "'dead' is there twice in these braces",
        "leave one out",
    ),
    "list of tables": (
        "[[masses]]",
        "[supports]",
        "[supports]",
        "[supports] is there already, in line 63",
        "write [[supports]] above each of them",
    ),
    "closed table": (
        "[combinations.strength]",
        "[combinations.service.cold]",
        "[combinations.service.cold]",
        "[combinations.service.cold] cannot add to what line 104 says already",
        "write all of it in one place",
    ),
}


@pytest.mark.parametrize(("old", "new", "line", "says", "hint"), TWICE.values(), ids=TWICE.keys())
def test_what_stands_twice_is_named_with_both_lines(
    gantry: str, old: str, new: str, line: str, says: str, hint: str
) -> None:
    text = gantry.replace(old, new, 1)
    (mistake,) = mistakes_in(text)
    assert (mistake.what, mistake.hint, mistake.source_line) == (says, hint, line)
    assert text.splitlines()[mistake.line - 1] == line


def test_a_file_that_ends_too_early(gantry: str) -> None:
    (mistake,) = mistakes_in(gantry + "x = [1,")
    assert mistake.line == gantry.count("\n") + 1


def test_tables_in_files_that_are_absent_or_not_utf8(tmp_path: Path) -> None:
    (tmp_path / "m.csv").write_bytes(b"member,from\n\xff\n")
    (tmp_path / "a.toml").write_text('[tables]\njoints = "j.csv"\nmembers = "m.csv"\n')
    with pytest.raises(ModelError) as caught:
        read_model(tmp_path / "a.toml")
    first, second = (m for m in caught.value.mistakes if m.path.startswith("tables"))
    assert (first.line, first.what) == (2, "'j.csv' cannot be read: No such file or directory")
    assert (second.line, second.path) == (3, "tables.members")
    assert "'m.csv' is not in UTF-8" in second.what


def test_a_part_that_hangs_on_an_unknown_joint_is_not_called_loose() -> None:
    """The unknown joint may be the supported one: only the name is worth telling."""
    text = BARE.replace('from = "E"', 'from = "Q"') + 'supports = [ { joints = ["A"], fixed = ["x"] } ]'
    said = [m.what for m in mistakes_in(text)]
    assert "there is no joint 'Q'" in said
    assert not any("not connected" in what for what in said)


def test_a_name_of_two_things_must_be_told_apart() -> None:
    text = FOOTBRIDGE.replace('name = "prop"', 'name = "back"').replace('["prop"', '["back"')
    told = {m.path: m.what for m in mistakes_in(text)}
    assert told['analysis "bare": with[1]'] == "'back' is a member and a support"


def test_a_load_case_without_loads_cannot_grow() -> None:
    text = FOOTBRIDGE.replace("[load_cases.dead]", "[load_cases.idle]\nself_weight = 0\n[load_cases.dead]")
    (mistake,) = mistakes_in(text.replace("loads = { crowd = 2 }", 'loads = "idle"'))
    assert mistake.path == 'analysis "critical": loads'
    assert "nothing acts in it, whatever the load factor" in mistake.what
    weather = text.replace("self_weight = 0", 'ice = [ { members = ["post"], thickness = 1, density = 9 } ]')
    assert model_from_text(weather.replace("loads = { crowd = 2 }", 'loads = "idle"'))


def test_forces_of_zero_cannot_grow() -> None:
    text = FOOTBRIDGE.replace("force = [0, -8]", "force = [0, 0]")
    told = [m.path for m in mistakes_in(text) if "no load grows" in m.what]
    assert told == ['analysis "collapse": loads', 'analysis "critical": loads']


@pytest.mark.parametrize("name", ["handrail.1", "handrail.8"])
def test_names_of_pieces_are_kept_free_from_the_first_to_the_last(name: str) -> None:
    """The analyses part the handrail in 8; a ninth piece there is none."""
    other = f'name = "{name}"\nfrom = "foot-1"\nto = "low"\nsection = "post"\n\n[[members]]\nname = "post"'
    text = FOOTBRIDGE.replace('name = "post"', other).replace('["post"], value', f'["post", "{name}"], value')
    said = [m.what for m in mistakes_in(text)]
    assert said == [f"the name '{name}' is that of a piece, but is used already"] * 2
    assert model_from_text(text.replace(name, "handrail.9"))


def test_a_joint_may_not_have_the_name_of_one_between_pieces() -> None:
    said = [m.what for m in mistakes_in(FOOTBRIDGE.replace("foot-1", '"handrail@7"').replace('""', '"'))]
    assert said == ["the name 'handrail@7' is that of a piece, but is used already"] * 2


def test_struts_cannot_be_kept_taut() -> None:
    text = FOOTBRIDGE.replace('name = "post"\n', 'name = "post"\nkind = "compression-only"\n')
    (mistake,) = mistakes_in(text.replace('keep_taut = ["back",', 'keep_taut = ["post",'))
    assert mistake.what == "'post.1', 'post.2': compression-only, so never taut"


def test_a_rope_is_not_stretched_by_many_times_its_length() -> None:
    """A pull of 2 kN on EA = 0.1 kN would be a strain of 20."""
    soft = FOOTBRIDGE.replace('breaking_force = "400 kN"\n', "").replace('"20 MN"', '"0.1 kN"')
    (mistake,) = mistakes_in(soft.replace('sag = "1.2 m"', 'pretension = "2 kN"'))
    assert mistake.what == "as drawn it would be stretched by 20 times its length"


def test_marking_at_another_temperature_needs_expansion() -> None:
    bare = FOOTBRIDGE.replace('expansion = "12e-6 / K"\nbreaking', "breaking", 1)
    told = {m.path: m.what for m in mistakes_in(bare)}
    assert told['analysis "tensions": cut_list.temperature'].endswith("the section has no expansion")


def test_lengths_of_ropes_put_in_later_are_not_judged_as_drawn() -> None:
    """Joints have moved by then: a length that would break the rope as drawn may be right."""
    later = FOOTBRIDGE.replace('slack = "0.2 m"', 'unstressed_length = "9 m"')  # 9.49 m as drawn: 1.1 MN
    assert model_from_text(later)
    found = mistakes_in(later.replace("absent = true\n\n[[members]]", "\n[[members]]"))
    (told,) = [m for m in found if m.path == 'member "hoist-line": unstressed_length']
    assert "less than possible" in told.what
