"""Equilibrium with large displacements and slack: a shallow bar on a spring, two-link cables."""

from __future__ import annotations

import numpy as np
import pytest
from published import case, half_digit, values

import tautbar

N02, C05, C06 = (case(name) for name in ("N02", "C05", "C06"))
MILLI = 1e-3


def shallow_bar() -> tautbar.Model:
    """The bar of N02: a foot held, a head free in height and on a spring; 2500 mm along the level."""
    d = N02["input"]
    return tautbar.Model(
        plane="xz",
        sections={"bar": {"axial_stiffness": d["EA_N"]}},
        joints={"foot": [0, 0], "head": [MILLI * d["length_mm"], MILLI * d["rise_mm"]]},
        members=[{"name": "bar", "from": "foot", "to": "head", "section": "bar"}],
        supports=[
            {"joints": ["foot"], "fixed": ["x", "z"]},
            {"joints": ["head"], "fixed": ["x"], "springs": {"z": d["spring_N_per_mm"] / MILLI}},
        ],
        load_cases={"W": {"forces": [{"joints": ["head"], "force": [0, d["load_N"]]}]}},
    )


def test_shallow_bar_of_true_geometry() -> None:
    """OWN (true geometry, engineering strain). 1e-11: its 12 digits."""
    found = tautbar.solve_static(shallow_bar(), "W", tolerance=1e-13).displacement("head")[0, 2]
    assert found / MILLI == pytest.approx(N02["computed"]["w_at_minus7_true_geometry_eng_mm"], rel=1e-11)


@pytest.mark.parametrize(("geometry", "key"), [("small", "first_predictor_mm"), ("large", "exact_mm")])
def test_shallow_bar_against_the_printed_values(geometry: str, key: str) -> None:
    """RECALLED: M. A. Crisfield, Non-linear Finite Element Analysis of Solids and Structures 1 (1991), ch. 1.

    The printed values hold for shallow Green strain with one fixed length; a slope of 1/100 makes 8e-5
    of difference to true geometry, as the data say.
    """
    found = tautbar.solve_static(shallow_bar(), "W", geometry=geometry).displacement("head")[0, 2]
    assert found / MILLI == pytest.approx(N02["published"][key], rel=8e-5)


def two_links(half: float, kind: str, **length: float) -> tautbar.Model:
    """Two links between supports 2 ``half`` apart, loaded downwards in the middle by 1 N times a factor."""
    EA = C05["input"]["SI"]["EA_N"]
    link = {"section": "rope", "kind": kind} | length
    return tautbar.Model(
        plane="xz",
        sections={"rope": {"axial_stiffness": EA}},
        joints={"A": [0, 0], "M": [half, 0], "B": [2 * half, 0]},
        members=[{"name": "a", "from": "A", "to": "M"} | link, {"name": "b", "from": "M", "to": "B"} | link],
        supports=[{"joints": ["A", "B"], "fixed": ["x", "z"]}],
        load_cases={"P": {"forces": [{"joints": ["M"], "force": [0, -1]}]}},
    )


def sag_and_tension(model: tautbar.Model, P: float) -> tuple[float, float]:
    """Sag [m] and tension [N]; the sides must agree, for the middle stays in the middle."""
    answer = tautbar.solve_static(model, {"P": P}, tolerance=1e-13)
    N = answer["axial_force"][0]
    assert N[0] == pytest.approx(N[1], rel=1e-12)
    return -answer.displacement("M")[0, 2], N[0]


@pytest.mark.parametrize("kind", ["tension-only", "bar"])
@pytest.mark.parametrize(
    ("key", "expected"), [row for row in C05["extra"]["exact_L0_law"].items() if row[0] != "T0,P"]
)
def test_two_link_cable_under_load(key: str, expected: list[float], kind: str) -> None:
    """CLOSED FORM of statics with N = EA (l - L0)/L0, Kwan (1998), Calladine and Pellegrino. 1e-10 as the
    data say, beside the half digit lost in the 12 kept ones of small values. Without pretension the drawn
    shape has no stiffness against the load: a mechanism that tightens."""
    T0, P = (float(x) for x in key.split(","))
    length = {"pretension": T0} if T0 else {"unstressed_length": C05["input"]["SI"]["link_length_m"]}
    d, tension = sag_and_tension(two_links(C05["input"]["SI"]["link_length_m"], kind, **length), P)
    assert d == pytest.approx(expected[0], rel=1e-10)
    assert tension == pytest.approx(expected[1], rel=1e-10)


def test_two_link_cable_near_the_cubic_law() -> None:
    """RECALLED cubic law P = 2 T0 d/L + EA d^3/L^3: 0.3 % at d/L = 0.1, as the data say."""
    rows = values("C05")
    d, _ = sag_and_tension(two_links(5.0, "tension-only", unstressed_length=5.0), 1000)
    assert d == pytest.approx(rows["deflection T0=0, P=1000 (cubic law)"]["published"], rel=3e-3)
    d, _ = sag_and_tension(two_links(5.0, "tension-only", pretension=2000), 1000)
    assert d == pytest.approx(rows["same, cubic law 2T0 d/L+EA d^3/L^3"]["published"], rel=3e-3)


@pytest.mark.parametrize(
    ("L0", "P", "quantity"),
    [
        (5.05, 1000, "deflection L0=5.05 P=1000"),
        (5.005, 10000, "deflection L0=5.005 P=10000"),
        (4.995, 1000, "deflection L0=4.995 P=1000"),
    ],
)
def test_slack_string_tightens_under_load(L0: float, P: float, quantity: str) -> None:
    """CLOSED FORM: 1e-10. From cold: the first two are drawn straight and slack, 50 and 5 mm too long."""
    row = values("C06")[quantity]
    d, tension = sag_and_tension(two_links(5.0, "tension-only", unstressed_length=L0), P)
    assert d == pytest.approx(row["published"], rel=1e-10)
    if L0 == 5.05:
        expected = values("C06")["tension"]["published"]
        assert tension == pytest.approx(expected, rel=0, abs=1e-10 * expected + half_digit(expected, 12))


def test_slack_string_under_hardly_any_load() -> None:
    """READ in Karnovsky and Lebed (2010), p. 116: f = (l/2) sqrt((L/l)^2 - 1); a cable 1 % longer than
    its span sags by 0.071 of it. 1e-8: 1 mN on 1 MN stretches the string by 4e-9 of its length, and the
    sag by 50 times that."""
    sag, _ = sag_and_tension(two_links(5.0, "tension-only", unstressed_length=5.05), 0.001)
    L0, T = 5.05, 0.001 / 2 * 5.05 / np.sqrt(5.05**2 - 25)
    stretched = L0 * (1 + T / 1e6)
    assert sag == pytest.approx(np.sqrt(stretched**2 - 25), rel=1e-10)
    assert sag == pytest.approx(values("C06")["slack sag L0=5.05"]["published"], rel=2e-7)
    assert round(sag / 10, 3) == 0.071
