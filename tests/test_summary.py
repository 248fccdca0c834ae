"""What `check` prints of the things that come, go, hang and push."""

from __future__ import annotations

import pytest

from tautbar.model.reading import model_from_text
from tautbar.summary import summarise

BRIDGE = """\
title = "Hoist"
plane = "xz"
joints = { A = [0, 0], B = [4, 0], C = [2, 3], D = [8, 3] }
sections.s = { axial_stiffness = "20 MN", mass_per_length = 2, wind_width = "20 mm" }
members = [
 { name = "legs", pairs = [["A", "C"], ["B", "C"], ["A", "B"]], section = "s" },
 { name = "curve", from = "C", to = "D", kind = "hanging", section = "s", sag = "0.5 m" },
 { name = "line", from = "C", to = "D", kind = "hanging", section = "s", sag = 0.4, pieces = 6, absent=true },
]
supports = [
 { name = "feet", joints = ["A", "B"], fixed = ["x"], only_pushes = "z" },
 { name = "bank", joints = ["D"], fixed = ["x", "z"] },
 { name = "prop", joints = ["C"], springs = { z = "2 kN/mm" }, absent = true },
]
masses = [ { name = "winch", joints = ["C"], mass = 7, absent = true } ]
load_cases.dead = { self_weight = 1 }
load_cases.load = { masses = [ { joints = ["C", "B"], mass = 30 } ] }
load_cases.frost = { ice = [ { members = ["legs"], thickness = "10 mm", density = 900 } ] }
[[analyses]]
name = "first"
kind = "static"
loads = { dead = 1, load = 1 }
[[analyses]]
name = "then"
kind = "static"
from = "first"
with = ["line", "prop"]
without = ["curve"]
[[analyses]]
name = "swing"
kind = "modes"
from = "first"
pieces = 5
"""


@pytest.fixture(scope="module")
def lines() -> list[str]:
    return summarise(model_from_text(BRIDGE)).splitlines()


def test_ropes_supports_and_stages_are_told(lines: list[str]) -> None:
    for line in (
        "  joints      9, 5 of them between pieces of ropes",
        "  members     5: 3 bar, 2 hanging",
        "              hanging as one curve: curve",
        "              hanging in 6 pieces: line",
        "              absent at first: line",
        "  supports    A, B: fixed in x; only pushed up in z, free to lift off (feet)",
        "              C: on springs z 2 MN/m (prop, absent at first)",
        "              absent at first: winch",
        "              then (static, from first, without curve, with line, prop)",
        "              swing (modes, from first, hanging members in 5 pieces)",
    ):
        assert line in lines, "\n".join(lines)


def test_masses_of_load_cases_stand_beside_the_total(lines: list[str]) -> None:
    """Twice 30 kg; ice of 900 pi 0.01 (0.02 + 0.01) kg/m on two legs and a beam."""
    ice = 900 * 3.141592653589793 * 0.01 * 0.03 * (2 * 13**0.5 + 4)
    (told,) = [line for line in lines if "load cases act" in line]
    assert (
        told.strip()
        == f"more where load cases act, once whatever their factor: load 60 kg, frost {ice:.5g} kg"
    )


def test_many_mechanisms_are_named_once() -> None:
    joints = ", ".join(f"J{k} = [{k}, 0, 0]" for k in range(12))
    chain = ", ".join(f'"J{k}"' for k in range(12))
    text = f"""
joints = {{ {joints} }}
sections.s = {{ axial_stiffness = 1e6, mass_per_length = 1 }}
members = [ {{ name = "m", chain = [{chain}], section = "s", kind = "tension-only" }} ]
supports = [ {{ joints = ["J0", "J11"], fixed = ["x", "y", "z"] }} ]
"""
    told = summarise(model_from_text(text)).splitlines()
    assert sum("mechanism 1:" in line for line in told) == 1
    assert sum(line.strip().startswith("and 14 more") for line in told) == 1
    assert sum("20 mechanisms that no member resists (see statics)" in line for line in told) == 1
    assert not any("mechanism: no member" in line for line in told)
