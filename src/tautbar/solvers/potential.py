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
from tautbar.mechanics.carriers import Carriers, Response, respond, tangent
from tautbar.mechanics.members import Springs, Stretch
from tautbar.mechanics.structure import HANGING, TIE
from tautbar.solvers.system import System

Array = NDArray[np.float64]


class Look(NamedTuple):
    """What there is to see at one position of the joints."""

    q: Array  # (n,) m
    response: Response
    residual: Array  # (n,) N
    energy: float  # J
    strain_energy: float  # J

    @property
    def stretch(self) -> Stretch:
        return self.response.stretch

    @property
    def axial(self) -> Array:
        """Axial force (N,) [N], the greatest along a hanging member."""
        return self.response.axial

    @property
    def imbalance(self) -> float:
        return float(np.abs(self.residual).max(initial=0.0))


@dataclass(frozen=True)
class Potential:
    """Energy under one loading; ``held`` (3, N) is how far held joints move member ends apart [m]."""

    system: System
    carriers: Carriers
    force: Array  # (n,) N
    held: Array  # (3, N) m
    small: bool = False  # geometry linearised about the drawing
    stressed: bool = False  # with the geometric stiffness of the forces also where geometry is small
    mu: float = 0.0  # N/m
    anchor: Array | None = None

    @property
    def springs(self) -> Springs:
        return self.carriers.springs

    @property
    def convex(self) -> bool:
        """Whether only ties and hanging ropes carry: then any equilibrium is the one of least energy."""
        s = self.system.structure
        return bool((~s.present | (s.kind == TIE) | (s.kind == HANGING)).all())

    def look(self, q: Array) -> Look:
        """Evaluate at ``q``; where a rope finds no shape the energy is not a number."""
        system = self.system
        response = respond(self.carriers, system.apart(q, self.held), self.small)
        grounded = system.spring @ q
        residual = self.force - system.freedom.pull(response.pull) - grounded
        strain = response.energy + 0.5 * float(q @ grounded) if response.found else np.nan
        energy = strain - float(self.force @ q)
        if self.anchor is not None:
            off = q - self.anchor
            residual = residual - self.mu * off
            energy += 0.5 * self.mu * float(off @ off)
        return Look(q, response, residual, energy, strain)

    def curvature(self, look: Look, carrying: NDArray[np.bool_] | None = None) -> Array:
        """Tangent stiffness, lower data; ``carrying`` (N,) overrides which members count as taut."""
        sp, st = self.springs, look.stretch
        on = members.taut(sp, st.e) if carrying is None else carrying
        flat = self.small and not self.stressed
        across = np.zeros(sp.members) if flat else look.axial / st.l
        return self._matrix(tangent(self.carriers, look.response, on, across), self.mu)

    def safe_curvature(self, look: Look) -> Array:
        """Tangent without its compressive geometric part, plus load/(10 size): positive definite."""
        sp, st = self.springs, look.stretch
        across = np.zeros(sp.members) if self.small else np.maximum(look.axial, 0.0) / st.l
        blocks = tangent(self.carriers, look.response, members.taut(sp, st.e), across)
        # Never so small beside the stiffness that a pivot would count as zero.
        shift = max(self.scale(look) / (10 * self.system.structure.size), 1e-11 * self._stiffest)
        return self._matrix(blocks, self.mu + shift)

    def _matrix(self, blocks: Array, shift: float) -> Array:
        lower = self.system.member_lower(blocks) + self.system.spring_lower
        lower[self.system.pattern.diagonal] += shift
        return lower

    def scale(self, look: Look) -> float:
        """The largest of applied joint load and member force [N], no less than rounding of lengths makes."""
        largest = max(np.abs(self.force).max(initial=0.0), np.abs(look.axial).max(initial=0.0))
        rounding = 1e-12 * (self._stiffest or 1.0) * self.system.structure.size
        return max(float(largest), rounding)

    def balanced(self, look: Look, tolerance: float) -> bool:
        """Is the residual within ``tolerance`` of the scale, or at the rounding of the largest force?

        A displacement is known to eps of its size, so a force no better than k times that.
        """
        move = np.abs(look.q).max(initial=0.0)
        floor = 8 * np.finfo(float).eps * max(self._stiffest * move, np.abs(look.axial).max(initial=0.0))
        return bool(look.imbalance <= max(tolerance * self.scale(look), float(floor)))

    @property
    def _stiffest(self) -> float:
        """Largest axial stiffness of any member [N/m]."""
        springs, ropes, _ = self.carriers
        hanging = 0.0 if ropes is None else float((ropes.EA / ropes.L0).max())
        return max(float(springs.k.max(initial=0.0)), hanging)

    def anchored(self, q: Array, mu: float) -> Potential:
        """The same with an over-damped pull [N/m] towards ``q``."""
        return replace(self, anchor=q, mu=mu)

    def softened(self, factor: float) -> Potential:
        """The same with all members' stiffness times ``factor``."""
        springs, ropes, at = self.carriers
        soft = None if ropes is None else ropes._replace(EA=ropes.EA * factor)
        return replace(self, carriers=Carriers(springs._replace(k=springs.k * factor), soft, at))
