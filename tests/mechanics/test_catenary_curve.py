"""The elastic catenary against an integration of its equations of equilibrium, and closed forms.

The check knows no hyperbolic function: along a rope hanging free the level pull is constant and the
upward pull grows by its weight; the strain is T/EA (H. M. Irvine, Cable Structures, 1981, eq. 1.40 ff.).
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

from tautbar.mechanics import catenary

# L0 [m], EA [N], w [N/m], x [m], z [m]
ROPES = {
    "level, slack": (30.0, 5e6, 12.0, 20.0, 0.0),
    "level, taut": (19.98, 5e6, 12.0, 20.0, 0.0),
    "inclined, taut": (25.6, 2e6, 12.0, 20.0, 16.0),
    "inclined, downward": (28.0, 2e6, 12.0, 20.0, -16.0),
    "very slack, ends close": (30.0, 5e6, 12.0, 0.3, 0.1),
    "very stretchy": (10.0, 800.0, 12.0, 20.0, 3.0),
    "nearly inextensible": (20.5, 1e12, 12.0, 20.0, 1.0),
    "nearly weightless": (20.1, 5e6, 1e-4, 20.0, 1.0),
    "steep": (31.0, 5e6, 12.0, 0.5, 30.0),
    "taut and steep": (29.9, 5e6, 12.0, 0.5, 30.0),
}


def integrated(L0, EA, w, H, V):
    """Where the rope ends when (H, V) pulls at its start, by an integrator of order 8."""

    def slope(s, _):
        T = np.hypot(H, V + w * s)
        return [H / T * (1 + T / EA), (V + w * s) / T * (1 + T / EA)]

    # Where the pull changes sense the direction turns quickly, in some H/w of length: stop steps there.
    turning = -V / w
    cuts = sorted({0.0, L0, *(s for s in (turning - 5 * H / w, turning, turning + 5 * H / w) if 0 < s < L0)})
    at = np.zeros(2)
    for a, b in itertools.pairwise(cuts):
        at = solve_ivp(slope, (a, b), at, method="DOP853", rtol=1e-12, atol=1e-13 * L0).y[:, -1]
    return at


@pytest.mark.parametrize("name", ROPES)
def test_end_forces_lead_to_the_other_end(name):
    """The integrator is asked for 1e-12 a step: 1e-10 of the rope over its hundreds of steps."""
    L0, EA, w, x, z = ROPES[name]
    H, V = catenary.end_force(L0, EA, w, x, z)
    assert H > 0
    assert integrated(L0, EA, w, H, V) == pytest.approx([x, z], abs=1e-10 * L0)


def test_parabola_of_a_shallow_rope():
    """Inextensible, sag ratio 1/100: H = w l^2/(8 d) to the fourth order of the ratio (Irvine, ch. 1)."""
    l, d, w = 100.0, 1.0, 5.0
    L0 = l * (1 + 8 / 3 * (d / l) ** 2 - 32 / 5 * (d / l) ** 4)
    H, V = catenary.end_force(L0, 1e15, w, l, 0.0)
    assert pytest.approx(w * l * l / (8 * d), rel=10 * (d / l) ** 2) == H
    assert pytest.approx(-w * L0 / 2, rel=1e-12) == V
    assert catenary.sag(L0, 1e15, w, l, 0.0) == pytest.approx(d, rel=10 * (d / l) ** 2)


def test_common_catenary():
    """Inextensible and level: sag a (cosh(l/2a) - 1), length 2 a sinh(l/2a), with a = H/w."""
    a, l, w = 8.0, 20.0, 7.0
    L0 = 2 * a * np.sinh(l / (2 * a))
    H, _ = catenary.end_force(L0, 1e16, w, l, 0.0)
    assert pytest.approx(a * w, rel=1e-11) == H
    assert catenary.sag(L0, 1e16, w, l, 0.0) == pytest.approx(a * (np.cosh(l / (2 * a)) - 1), rel=1e-11)


@pytest.mark.parametrize(
    ("z", "doubled"), [(30.5, False), (-30.5, False), (12.0, True), (-12.0, True), (0.0, True)]
)
def test_vertical_rope(z, doubled):
    """Hanging straight: N grows by the weight; doubled back: each leg hangs from its own end."""
    L0, EA, w = 30.0, 1e5, 12.0
    H, V = catenary.end_force(L0, EA, w, 0.0, z)
    assert H == 0.0
    if doubled:
        down = np.array([-V / w, L0 + V / w])  # legs from the start and the end, unstressed
        assert (down > 0).all()
        stretched = down + w * down**2 / (2 * EA)
        assert stretched[1] - stretched[0] == pytest.approx(z, abs=1e-12 * L0)
        return
    lower = min(V, -V - w * L0, key=abs) if z < 0 else V
    stretch = (abs(lower) + w * L0 / 2) * L0 / EA
    assert L0 + stretch == pytest.approx(abs(z), rel=1e-13)


def test_a_nearly_plumb_rope_meets_the_plumb_one():
    for z in (30.5, 12.0, -12.0):
        plumb = catenary.end_force(30.0, 1e5, 12.0, 0.0, z)
        near = catenary.end_force(30.0, 1e5, 12.0, 1e-7, z)
        assert near == pytest.approx(plumb, abs=1e-4)


def test_reversed_rope_pulls_alike():
    L0, EA, w, x, z = ROPES["inclined, taut"]
    H, V = catenary.end_force(L0, EA, w, x, z)
    H2, V2 = catenary.end_force(L0, EA, w, x, -z)
    assert pytest.approx(H, rel=1e-11) == H2
    assert pytest.approx(-(V + w * L0), rel=1e-11) == V2


@settings(derandomize=True, max_examples=12, deadline=None)
@given(
    shape=st.floats(0.0, 1.0),
    steep=st.floats(-1.5, 1.5),
    stiff=st.floats(2.0, 5.5),
    chord=st.floats(0.5, 500.0),
)
def test_length_is_found_again_from_sag_and_from_tension(shape, steep, stiff, chord):
    """Over slack and taut, level and steep, stretchy and stiff ropes."""
    w = 9.0
    EA = w * chord * 10**stiff
    x, z = chord * np.cos(steep), chord * np.sin(steep)
    L0 = chord * (0.9999 + 0.2 * shape**3)
    wanted = catenary.sag(L0, EA, w, x, z)
    again = catenary.length_for_sag(wanted, EA, w, x, z)
    assert catenary.sag(again, EA, w, x, z) == pytest.approx(wanted, rel=1e-8)
    tension = catenary.lower_end_tension(L0, EA, w, x, z)
    found = catenary.length_for_tension(tension, EA, w, x, z)
    assert catenary.lower_end_tension(found, EA, w, x, z) == pytest.approx(tension, rel=1e-8)
    # Lengths with the same tension lie on either side of its minimum; the taut one is given.
    assert found <= L0 * (1 + 1e-9)


def test_points_lie_on_the_integrated_curve():
    L0, EA, w, x, z = ROPES["very stretchy"]
    H, V = catenary.end_force(L0, EA, w, x, z)
    curve = catenary.points(L0, EA, w, x, z, 5)
    assert (curve[:, 0] == 0).all()
    assert (curve[1] == 0).all()
    for s, point in zip(L0 * np.array([0.25, 0.5, 0.75, 1.0]), curve.T[1:], strict=True):
        assert point[[0, 2]] == pytest.approx(integrated(s, EA, w, H, V), abs=1e-10 * L0)


def test_impossible_sags_are_refused():
    """Even stretched a thousandfold this soft rope hangs lower than a tenth of a micron."""
    with pytest.raises(ValueError, match="no unstressed length"):
        catenary.length_for_sag(1e-7, 50.0, 12.0, 20.0, 0.0)


@pytest.mark.parametrize("w", [1e-2, 1e-5, 1e-8, 1e-12])
def test_weight_towards_nothing_is_the_tie(w):
    """A taut rope that weighs next to nothing is a straight elastic tie."""
    L0, EA, x, z = 10.2, 5e5, 20.0, 4.0
    chord = np.hypot(x, z)
    H, V = catenary.end_force(L0, EA, w, x, z)
    # Its ends differ by its weight over the rise, the lower one by half of that from the tie.
    assert np.hypot(H, V) == pytest.approx(EA * (chord / L0 - 1), rel=1e-9, abs=w * z)
