"""Values that do not fit each other are warned of; those of real things are not."""

from __future__ import annotations

import pytest
from footbridge_text import FOOTBRIDGE
from gantry_text import GANTRY

from tautbar.model.reading import model_from_text

SLIPS = {
    "MPa for GPa": (
        '"210 GPa"',
        '"210 MPa"',
        ["material 'steel': modulus 210 MPa with density 7850 kg/m3: metals"],
    ),
    "too stiff": ('"210 GPa"', '"900 GPa"', ["have 40 to 300 GPa (steel 210 GPa)"]),
    "light metal": (
        'modulus = "210 GPa"\ndensity = "7850 kg/m^3"',
        'modulus = "70 MPa"\ndensity = "2700 kg/m^3"',
        ["metals, glass and stone have 10 GPa or more"],
    ),
    "yield": (
        'modulus = "210 GPa"\ndensity = "7850 kg/m^3"',
        'modulus = "1 GPa"\ndensity = "1100 kg/m^3"',
        ["yields at 355 MPa, with modulus 1 GPa a strain of 36 %"],
    ),
    "expansion": ('"12e-6 / K"', '"1.2e-4 / K"', ["expansion 0.00012 1/K with density 7850 kg/m3"]),
    "far expansion": ('"12e-6 / K"', '"12e-3 / K"', ["expansion 0.012 1/K is outside the plausible range"]),
    "soft rope": (
        '"18 MN"',
        '"18 kN"',
        [
            "18 kN is as soft as rubber for its 1.1 kg/m (steel: 29.43 MN)",
            "'stay-1': stretched by more than 5 %",
        ],
    ),
    "stiff rope": ('"18 MN"', '"18 GN"', ["is stiffer than any material for its 1.1 kg/m"]),
    "strong rope": ('"190 kN"', '"190 MN"', ["it would break at a strain of 1.1e+03 %"]),
    "take-up": (
        '"8 mm"',
        "0.5",
        ["take_up of 500 mm is 11 % of the length of 'stay-1' (4.472 m): is its unit right?"],
    ),
    "movement": (
        '"-12 mm"',
        "-0.5",
        ["joint 'A' moves by 500 mm, 11 % of the length of 'stay-1' (4.472 m)"],
    ),
    "event": (
        '"-40 kN"',
        '"-40 MN"',
        ["event 'drop': a force of 40 MN on joint 'C' is 8451 times the weight"],
    ),
    "load": ("force = [1, 0]", 'force = ["1 MN", 0]', ["load case 'gale-east': a force of 1 MN"]),
    "long tie": (
        'pretension = "15 kN"',
        'unstressed_length = "4472 m"',
        ["members 'stay-1': more than 2 times as long as drawn"],
    ),
    "own expansion": (
        'expansion = "12e-6 / K"\nbreaking',
        'expansion = "12 / K"\nbreaking',
        ["section 'stay': expansion 12"],
    ),
}


@pytest.mark.parametrize(("old", "new", "says"), SLIPS.values(), ids=SLIPS.keys())
def test_a_slip_in_a_unit_is_warned_of_once(old: str, new: str, says: list[str]) -> None:
    assert old in GANTRY
    found = model_from_text(GANTRY.replace(old, new, 1)).warnings
    assert len(found) == len(says), found
    assert all(any(text in warning for warning in found) for text in says), found


def test_take_up_and_movements_are_held_against_whole_ropes() -> None:
    """0.2 m is 2.8 % of the 7.21 m of the stern line, and more of a single piece of it."""
    text = FOOTBRIDGE.replace('["carrier", "handrail"], length = "30 mm"', '["stern-line"], length = 0.2')
    (warning,) = [w for w in model_from_text(text).warnings if "take_up" in w]
    assert "take_up of 200 mm is 2.8 % of the length of 'stern-line' (7.211 m)" in warning
    small = model_from_text(text.replace("length = 0.2", "length = 0.1"))
    assert not [w for w in small.warnings if "take_up" in w]


MATERIALS = {  # handbook values: modulus [GPa], density [kg/m3], expansion [1/K]
    "steel": (210, 7850, 12e-6),
    "steel rope by metal area": (60, 7850, 12e-6),
    "aluminium": (70, 2700, 23e-6),
    "titanium": (110, 4500, 9e-6),
    "lead": (16, 11340, 29e-6),
    "tungsten": (400, 19300, 4.5e-6),
    "glass": (70, 2500, 9e-6),
    "carbon fibre": (900, 2150, -1e-6),
    "aramid": (110, 1440, -4e-6),
    "polyester": (10, 1380, 5e-5),
    "nylon": (2, 1140, 8e-5),
    "spruce": (11, 450, 5e-6),
    "concrete": (30, 2400, 10e-6),
}


@pytest.mark.parametrize(("modulus", "density", "expansion"), MATERIALS.values(), ids=MATERIALS.keys())
def test_real_materials_are_not_warned_of(modulus: float, density: float, expansion: float) -> None:
    text = GANTRY.replace('"210 GPa"', f'"{modulus} GPa"').replace('"7850 kg/m^3"', f'"{density} kg/m^3"', 1)
    text = text.replace('expansion = "12e-6 / K"\nyield', f'expansion = "{expansion} / K"\nyield')
    assert model_from_text(text).warnings == ()
