"""Warnings: what a model may say but probably does not mean, and that good models have none."""

from __future__ import annotations

import pytest
from footbridge_text import FOOTBRIDGE

from tautbar.model.reading import model_from_text

SERVED = 'loads = ["strength", { dead = 1, settlement = 1, tightening = 1 }]'


def warnings_in(text: str) -> tuple[str, ...]:
    return model_from_text(text).warnings


@pytest.fixture
def quiet(gantry: str) -> str:
    """The gantry with masses in place of the line load."""
    return "\n".join(line for line in gantry.splitlines() if not line.startswith("line_loads")) + "\n"


def test_a_sensible_model_has_no_warnings(quiet: str) -> None:
    assert warnings_in(quiet) == ()


WARNINGS = {
    "modulus": (
        '"210 GPa"',
        '"210 kPa"',
        "material 'steel': modulus 210 kPa is outside the plausible range 50 MPa to 1000 GPa (soft plastics",
    ),
    "density": ('"7850 kg/m^3"', '"7850 g/m^3"', "material 'steel': density 7.85 kg/m3 is outside"),
    "area": ('"12.0 cm^2"', '"12.0 m^2"', "section 'chord': area 12 m2 is outside"),
    "mN for MN": ('"18 MN"', '"18 mN"', "mN is a thousandth of a newton"),
    "small force": ('"0.4 kN"', '"0.4 mN"', "load case 'lanterns': force 0.4 mN is outside"),
    "temperature": ('"-25 degC"', '"225 degC"', "load case 'cold': temperature change 215 K is outside"),
    "gravity": ("format = 1", "gravity = 98.1", "model: gravity 98.1 m/s2 is outside"),
    "step": ('"1 ms"', '"1 ns"', "analysis 'lantern dropped': time_step 1e-09 s is outside"),
    "steps": ('"3 s"', '"30000 s"', "takes 3e+07 steps"),
    "long step": ('"1 ms"', '"4 s"', "time_step is longer than duration"),
    "late event": ('"0.05 s"', '"5 s"', "the event 'drop' starts only after its end"),
    "slender": ('"2.4 cm"', '"2.4 mm"', "members 'bottom.1', 'bottom.2', 'top.1': slenderness above 400"),
    "yield": (
        'section = "chord"',
        'section = "chord"\npretension = "430 kN"',
        "the force as drawn is above yield",
    ),
    "length": ('D = [0, "6 m"]', 'D = [0, "6 km"]', "members 'top.1': length outside the plausible range"),
    "unused case": (
        "[combinations]",
        "[load_cases.other]\n[combinations]",
        "load case 'other' is used by no analysis",
    ),
    "unused combination": (
        "service = {",
        "idle = { dead = 1 }\nservice = {",
        "combination 'idle' is used by no",
    ),
    "no self-weight": (
        SERVED,
        'loads = ["strength", "settlement", "tightening"]',
        "analysis 'strength': no self-weight acts in 'settlement', 'tightening'",
    ),
    "twice between": (
        'pairs = [["D", "C"]]',
        'pairs = [["D", "C"], ["C", "D"]]',
        "'top.1' and 'top.2' join the same two",
    ),
}


@pytest.mark.parametrize(("old", "new", "says"), WARNINGS.values(), ids=WARNINGS.keys())
def test_what_is_probably_not_meant_is_warned_of(quiet: str, old: str, new: str, says: str) -> None:
    assert old in quiet
    text = quiet.replace(old, new, 1)
    if old == 'D = [0, "6 m"]':  # a longer rope goes with the higher joint
        text = text.replace('unstressed_length = "7.3 m"', 'unstressed_length = "6001 m"')
    found = warnings_in(text)
    assert any(says in w for w in found), found


LINE = """
unsupported = "allowed"
joints = { A = [0, 0, 0], B = [1, 0, 0], C = [2, 0, 0], D = [1, 1, 0] }
sections.s = { axial_stiffness = 1e6, mass_per_length = 1 }
"""


def test_a_hinge_in_a_line_of_bars_is_named() -> None:
    frame = '[[members]]\nname = "rest"\npairs = [["A", "D"], ["D", "C"]]\nsection = "s"\n'
    line = '[[members]]\nname = "chord"\nchain = ["A", "B", "C"]\nsection = "s"\n'
    (warning,) = warnings_in(LINE + line + frame)
    assert warning.startswith("joints 'B': a hinge in a line of bars")
    assert warnings_in(LINE + line + frame.replace('"C"]]', '"C"], ["D", "B"]]')) == ()  # held by a third
    assert warnings_in(LINE.replace("B = [1, 0, 0]", "B = [1, 0.1, 0]") + line + frame) == ()  # an angle
    assert warnings_in(LINE + line + 'kind = "tension-only"\n' + frame) == ()  # a rope is no bar
    held = '[[supports]]\njoints = ["B"]\nfixed = ["y"]\n'
    assert warnings_in(LINE + line + frame + held) == ()


def test_forces_that_should_be_masses_in_dynamics(gantry: str) -> None:
    """The line load is 120 N in all, the weight of members and three times 120 kg 4.8 kN: 2.5 %."""
    weight = 9.80665 * (7850 * 12e-4 * (6 + 32**0.5) + 1.1 * (20**0.5 + 52**0.5) + 360)
    assert warnings_in(gantry) == ()
    found = warnings_in(gantry.replace('"-0.02 kN/m"', '"-0.2 kN/m"'))
    assert len(found) == 2  # the modes and the history, not the statics
    assert (
        f"forces downward of 1.2 kN act where no mass is given, {1200 / weight:.0%} of the weight" in found[0]
    )
    assert "analysis 'lantern dropped'" in found[1]


def test_forces_at_joints_with_a_mass_are_not_warned_of(quiet: str) -> None:
    assert warnings_in(quiet.replace('["0.4 kN", 0]', '["0.4 kN", -3]')) == ()


CRITICAL = "analysis 'critical': no self-weight acts in '2 crowd', though there is mass"


def test_the_footbridge_is_warned_of_once() -> None:
    """Its buckling is asked for without what stays."""
    assert warnings_in(FOOTBRIDGE) == (CRITICAL,)
    assert warnings_in(FOOTBRIDGE.replace("count = 3", 'count = 3\nconstant = "dead"')) == ()


IN_STATICS = {
    "pressure": ('"0.3 kPa"', '"0.3 MPa"', "load case 'gale': pressure 300 kPa is outside the plausible"),
    "thickness": ('"20 mm", density', '"20 m", density', "load case 'frost': thickness 20 m is outside"),
    "density of ice": ('"900 kg/m^3"', '"0.9 kg/m^3"', "load case 'frost': density 0.9 kg/m3 is outside"),
    "force density": ('"4 kN/m"', '"4 GN/m"', "analysis 'shape': force density 4000 MN/m"),
    "tension": ("tension = 9,", 'tension = "9 mN",', "analysis 'tensions': tension 9 mN is outside"),
    "held after all": (
        "[[masses]]",
        '[[supports]]\njoints = ["foot-1"]\nfixed = ["z"]\n\n[[masses]]',
        "joints 'foot-1': support 'support 4' holds z both ways, so 'feet' never lets go",
    ),
    "never put in": (
        'with = ["hoist-*", "back.2", "mass 2"]',
        'with = ["back.2"]',
        "'hoist-line', 'mass 2': declared absent, and no analysis puts them in",
    ),
    "load on nothing": (
        'name = "bare"\nkind = "static"\nloads = "dead"',
        'name = "frame"\nkind = "static"\nloads = "service"\nwithout = ["carrier"]\n\n'
        '[[analyses]]\nname = "bare"\nkind = "static"\nloads = "dead"',
        "analysis 'frame': load case 'crowd' acts on joints 'low', which no member goes to there",
    ),
    "unused constant": (
        'constant = "dead"',
        'constant = "none"',
        "analysis 'collapse': no self-weight acts in 'crowd'",
    ),
}


@pytest.mark.parametrize(("old", "new", "says"), IN_STATICS.values(), ids=IN_STATICS.keys())
def test_what_is_probably_not_meant_in_the_footbridge(old: str, new: str, says: str) -> None:
    assert old in FOOTBRIDGE
    found = warnings_in(FOOTBRIDGE.replace(old, new, 1))
    assert [w for w in found if w != CRITICAL] == [w for w in found if says in w] != [], found


def test_what_only_a_path_scales_or_holds_is_used() -> None:
    """A case named only as `constant`, and one only as growing loads."""
    text = FOOTBRIDGE.replace("[combinations]", "[load_cases.push]\nself_weight = 0.1\n[combinations]")
    unused = "load case 'push' is used by no analysis"
    assert unused in warnings_in(text)
    assert unused not in warnings_in(text.replace('constant = "dead"', 'constant = "push"'))
    assert unused not in warnings_in(text.replace("loads = { crowd = 2 }", 'loads = "push"'))


def test_a_new_rope_beside_an_old_one_is_not_given_twice() -> None:
    """A guy is replaced: the new one is absent until the old one goes."""
    new = '[[members]]\nname = "new"\nfrom = "anchor-1"\nto = "top-1"\nkind = "tension-only"\n'
    new += 'section = "rope"\n'
    beside = FOOTBRIDGE.replace("[[supports]]", new + "absent = true\n[[supports]]", 1)
    beside = beside.replace('"back.2", "mass 2"]', '"back.2", "mass 2", "new"]')
    assert warnings_in(beside) == (CRITICAL,)
    (warning,) = [
        w
        for w in warnings_in(
            beside.replace("absent = true\n[[supports]]", "[[supports]]", 1)
            .replace(', "new"]', "]")
            .replace('["back", "stern-line"], value', '["back", "stern-line", "new"], value')
        )
        if w != CRITICAL
    ]
    assert "'back.1' and 'new' join the same two joints" in warning


def test_what_a_path_hands_on_counts_in_dynamics() -> None:
    """Modes from the end of a path carry its loads: the crowd is a force of 8 kN without mass."""
    crowd = FOOTBRIDGE.replace('joints = ["low"], force', 'joints = ["top-2"], force')
    text = crowd.replace('"tensions", loads = "dead" }', '"collapse" }')
    assert any("analysis 'swing': forces downward of 8 kN" in w for w in warnings_in(text))
    lost = crowd.replace('"tensions", loads = "dead"', '"one rope lost", loads = "service, without back.1"')
    assert any("analysis 'swing': forces downward of 8 kN" in w for w in warnings_in(lost))
