"""What all analyses of one run share: the model, its systems by stage, and the states they hand over."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.scene import Scene
from tautbar.errors import AnalysisFailed
from tautbar.mechanics.carriers import Response
from tautbar.mechanics.freedom import Freedom, pushers
from tautbar.mechanics.loads import Acting, nothing
from tautbar.mechanics.structure import Stage, lengths_as_given
from tautbar.model.parts import Change, Loading, Parts, StartFrom
from tautbar.solvers.system import System

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
UNLOADED = Loading("nothing", {})
NO_CHANGE = Change()


@dataclass(frozen=True)
class Rest:
    """A state of rest that a later analysis may start from."""

    scene: Scene
    loading: Loading
    acting: Acting
    displacement: Array  # (3, J) m, of all joints from the drawing
    response: Response
    loose: tuple[Array, ...] = ()  # (n,) directions that nothing holds, harmless
    small: bool = False  # found with geometry linearised about the drawing

    @property
    def q(self) -> Array:
        """Free unknowns (n,) [m]."""
        return self.scene.free_part(self.displacement)

    @property
    def axial(self) -> Array:
        return self.response.axial


@dataclass
class Context:
    """The model, its systems by stage, and the states found so far by analysis name."""

    parts: Parts
    states: dict[str, list[Rest]] = field(default_factory=dict)
    _systems: dict[object, System] = field(default_factory=dict)
    _last_loss: object = None

    @property
    def joint_names(self) -> tuple[str, ...]:
        return self.parts.joints.names

    @property
    def member_names(self) -> tuple[str, ...]:
        return self.parts.members.names

    def first_scene(self) -> Scene:
        """The model as drawn, one-way supports holding."""
        stage = Stage.first(self.parts)
        pushing = pushers(self.parts, stage, len(self.parts.joints))
        system = self._system(stage, pushing)
        nowhere = np.zeros((3, system.structure.joints))
        anchors = {i: nowhere for i, there in enumerate(stage.supports) if there}
        return Scene(self.parts, stage, system, nowhere, anchors, pushing)

    def drawn(self) -> Rest:
        """The drawing with nothing acting; members carry what their lengths make them carry there."""
        scene = self.first_scene()
        unloaded = nothing(scene.structure)
        look = scene.potential(unloaded).look(np.zeros(scene.system.n))
        U = np.zeros((3, scene.structure.joints))
        return Rest(scene, UNLOADED, unloaded, U, look.response)

    def start(self, start: StartFrom | None, change: Change = NO_CHANGE) -> Rest:
        """The state an analysis starts from, its changes made: that of an earlier one, or the drawing."""
        return self.changed(self._found(start), change)

    def starts(self, start: StartFrom | None, change: Change = NO_CHANGE) -> list[Rest]:
        """Every state an analysis starts from: several only with ``loads = "each"``."""
        if start is not None and start.each:
            self._found(start)
            return [self.changed(rest, change) for rest in self.states[start.analysis]]
        return [self.start(start, change)]

    def _found(self, start: StartFrom | None) -> Rest:
        if start is None or start.as_drawn:
            return self.drawn()
        if start.analysis not in self.states:
            raise AnalysisFailed(f"'{start.analysis}' left no state to start from", None)
        found = self.states[start.analysis]
        wanted = start.at or start.loads
        if wanted is None:
            return found[0]
        for rest in found:
            if rest.loading.name == wanted:
                return rest
        there = ", ".join(rest.loading.name for rest in found)
        raise AnalysisFailed(f"'{start.analysis}' has no {wanted}; it has {there}", None)

    def changed(self, rest: Rest, change: Change) -> Rest:
        """The state just after members, supports and masses came or went, joints where they were."""
        if change == NO_CHANGE:
            return rest
        scene, parts = rest.scene, self.parts
        stage = scene.stage.changed(parts, change)
        pushing = pushers(parts, stage, len(parts.joints))
        staged = self.restaged(scene, stage, pushing, rest.displacement)
        new = stage.members & ~scene.stage.members
        if new.any():
            EA, L0 = self._lengths_now(staged, rest.displacement, new)
            s = staged.structure
            staged = staged.with_lengths(np.where(new, L0, s.L0), np.where(new, EA, s.EA))
        return self.rest_at(staged, rest.loading, rest.displacement)

    def restaged(self, scene: Scene, stage: Stage, pushing: Flags, displacement: Array) -> Scene:
        """The scene at another stage: supports and springs that come hold joints where they are."""
        system = self._system(stage, pushing).with_lengths(scene.structure.L0, scene.structure.EA)
        before, after = self._all_pushing(scene.stage), self._all_pushing(stage)
        off = displacement - scene.settled
        new = after.held_part(before.spread(before.gather(off)))
        anchors = {i: scene.anchors.get(i, displacement) for i, there in enumerate(stage.supports) if there}
        return Scene(self.parts, stage, system, scene.settled + new, anchors, pushing, scene.pieces)

    def _all_pushing(self, stage: Stage) -> Freedom:
        """Free directions with every support of the stage holding, one-way ones included."""
        return self._system(stage, pushers(self.parts, stage, len(self.parts.joints))).freedom

    def losing(self, rest: Rest, member: int) -> Rest:
        """The state just after one member was lost, joints where they were."""
        stage = rest.scene.stage.without(member)
        self._systems.pop(self._last_loss, None)  # one lost member at a time: each has a system of its own
        self._last_loss = (stage.key, rest.scene.pushing.tobytes())
        scene = self.restaged(rest.scene, stage, rest.scene.pushing, rest.displacement)
        return self.rest_at(scene, rest.loading, rest.displacement)

    def rest_at(self, scene: Scene, loading: Loading, displacement: Array) -> Rest:
        """A state (perhaps not yet in balance) with joints displaced by (3, J) [m]."""
        acting = scene.acting(loading)
        look = scene.potential(acting).look(scene.free_part(displacement))
        return Rest(scene, loading, acting, displacement, look.response)

    def _lengths_now(self, scene: Scene, displacement: Array, new: Flags) -> tuple[Array, Array]:
        """EA [N] and unstressed lengths [m] of new members as their keys say, joints where they are now."""
        s = scene.structure
        return lengths_as_given(self.parts, s.position + displacement, s.down, new)[:2]

    def _system(self, stage: Stage, pushing: Flags) -> System:
        key = (stage.key, pushing.tobytes())
        if key not in self._systems:
            self._systems[key] = System.of(self.parts, stage, pushing)
        return self._systems[key]

    def keep(self, name: str, states: list[Rest]) -> None:
        """Hand states on to later analyses."""
        self.states[name] = states


def under(rest: Rest, loading: Loading | None) -> Rest:
    """The state with another loading put on at once; with its own where None is given."""
    if loading is None:
        return rest
    return replace(rest, loading=loading, acting=rest.scene.acting(loading))
