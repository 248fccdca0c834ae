"""The structure at one stage: who is present, at which lengths, and where its supports stand."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.carriers import carriers
from tautbar.mechanics.loads import Acting, acting
from tautbar.mechanics.structure import Stage, Structure
from tautbar.model.parts import Loading, Parts
from tautbar.records.fields import Field
from tautbar.solvers.potential import Potential
from tautbar.solvers.system import System

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]


@dataclass(frozen=True)
class Scene:
    """What an analysis works on.

    ``settled`` (3, J) [m] is how far from the drawing each held direction was when its support came,
    ``anchors`` says for each support where the joints (3, J) [m] were when it came: springs pull to there;
    ``pushing`` (3, J) are the one-way supports that hold now.
    """

    parts: Parts
    stage: Stage
    system: System
    settled: Array
    anchors: Mapping[int, Array]
    pushing: Flags
    pieces: int | None = None  # hanging members as so many pieces, for this analysis only

    @property
    def joint_axis(self) -> str:
        """Name of the axis over joints in results: its own where ropes are in pieces."""
        return "joint" if self.pieces is None else "joint_with_pieces"

    @property
    def member_axis(self) -> str:
        return "member" if self.pieces is None else "member_with_pieces"

    @property
    def structure(self) -> Structure:
        return self.system.structure

    @cached_property
    def sprung(self) -> Array:
        """Where the springs at each joint are without force together (3, J) [m]: their mean, by stiffness."""
        pull, rate = np.zeros_like(self.settled), np.zeros_like(self.settled)
        for i, place in self.anchors.items():
            joints = list(self.parts.supports[i].joints)
            for axis, k in self.parts.supports[i].springs:
                pull[axis, joints] += k * place[axis, joints]
                rate[axis, joints] += k
        return np.divide(pull, rate, out=np.zeros_like(pull), where=rate > 0)

    @property
    def present(self) -> dict[str, Field]:
        """Which members are there, as a field."""
        there = self.stage.members.astype(np.int8)
        return {"present": Field(there, "1", "1 where the member is there", (self.member_axis,))}

    def acting(self, loading: Loading) -> Acting:
        """Arrays of a loading."""
        return acting(self.parts, self.structure, loading)

    def potential(self, acting: Acting, small: bool = False) -> Potential:
        """Potential energy under one loading."""
        freedom = self.system.freedom
        force = freedom.gather(acting.force - freedom.grounded(self.held_displacement(acting) - self.sprung))
        return Potential(self.system, carriers(self.structure, acting), force, self.held(acting), small)

    def held(self, acting: Acting) -> Array:
        """How far held joints pull member ends apart (3, N) [m]."""
        return self.system.apart_held(self.held_displacement(acting))

    def held_displacement(self, acting: Acting) -> Array:
        """Displacement of held directions (3, J) [m]."""
        return self.system.freedom.held_part(self.settled + acting.move)

    def displacement(self, q: Array, acting: Acting) -> Array:
        """Displacement of all joints (3, J) [m] from the drawing."""
        return self.system.freedom.spread(q) + self.held_displacement(acting)

    def reaction(self, needed: Array, load: Array, displacement: Array) -> Array:
        """Forces of supports on the structure (3, J) [N]; see `Freedom.reaction`."""
        return self.system.freedom.reaction(needed, load, displacement - self.sprung)

    @property
    def joints_there(self) -> Flags:
        """Joints (J,) at which a member is present."""
        there = np.zeros(self.structure.joints, dtype=bool)
        at = self.structure.start[self.stage.members], self.structure.end[self.stage.members]
        there[np.concatenate(at)] = True
        return there

    def loads_on_nothing(self, acting: Acting) -> list[str]:
        """Joints at which something acts but no member is present and no support holds it."""
        there = self.joints_there
        held = np.zeros((3, there.size), dtype=bool)
        for support, stands in zip(self.parts.supports, self.stage.supports, strict=True):
            if stands:
                held[np.ix_(support.fixed, support.joints)] = True
        if self.parts.held_axis is not None:
            held[self.parts.held_axis] = True
        lost = (~there & (np.abs(acting.force) > 0) & ~held).any(axis=0)
        return [self.parts.joints.names[j] for j in np.flatnonzero(lost)]

    def free_part(self, displacement: Array) -> Array:
        """Free unknowns (n,) nearest to a displacement of all joints (3, J)."""
        return self.system.freedom.gather(displacement)

    def name_direction(self, vector: Array) -> tuple[str, Array]:
        """The joint that moves most in a vector over the free unknowns, and its direction (3,)."""
        U = self.system.freedom.spread(vector)
        joint = int((U * U).sum(axis=0).argmax())
        return self.parts.joints.names[joint], U[:, joint]

    def with_lengths(self, L0: Array, EA: Array | None = None) -> Scene:
        """The same with other unstressed lengths (N,) [m], and axial stiffness [N] where given."""
        return replace(self, system=self.system.with_lengths(L0, EA))
