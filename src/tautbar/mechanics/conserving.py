"""Member forces over a step that do exactly the work of the strain energy's change.

Discrete gradient in the form of R. A. LaBudde and D. Greenspan, Numer. Math. 25 (1976) 323-346, also
across the slack/taut kink. With p the carried elongation, S = l0 + l1, t the share of the length
change that is carried and A = (1 + chi) p1 + (1 - chi) p0 the force is g (r0 + r1)/2 with
g = sigma k t A/S. chi = 0 conserves energy; chi = 1 catches a snap; chi = 2 tau/dt is Kelvin-Voigt
viscosity. Nothing divides by l1 - l0.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.members import Springs, Stretch, carried

Array = NDArray[np.float64]


class StepForce(NamedTuple):
    """Member forces over one step, (N,) or (3, N)."""

    g: Array  # N/m: the force is g times the vector `middle`
    slope: Array  # N/m2: dg/dl1
    turn: Array  # N/m: stiffness against the turning of `middle`
    middle: Array  # (3, N) m, mid-step vector from start to end
    lost: Array  # J, energy that chi took from each member


def step_force(sp: Springs, before: Stretch, after: Stretch, r_mid: Array, chi: Array) -> StepForce:
    """Force, its slope and its loss over a step from ``before`` to ``after``.

    Parameters
    ----------
    r_mid : (3, N)
        Mean of the member vectors at both ends of the step [m].
    chi : (N,)
        Share of the elongation's change that is resisted as by a damper, 0 or more.
    """
    tA, q, lost = _carried_twice(sp, before.e, after.e, chi)
    S = before.l + after.l
    g = sp.sigma * sp.k * tA / S
    return StepForce(g, (sp.k * q - g) / S, 0.5 * g, r_mid, lost)


def step_force_linear(sp: Springs, before: Stretch, after: Stretch, chi: Array) -> StepForce:
    """The same with geometry linearised about the drawing: along the drawn unit vector."""
    tA, q, lost = _carried_twice(sp, before.e, after.e, chi)
    g = 0.5 * sp.sigma * sp.k * tA
    return StepForce(g, 0.5 * sp.k * q, np.zeros_like(g), after.n, lost)


def _carried_twice(sp: Springs, e0: Array, e1: Array, chi: Array) -> tuple[Array, Array, Array]:
    """t A [m], its derivative q over the end's elongation, and the energy lost [J]."""
    p0, p1 = carried(sp, e0) * sp.sigma, carried(sp, e1) * sp.sigma
    t, q = _shares(sp, e0, e1, chi)
    A = (1 + chi) * p1 + (1 - chi) * p0
    pushed = ~sp.two_way & (A < 0)  # a damper cannot make a tie push
    A = np.where(pushed, 0.0, A)
    return t * A, np.where(pushed, 0.0, q), 0.5 * sp.k * (p1 - p0) * (A - p1 - p0)


def _shares(sp: Springs, e0: Array, e1: Array, chi: Array) -> tuple[Array, Array]:
    """t and q = d(t A)/d(sigma e1) of the four cases: taut or slack at either end of the step."""
    s0, s1 = sp.sigma * e0, sp.sigma * e1
    on0, on1 = sp.two_way | (s0 > 0), sp.two_way | (s1 > 0)
    span = np.abs(s0) + np.abs(s1)
    span = np.where(span > 0, span, 1.0)  # 0/0 only where nothing is carried
    t = np.where(on0 & on1, 1.0, np.where(on1, s1 / span, np.where(on0, s0 / span, 0.0)))
    q = np.where(
        on0 & on1,
        1 + chi,
        np.where(on1, (1 + chi) * t * (2 - t), np.where(on0, (1 - chi) * t * t, 0.0)),
    )
    return t, q
