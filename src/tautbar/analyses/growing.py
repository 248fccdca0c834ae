"""Constant and growing loads of one analysis, and the state in balance under the constant ones."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import UNLOADED, Context, Rest
from tautbar.analyses.reach import settle
from tautbar.analyses.scene import Scene
from tautbar.analyses.words import listed
from tautbar.errors import AnalysisFailed
from tautbar.mechanics.loads import Acting
from tautbar.model.parts import Buckling, EquilibriumPath, Loading, Parts, Static
from tautbar.solvers.path_family import Family

Array = NDArray[np.float64]
AT_REST = 1e-9  # of the largest force: a start state this near balance is taken as it is


@dataclass(frozen=True)
class Growing:
    """Loads constant + factor x growing on a scene.

    ``both`` has the masses of all load cases, once each.
    """

    scene: Scene
    constant_loading: Loading
    growing_loading: Loading
    constant: Acting
    growing: Acting
    both: Acting

    def acting(self, factor: float) -> Acting:
        """All that acts at a load factor."""
        total = self.constant.plus(self.growing, factor)
        return total._replace(mass=self.both.mass, coat=self.both.coat)

    def loading(self, name: str, factor: float) -> Loading:
        """The load cases at a load factor, under a name of their own."""
        factors = dict(self.constant_loading.factors)
        for case, share in self.growing_loading.factors.items():
            factors[case] = factors.get(case, 0.0) + factor * share
        return Loading(name, factors)

    @property
    def only_forces(self) -> bool:
        """Whether the growing loads are forces at joints and nothing else."""
        lengths = (self.growing.move, self.growing.take_up, self.growing.heating)
        along = self.growing.along[:, self.scene.structure.hangs]
        return not any(a.any() for a in (*lengths, along))

    def family(self) -> Family:
        """Potentials over the load factor."""
        scene, gather = self.scene, self.scene.system.freedom.gather
        if not self.only_forces:
            return Family(scene.system, lambda f: scene.potential(self.acting(f)), None)
        base = scene.potential(self.constant)
        rate = gather(self.growing.force)
        return Family(scene.system, lambda f: replace(base, force=base.force + f * rate), rate)

    def displacement(self, q: Array, factor: float) -> Array:
        """Displacement of all joints (3, J) [m] from the drawing."""
        return self.scene.displacement(q, self.acting(factor))

    def acting_words(self) -> tuple[str, ...]:
        constant = f"constant: {self.constant_loading.acting}"
        return constant, f"times the load factor: {self.growing_loading.acting}"


@dataclass(frozen=True)
class Beginning:
    """The state in balance under the constant loads, or why there is none (``fault``, in words)."""

    growing: Growing
    q: Array
    fault: str = ""


def begin(context: Context, analysis: EquilibriumPath | Buckling) -> Beginning:
    """Find the state that the growing loads are to act on."""
    rest = context.start(analysis.start, analysis.change)
    constant = analysis.constant or UNLOADED
    for loading in (constant, analysis.loads):
        fallen = rest.scene.loads_on_nothing(rest.scene.acting(loading))
        if fallen:
            raise AnalysisFailed(f"no member is there to carry the load at {listed(fallen)}", rest)
    potential = rest.scene.potential(rest.scene.acting(constant))
    look = potential.look(rest.q)
    if look.imbalance <= AT_REST * potential.scale(look) or potential.system.n == 0:
        return Beginning(_growing(context.parts, rest.scene, constant, analysis.loads), rest.q)
    return _settled(context, analysis, rest, constant)


def _settled(
    context: Context, analysis: EquilibriumPath | Buckling, rest: Rest, constant: Loading
) -> Beginning:
    """After a static step to the constant loads."""
    step = Static(analysis.name, loads=(constant,), folding=True)
    scene, verdict = settle(context, step, rest, rest.scene.acting(constant))
    growing = _growing(context.parts, scene, constant, analysis.loads)
    reasons = {
        "not converged": "no equilibrium was found",
        "unstable": "the equilibrium is unstable",
        "no steady contact": "supports that only push find no steady state",
    }
    why = f"under the constant loads ({constant.acting}) {reasons.get(verdict.fault, verdict.fault)}"
    return Beginning(growing, verdict.look.q, why if verdict.fault else "")


def _growing(parts: Parts, scene: Scene, constant: Loading, growing: Loading) -> Growing:
    """Arrays of both loadings. With ice about, wind of one meets members that the other made wider."""
    cases = dict(constant.factors)
    for name, factor in growing.factors.items():
        cases[name] = cases.get(name, 0.0) + factor
    both = scene.acting(Loading("both", cases))
    first = scene.acting(constant)
    iced = any(parts.load_cases[name].ice for name in cases)
    second = _difference(both, first) if iced else scene.acting(growing)
    return Growing(scene, constant, growing, first, second, both)


def _difference(one: Acting, other: Acting) -> Acting:
    return one.plus(other, -1.0)._replace(mass=one.mass, coat=one.coat)
