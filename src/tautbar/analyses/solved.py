"""One loading of a static analysis, solved and judged."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Rest
from tautbar.analyses.judge import Verdict
from tautbar.analyses.scene import Scene
from tautbar.mechanics.loads import Acting
from tautbar.model.parts import Loading

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]


@dataclass(frozen=True)
class Solved:
    """One loading of a static analysis, judged. Joint arrays are (3, J)."""

    loading: Loading
    scene: Scene
    acting: Acting
    verdict: Verdict
    displacement: Array  # m
    reaction: Array  # N
    slack: Flags
    onset: Array  # (N,) load factor
    reaction_sum_error: float
    small: bool = False

    @property
    def rest(self) -> Rest:
        look = self.verdict.look
        loose = tuple(f.vector for f in self.verdict.free if f.nature == "loose")
        return Rest(
            self.scene, self.loading, self.acting, self.displacement, look.response, loose, self.small
        )

    @property
    def loose_length(self) -> Array:
        """How much each slack member is too long (N,) [m]."""
        return np.where(self.slack, np.abs(self.verdict.look.stretch.e), 0.0)
