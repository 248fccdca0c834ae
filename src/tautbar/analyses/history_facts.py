"""What is known of one history: what it starts from, what was decided for it, what it added up."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from tautbar.analyses.context import Context, Rest
from tautbar.analyses.history_audit import Tally
from tautbar.analyses.scene import Scene
from tautbar.mechanics.damping import Rayleigh, rayleigh
from tautbar.model.parts import History
from tautbar.solvers.motion import Motion


@dataclass(frozen=True)
class Choices:
    """What the analysis leaves open, decided; and why, in words."""

    method: str
    lumped: bool
    mass_part: bool
    rayleigh: Rayleigh

    @classmethod
    def of(cls, scene: Scene, analysis: History) -> Choices:
        can_slack = bool(scene.structure.can_slack.any())
        method = analysis.method or ("energy-conserving" if can_slack else "newmark")
        lumped = analysis.mass == "lumped" if analysis.mass else can_slack
        asked = analysis.damping.mass_part if analysis.damping else None
        falls = can_slack or scene.parts.floating
        mass_part = (not falls) if asked is None else asked
        return cls(method, lumped, mass_part, rayleigh(analysis.damping, mass_part))


@dataclass
class Facts:
    """All that the sentences about a history are made from. ``said`` is of its start state."""

    context: Context
    analysis: History
    rest: Rest
    choices: Choices
    motion: Motion
    tally: Tally
    said: tuple[str, ...] = ()
    changed: Mapping[str, object] = field(default_factory=dict)  # what was taken away and put in
    failure: str = ""

    @property
    def duration(self) -> float:
        return self.analysis.duration
