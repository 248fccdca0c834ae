"""The conserving step's member force against its definition at 60 digits."""

from __future__ import annotations

import itertools

import mpmath
import numpy as np
import pytest

import plain
from tautbar.mechanics.conserving import step_force
from tautbar.mechanics.members import Springs, Stretch

L0, K = 2.0, 3.0e5
GAPS = [10.0**-p for p in range(1, 16)]
KINDS = {"bar": (1.0, True), "tie": (1.0, False), "strut": (-1.0, False)}
SIDES = {"taut-taut": (1, 1), "slack-taut": (-1, 1), "taut-slack": (1, -1), "slack-slack": (-1, -1)}


def kernel(kind, e0, e1, chi=0.0):
    """g, dg/dl1 and the loss of one member stretched along x from e0 to e1 (floats)."""
    sigma, two_way = KINDS[kind]
    one = np.ones(1)
    sp = Springs(
        np.array([[L0], [0], [0]]),
        L0 * one,
        L0 * one,
        0 * one,
        K * one,
        sigma * one,
        np.array([two_way]),
        0.0,
    )
    n = np.array([[1.0], [0], [0]])
    before, after = Stretch(e0 * one, n, (L0 + e0) * one), Stretch(e1 * one, n, (L0 + e1) * one)
    found = step_force(sp, before, after, n * (L0 + 0.5 * (e0 + e1)), chi * one)
    return found.g[0], found.slope[0], found.lost[0]


def exact(kind, e0, e1, chi=0.0):
    """The same by definition, the slope by a central difference whose step is far below any gap."""
    with mpmath.workdps(80):
        l0 = L0 + mpmath.mpf(e0)
        h = mpmath.mpf(10) ** -30

        def g(l1):
            return plain.step_strength(kind, mpmath.mpf(K), mpmath.mpf(L0), l0, l1, mpmath.mpf(chi))

        l1 = L0 + mpmath.mpf(e1)
        return float(g(l1)), float((g(l1 + h) - g(l1 - h)) / (2 * h))


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("case", SIDES)
@pytest.mark.parametrize("chi", [0.0, 0.3, 1.0])
def test_force_and_slope_at_all_gaps(kind, case, chi):
    """Lengths carry their own rounding (1e-16 of L0), so g is asked to 4 of those; slope to 16.

    Both are compared on the member's own scale, k and k/S: where they cancel to nothing, nothing is
    what the formula must give there as well.
    """
    way = -1 if kind == "strut" else 1
    s0, s1 = SIDES[case]
    for a, b in itertools.product(GAPS, GAPS[::4]):
        e0, e1 = way * s0 * a, way * s1 * b * 0.7
        g, slope, _ = kernel(kind, e0, e1, chi)
        g_true, slope_true = exact(kind, e0, e1, chi)
        assert abs(g - g_true) <= 4 * 2.3e-16 * max(abs(g_true), K * max(a, b) / (2 * L0)), (e0, e1)
        assert abs(slope - slope_true) <= 16 * 2.3e-16 * K * (1 + chi) / (2 * L0), (e0, e1)


@pytest.mark.parametrize("kind", KINDS)
def test_unmoved_member_keeps_its_static_force(kind):
    """l1 = l0, where the definition is 0/0: g must be N/l, with slack members at nothing."""
    for e in (-0.03, -1e-9, 0.0, 1e-9, 0.03):
        N = K * e if plain.carries(kind, e) else 0.0
        g, slope, lost = kernel(kind, e, e)
        assert g == pytest.approx(N / (L0 + e), rel=1e-15, abs=0.0)
        assert np.isfinite(slope)
        assert lost == 0.0


def test_work_is_the_change_of_energy_and_the_loss_is_never_a_gain():
    rng = np.random.default_rng(1)
    for kind, chi in itertools.product(KINDS, (0.0, 0.3, 1.0, 4.0)):
        for e0, e1 in rng.uniform(-0.2, 0.2, size=(200, 2)):
            g, slope, lost = kernel(kind, e0, e1, chi)
            work = g * ((L0 + e1) ** 2 - (L0 + e0) ** 2) / 2
            stored = [
                plain.axial_force(plain.Rod(0, 1, kind, K * L0, L0), L0 + e) ** 2 / (2 * K) for e in (e0, e1)
            ]
            # Energies of 1e4 J: their difference is known to some 1e-12 of that.
            assert work == pytest.approx(stored[1] - stored[0] + lost, abs=1e-8)
            assert lost >= -1e-12
            if kind == "tie" and chi <= 1:
                assert g >= 0
                assert slope >= 0


def test_a_damped_tie_lets_go_rather_than_push():
    """chi = 4 while it shortens quickly: a damper would push; the tie carries nothing, and books it all."""
    g, slope, lost = kernel("tie", 0.01, 0.004, chi=4.0)
    assert (g, slope) == (0.0, 0.0)
    assert lost == pytest.approx(K * (0.01**2 - 0.004**2) / 2, rel=1e-12)
