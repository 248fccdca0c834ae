"""The potential energy of a structure under dead loads, its slope (the residual) and its curvature.

E(q) = strain energy of members and springs - P.q, and where an anchor is set + mu/2 |q - anchor|^2.
The residual is -dE/dq = P - f(q), zero in equilibrium.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics import members
from tautbar.mechanics.members import Springs, Stretch
from tautbar.solvers.system import System

Array = NDArray[np.float64]


class Look(NamedTuple):
    """What there is to see at one position of the joints."""

    q: Array  # (n,) m
    stretch: Stretch
    axial: Array  # (N,) N
    residual: Array  # (n,) N
    energy: float  # J
    strain_energy: float  # J

    @property
    def imbalance(self) -> float:
        return float(np.abs(self.residual).max(initial=0.0))


@dataclass(frozen=True)
class Potential:
    """Energy under one loading; ``held`` (3, N) is how far held joints move member ends apart [m]."""

    system: System
    springs: Springs
    force: Array  # (n,) N
    held: Array  # (3, N) m
    small: bool = False  # geometry linearised about the drawing
    mu: float = 0.0  # N/m
    anchor: Array | None = None

    def look(self, q: Array) -> Look:
        """Evaluate at ``q``."""
        sp, system = self.springs, self.system
        du = system.apart(q, self.held)
        st = members.stretch_linear(sp, du) if self.small else members.stretch(sp, du)
        axial = members.force(sp, st.e)
        grounded = system.spring @ q
        residual = self.force - system.pull(axial, st.n) - grounded
        strain = members.energy(sp, st.e) + 0.5 * float(q @ grounded)
        energy = strain - float(self.force @ q)
        if self.anchor is not None:
            off = q - self.anchor
            residual = residual - self.mu * off
            energy += 0.5 * self.mu * float(off @ off)
        return Look(q, st, axial, residual, energy, strain)

    def curvature(self, look: Look, carrying: NDArray[np.bool_] | None = None) -> Array:
        """Tangent stiffness, lower data; ``carrying`` (N,) overrides which members count as taut."""
        sp, st = self.springs, look.stretch
        on = members.taut(sp, st.e) if carrying is None else carrying
        across = np.zeros(sp.members) if self.small else look.axial / st.l
        return self._matrix(members.tangent(st.n, sp.k * on, across), self.mu)

    def safe_curvature(self, look: Look) -> Array:
        """Tangent without its compressive geometric part, plus load/(10 size): positive definite."""
        sp, st = self.springs, look.stretch
        across = np.zeros(sp.members) if self.small else np.maximum(look.axial, 0.0) / st.l
        blocks = members.tangent(st.n, sp.k * members.taut(sp, st.e), across)
        return self._matrix(blocks, self.mu + self.scale(look) / (10 * self.system.structure.size))

    def _matrix(self, blocks: Array, shift: float) -> Array:
        lower = self.system.member_lower(blocks) + self.system.spring_lower
        lower[self.system.pattern.diagonal] += shift
        return lower

    def scale(self, look: Look) -> float:
        """The largest of applied joint load and member force [N], no less than rounding of lengths makes."""
        largest = max(np.abs(self.force).max(initial=0.0), np.abs(look.axial).max(initial=0.0))
        rounding = 1e-12 * float(self.springs.k.max(initial=1.0)) * self.system.structure.size
        return max(float(largest), rounding)

    def balanced(self, look: Look, tolerance: float) -> bool:
        """Is the residual within ``tolerance`` of the scale, or at the rounding of the largest force?

        A displacement is known to eps of its size, so a force no better than k times that.
        """
        k, move = self.springs.k.max(initial=0.0), np.abs(look.q).max(initial=0.0)
        floor = 8 * np.finfo(float).eps * k * max(move, np.abs(look.stretch.e).max(initial=0.0))
        return bool(look.imbalance <= max(tolerance * self.scale(look), float(floor)))

    def anchored(self, q: Array, mu: float) -> Potential:
        """The same with an over-damped pull [N/m] towards ``q``."""
        return replace(self, anchor=q, mu=mu)

    def softened(self, factor: float) -> Potential:
        """The same with all members' stiffness times ``factor``."""
        return replace(self, springs=self.springs._replace(k=self.springs.k * factor))
