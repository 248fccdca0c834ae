"""What all analyses of one run share: the model, its system, and the states they hand over."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.loads import Acting, acting, nothing
from tautbar.mechanics.members import Springs, Stretch
from tautbar.model.parts import Loading, Parts, StartFrom
from tautbar.solvers.potential import Potential
from tautbar.solvers.system import System

Array = NDArray[np.float64]
UNLOADED = Loading("nothing", {})


@dataclass(frozen=True)
class Rest:
    """A state of rest that a later analysis may start from."""

    loading: Loading
    acting: Acting
    q: Array  # (n,) m, free unknowns, from the drawing
    stretch: Stretch
    axial: Array  # (N,) N
    loose: tuple[Array, ...] = ()  # (n,) directions that nothing holds, harmless


@dataclass
class Context:
    """The model, the arrays made from it once, and the states found so far by analysis name."""

    parts: Parts
    states: dict[str, list[Rest]] = field(default_factory=dict)

    @cached_property
    def system(self) -> System:
        return System.of(self.parts)

    @property
    def joint_names(self) -> tuple[str, ...]:
        return self.parts.joints.names

    @property
    def member_names(self) -> tuple[str, ...]:
        return self.parts.members.names

    def acting(self, loading: Loading) -> Acting:
        return acting(self.parts, self.system.structure, loading)

    def start(self, start: StartFrom | None) -> Rest:
        """The state an analysis starts from: that of an earlier one, or the drawing without loads."""
        if start is None or start.as_drawn:
            return self.drawn()
        found = self.states[start.analysis]
        if start.loads is None:
            return found[0]
        return next(rest for rest in found if rest.loading.name == start.loads)

    def drawn(self) -> Rest:
        """The drawing with nothing acting; members carry what their lengths make them carry there."""
        unloaded = nothing(self.system.structure)
        q = np.zeros(self.system.n)
        look = self.potential(unloaded).look(q)
        return Rest(UNLOADED, unloaded, q, look.stretch, look.axial)

    def potential(self, acting: Acting, small: bool = False) -> Potential:
        """Potential energy under one loading."""
        return Potential(
            self.system,
            self.springs(acting),
            self.system.freedom.gather(acting.force),
            self.held(acting),
            small,
        )

    def springs(self, acting: Acting) -> Springs:
        return self.system.springs(acting.take_up, acting.heating)

    def held(self, acting: Acting) -> Array:
        """How far movements of held joints pull member ends apart (3, N) [m]."""
        return self.system.apart_held(self.system.freedom.held_part(acting.move))

    def displacement(self, q: Array, acting: Acting) -> Array:
        """Displacement of all joints (3, J) [m] from the drawing."""
        return self.system.freedom.spread(q) + self.system.freedom.held_part(acting.move)

    def name_direction(self, vector: Array) -> tuple[str, Array]:
        """The joint that moves most in a vector over the free unknowns, and its direction (3,)."""
        U = self.system.freedom.spread(vector)
        joint = int((U * U).sum(axis=0).argmax())
        return self.joint_names[joint], U[:, joint]
