"""The equations of motion M a + C v + f(q, v) = P + p(t) over the free unknowns, and what a step is.

P are the dead loads, p(t) the events. C is Rayleigh's: the mass part times M, and the stiffness part
times each member's tangent at the start, only while that member is taut.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import Factor
from tautbar.mechanics import members
from tautbar.mechanics.damping import Rayleigh
from tautbar.mechanics.members import Springs, Stretch
from tautbar.mechanics.product import Product
from tautbar.mechanics.pulses import EventForces
from tautbar.solvers.system import System

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]


class State(NamedTuple):
    """Motion at one instant, over the free unknowns. ``pace`` is the last step's mean acceleration."""

    t: float  # s
    q: Array  # m, (n,)
    v: Array  # m/s
    a: Array  # m/s2
    pace: Array  # m/s2, what the next step expects


class Step(NamedTuple):
    """A step taken: the new state, and what the step did to the energy [J]."""

    state: State
    stretch: Stretch
    axial: Array  # (N,) N at the end, viscosity included
    event_work: float
    damped: float
    dissipated: float  # by the method, by design
    iterations: int
    ringing: float  # N, largest gap between end force and the step's mean force
    inside: float  # s, an instant within the step, which tells the side of a jump its end is on


class StepNotConverged(Exception):
    """The iteration of one step failed; the march takes half of it."""


class Stepper(Protocol):
    """One step of the equations of motion: a function of the state before it."""

    def step(self, motion: Motion, now: State, t: float) -> Step: ...


@dataclass(frozen=True)
class Motion:
    """What a stepper may ask of a structure."""

    system: System
    springs: Springs
    held: Array  # (3, N) m, member ends moved apart by held joints
    dead: Array  # (n,) N
    events: EventForces
    joint_mass: Product  # (J, J) kg
    rayleigh: Rayleigh
    damper_blocks: Array  # (6, N) N s/m of each member while taut
    small: bool = False

    @cached_property
    def M(self) -> Product:
        return Product(self.system.free_mass(self.joint_mass.matrix))

    @cached_property
    def M_lower(self) -> Array:
        return self.system.lower_of(self.M.matrix)

    @cached_property
    def _has_mass(self) -> Flags:
        return np.asarray(self.M.matrix.diagonal() > 0)

    @cached_property
    def tau(self) -> Array:
        return self.system.structure.tau

    @cached_property
    def viscous(self) -> bool:
        return bool(self.tau.any())

    @cached_property
    def _mass_factor(self) -> Factor:
        lower = self.M_lower.copy()
        diagonal = lower[self.system.pattern.diagonal]
        lower[self.system.pattern.diagonal] = np.where(diagonal > 0, diagonal, 1.0)
        return self.system.solver.cholesky(lower)

    def over_mass(self, force: Array) -> Array:
        """M^-1 force [m/s2]; zero for unknowns without mass, whose acceleration nothing decides."""
        return np.where(self._has_mass, self._mass_factor.solve(force), 0.0)

    def stretch(self, q: Array) -> Stretch:
        du = self.system.apart(q, self.held)
        return members.stretch_linear(self.springs, du) if self.small else members.stretch(self.springs, du)

    def rates(self, st: Stretch, v: Array) -> Array:
        """Rate of elongation of each member (N,) [m/s]."""
        return np.asarray((st.n * self.system.apart(v)).sum(axis=0))

    def axial(self, st: Stretch, v: Array) -> tuple[Array, Array]:
        """Axial force with viscosity, and the elastic one alone, (N,) [N]. A tie never pushes."""
        sp = self.springs
        elastic = members.force(sp, st.e)
        if not self.viscous:
            return elastic, elastic
        on = sp.two_way | (sp.sigma * st.e > 0)
        whole = elastic + np.where(on, sp.k * self.tau * self.rates(st, v), 0.0)
        pushed = ~sp.two_way & (sp.sigma * whole < 0)
        return np.where(pushed, 0.0, whole), elastic

    def internal(self, q: Array, st: Stretch, axial: Array) -> Array:
        """Force of members and springs on the free unknowns (n,) [N]."""
        return self.system.freedom.pull(axial * st.n) + self.system.spring @ q

    def carrying(self, st: Stretch) -> Flags:
        """The *state* taut (N,): a tie exactly at its length is, whatever rounding says."""
        return members.taut(self.springs, st.e)

    def drag(self, v: Array, on: Flags) -> Array:
        """Rayleigh damping force C v (n,) [N], members not ``on`` left out."""
        force = self.rayleigh.mass_part * (self.M @ v)
        if self.rayleigh.stiffness_part:
            ends = members.block_times(self.damper_blocks * on, self.system.apart(v))
            force = (
                force
                + self.system.freedom.pull(ends)
                + self.rayleigh.stiffness_part * (self.system.spring @ v)
            )
        return np.asarray(force)

    def C_lower(self, on: Flags) -> Array:
        """Rayleigh damping matrix, lower data [N s/m]."""
        lower = self.rayleigh.mass_part * self.M_lower
        if self.rayleigh.stiffness_part:
            lower = lower + self.system.member_lower(self.damper_blocks * on)
            lower = lower + self.rayleigh.stiffness_part * self.system.spring_lower
        return lower

    def event_force(self, t: float, inside: float) -> Array:
        return self.system.freedom.gather(self.events.at(t, inside))

    def start(self, q: Array, v: Array, first_step: float) -> Step:
        """The state at t = 0 as a step that took no time, in balance with what acts just after it."""
        st = self.stretch(q)
        axial, _ = self.axial(st, v)
        corners = self.events.landings(first_step)
        inside = 0.5 * float(np.append(corners[corners > 1e-9 * first_step], first_step).min())
        load = self.dead + self.event_force(0.0, inside)
        a = self.over_mass(load - self.internal(q, st, axial) - self.drag(v, self.carrying(st)))
        return Step(State(0.0, q, v, a, a), st, axial, 0.0, 0.0, 0.0, 0, 0.0, inside)

    def joint_forces(self, step: Step, V: Array, A: Array) -> Array:
        """What every joint (3, J) needs [N]: member pull, inertia and damping, springs left out."""
        system, st = self.system, step.stretch
        needed = system.freedom.joint_pull(step.axial * st.n) + (self.joint_mass @ A.T).T
        if self.rayleigh.mass_part:
            needed = needed + self.rayleigh.mass_part * (self.joint_mass @ V.T).T
        if self.rayleigh.stiffness_part:
            blocks = self.damper_blocks * self.carrying(st)
            ends = members.block_times(blocks, system.apart(step.state.v))
            needed = needed + system.freedom.joint_pull(ends)
            needed = needed + self.rayleigh.stiffness_part * system.freedom.grounded(V)
        return np.asarray(needed)

    def kinetic(self, v: Array) -> float:
        return float(0.5 * (v @ (self.M @ v)))

    def strain(self, q: Array, st: Stretch) -> float:
        return members.energy(self.springs, st.e) + 0.5 * float(q @ (self.system.spring @ q))


def damper_blocks(springs: Springs, st: Stretch, axial: Array, stiffness_part: float, small: bool) -> Array:
    """Stiffness part of Rayleigh damping: each member's tangent at the start of the history (6, N).

    Its compressive geometric part is left out: a damper must never feed energy in.
    """
    across = np.zeros(springs.members) if small else np.maximum(axial, 0.0) / st.l
    return stiffness_part * members.tangent(st.n, springs.k, across)
