"""What a march adds up: the energy ledger, peaks, slack episodes, and whether the ledger closes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tautbar.records.fields import Field
from tautbar.records.peaks import Peaks
from tautbar.records.slack import SlackEpisodes
from tautbar.solvers.march import Marched
from tautbar.solvers.motion import Motion, Step

Array = NDArray[np.float64]
LEDGER_LIMIT = 1e-6  # of the energy turned over
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

    def __init__(self, motion: Motion) -> None:
        s = motion.system.structure
        self.motion = motion
        shapes = {
            key: (s.joints, 3) if axes[0] == "joint" else (s.members,)
            for key, (_, _, axes) in _QUANTITIES.items()
        }
        self.peaks = {key: Peaks(shape) for key, shape in shapes.items()}
        self.slack = SlackEpisodes(s.can_slack)
        self.event_work = self.damped = self.dissipated = 0.0
        self.start_energy: float | None = None
        self.turned_over = 0.0
        self.worst = 0.0  # J, largest unaccounted so far
        self.steps = self.iterations = self.halvings = 0
        self.ringing = 0.0
        self.time = 0.0
        self.end_share = 0.0

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
        return self._ledger(step)

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
        self.turned_over = max(self.turned_over, kinetic + strain + abs(self.event_work))
        self.worst = max(self.worst, abs(left)) if np.isfinite(left) else np.inf
        return (state.t, kinetic, strain, potential, self.event_work, self.damped, self.dissipated, left)

    @property
    def left_over(self) -> float:
        """Largest unaccounted energy as a share of the energy turned over (or in rounding of lengths)."""
        sp = self.motion.springs
        over = max(self.turned_over, 0.5 * float(sp.k.max(initial=0.0)) * sp.at_length**2)
        return self.worst / over if over > 0 else 0.0

    def faults(self, failure: str) -> list[str]:
        """What is wrong with the run, in words; empty where the audit holds."""
        found = [failure] if failure else []
        if not self.left_over <= LEDGER_LIMIT:
            found.append(
                f"the energy ledger does not close: {self.left_over:.1e} of the energy turned over is "
                f"unaccounted for (limit {LEDGER_LIMIT:g})"
            )
        return found

    def fields(self) -> dict[str, Field]:
        out: dict[str, Field] = {}
        for key, (unit, words, axes) in _QUANTITIES.items():
            out |= self.peaks[key].fields(key, unit, words, axes)
        out |= self.slack.fields()
        audit = {
            "energy_left_over": (self.left_over, "largest unaccounted energy, share of that turned over"),
            "energy_turned_over": (self.turned_over, "kinetic + strain + work at most"),
            "computed_steps": (self.steps, "steps computed, halved ones included"),
            "iterations": (self.iterations, "iterations made"),
            "greatest_halving": (self.halvings, "times a step was halved at most"),
            "ringing": (self.ringing, "largest gap of end force and mean force in a step"),
        }
        units = {"energy_turned_over": "J", "ringing": "N"}
        return out | {
            f"audit/{key}": Field(np.array(value), units.get(key, "1"), words)
            for key, (value, words) in audit.items()
        }
