"""Ropes that hang: published and closed-form catenaries, elastic and inextensible, and sagging stays.

C12 "pr 5.3" and "pr 5.4" are loaded per metre of span, a parabola and no catenary: they are left out.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from published import Array, case, values
from scipy.optimize import brentq

import tautbar
from tautbar.analyses.memory import Answer

INEXTENSIBLE = 1e12  # axial stiffness over weight: stretches by less than the digits of any source


def rope(span: float, rise: float, w: float, EA: float, **length: float) -> tautbar.Model:
    """One rope from A at the origin to B, its weight ``w`` [N/m]."""
    return tautbar.Model(
        plane="xz",
        gravity=10.0,
        sections={"rope": {"axial_stiffness": EA, "mass_per_length": w / 10.0}},
        joints={"A": [0, 0], "B": [span, rise]},
        members=[{"name": "rope", "from": "A", "to": "B", "kind": "hanging", "section": "rope"} | length],
        supports=[{"joints": ["A", "B"], "fixed": ["x", "z"]}],
        load_cases={"dead": {"self_weight": 1.0}},
    )


def hung(*args: float, **length: float) -> Answer:
    return tautbar.solve_static(rope(*args, **length), "dead")


def pulls(a: Answer) -> tuple[float, float, float, float]:
    """Level pull, upward reaction at A, tension at A and at B [N]."""
    R = a.joint("reaction", "A")[0]
    ends = a["end_tension"][0, 0]
    return -float(R[0]), float(R[2]), float(ends[0]), float(ends[1])


# ---------------------------------------------------------------- C16: exact elastic catenaries

C16 = case("C16")["extra"]


@pytest.mark.parametrize("name", C16)
def test_elastic_catenary(name: str) -> None:
    """OWN: the formulas to 40 digits, checked there by integration (Irvine 1981). 1e-10, as its file says."""
    d = C16[name]
    a = hung(d["dx"], d["dz"], d["w"], d["EA"], unstressed_length=d["L0"])
    assert pulls(a) == pytest.approx([d["H"], d["V1"], d["T1"], d["T2"]], rel=1e-10)
    assert a["axial_force"][0, 0] == pytest.approx(max(d["T1"], d["T2"]), rel=1e-10)
    if d["lowest_z"] is not None:
        assert a["rope_curve/lowest_point"][0, 0, 2] == pytest.approx(d["lowest_z"], rel=1e-10)
    else:
        assert a["rope_curve/lowest_point"][0, 0] == pytest.approx([0, 0, 0], abs=1e-12), "its lower end"


# ---------------------------------------------------------------- C01: point load on a long rope

C01 = case("C01")
FOOT, POUND = 0.3048, 4.4482216152605
SI = C01["input"]["SI"]


def by(author: str, quantity: str) -> dict[str, Any]:
    return next(v for v in C01["values"] if v["by"].startswith(author) and v["quantity"] == quantity)


def two_ropes() -> tautbar.Model:
    """The rope of C01 as two catenaries that meet in M, drawn where M hangs under the weight alone."""
    section = {"axial_stiffness": SI["EA_N"], "mass_per_length": SI["w_N_per_m"] / 10.0}
    lengths = (SI["unstressed_left_m"], SI["unstressed_right_m"])
    members = [
        {"name": f"{a}{b}", "from": a, "to": b, "kind": "hanging", "section": "rope", "unstressed_length": L0}
        for (a, b), L0 in zip(("AM", "MB"), lengths, strict=True)
    ]
    return tautbar.Model(
        plane="xz",
        gravity=10.0,
        sections={"rope": section},
        joints={"A": [0, 0], "M": [400 * FOOT, -96.05 * FOOT], "B": [SI["span_m"], 0]},
        members=members,
        supports=[{"joints": ["A", "B"], "fixed": ["x", "z"]}],
        load_cases={
            "dead": {"self_weight": 1.0},
            "P": {"forces": [{"joints": ["M"], "force": [0, -SI["load_N"]]}]},
        },
    )


def test_point_load_on_a_long_rope_as_catenaries() -> None:
    """RECALLED: O'Brien & Francis 1964, Jayaraman & Knudson 1981. 2e-4, its file; 1e-5 to its own digits."""
    model = two_ropes()
    before = tautbar.solve_static(model, "dead")
    after = tautbar.solve_static(model, {"dead": 1.0, "P": 1.0}, start=before)
    height = -96.05 * FOOT + before.displacement("M")[0, 2]
    initial = by("original data", "initial height of load point")
    assert height / FOOT == pytest.approx(initial["published"], rel=1e-5)
    assert height / FOOT == pytest.approx(initial["computed"], rel=1e-8)
    moved = after.displacement("M")[0] - before.displacement("M")[0]
    for axis, quantity in ((2, "load point displacement z"), (0, "load point displacement x")):
        for author in ("O'Brien", "Jayaraman"):
            row = by(author, quantity)
            assert moved[axis] / FOOT == pytest.approx(row["published"], rel=2e-4)
            assert moved[axis] / FOOT == pytest.approx(row["computed"], rel=1e-5)
        metric = by("same, metric", quantity)
        assert moved[axis] == pytest.approx(metric["published"], abs=5e-4)  # printed in millimetres
    own = C01["extra"]["computed_SI"]
    assert -before.joint("reaction", "A")[0, 0] == pytest.approx(own["H_initial_N"], rel=1e-9)
    R = after.joint("reaction", "A")[0]
    assert [-R[0], R[2]] == pytest.approx([own["H_loaded_N"], own["V_left_loaded_N"]], rel=1e-9)


def test_point_load_on_a_long_rope_as_ten_links() -> None:
    """RECALLED: Michalos & Birnstiel 1962, ten straight links drawn on the curve. 5e-4, as its file says."""
    a, H, w = 1266.32436 * FOOT, 4.0015850e3 * POUND, SI["w_N_per_m"]
    x = np.linspace(0, SI["span_m"], 11)
    z = a * (np.cosh((x - x[-1] / 2) / a) - np.cosh(x[-1] / 2 / a))
    chord = np.hypot(np.diff(x), np.diff(z))
    tension = H * chord / np.diff(x)
    model = tautbar.Model(
        plane="xz",
        sections={"link": {"axial_stiffness": SI["EA_N"]}},
        joints={f"J{i}": [float(x[i]), float(z[i])] for i in range(11)},
        members=[
            {"name": f"l{i}", "from": f"J{i}", "to": f"J{i + 1}", "kind": "tension-only", "section": "link",
             "unstressed_length": float(chord[i] / (1 + tension[i] / SI["EA_N"]))}
            for i in range(10)
        ],
        supports=[{"joints": ["J0", "J10"], "fixed": ["x", "z"]}],
        load_cases={
            "dead": {
                "forces": [
                    {"joints": [f"J{i}"], "force": [0, -float(w * (chord[i - 1] + chord[i]) / 2)]}
                    for i in range(1, 10)
                ]
            },
            "P": {"forces": [{"joints": ["J4"], "force": [0, -SI["load_N"]]}]},
        },
    )  # fmt: skip
    before = tautbar.solve_static(model, "dead")
    after = tautbar.solve_static(model, {"dead": 1.0, "P": 1.0}, start=before)
    moved = after.displacement("J4")[0] - before.displacement("J4")[0]
    for axis, quantity in ((2, "load point displacement z"), (0, "load point displacement x")):
        row = by("Michalos", quantity)
        assert moved[axis] / FOOT == pytest.approx(row["published"], rel=5e-4)
        # Its own model takes displacements from the drawn curve, ours from the links at rest.
        assert moved[axis] / FOOT == pytest.approx(row["computed"], rel=5e-4)


# ---------------------------------------------------------------- C11, C12: inextensible ones


def level(span: float, w: float, **length: float) -> Answer:
    return hung(span, 0.0, w, INEXTENSIBLE * w * span, **length)


def found_length(a: Answer) -> float:
    return float(a.context.first_scene().structure.L0[0])


def test_handbook_rope_of_given_length() -> None:
    """READ: the source's printed example 1. 1e-4 for printed digits, 1e-9 to own ones."""
    row = values("C11")
    a = level(120.0, 3 * 9.81, unstressed_length=140.0)
    H, _, _, T = pulls(a)
    c, sag = H / (3 * 9.81), -a["rope_curve/lowest_point"][0, 0, 2]
    assert [c, sag] == pytest.approx([row["A c"]["published"], row["A sag"]["published"]], rel=1e-4)
    own = [row[k]["computed"] for k in ("A c", "A sag", "A Tmax (g=9.81)")]
    assert [c, sag, T] == pytest.approx(own, rel=1e-9)


def test_handbook_rope_of_given_sag() -> None:
    """READ: problem sheet; the length 625 ft comes out of the sag. Its figures in feet and pounds."""
    row = values("C11")
    a = level(row["B span"]["computed"], 2.0, sag=25.0)
    # A span known to ten digits leaves the sag, and c with it, nine.
    assert found_length(a) == pytest.approx(625.0, rel=1e-9)
    H, V, T, _ = pulls(a)
    assert pytest.approx(2 * row["B c"]["published"], rel=1e-8) == H
    assert pytest.approx(row["B Tmax"]["published"], rel=1e-8) == T
    assert np.arctan2(V, H) == pytest.approx(row["B angle"]["computed"], rel=1e-7)


def test_extra_length_of_a_dip_of_ten_in_a_hundred() -> None:
    """READ: Cheney & Kincaid (2.6, printed short); 2e-8 is its own last digit."""
    row = values("C11")["C extra length"]
    extra = found_length(level(100.0, 1.0, sag=10.0)) - 100.0
    assert extra == pytest.approx(row["published"], abs=0.05)
    assert extra == pytest.approx(row["computed"], rel=2e-8)


@pytest.mark.parametrize(
    ("sag", "key", "share"),
    [(40.0, "D max parabola deviation", 1.0), (5.0, "D at sag/span 1/8: deviation/sag", 100 / 5.0)],
)
def test_a_catenary_is_no_parabola(sag: float, key: str, share: float) -> None:
    """READ: leancrew.com 2022-03; greatest deviation of the curve from the parabola of the same sag.

    Of the 33 points stored the nearest to the place of the greatest is within 0.1 % of it.
    """
    row = values("C11")[key]
    a = level(40.0, 1.0, sag=sag)
    x, _, z = a["rope_curve/position"][0, 0].T
    deviation = np.abs(z - (-sag + sag * ((x - 20) / 20) ** 2)).max() * share
    assert deviation == pytest.approx(row["computed"], rel=2e-3)
    assert deviation == pytest.approx(row["published"], abs=0.02)


C12 = values("C12")
READ = 5e-4  # printed figures are truncated
OWN = 2e-8  # own digits, printed to nine
SHORT = {"p135 vertical reaction at A (down)": 3e-7}  # where its own digits end sooner


def check(found: float, quantity: str) -> None:
    row = C12[quantity]
    assert found == pytest.approx(row["published"], rel=READ if "down" not in quantity else 2e-3)
    assert found == pytest.approx(row["computed"], rel=SHORT.get(quantity, OWN))


def test_level_ropes_of_karnovsky_and_lebed() -> None:
    """READ: Karnovsky & Lebed 2010, ex. 5.3: H given, then the length given."""
    a = 5.6 / 1.25
    one = level(20.0, 1.25, unstressed_length=2 * a * np.sinh(10 / a))
    assert pulls(one)[0] == pytest.approx(5.6, rel=1e-9)
    sag = -one["rope_curve/lowest_point"][0, 0, 2]
    check(sag, "5.3(1) sag")
    check(sag + a, "5.3(1) y(10)")
    two = level(20.0, 1.25, unstressed_length=42.0)
    check(pulls(two)[0], "5.3(2) H")
    check(-two["rope_curve/lowest_point"][0, 0, 2], "5.3(2) sag")


def test_inclined_rope_of_karnovsky_and_lebed() -> None:
    """READ: ex. 5.4, supports 18 m different in height, A the higher one; its low point lies in the span."""
    a = 5.6 / 1.25
    length = np.hypot(2 * a * np.sinh(10 / a), 18.0)
    check(length, "5.4 total length")
    found = hung(20.0, -18.0, 1.25, INEXTENSIBLE * 1.25 * 20, unstressed_length=length)
    H, V, N_A, N_B = pulls(found)
    assert pytest.approx(5.6, rel=1e-9) == H
    check(N_A, "5.4 N_A")
    check(N_B, "5.4 N_B")
    check(V / H, "5.4 tan A")
    low = found["rope_curve/lowest_point"][0, 0, 0]
    check(low, "5.4 xA")
    check(20.0 - low, "5.4 xB")


def test_rope_whose_low_point_is_outside_its_span() -> None:
    """READ: p. 135; A is the lower end and pulled down. Truncated products there: 2e-3 for its reaction."""
    found = hung(100.0, 57.7, 0.014, INEXTENSIBLE * 0.014 * 100, unstressed_length=117.7)
    H, V, N_A, N_B = pulls(found)
    check(H / 0.014, "p135 a")
    check(H, "p135 H")
    check(N_A, "p135 N_A")
    check(N_B, "p135 N_B")
    check(V, "p135 vertical reaction at A (down)")
    by_hand = 0.007 * (117.7 - 57.7 / np.tanh(50 * 0.014 / H))
    assert by_hand == pytest.approx(V, rel=1e-8)
    assert found["rope_curve/lowest_point"][0, 0] == pytest.approx([0, 0, 0], abs=1e-12)


def test_weightless_cable_with_a_load() -> None:
    """READ: p. 123: a cable 1.2 spans long without weight, P at 0.4 of the span: two ties."""
    dip = float(brentq(lambda f: np.hypot(0.4, f) + np.hypot(0.6, f) - 1.2, 0.1, 1.0, xtol=1e-15))
    ropes = [("A", "M", np.hypot(0.4, dip)), ("M", "B", np.hypot(0.6, dip))]
    model = tautbar.Model(
        plane="xz",
        sections={"rope": {"axial_stiffness": 1e9}},
        joints={"A": [0, 0], "M": [0.401, -dip], "B": [1, 0]},
        members=[
            {"name": a + b, "from": a, "to": b, "kind": "tension-only", "section": "rope",
             "unstressed_length": float(L0)}
            for a, b, L0 in ropes
        ],
        supports=[{"joints": ["A", "B"], "fixed": ["x", "z"]}],
        load_cases={"P": {"forces": [{"joints": ["M"], "force": [0, -1.0]}]}},
    )  # fmt: skip
    found = tautbar.solve_static(model, "P")
    H = -found.joint("reaction", "A")[0, 0]
    check(H, "p123 H/P exact")
    assert C12["p123 H/P approximate formula"]["computed"] == pytest.approx(np.sqrt(0.6), rel=1e-8)


# ---------------------------------------------------------------- C17: loads added to a shallow rope


def sagging(ratio: float) -> tuple[float, float, float]:
    """H, EA and unstressed length of the rope of C17: 100 m, 100 N/m, lambda^2 = 50, H of the parabola."""
    l, w, d = 100.0, 100.0, 100.0 * ratio
    H = w * l * l / (8 * d)
    EA = 50 * H * (1 + 8 * ratio**2) / (w * l / H) ** 2

    def too_long(L0: float) -> float:
        return float(H * L0 / EA + 2 * H / w * np.arcsinh(w * L0 / (2 * H)) - l)

    return H, EA, float(brentq(too_long, 0.5 * l, 2 * l, xtol=1e-13))


def loaded(ratio: float, x: float, P: float) -> float:
    """Share by which H grows under a load of P w l at the share x of the span, as two catenaries."""
    l, w = 100.0, 100.0
    H, EA, L0 = sagging(ratio)

    def where(s: float) -> Array:
        V = np.array([-w * L0 / 2, w * (s - L0 / 2)])
        along = H * s / EA + H / w * np.diff(np.arcsinh(V / H))[0]
        return np.array([along, np.diff(V**2)[0] / (2 * w * EA) + np.diff(np.hypot(H, V))[0] / w])

    s = float(brentq(lambda s: where(s)[0] - x * l, 0, L0, xtol=1e-13))
    rope = {"kind": "hanging", "section": "rope"}
    model = tautbar.Model(
        plane="xz",
        gravity=10.0,
        sections={"rope": {"axial_stiffness": EA, "mass_per_length": w / 10}},
        joints={"A": [0, 0], "M": [float(v) for v in where(s)], "B": [l, 0]},
        members=[
            {"name": "left", "from": "A", "to": "M", "unstressed_length": s} | rope,
            {"name": "right", "from": "M", "to": "B", "unstressed_length": L0 - s} | rope,
        ],
        supports=[{"joints": ["A", "B"], "fixed": ["x", "z"]}],
        load_cases={
            "dead": {"self_weight": 1.0},
            "P": {"forces": [{"joints": ["M"], "force": [0, -P * w * l]}]},
        },
    )
    before = tautbar.solve_static(model, "dead")
    assert np.abs(before["displacement"]).max() < 1e-7, "drawn in balance"
    assert -before.joint("reaction", "A")[0, 0] == pytest.approx(H, rel=1e-9)
    after = tautbar.solve_static(model, {"dead": 1.0, "P": 1.0})
    return float(-after.joint("reaction", "A")[0, 0] / H - 1)


C17 = values("C17")


@pytest.mark.parametrize(
    ("key", "ratio", "x", "P", "tolerance"),
    [
        ("h point x=.5 P=.5, sag 1/100", 1 / 100, 0.5, 0.5, 1e-3),
        ("h point x=.3 P=1, sag 1/50", 1 / 50, 0.3, 1.0, 1e-3),
        ("h point x=.5 P=5, sag 1/8", 1 / 8, 0.5, 5.0, 4e-2),
    ],
)
def test_point_load_on_a_shallow_rope(key: str, ratio: float, x: float, P: float, tolerance: float) -> None:
    """RECALLED: Irvine 1981, his cubic of the shallow rope; tolerances of its file, the widest at sag 1/8."""
    found = loaded(ratio, x, P)
    assert found == pytest.approx(C17[key]["published"], rel=tolerance)
    assert found == pytest.approx(C17[key]["computed"], abs=1e-6)


def test_uniform_load_on_a_shallow_rope() -> None:
    """The same for an added load of twice the weight, along the rope as the weight is."""
    H, EA, L0 = sagging(1 / 50)
    found = tautbar.solve_static(rope(100.0, 0.0, 100.0, EA, unstressed_length=L0), {"dead": 3.0})
    row = C17["h uniform p=2, sag 1/50"]
    grown = pulls(found)[0] / H - 1
    assert grown == pytest.approx(row["published"], rel=1e-3)
    assert grown == pytest.approx(row["computed"], abs=1e-6)


# ---------------------------------------------------------------- C18: sagging stays

E, AREA, WEIGHT = 195e9, 0.01, 800.0  # Pa, m2, N/m


def stay(span: float, stress: float, slope: float = 0.0) -> tuple[float, float, float]:
    """Chord [m], its slope and the stay's unstressed length, its level pull stress x area x cos(slope)."""
    chord, EA = span / np.cos(slope), E * AREA
    H = stress * AREA * np.cos(slope)

    def too_long(L0: float) -> float:
        a = hung(span, span * np.tan(slope), WEIGHT, EA, unstressed_length=L0)
        return pulls(a)[0] - H

    return float(chord), EA, float(brentq(too_long, 0.9 * chord, 1.1 * chord, xtol=1e-9))


def chord_force(span: float, EA: float, L0: float, slope: float, longer: float) -> float:
    """Pull along the chord [N] (mean of both ends) once it is longer, by moving its support."""
    rise = span * np.tan(slope)
    a = hung(span + longer * np.cos(slope), rise + longer * np.sin(slope), WEIGHT, EA, unstressed_length=L0)
    H, V, _, _ = pulls(a)
    return float(H * np.cos(slope) + (WEIGHT * L0 / 2 - V) * np.sin(slope))


C18 = values("C18")


@pytest.mark.parametrize(
    ("key", "span", "stress"),
    [
        ("Eeq/E Lh=200 m, 400 MPa", 200.0, 400e6),
        ("Eeq/E Lh=300, 200 MPa", 300.0, 200e6),
        ("Eeq/E Lh=400, 200 MPa", 400.0, 200e6),
    ],
)
def test_tangent_modulus_of_a_sagging_stay(key: str, span: float, stress: float) -> None:
    """RECALLED: Ernst 1965, with the HORIZONTAL length. 5e-3, as its file says; level and at 45 degrees."""
    for slope in (0.0, np.pi / 4):
        chord, EA, L0 = stay(span, stress, slope)
        step = 1e-4 * chord
        up, down = (chord_force(span, EA, L0, slope, s) for s in (step, -step))
        share = (up - down) / (2 * step) * chord / EA
        assert share == pytest.approx(C18[key]["published"], rel=5e-3)
        # Its own figures take the stress elsewhere along the stay, worth a part in a thousand or two.
        assert share == pytest.approx(C18[key]["computed"], rel=2e-3)


def test_secant_modulus_of_a_sagging_stay() -> None:
    """RECALLED: EN 1993-1-11 cl. 5.4.2, from 200 to 500 MPa: the change of stress over that of strain."""
    row = C18["Esec/E Lh=200, 200->500 MPa"]
    chord, EA, L0 = stay(200.0, 200e6)
    longer = float(brentq(lambda s: chord_force(200.0, EA, L0, 0.0, s) - 500e6 * AREA, 0, 2.0, xtol=1e-9))
    share = 300e6 * AREA / longer * chord / EA
    assert share == pytest.approx(row["published"], rel=5e-3)
    assert share == pytest.approx(row["computed"], rel=1e-4)


def test_data_are_whole() -> None:
    """All rows of the cases used here are known by name: a renamed row is a test that no longer runs."""
    assert len(C12) == 19
    assert len(C16) == 10
