"""What a tuning found, and what the real ties say to it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.solved import Solved
from tautbar.analyses.tune_problem import Ladder, Named, Problem
from tautbar.model.parts import Tune
from tautbar.solvers.lengths import State
from tautbar.solvers.pretension import HELD, Least
from tautbar.solvers.tuning import MET, Tuning

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Tuned:
    """Lengths, the signed states inside, and the real answers under every loading.

    ``moved`` are loadings that find another balance when they start from the start shape.
    """

    problem: Problem
    L0: Array  # (N,) m
    states: list[State]
    solved: list[Solved]
    moved: tuple[str, ...]

    @property
    def analysis(self) -> Tune:
        return self.problem.analysis

    @property
    def miss(self) -> Array:
        """What the real answer misses (T,), over what was wanted."""
        raise NotImplementedError

    @property
    def met(self) -> bool:
        """Whether the real answer gives what was asked for."""
        raise NotImplementedError

    @property
    def slack(self) -> list[tuple[int, int]]:
        """(loading, member) of ties that hang loose where they must not."""
        raise NotImplementedError

    @property
    def holds(self) -> bool:
        return all(s.verdict.holds for s in self.solved) and self.met and not self.slack

    def _loose(self, cases: list[int], members: tuple[int, ...]) -> list[tuple[int, int]]:
        return [(k, m) for k in cases for m in members if self.solved[k].slack[m]]


@dataclass(frozen=True)
class ToTargets(Tuned):
    """A tuning to wanted tensions and positions; adjusted ties stay taut where there is a target."""

    tuning: Tuning
    named: tuple[Named, ...]

    @property
    def miss(self) -> Array:
        return np.asarray(self.off / np.array([t.target.scale for t in self.named]))

    @property
    def off(self) -> Array:
        """Real values less wanted ones (T,) [N or m]."""
        return np.array([self._value(t) - t.target.wanted for t in self.named])

    def _value(self, named: Named) -> float:
        target, solved = named.target, self.solved[named.target.case]
        if target.ends:
            tension = end_tensions(solved)
            return max(float(tension[e]) for e in target.ends)
        s = solved.scene.structure
        return float((s.position + solved.displacement).ravel()[target.row])

    @property
    def met(self) -> bool:
        return bool((np.abs(self.miss) <= MET).all())

    @property
    def asked(self) -> list[int]:
        """Loadings that have a target."""
        return sorted({t.target.case for t in self.named})

    @property
    def slack(self) -> list[tuple[int, int]]:
        return self._loose(self.asked, self.analysis.adjust)


@dataclass(frozen=True)
class KeptTaut(Tuned):
    """The least pretension; kept members hold the margin under every loading."""

    least: Least
    ladder: Ladder
    by_strength: bool  # shares of breaking forces are compared, not tensions

    @property
    def loose_elsewhere(self) -> bool:
        """Whether an adjusted tie that need not stay taut hangs loose under some loading."""
        free = tuple(m for m in self.analysis.adjust if m not in self.analysis.keep_taut)
        return bool(self._loose(list(range(len(self.solved))), free))

    @property
    def lowest(self) -> Array:
        """Tension of the kept members (loadings, K) [N], the smaller of both ends."""
        kept = list(self.analysis.keep_taut)
        return np.stack([end_tensions(s)[kept].min(axis=1) for s in self.solved])

    @property
    def miss(self) -> Array:
        """By how much each kept member misses the margin at worst (K,), over the largest tension."""
        lowest, margin = self.lowest, self.analysis.margin
        scale = max(margin, float(np.abs(lowest).max(initial=0.0))) or 1.0
        return np.asarray(np.minimum(lowest.min(axis=0) - margin, 0.0) / scale)

    @property
    def met(self) -> bool:
        return bool((np.abs(self.miss) <= HELD).all())

    @property
    def slack(self) -> list[tuple[int, int]]:
        return self._loose(list(range(len(self.solved))), self.analysis.keep_taut)


def end_tensions(solved: Solved) -> Array:
    """Tension at the start and end of each member (N, 2) [N] in the real answer."""
    return State(solved.scene.potential(solved.acting), solved.verdict.look).tension
