"""One slip, one message: nothing that only follows from it is told beside it."""

from __future__ import annotations

import pytest
from footbridge_text import FOOTBRIDGE
from gantry_text import GANTRY

from tautbar.errors import Mistake, ModelError
from tautbar.model.reading import model_from_text

CABLE = 'a straight one that only pulls is "tension-only", one that sags under its own weight "hanging"'
STRUT = 'one that only pushes is "compression-only", one that pushes and pulls "bar"'
IN_GANTRY = {
    "no pieces": ("pieces = 4", "pieces = 0", "must be 2 or more, is 0"),
    "half a piece": ("pieces = 4", "pieces = 8.5", "a whole number is wanted"),
    "misspelt length": ("unstressed_length =", "unstresed_length =", "did you mean 'unstressed_length'?"),
    "cable": ('"tension-only"', '"cable"', CABLE),
    "rod": ('"tension-only"', '"rod"', 'a straight one that only pulls is "tension-only"'),
    "strut": ('"tension-only"', '"Strut"', STRUT),
    "truss": ('"tension-only"', '"truss"', 'axial force of both senses is "bar"'),
    "beam": ('"tension-only"', '"beam"', "bending is not modelled"),
    "rope with pieces": ('"hanging"', '"rope"', CABLE),
    "misspelt name": ('name = "main-rope"', 'nme = "main-rope"', "did you mean 'name'?"),
    "name no text": ('name = "main-rope"', "name = 5", "quoted text is wanted"),
    "no name": ('name = "stay-1"\n', "", "'name' is missing"),
    "joints": ("[joints]", "[joint]", "did you mean 'joints'?"),
    "one section": ("[sections.chord]", "[section.chord]", "did you mean 'sections'?"),
    "one load case": ("[load_cases.dead]", "[loadcases.dead]", "did you mean 'load_cases'?"),
    "kind of analysis": ('kind = "static"', 'kind = "statik"', "did you mean 'static'?"),
    "turned plane": ('"xz"', '"zx"', "known: xy, xz, yz"),
    "no plane": ('plane = "xz"\n', "", 'add plane = "xz" above all tables'),
    "symbol": ("modulus =", "E =", "did you mean 'modulus'?"),
    "other word": ("time_step =", "dt =", "did you mean 'time_step'?"),
    "value": ('force = ["0.4 kN", 0]', 'value = ["0.4 kN", 0]', "did you mean 'force'?"),
    "axes as text": ('["x", "y", "z"]', '"xyz"', 'write ["x", "y", "z"]'),
    "rotation": ('["x", "y", "z"]', '["x", "y", "rz"]', "no rotation to hold"),
    "one frequency": ('["2 Hz", "20 Hz"]', '"2 Hz"', 'write ["2 Hz"]'),
    "event no list": ('events = ["drop"]', 'events = "drop"', 'write ["drop"]'),
    "event": ("events = [", "event = [", "did you mean 'events'?"),
    "force no list": ('forces = [ { joints = ["C"], force = [1, 0] } ]', "forces = { C = 1 }", "[ { .. } ]"),
    "plain number": ("self_weight = 1.0", "self_weight = true", "a number is wanted, not true"),
}
IN_FOOTBRIDGE = {
    "absent": ("absent = true", 'absent = "yes"', "true or false is wanted"),
    "loads": ('["service", "weather"]', '["service", "wether"]', "did you mean 'weather'?"),
    "factor of a combination": ('["service", "weather"]', "{ service = 1 }", "'service' is a combination"),
    "with": ('with = ["prop"]', 'with = ["props"]', "did you mean 'prop'?"),
    "without": ('without = ["back.2"]', 'without = ["back.3"]', "did you mean 'back.2'?"),
    "adjust": ('adjust = ["back", "carrier", "stern-line", "handrail"]', 'adjust = "all"', "list of names"),
    "target": ("tension = 25", "force = 25", "did you mean 'tension'?"),
    "margin alone": ('keep_taut = ["back", "carrier"]\n', "", "'margin' belongs to keep_taut"),
    "stop": ("stop_at =", "stop =", "did you mean 'stop_at'?"),
    "temperature": ('"10 degC"', '"10 C"', "did you mean 'degC'?"),
    "wind": ("toward = [3, 0]", "direction = [3, 0]", "did you mean 'toward'?"),
}


def told_in(text: str) -> tuple[Mistake, ...]:
    with pytest.raises(ModelError) as caught:
        model_from_text(text)
    return caught.value.mistakes


@pytest.mark.parametrize(("old", "new", "says"), IN_GANTRY.values(), ids=IN_GANTRY.keys())
def test_one_slip_in_the_gantry_is_told_once(old: str, new: str, says: str) -> None:
    assert old in GANTRY
    (mistake,) = told_in(GANTRY.replace(old, new, 1))
    assert says in str(mistake)


@pytest.mark.parametrize(("old", "new", "says"), IN_FOOTBRIDGE.values(), ids=IN_FOOTBRIDGE.keys())
def test_one_slip_in_the_footbridge_is_told_once(old: str, new: str, says: str) -> None:
    assert old in FOOTBRIDGE
    (mistake,) = told_in(FOOTBRIDGE.replace(old, new, 1))
    assert says in str(mistake)


def test_a_wrong_number_of_pieces_does_not_hide_other_unknown_names() -> None:
    text = GANTRY.replace("pieces = 4", "pieces = 0").replace(
        '["main-rope", "stay-*"]', '["main-rope.9", "stey"]'
    )
    assert [m.what for m in told_in(text)] == ["must be 2 or more, is 0", "there is no member 'stey'"]


def test_all_joints_with_three_coordinates_in_a_plane_are_told_once() -> None:
    text = 'plane = "xz"\n[joints]\nA = [0, 0, 0]\nB = [1, 0, 0]\n'
    (mistake, *_) = told_in(text)
    assert mistake.what == "the model is in the plane xz, but every joint has three coordinates"


def test_a_joint_that_unknown_names_mean_is_not_called_lonely() -> None:
    said = [m.what for m in told_in(GANTRY.replace("A = [0, 0]", "a = [0, 0]"))]
    assert set(said) == {"there is no joint 'A'"}


def test_a_joint_between_pieces_is_no_suggestion() -> None:
    (mistake, *_) = told_in(GANTRY.replace('joints = ["C"]\nmass', 'joints = ["Q"]\nmass'))
    assert mistake.hint == "known: A, B, C, D"
