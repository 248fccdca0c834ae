"""Rayleigh damping: a mass part and a stiffness part fitted at given frequencies.

Source: R. W. Clough and J. Penzien, Dynamics of Structures, Rayleigh damping (from memory):
ratio = a0/(2 omega) + a1 omega/2.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from tautbar.model.parts import Damping


class Rayleigh(NamedTuple):
    """C = mass_part M + stiffness_part K."""

    mass_part: float  # 1/s
    stiffness_part: float  # s


def rayleigh(damping: Damping | None, with_mass_part: bool) -> Rayleigh:
    """Fit both parts at two frequencies, or the stiffness part alone at the highest one given.

    A single frequency with the mass part allowed takes half of the ratio from either part, which is
    where the sum of both is least there.
    """
    if damping is None:
        return Rayleigh(0.0, 0.0)
    omega = 2 * np.pi * np.array(damping.at)
    ratio = np.broadcast_to(np.array(damping.ratio), omega.shape)
    if not with_mass_part:
        top = int(omega.argmax())
        return Rayleigh(0.0, float(2 * ratio[top] / omega[top]))
    if omega.size == 1:
        return Rayleigh(float(ratio[0] * omega[0]), float(ratio[0] / omega[0]))
    a0, a1 = np.linalg.solve(np.stack([0.5 / omega, 0.5 * omega], axis=1), ratio)
    return Rayleigh(float(a0), float(a1))
