"""Transient response: the march over time with its ledger, peaks and slack episodes."""

from __future__ import annotations

import time
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context
from tautbar.analyses.history_audit import Tally
from tautbar.analyses.history_facts import Choices, Facts
from tautbar.analyses.history_warnings import warnings
from tautbar.analyses.history_words import audit_lines, outcome
from tautbar.analyses.pieces import begin, finer_members, piece_names
from tautbar.analyses.words import changes
from tautbar.errors import NotConverged
from tautbar.mechanics.product import Product
from tautbar.mechanics.pulses import event_forces
from tautbar.model.parts import History
from tautbar.records.fields import Field, Record
from tautbar.records.frames import Frame, StreamedField
from tautbar.solvers.conserving import EnergyConserving
from tautbar.solvers.march import Marched, march, step_times
from tautbar.solvers.motion import Motion, Step, Stepper, damper_blocks
from tautbar.solvers.newmark import Newmark

Array = NDArray[np.float64]
SOURCES = {
    "newmark": "N. M. Newmark, J. Eng. Mech. Div. ASCE 85 (1959) 67-94",
    "energy-conserving": "discrete gradient: R. A. LaBudde and D. Greenspan, Numer. Math. 25 (1976) 323-346",
}


@dataclass
class HistoryRun(Facts):
    """One history on its way; `frames` marches, `record` tells what was found."""

    began: float = field(default_factory=time.perf_counter)

    kind = "history"

    @property
    def name(self) -> str:
        return self.analysis.name

    @property
    def acting(self) -> tuple[str, ...]:
        events = "; events: " + ", ".join(self.analysis.events) if self.analysis.events else ""
        return (f"{self.rest.loading.name}: {self.rest.loading.acting}{events}",)

    @property
    def settings(self) -> Mapping[str, object]:
        a, c = self.analysis, self.choices
        out: dict[str, object] = {
            "from": a.start.analysis if a.start else "the drawing, at rest",
            "method": c.method,
            "duration": a.duration,
            "time_step": a.time_step,
            "mass": "lumped" if c.lumped else "consistent",
            "geometry": a.geometry,
            "rayleigh_mass_part": c.rayleigh.mass_part,
            "rayleigh_stiffness_part": c.rayleigh.stiffness_part,
            "pieces": a.pieces or "as the model says",
        } | dict(self.changed)
        if c.method == "newmark":
            return out | {"beta": a.beta, "gamma": a.gamma}
        return out | {"snap_loss": a.snap_loss}

    @property
    def streamed(self) -> Mapping[str, StreamedField]:
        return {
            path: StreamedField(unit, words, ("time", *axes), shape, self._dtype)
            for path, (unit, words, axes, shape) in self._layout().items()
        }

    @property
    def _dtype(self) -> str:
        return "float64" if self.analysis.precision == "double" else "float32"

    def _layout(self) -> dict[str, tuple[str, str, tuple[str, ...], tuple[int, ...]]]:
        store = self.analysis.store
        J = len(self.context.joint_names) if store.joints is None else len(store.joints)
        N = len(self.context.member_names) if store.members is None else len(store.members)
        joint = (self.rest.scene.joint_axis if store.joints is None else "stored_joint", "direction")
        member = (self.rest.scene.member_axis if store.members is None else "stored_member",)
        return {
            "displacement": ("m", "displacement from the drawn position", joint, (J, 3)),
            "velocity": ("m/s", "velocity", joint, (J, 3)),
            "acceleration": ("m/s2", "acceleration", joint, (J, 3)),
            "axial_force": ("N", "axial force, tension positive", member, (N,)),
            "reaction": ("N", "force of supports on the structure", joint, (J, 3)),
        }

    def frames(self) -> Iterator[Frame]:
        """March to the end; a step that finds no balance ends it, and is told in the record."""
        times = step_times(self.analysis.duration, self.analysis.time_step)
        first = self.motion.start(self.rest.q, np.zeros(self.rest.scene.system.n), float(times[1]))
        try:
            for marched in march(self.motion, self._stepper(), first, times):
                frame = self._frame(marched, times.size - 1)
                if frame is not None:
                    yield frame
        except NotConverged as stop:
            self.failure = str(stop)

    def _stepper(self) -> Stepper:
        if self.choices.method == "newmark":
            return Newmark(self.analysis.beta, self.analysis.gamma)
        return EnergyConserving(capture=self.analysis.snap_loss == "capture")

    def _frame(self, marched: Marched, last: int) -> Frame | None:
        """Take a computed step into the tally; a frame where it completes a regular step."""
        values = self._values(marched.step)
        energy = self.tally.take(marched, values)
        if marched.number is None:
            return None
        stored = marched.number % self.analysis.store.every == 0 or marched.number == last
        return Frame(marched.step.state.t, energy, self._kept(values) if stored else None)

    def _values(self, step: Step) -> dict[str, Array]:
        """All quantities of a step, joints first: (J, 3) and (N,)."""
        scene, state = self.rest.scene, step.state
        spread = scene.system.freedom.spread
        U = scene.displacement(state.q, self.rest.acting)
        V, A = spread(state.v), spread(state.a)
        return {
            "displacement": U.T,
            "velocity": V.T,
            "acceleration": A.T,
            "axial_force": step.axial,
            "reaction": self._reaction(step, U, V, A).T,
        }

    def _reaction(self, step: Step, U: Array, V: Array, A: Array) -> Array:
        """Forces of supports (3, J) [N]: what held joints need, inertia and damping included."""
        motion = self.motion
        needed = motion.joint_forces(step, V, A)
        acting = self.rest.acting.force + motion.events.at(step.state.t, step.inside)
        return self.rest.scene.reaction(needed, acting, U)

    def _kept(self, values: dict[str, Array]) -> dict[str, Array]:
        store = self.analysis.store
        if store.joints is None and store.members is None:
            return values
        joints = slice(None) if store.joints is None else list(store.joints)
        members = slice(None) if store.members is None else list(store.members)
        return {k: v[members if k == "axial_force" else joints] for k, v in values.items()}

    def _names_stored(self) -> dict[str, Field]:
        """Names along the axes of a history that stores some joints or members only."""
        out: dict[str, Field] = {}
        store, context = self.analysis.store, self.context
        for axis, which, names in (
            ("stored_joint", store.joints, context.joint_names),
            ("stored_member", store.members, context.member_names),
        ):
            if which is not None:
                kept = np.array([names[i] for i in which], dtype=np.object_)
                out[axis] = Field(kept, "1", f"{axis.removeprefix('stored_')}s stored", (axis,))
        return out

    def record(self, status_if_cut: str | None = None) -> Record:
        """Peaks, slack episodes and audit of the steps marched so far."""
        advice = "take shorter steps"
        if self.choices.method == "newmark":
            advice += ', or method = "energy-conserving"'
        faults = self.tally.faults(self.failure, advice)
        status = status_if_cut or ("failed" if faults else "complete")
        if self.failure:
            status = "failed"
        return Record(
            name=self.name,
            kind=self.kind,
            status=status,
            outcome=outcome(self, faults, status),
            acting=self.acting,
            settings=self.settings,
            fields=self.rest.scene.present
            | self.tally.fields()
            | self._names_stored()
            | piece_names(self.rest.scene),
            audit_lines=audit_lines(self),
            warnings=(*self.said, *warnings(self)),
            sources=(SOURCES[self.choices.method],),
            wall_time=time.perf_counter() - self.began,
        )


def start_history(context: Context, analysis: History) -> HistoryRun:
    """Everything a history needs before its first step."""
    loading = analysis.loads[0] if analysis.loads is not None else None
    model, changed = context, changes(context, analysis.change)
    context, rest, said = begin(context, analysis.start, analysis.change, loading, analysis.pieces)
    if rest.scene.pieces is not None and analysis.store.members is not None:
        kept = finer_members(model, context, analysis.store.members)
        analysis = replace(analysis, store=replace(analysis.store, members=kept))
    scene = rest.scene
    choices = Choices.of(scene, analysis)
    small = analysis.geometry == "small"
    potential = scene.potential(rest.acting, small)
    look = potential.look(rest.q)
    pulses = [context.parts.events[name] for name in analysis.events]
    damped = choices.rayleigh.stiffness_part
    motion = Motion(
        system=scene.system,
        springs=potential.springs,
        held=potential.held,
        dead=potential.force,
        events=event_forces(pulses, scene.structure.joints),
        joint_mass=Product(scene.system.joint_mass(rest.acting, choices.lumped)),
        rayleigh=choices.rayleigh,
        damper_blocks=damper_blocks(potential.springs, look.stretch, look.axial, damped, small),
        small=small,
    )
    return HistoryRun(
        context, analysis, rest, choices, motion, Tally(motion, scene, rest.acting), said, changed
    )
