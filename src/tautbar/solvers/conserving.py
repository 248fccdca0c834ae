"""The energy-conserving step: a discrete gradient that survives members going slack and snapping taut.

Sources: R. A. LaBudde and D. Greenspan, Numer. Math. 25 (1976) 323-346; J. C. Simo and N. Tarnow, ZAMP
43 (1992) 757-792. v1 - v0 = 2 (dq/dt - v0): the unknown is the increment dq, never the position,
whose rounding M x/dt^2 eps would stop the iteration.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import Factor
from tautbar.mechanics import members
from tautbar.mechanics.conserving import StepForce, step_force, step_force_linear
from tautbar.mechanics.members import Stretch
from tautbar.solvers.motion import Motion, State, Step
from tautbar.solvers.newton import KeptFactor, solve_step

Array = NDArray[np.float64]
TOLERANCE = 1e-10  # of the forces in play: keeps energy and angular momentum of a slack net to 3e-11


@dataclass
class EnergyConserving:
    """``capture``: a member slack at the start of a step is caught with chi = 1 when it snaps taut."""

    capture: bool = True
    kept: KeptFactor = field(default_factory=KeptFactor)

    def step(self, motion: Motion, now: State, t: float) -> Step:
        """Advance ``now`` to the time ``t`` [s], across no corner of an event.

        Raises
        ------
        StepNotConverged
            The march then takes half the step.
        """
        dt = t - now.t
        pushed = motion.system.freedom.gather(motion.events.mean(now.t, t))
        trial = _Trial(motion, now, dt, motion.dead + pushed, self.capture)
        guess = dt * now.v + 0.5 * dt * dt * now.pace
        dq, iterations = solve_step(trial, guess, self.kept, self.kept.key_of(dt, trial.on))
        return self._finish(motion, trial, dq, t, pushed, iterations)

    def _finish(
        self, motion: Motion, trial: _Trial, dq: Array, t: float, pushed: Array, iterations: int
    ) -> Step:
        trial.balance(dq)
        now, dt = trial.now, trial.dt
        q, v, st = now.q + dq, 2 * dq / dt - now.v, trial.after
        axial, _ = motion.axial(st, v)
        load = motion.dead + motion.event_force(t, 0.5 * (now.t + t))
        a = motion.over_mass(load - motion.internal(q, st, axial) - motion.drag(v, motion.carrying(st)))
        lost, by_viscosity = trial.forces.lost, trial.viscous_share
        dragged = float(motion.drag(dq / dt, trial.on) @ dq)
        damped = dragged + float(lost @ by_viscosity)
        dissipated = float(lost @ (1 - by_viscosity))
        ringing = float(np.abs(axial - trial.mean_axial()).max(initial=0.0))
        state = State(t, q, v, a, (v - now.v) / dt)
        return Step(
            state, st, axial, float(pushed @ dq), damped, dissipated, iterations, ringing, 0.5 * (now.t + t)
        )


class _Trial:
    """One energy-conserving step being solved for its displacement increment."""

    def __init__(self, motion: Motion, now: State, dt: float, load: Array, capture: bool) -> None:
        self.motion, self.now, self.dt, self.load = motion, now, dt, load
        self.before = motion.stretch(now.q)
        self.on = motion.carrying(self.before)
        viscous = 2 * motion.tau / dt
        self.chi = np.where(capture & ~self.on, np.maximum(1.0, viscous), viscous)
        self.viscous_share = np.divide(viscous, self.chi, out=np.zeros_like(viscous), where=self.chi > 0)
        self.inertia0 = motion.M @ now.v
        self.residual = load
        self.enough = 0.0

    def balance(self, dq: Array) -> _Trial:
        motion, now, dt = self.motion, self.now, self.dt
        self.after: Stretch = motion.stretch(now.q + dq)
        self.forces: StepForce = self._forces(dq)
        pull = motion.system.freedom.pull(self.forces.g * self.forces.middle)
        grounded = motion.system.spring @ (now.q + 0.5 * dq)
        drag = motion.drag(dq / dt, self.on)
        inertia = 2 * (motion.M @ (dq / dt) - self.inertia0) / dt
        self.residual = self.load - inertia - drag - pull - grounded
        forces = sum(float(np.abs(x).max(initial=0.0)) for x in (self.load, pull, grounded, drag, inertia))
        self.enough = TOLERANCE * forces + self._rounding()
        return self

    def _forces(self, dq: Array) -> StepForce:
        sp, motion = self.motion.springs, self.motion
        if motion.small:
            return step_force_linear(sp, self.before, self.after, self.chi)
        middle = sp.r0 + motion.system.apart(self.now.q + 0.5 * dq, motion.held)
        return step_force(sp, self.before, self.after, middle, self.chi)

    def _rounding(self) -> float:
        """What rounding leaves of the residual [N]; all there is where everything is slack."""
        sp, on = self.motion.springs, self.on
        # Elongations come from displacements: no worse than eps of those, or of the members' length.
        move = float(np.abs(self.now.q).max(initial=0.0)) + np.abs(self.before.e[on])
        stretch = (sp.k[on] * np.minimum(move, sp.L0[on])).max(initial=0.0)
        inertia = float(np.abs(self.inertia0).max(initial=0.0)) / self.dt
        return 8 * float(np.finfo(float).eps) * (inertia + float(stretch))

    def mean_axial(self) -> Array:
        """Mean axial force of the step (N,) [N]."""
        return np.asarray(self.forces.g * np.sqrt((self.forces.middle**2).sum(axis=0)))

    def symmetric_factor(self) -> Factor:
        """Cholesky of the form that equals the exact matrix where no member turns in the step."""
        f = self.forces
        length = np.maximum(np.sqrt((f.middle * f.middle).sum(axis=0)), 1e-300)
        turned = (f.middle * self.after.n).sum(axis=0)
        along, across = f.turn + f.slope * turned, f.turn
        blocks = members.tangent(f.middle / length, along, across)
        return self.motion.system.solver.cholesky(self._constant() + self.motion.system.member_lower(blocks))

    def exact_factor(self) -> Factor:
        """LU of the exact matrix, which is not symmetric."""
        f = self.forces
        blocks = members.unsymmetric(f.middle, self.after.n, f.slope, f.turn)
        constant = self._constant()[self.motion.system.pattern.full.mirror]
        return self.motion.system.solver.general(constant + self.motion.system.member_full(blocks))

    def _constant(self) -> Array:
        motion, dt = self.motion, self.dt
        return 2 / dt**2 * motion.M_lower + motion.C_lower(self.on) / dt + 0.5 * motion.system.spring_lower
