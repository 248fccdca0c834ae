"""An invented guyed mast with made-up results, to test files and plots without any mechanics.

The numbers are smooth and plausible, not right: nothing here is an answer.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field

import numpy as np

from tautbar.records.fields import Field, Record
from tautbar.records.frames import Frame, StreamedField
from tautbar.records.peaks import Peaks
from tautbar.records.slack import SlackEpisodes

LEVELS = 6
HEIGHT = 4.0  # m, of a level
GUYS = 3


@dataclass
class FakeMast:
    """Joints and members of a three-sided lattice mast with guys at two levels."""

    joints: dict[str, tuple[float, float, float]] = field(default_factory=dict)
    members: dict[str, tuple[str, str, str, str]] = field(default_factory=dict)  # ends, kind, group

    more_fields: dict[str, Field] = field(default_factory=dict)

    def __post_init__(self) -> None:
        for level in range(LEVELS + 1):
            for k in range(3):
                angle = 2.0 * np.pi * k / 3
                self.joints[f"m{level}{'abc'[k]}"] = (np.cos(angle), np.sin(angle), HEIGHT * level)
        for k in range(GUYS):
            angle = 2.0 * np.pi * k / 3
            self.joints[f"anchor-{k + 1}"] = (14.0 * np.cos(angle), 14.0 * np.sin(angle), 0.0)
        for level in range(LEVELS):
            for k in range(3):
                self._level(level, k)
        for level in (LEVELS // 2, LEVELS):
            for k in range(GUYS):
                ends = (f"anchor-{k + 1}", f"m{level}{'abc'[k]}")
                self.members[f"guy-{level}-{k + 1}"] = (*ends, "tension-only", "guys")

    def _level(self, level: int, k: int) -> None:
        a, b = "abc"[k], "abc"[(k + 1) % 3]
        self.members[f"leg-{level}{a}"] = (f"m{level}{a}", f"m{level + 1}{a}", "bar", "legs")
        self.members[f"brace-{level}{a}"] = (f"m{level}{a}", f"m{level + 1}{b}", "bar", "braces")
        self.members[f"ring-{level + 1}{a}"] = (f"m{level + 1}{a}", f"m{level + 1}{b}", "bar", "rings")

    @property
    def positions(self) -> np.ndarray:
        return np.array(list(self.joints.values()))

    @property
    def ends(self) -> np.ndarray:
        index = {name: k for k, name in enumerate(self.joints)}
        return np.array([[index[a], index[b]] for a, b, _, _ in self.members.values()])

    @property
    def ties(self) -> np.ndarray:
        return np.array([kind == "tension-only" for _, _, kind, _ in self.members.values()])

    @property
    def model_fields(self) -> dict[str, Field]:
        joint, member = ("joint",), ("member",)
        count = len(self.members)
        plain = np.ones(count)
        return {
            "joints/name": Field(np.array(list(self.joints)), "1", "names of the joints", joint),
            "joints/position": Field(self.positions, "m", "position", ("joint", "direction")),
            "members/name": Field(np.array(list(self.members)), "1", "names of the members", member),
            "members/group": Field(np.array([m[3] for m in self.members.values()]), "1", "group", member),
            "members/ends": Field(self.ends, "1", "joints at the ends", ("member", "end")),
            "members/kind": Field(np.array([m[2] for m in self.members.values()]), "1", "kind", member),
            "members/section": Field(np.array(["tube"] * count), "1", "section", member),
            "members/axial_stiffness": Field(2e7 * plain, "N", "axial stiffness", member),
            "members/unstressed_length": Field(4.0 * plain, "m", "unstressed length", member),
            "members/mass_per_length": Field(5.0 * plain, "kg/m", "mass per length", member),
            **self.more_fields,
        }

    def sway(self, amount: float) -> np.ndarray:
        """A bent mast, (J, 3)."""
        bent = np.zeros((len(self.joints), 3))
        height = self.positions[:, 2] / (LEVELS * HEIGHT)
        bent[:, 0] = amount * height**1.5
        bent[:, 1] = 0.4 * amount * np.sin(np.pi * height)
        return bent

    def forces(self, amount: float) -> np.ndarray:
        """Axial forces of a bent mast, (N,): guys in front slacken, legs behind press."""
        middle = self.positions[self.ends].mean(axis=1)
        force = -9e3 - 4e5 * amount * middle[:, 0] / (1.0 + middle[:, 2])
        guys = 8e3 - 6e4 * amount * middle[:, 0] / 7.0
        return np.where(self.ties, np.maximum(guys, 0.0), force)

    def looseness(self, amount: float) -> np.ndarray:
        middle = self.positions[self.ends].mean(axis=1)
        return np.where(self.ties, -(8e3 - 6e4 * amount * middle[:, 0] / 7.0) / 1e6, -1.0)


def static_record(mast: FakeMast, name: str = "standing", status: str = "complete") -> Record:
    amounts = (0.02, 0.35, -0.2)
    loads = np.array(["dead", "dead + wind x", "dead + wind -x"])
    moved = np.array([mast.sway(a) for a in amounts])
    force = np.array([mast.forces(a) for a in amounts])
    taut = np.array([mast.looseness(a) <= 0.0 for a in amounts])
    per_member, per_joint = ("loading", "member"), ("loading", "joint", "direction")
    return Record(
        name,
        "static",
        status,
        "3 loadings in balance; 2 ties go slack under dead + wind x",
        acting=tuple(loads),
        settings={"geometry": "large", "tolerance": 1e-9},
        fields={
            "loads": Field(loads, "1", "names of the loadings", ("loading",)),
            "displacement": Field(moved, "m", "displacement", per_joint),
            "axial_force": Field(force, "N", "axial force, tension positive", per_member),
            "reaction": Field(1e3 * moved, "N", "force of the supports", per_joint),
            "taut": Field(taut, "1", "whether taut", per_member),
            "envelope/min": Field(force.min(axis=0), "N", "least axial force", ("member",)),
            "envelope/max": Field(force.max(axis=0), "N", "greatest axial force", ("member",)),
            "audit/force_residual": Field(np.full(3, 1e-12), "1", "force residual", ("loading",)),
        },
        audit_lines=("force residual 1e-12 of the loads",),
        sources=("Newton-Raphson",),
    )


def modes_record(mast: FakeMast, name: str = "ringing") -> Record:
    shape = np.array([mast.sway(1.0), mast.sway(-1.0) * [[0.3, 1.0, 0.0]]])
    return Record(
        name,
        "modes",
        "complete",
        "2 modes from 1.9 to 4.7 Hz",
        acting=("dead",),
        fields={
            "frequency": Field(np.array([1.9, 4.7]), "Hz", "natural frequency", ("mode",)),
            "shape": Field(shape, "m", "mode shape", ("mode", "joint", "direction")),
            "participation_factor": Field(np.ones((2, 3)), "1", "participation", ("mode", "direction")),
            "audit/sturm_count": Field(np.array(2), "1", "modes below, counted", ()),
            "audit/residual": Field(np.array([1e-9, 2e-9]), "1", "residual of each mode", ("mode",)),
        },
        audit_lines=("2 modes counted, 2 found",),
    )


@dataclass
class FakeHistory:
    """A march of made-up steps. ``at_step`` is called with each step's number before it is handed out."""

    mast: FakeMast
    name: str = "lantern dropped"
    steps: int = 400
    every: int = 1
    precision: str = "float32"
    at_step: Callable[[int], None] = lambda step: None
    kind: str = "history"
    acting: tuple[str, ...] = ("dead", "event drop")
    duration: float = 4.0
    settings: Mapping[str, object] = field(default_factory=lambda: {"time_step": 0.01})

    @property
    def streamed(self) -> dict[str, StreamedField]:
        vector = (len(self.mast.joints), 3)
        at_joint = ("time", "joint", "direction")
        force = StreamedField(
            "N",
            "axial force, tension positive",
            ("time", "member"),
            (len(self.mast.members),),
            self.precision,
        )
        return {
            "displacement": StreamedField("m", "displacement", at_joint, vector, self.precision),
            "velocity": StreamedField("m/s", "velocity", at_joint, vector, self.precision),
            "acceleration": StreamedField("m/s2", "acceleration", at_joint, vector, self.precision),
            "axial_force": force,
        }

    def amount(self, time: float) -> float:
        return float(0.42 * np.exp(-0.5 * time) * np.sin(2.0 * np.pi * 1.9 * time + 0.03))

    def energy(self, time: float) -> tuple[float, ...]:
        work = 900.0 * (1.0 - np.exp(-3.0 * time))
        damped = 0.8 * work * (1.0 - np.exp(-time))
        kinetic = (work - damped) * np.cos(2.0 * np.pi * 1.9 * time) ** 2
        return (time, kinetic, work - damped - kinetic, -50.0, work, damped, 0.5 * time, 1e-9 * time)

    def frames(self) -> Iterator[Frame]:
        mast = self.mast
        self._peaks = {
            "displacement": Peaks((len(mast.joints), 3)),
            "axial_force": Peaks((len(mast.members),)),
        }
        self._slack = SlackEpisodes(mast.ties)
        for step in range(self.steps + 1):
            self.at_step(step)
            time = self.duration * step / self.steps
            amount = self.amount(time)
            moved, force = mast.sway(amount), mast.forces(amount)
            self._peaks["displacement"].update(time, moved)
            self._peaks["axial_force"].update(time, force)
            self._slack.update(time, mast.looseness(amount), force)
            values = {
                "displacement": moved,
                "velocity": mast.sway(12.0 * self.amount(time + 0.13)),
                "acceleration": mast.sway(-142.0 * amount),
                "axial_force": force,
            }
            yield Frame(time, self.energy(time), values if step % self.every == 0 else None)

    def record(self, status_if_cut: str | None = None) -> Record:
        moved, force = self._peaks["displacement"], self._peaks["axial_force"]
        fields = moved.fields("displacement", "m", "displacement", ("joint", "direction"))
        fields |= force.fields("axial_force", "N", "axial force", ("member",))
        fields |= self._slack.fields()
        fields["audit/unaccounted"] = Field(np.array(4e-9), "1", "share of the energy left over", ())
        return Record(
            self.name,
            self.kind,
            status_if_cut or "complete",
            f"greatest axial force {force.high.max() / 1e3:.1f} kN",
            acting=self.acting,
            settings=self.settings,
            fields=fields,
            audit_lines=("energy ledger closes to 4e-9",),
            warnings=("guys snatch without viscosity",),
        )
