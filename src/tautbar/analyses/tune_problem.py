"""A tuning as the solvers see it: cases, adjustments, targets, and where to start."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context, Rest
from tautbar.analyses.scene import Scene
from tautbar.analyses.strength import Strength
from tautbar.mechanics.structure import HANGING
from tautbar.model.parts import AXES, Loading, Parts, PositionTarget, TensionTarget, Tune
from tautbar.solvers.lengths import Case, reached
from tautbar.solvers.potential import Potential
from tautbar.solvers.pretension import Levels, Wanted
from tautbar.solvers.tuning import Ratios, Target

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
Indices = tuple[int, ...]
_ENDS = {"from end": (0,), "to end": (1,)}


@dataclass(frozen=True)
class Problem:
    """What a tuning works on.

    ``scenes`` are those of the loadings (one-way supports may hold in one and not in another);
    ``signed`` (N,) are the members that count as two-way inside, ``distance`` (N,) [m] lies between a
    member's joints in the start shape.
    """

    analysis: Tune
    rest: Rest
    scenes: tuple[Scene, ...]
    signed: Flags
    distance: Array

    @property
    def cases(self) -> list[Case]:
        return [
            _case(scene, loading, self.signed)
            for scene, loading in zip(self.scenes, self.analysis.loads, strict=True)
        ]

    @property
    def q(self) -> list[Array]:
        """Free unknowns (n,) [m] of each loading in the start shape."""
        return [scene.free_part(self.rest.displacement) for scene in self.scenes]

    def signing_kept_only(self) -> Problem | None:
        """The same with only the kept members two-way; None where it is so already."""
        kept = np.zeros_like(self.signed)
        kept[list(self.analysis.keep_taut)] = True
        return replace(self, signed=kept) if (self.signed & ~kept).any() else None


def pose(analysis: Tune, rest: Rest) -> Problem:
    """The problem as it starts: adjusted, targeted and kept members count as two-way."""
    s = rest.scene.structure
    now = s.position + rest.displacement
    r = now[:, s.end] - now[:, s.start]
    signed = np.zeros(s.members, dtype=bool)
    signed[[*analysis.adjust, *analysis.keep_taut, *_targeted(analysis)]] = True
    scenes = (rest.scene,) * len(analysis.loads)
    return Problem(analysis, rest, scenes, signed, np.sqrt((r * r).sum(axis=0)))


def _targeted(analysis: Tune) -> Iterator[int]:
    for target in analysis.targets:
        if isinstance(target, TensionTarget):
            yield from target.members


def _case(scene: Scene, loading: Loading, signed: Flags) -> Case:
    """One loading; how its weight grows with a length shows when every length is doubled."""
    L0, acting = scene.structure.L0, scene.acting(loading)
    doubled = scene.with_lengths(2 * L0).acting(loading)
    return Case(
        potential=lambda L0: _potential(scene.with_lengths(L0), loading),
        grows=2 * doubled.along - acting.along,  # what is along a member is affine in its length
        warmer=1 + acting.heating,
        signed=signed,
    )


def _potential(scene: Scene, loading: Loading) -> Potential:
    return scene.potential(scene.acting(loading))


def ratios(problem: Problem) -> Ratios:
    """The adjustments of a tuning to targets: one relative change for each list of ``together``."""
    analysis = problem.analysis
    joined = {m for group in analysis.together for m in group}
    singles = tuple((m,) for m in analysis.adjust if m not in joined)
    return Ratios(problem.rest.scene.structure.L0, (*analysis.together, *singles), problem.distance)


def first_guess(problem: Problem, adjusting: Ratios) -> tuple[Array, Array]:
    """Where to start (A,), and from where the least change is measured (A,).

    Starts with the lengths that would give the wanted tensions in the start shape, L0 = l/(1 + T/EA).
    Changes are measured from the lengths there were; a slack tie is first taken to the least tension
    wanted, or to its length.
    """
    s, l = problem.rest.scene.structure, problem.distance
    straight = s.kind != HANGING
    pulls = [t.tension for t in problem.analysis.targets if isinstance(t, TensionTarget) and t.tension > 0]
    slack = straight & s.can_slack & (l < s.L0)
    home = np.where(slack, l / (1 + min(pulls, default=0.0) / s.EA), s.L0)
    start = home.copy()
    for target in reversed(problem.analysis.targets):
        if isinstance(target, TensionTarget):
            m = [m for m in target.members if straight[m]]
            start[m] = l[m] / (1 + target.tension / s.EA[m])

    def ratios_of(L0: Array) -> Array:
        ratio = [float((L0[list(g)] / s.L0[list(g)]).mean()) - 1 for g in adjusting.members]
        return np.clip(ratio, *adjusting.limits())

    return ratios_of(start), ratios_of(home)


@dataclass(frozen=True)
class Named:
    """A target for the solver, and what it is called."""

    target: Target
    name: str
    tension: bool


def targets(context: Context, problem: Problem) -> list[Named]:
    """One target for each member or joint wanted somewhere."""
    found = []
    for target in problem.analysis.targets:
        case = _case_of(problem.analysis, target.loads)
        under = f" under {problem.analysis.loads[case].name}"
        if isinstance(target, PositionTarget):
            found.append(
                Named(_position(problem, target, case), _place(context.parts, target) + under, False)
            )
            continue
        largest = max(abs(t.tension) for t in problem.analysis.targets if isinstance(t, TensionTarget))
        for m in target.members:
            ends = tuple((m, end) for end in _ENDS.get(target.at or "", (0, 1)))
            scale = abs(target.tension) or largest or 1.0
            at = f' at its "{target.at.removesuffix(" end")}" end' if target.at in _ENDS else ""
            name = f"tension of {context.member_names[m]}{at}{under}"
            found.append(Named(Target(case, target.tension, scale, ends), name, True))
    return found


def _case_of(analysis: Tune, name: str | None) -> int:
    return 0 if name is None else [loading.name for loading in analysis.loads].index(name)


def _place(parts: Parts, target: PositionTarget) -> str:
    return f"position of {parts.joints.names[target.joint]} in {AXES[target.axis]}"


def _position(problem: Problem, target: PositionTarget, case: int) -> Target:
    scene, loading = problem.scenes[case], problem.analysis.loads[case]
    s = scene.structure
    held = scene.held_displacement(scene.acting(loading))
    offset = float(s.position[target.axis, target.joint] + held[target.axis, target.joint])
    row = target.axis * s.joints + target.joint
    return Target(case, target.position, s.size, row=row, offset=offset)


def beyond_reach(analysis: Tune, scene: Scene) -> list[tuple[str, str]]:
    """Targets that no adjustment can influence, whatever the forces: what is wrong, and what would help."""
    joints, members = reached(scene.system, np.array(analysis.adjust, dtype=np.intp))
    T, J = scene.system.freedom.T, scene.structure.joints
    hint = "adjust a member that is connected to it by joints that can move"
    found = []
    for target in analysis.targets:
        if isinstance(target, TensionTarget):
            names = [scene.parts.members.names[m] for m in target.members if not members[m]]
            found += [(f"no adjusted member can influence the tension of {name}", hint) for name in names]
        elif not np.diff(T.indptr)[target.axis * J + target.joint]:
            found.append(
                (f"{_place(scene.parts, target)}: it is held there", "it stays where its support is")
            )
        elif not joints[target.joint]:
            found.append((f"no adjusted member can influence the {_place(scene.parts, target)}", hint))
    return found


@dataclass(frozen=True)
class Ladder:
    """The levels of a keep-taut tuning: their names, and whether each is of more than one member."""

    levels: Levels
    names: tuple[str, ...]
    shared: bool


def ladder(context: Context, problem: Problem) -> Ladder:
    """One level for each list of ``together``, each group of the model, and each member left."""
    analysis, s = problem.analysis, problem.rest.scene.structure
    left = dict.fromkeys(analysis.adjust)
    found: list[tuple[str, Indices]] = []
    named = [(" + ".join(context.member_names[m] for m in g), g) for g in analysis.together]
    for name, group in [*named, *context.parts.members.groups.items()]:
        mine = tuple(m for m in group if m in left)
        for m in mine:
            del left[m]
        if mine:
            found.append((name, mine))
    found += [(context.member_names[m], (m,)) for m in left]
    levels = Levels(s.L0, s.EA, tuple(g for _, g in found), problem.distance)
    return Ladder(levels, tuple(name for name, _ in found), not left)


def wanted_of(problem: Problem) -> tuple[Wanted, bool]:
    """Margin and strengths; whether these are breaking forces (else all alike: tensions are compared)."""
    analysis, s = problem.analysis, problem.rest.scene.structure
    there = [m for m in dict.fromkeys((*analysis.adjust, *analysis.keep_taut)) if s.present[m]]
    counted = np.array(there, dtype=np.intp)
    breaks = Strength.of(problem.rest.scene).breaks[counted]
    known = bool(np.isfinite(breaks).all())
    scale = max(analysis.margin, 1e-6 * float(s.EA[counted].max()))
    strength = breaks if known else np.full(counted.size, scale)
    kept = np.array([m for m in analysis.keep_taut if s.present[m]], dtype=np.intp)
    return Wanted(kept, analysis.margin, counted, strength), known


def first_levels(problem: Problem, levels: Levels) -> Array:
    """Where to start (A,) [N]: the pretension the lengths give in the start shape, the margin at least."""
    s, l = problem.rest.scene.structure, problem.distance
    given = s.EA * (l / s.L0 - 1)
    start = [float(given[list(g)].mean()) for g in levels.members]
    return np.clip(np.maximum(start, problem.analysis.margin), -levels.limits(), levels.limits())


def scenes_now(problem: Problem, scenes: Sequence[Scene]) -> Problem | None:
    """The problem with the one-way supports that hold in the real answer; None if they are the same."""
    same = all((a.pushing == b.pushing).all() for a, b in zip(problem.scenes, scenes, strict=True))
    return None if same else replace(problem, scenes=tuple(scenes))
