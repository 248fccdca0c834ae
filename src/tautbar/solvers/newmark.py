"""Newmark's method. Source: N. M. Newmark, J. Eng. Mech. Div. ASCE 85 (1959) 67-94.

Displacement, velocity and acceleration are corrected in place: u rebuilt from a would lose
(omega dt)^2 in rounding.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import Factor
from tautbar.mechanics import members
from tautbar.solvers.motion import Motion, State, Step
from tautbar.solvers.newton import KeptFactor, solve_step

Array = NDArray[np.float64]
TOLERANCE = 1e-9  # of the forces in play: leaves about 1e-11 of the energy unaccounted


@dataclass
class Newmark:
    """Second order for gamma = 1/2; beta = 1/4 is the average-acceleration rule."""

    beta: float = 0.25
    gamma: float = 0.5
    kept: KeptFactor = field(default_factory=KeptFactor)

    def step(self, motion: Motion, now: State, t: float) -> Step:
        """Advance ``now`` to the time ``t`` [s], across no corner of an event.

        Raises
        ------
        StepNotConverged
            The march then takes half the step.
        """
        dt, inside = t - now.t, 0.5 * (now.t + t)
        before = motion.stretch(now.q)
        p0, p1 = motion.event_force(now.t, inside), motion.event_force(t, inside)
        a0 = self._acceleration(motion, now, dt, p0)
        trial = _Trial(self, motion, now, a0, dt, motion.dead + p1, motion.carrying(before))
        guess = dt * now.v + 0.5 * dt * dt * a0
        key = self.kept.key_of(dt, trial.on)
        dq, iterations = solve_step(trial, guess, self.kept, key)
        q, v, a = trial.motion_at(dq)
        st = motion.stretch(q)
        axial, elastic = motion.axial(st, v)
        axial0, elastic0 = motion.axial(before, now.v)
        viscous = motion.system.freedom.pull((axial - elastic) * st.n + (axial0 - elastic0) * before.n)
        damped = 0.5 * float((motion.drag(now.v, trial.on) + motion.drag(v, trial.on) + viscous) @ dq)
        work = 0.5 * float((p0 + p1) @ dq)
        return Step(State(t, q, v, a, a), st, axial, work, damped, 0.0, iterations, 0.0, inside)

    def _acceleration(self, motion: Motion, now: State, dt: float, p0: Array) -> Array:
        """Acceleration just after the start of the step: another one where an event force jumps."""
        if now.t == 0.0:
            return now.a
        jump = p0 - motion.event_force(now.t, now.t - 2e-9 * dt)
        return now.a + motion.over_mass(jump) if jump.any() else now.a


class _Trial:
    """One Newmark step being solved for its displacement increment."""

    def __init__(
        self,
        method: Newmark,
        motion: Motion,
        now: State,
        a0: Array,
        dt: float,
        load: Array,
        on: NDArray[np.bool_],
    ) -> None:
        self.motion, self.now, self.dt, self.load, self.on = motion, now, dt, load, on
        self.per_v = method.gamma / (method.beta * dt)
        self.per_a = 1.0 / (method.beta * dt * dt)
        self.first = dt * now.v + 0.5 * dt * dt * a0  # the increment if the acceleration stays
        self.thrown = self.per_a * float(
            np.abs(motion.M @ self.first).max(initial=0.0)
        )  # N, rounds in free flight
        self.a0 = a0
        self.residual = load
        self.enough = 0.0

    def motion_at(self, dq: Array) -> tuple[Array, Array, Array]:
        """Displacement, velocity and acceleration at the end of the step for an increment."""
        off = dq - self.first
        a = self.a0 + self.per_a * off
        v = self.now.v + self.dt * self.a0 + self.per_v * off
        return self.now.q + dq, v, a

    def balance(self, dq: Array) -> _Trial:
        motion = self.motion
        q, v, a = self.motion_at(dq)
        self.st = motion.stretch(q)
        self.axial, _ = motion.axial(self.st, v)
        inertia, drag = motion.M @ a, motion.drag(v, self.on)
        internal = motion.internal(q, self.st, self.axial)
        self.residual = self.load - inertia - drag - internal
        largest = sum(float(np.abs(x).max(initial=0.0)) for x in (self.load, inertia, drag, internal))
        k = float(motion.springs.k.max(initial=0.0))
        floor = 8 * np.finfo(float).eps * (k * float(np.abs(q).max(initial=0.0)) + self.thrown)
        self.enough = max(TOLERANCE * largest, floor)
        return self

    def symmetric_factor(self) -> Factor:
        return self.motion.system.solver.cholesky(self._matrix())

    def exact_factor(self) -> Factor:
        return self.motion.system.solver.symmetric(self._matrix())

    def _matrix(self) -> Array:
        motion, sp = self.motion, self.motion.springs
        along = sp.k * members.taut(sp, self.st.e) * (1 + motion.tau * self.per_v)
        across = np.zeros(sp.members) if motion.small else self.axial / self.st.l
        lower = motion.system.member_lower(members.tangent(self.st.n, along, across))
        return (
            lower
            + motion.system.spring_lower
            + self.per_a * motion.M_lower
            + self.per_v * motion.C_lower(self.on)
        )
