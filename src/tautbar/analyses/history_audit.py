"""What a march adds up: the energy ledger, peaks, slack episodes, and whether the ledger closes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.reach import contact_lost
from tautbar.analyses.scene import Scene
from tautbar.analyses.strength import Strength
from tautbar.mechanics.freedom import pushers
from tautbar.mechanics.loads import Acting
from tautbar.mechanics.turn import greatest_turn
from tautbar.records.fields import Field
from tautbar.records.peaks import Peaks
from tautbar.records.slack import SlackEpisodes
from tautbar.solvers.march import Marched
from tautbar.solvers.motion import Motion, Step

Array = NDArray[np.float64]
LEDGER_LIMIT = 1e-6  # of the energy turned over: kinetic, and what stored energies changed by
ROUNDING = 1e-13  # of the energy stored: a sum of that many rounded terms is no better
_QUANTITIES = {
    "displacement": ("m", "displacement", ("joint", "direction")),
    "velocity": ("m/s", "velocity", ("joint", "direction")),
    "acceleration": ("m/s2", "acceleration", ("joint", "direction")),
    "axial_force": ("N", "axial force", ("member",)),
    "reaction": ("N", "reaction", ("joint", "direction")),
}


class Tally:
    """Accumulates over every computed step; memory does not grow with their number.

    The ledger: unaccounted = kinetic + strain + load potential + damped + dissipated by the method
    - event work, less its value at the start.
    """

    def __init__(self, motion: Motion, scene: Scene, acting: Acting) -> None:
        s = motion.system.structure
        self.motion, self.scene, self.acting = motion, scene, acting
        shapes = {
            key: (s.joints, 3) if axes[0] == "joint" else (s.members,)
            for key, (_, _, axes) in _QUANTITIES.items()
        }
        self.peaks = {key: Peaks(shape) for key, shape in shapes.items()}
        self.slack = SlackEpisodes(s.can_slack)
        self.event_work = self.damped = self.dissipated = 0.0
        self.start_energy: float | None = None
        self.start_strain: float | None = None
        self.start_potential = 0.0
        self.turned_over = 0.0
        self.rounding = 0.0  # J, what rounding of the stored energies leaves
        self.worst = 0.0  # J, largest unaccounted so far
        self.steps = self.iterations = self.halvings = 0
        self.ringing = 0.0
        self.time = 0.0
        self.turn, self.turned_member = 0.0, -1  # rad, the farthest at any step
        self.move = 0.0  # m, farthest joint from the drawing
        self.strength = Strength.of(scene)
        self.one_way = pushers(scene.parts, scene.stage, s.joints)
        self.lifted: tuple[float, int] | None = None  # s, the first joint whose one-way support changes
        self.buckled: tuple[float, int] | None = None  # s, the first member past its Euler load

    def take(self, marched: Marched, values: dict[str, Array]) -> tuple[float, ...]:
        """Take in a step; its ledger row in the order of `ENERGY`."""
        step = marched.step
        for key, peaks in self.peaks.items():
            peaks.update(step.state.t, values[key])
        sp = self.motion.springs
        self.slack.update(step.state.t, -sp.sigma * step.stretch.e - sp.at_length, step.axial)
        self.steps += marched.number != 0
        self.iterations += step.iterations
        self.halvings = max(self.halvings, marched.halvings)
        self.ringing = max(self.ringing, step.ringing)
        self.time = step.state.t
        self._shape(step, values)
        self._contact(step, values)
        return self._ledger(step)

    def _contact(self, step: Step, values: dict[str, Array]) -> None:
        """A history keeps the one-way supports that hold at its start: notice the first that should not."""
        if self.lifted is not None or not self.one_way.any():
            return
        scale = np.append(step.axial, self.motion.dead)
        force, U = values["reaction"].T, values["displacement"].T
        lifts, sinks = contact_lost(self.scene, self.one_way, self.acting, force, U, scale)
        if lifts.any() or sinks.any():
            self.lifted = step.state.t, int(np.nonzero(lifts | sinks)[1][0])

    def _shape(self, step: Step, values: dict[str, Array]) -> None:
        """Is it still the structure as drawn?"""
        turn, member = greatest_turn(self.scene.structure, step.stretch.n)
        if turn > self.turn:
            self.turn, self.turned_member = turn, member
        U = values["displacement"]
        self.move = max(self.move, float(np.sqrt((U * U).sum(axis=1).max(initial=0.0))))
        past = -step.axial > self.strength.euler
        if self.buckled is None and past.any():
            self.buckled = step.state.t, int(past.argmax())

    def _ledger(self, step: Step) -> tuple[float, ...]:
        motion, state = self.motion, step.state
        self.event_work += step.event_work
        self.damped += step.damped
        self.dissipated += step.dissipated
        kinetic = motion.kinetic(state.v)
        strain = motion.strain(state.q, step.stretch)
        potential = -float(motion.dead @ state.q)
        total = kinetic + strain + potential + self.damped + self.dissipated - self.event_work
        if self.start_energy is None:
            self.start_energy = total
        left = total - self.start_energy
        if self.start_strain is None:
            self.start_strain, self.start_potential = strain, potential
        stored = abs(strain - self.start_strain) + abs(potential - self.start_potential)
        self.turned_over = max(self.turned_over, kinetic + stored + abs(self.event_work))
        self.rounding = max(self.rounding, ROUNDING * (abs(strain) + abs(potential)))
        self.worst = max(self.worst, abs(left)) if np.isfinite(left) else np.inf
        return (state.t, kinetic, strain, potential, self.event_work, self.damped, self.dissipated, left)

    @property
    def left_over(self) -> float:
        """Largest unaccounted energy as a share of the energy turned over (or in rounding of lengths)."""
        sp = self.motion.springs
        over = max(self.turned_over, 0.5 * float(sp.k.max(initial=0.0)) * sp.at_length**2)
        return max(self.worst - self.rounding, 0.0) / over if over > 0 else 0.0

    def faults(self, failure: str, advice: str) -> list[str]:
        """What is wrong with the run, in words; empty where the audit holds."""
        found = [failure] if failure else []
        if self.lifted is not None:
            time, joint = self.lifted
            found.append(
                f"the support that only pushes at {self.scene.parts.joints.names[joint]} would lift off or "
                f"set down at {time:.6g} s; a history keeps it as it is at the start"
            )
        if not self.left_over <= LEDGER_LIMIT:
            found.append(
                f"the energy ledger does not close: {self.left_over:.1e} of the energy turned over is "
                f"unaccounted for (limit {LEDGER_LIMIT:g}); {advice}"
            )
        return found

    def _axis(self, axis: str) -> str:
        named = {"joint": self.scene.joint_axis, "member": self.scene.member_axis}
        return named.get(axis, axis)

    def fields(self) -> dict[str, Field]:
        out: dict[str, Field] = {}
        for key, (unit, words, axes) in _QUANTITIES.items():
            out |= self.peaks[key].fields(key, unit, words, tuple(self._axis(a) for a in axes))
        out |= self.slack.fields(self._axis("member"))
        audit = {
            "energy_left_over": (self.left_over, "largest unaccounted energy, share of that turned over"),
            "energy_turned_over": (self.turned_over, "kinetic + strain + work at most"),
            "computed_steps": (self.steps, "steps computed, halved ones included"),
            "iterations": (self.iterations, "iterations made"),
            "greatest_halving": (self.halvings, "times a step was halved at most"),
            "ringing": (self.ringing, "largest gap of end force and mean force in a step"),
            "greatest_turn": (self.turn, "greatest turn of a bar or strut from its drawn direction"),
            "largest_displacement_over_size": (
                self.move / self.scene.structure.size,
                "farthest joint from the drawing over the model's size",
            ),
        }
        units = {"energy_turned_over": "J", "ringing": "N", "greatest_turn": "rad"}
        return out | {
            f"audit/{key}": Field(np.array(value), units.get(key, "1"), words)
            for key, (value, words) in audit.items()
        }
