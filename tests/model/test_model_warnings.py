"""Warnings: what a model may say but probably does not mean, and that good models have none."""

from __future__ import annotations

import pytest

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
        "material 'steel': modulus 2.1e+05 Pa is outside the plausible range",
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
