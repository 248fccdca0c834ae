"""Hanging members as straight pieces, for analyses that cannot take the catenary itself."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context, Rest, under
from tautbar.analyses.reach import settle
from tautbar.analyses.scene import Scene
from tautbar.analyses.words import chosen, listed
from tautbar.errors import AnalysisFailed, InputError
from tautbar.mechanics.structure import HANGING
from tautbar.model.parts import Change, Loading, StartFrom, Static
from tautbar.model.pieces import with_pieces
from tautbar.records.fields import Field

Array = NDArray[np.float64]
AT_REST = 1e-6  # of the largest force: a start state this near balance is taken as it is


class Begun(NamedTuple):
    """What an analysis begins with; ``context`` has the ropes in pieces where it asked for that."""

    context: Context
    rest: Rest
    said: tuple[str, ...]


def begin(
    context: Context,
    start: StartFrom | None,
    change: Change,
    loading: Loading | None,
    pieces: int | None,
) -> Begun:
    """The start state, with pieces if need be, then its changes and its loading: in that order.

    A state that is handed on is in balance; it is found again with pieces before anything is taken
    away or put on, so that what follows starts from there.

    Raises
    ------
    InputError
        A member hangs as one curve, and no number of pieces is given.
    AnalysisFailed
        No state was found with pieces, or something acts on a joint without a member.
    """
    rest = context.start(start)
    finer = finer_context(context, rest, pieces)
    said: tuple[str, ...] = ()
    if finer is not None and pieces is not None:
        if start is None or start.as_drawn:
            rest = cut(finer, rest, pieces)
        else:
            rest, said = _found_again(context, finer, rest, pieces)
        change = _in_finer(context, finer, change)
    whole = finer or context
    rest = under(whole.changed(rest, change), loading)
    if rest.scene.structure.hangs.any():
        names = chosen(whole.member_names, rest.scene.structure.hangs)
        raise InputError(f"{names} hangs as one curve, which this analysis cannot take; give pieces = 16")
    fallen = rest.scene.loads_on_nothing(rest.acting)
    if fallen:
        raise AnalysisFailed(f"no member is there to carry the load at {listed(fallen)}", rest)
    return Begun(whole, rest, said)


def balanced(begun: Begun, name: str) -> Begun:
    """The same with the state in balance, for analyses about a state of rest.

    Raises
    ------
    AnalysisFailed
        After what was taken away or put in, no equilibrium is found.
    """
    context, rest, said = begun
    potential = rest.scene.potential(rest.acting, rest.small)
    if potential.balanced(potential.look(rest.q), AT_REST):
        return begun
    geometry = "small" if rest.small else "large"
    scene, verdict = settle(context, Static(name, geometry=geometry, folding=True), rest, rest.acting)
    if not verdict.holds:
        raise AnalysisFailed(
            f"the state it starts from, after its changes, is not at rest: {verdict.fault}", verdict
        )
    U = scene.displacement(verdict.look.q, rest.acting)
    found = Rest(scene, rest.loading, rest.acting, U, verdict.look.response, small=rest.small)
    return Begun(context, found, (*said, "the state it starts from was brought to rest after its changes"))


def _found_again(context: Context, finer: Context, rest: Rest, pieces: int) -> tuple[Rest, tuple[str, ...]]:
    """A state of rest found again with pieces, from where it is known to be."""
    start = cut(finer, rest, pieces)
    geometry = "small" if rest.small else "large"
    step = Static(rest.loading.name, geometry=geometry, folding=True)
    scene, verdict = settle(finer, step, start, start.acting)
    if not verdict.holds:
        raise AnalysisFailed(f"the start state is not found again with pieces: {verdict.fault}", verdict)
    U = scene.displacement(verdict.look.q, start.acting)
    found = Rest(scene, rest.loading, start.acting, U, verdict.look.response, small=rest.small)
    names = chosen(context.member_names, rest.scene.structure.kind == HANGING)
    return found, (f"the start state was found again with {names} in {pieces} straight pieces",)


def finer_members(context: Context, finer: Context, members: Iterable[int]) -> tuple[int, ...]:
    """The same members in the finer model: a rope that was cut is all of its pieces."""
    place: dict[str, list[int]] = {}
    known = set(finer.member_names)
    for i, name in enumerate(finer.member_names):
        place.setdefault(name, []).append(i)
        place.setdefault(name.rpartition(".")[0], []).append(i)
    names = (context.member_names[m] for m in members)
    return tuple(i for n in names for i in (place[n][:1] if n in known else place[n]))


def _in_finer(context: Context, finer: Context, change: Change) -> Change:
    return replace(
        change,
        without_members=finer_members(context, finer, change.without_members),
        with_members=finer_members(context, finer, change.with_members),
    )


def finer_context(context: Context, rest: Rest, pieces: int | None) -> Context | None:
    """The model with hanging members in pieces, equal parts of their lengths in the state; None: no need."""
    hangs = np.flatnonzero(rest.scene.structure.kind == HANGING)
    if pieces is None or not hangs.size:
        return None
    lengths = {int(i): float(rest.scene.structure.L0[i]) for i in hangs}
    return Context(with_pieces(context.parts, pieces, lengths, tuple(int(i) for i in hangs)))


def cut(finer: Context, rest: Rest, pieces: int) -> Rest:
    """A state in the finer model: old joints where they are, those between pieces moved with the ends."""
    first, old = finer.first_scene(), rest.scene.structure
    stage = first.stage._replace(
        members=_presence(rest, finer, rest.scene.stage.members),
        supports=rest.scene.stage.supports,
        masses=rest.scene.stage.masses,
    )
    U = np.zeros((3, first.structure.joints))
    U[:, : old.joints] = rest.displacement
    for rope in finer.parts.members.hanging:
        if rope.joints.start >= old.joints:
            share = np.arange(1, len(rope.members)) / len(rope.members)
            between = np.outer(U[:, rope.start], 1 - share) + np.outer(U[:, rope.end], share)
            U[:, rope.joints.start : rope.joints.stop] = between
    pushing = np.zeros((3, len(finer.joint_names)), dtype=bool)
    pushing[:, : old.joints] = rest.scene.pushing
    scene = finer.restaged(replace(first, pieces=pieces), stage, pushing, U)
    inner = U.shape[1] - old.joints

    def wider(of_joints: Array) -> Array:
        return np.pad(of_joints, ((0, 0), (0, inner)))

    anchors = {i: wider(place) for i, place in rest.scene.anchors.items()}
    settled = wider(rest.scene.settled)
    scene = replace(_same_lengths(scene, rest), settled=settled, anchors=anchors, pieces=pieces)
    return finer.rest_at(scene, rest.loading, U)


def _same_lengths(scene: Scene, rest: Rest) -> Scene:
    """Members that are not cut keep the lengths and stiffnesses of the state."""
    old = {name: i for i, name in enumerate(rest.scene.parts.members.names)}
    pairs = [(k, old[n]) for k, n in enumerate(scene.parts.members.names) if n in old]
    new, was = (list(p) for p in zip(*pairs, strict=True)) if pairs else ([], [])
    L0, EA = scene.structure.L0.copy(), scene.structure.EA.copy()
    L0[new], EA[new] = rest.scene.structure.L0[was], rest.scene.structure.EA[was]
    return scene.with_lengths(L0, EA)


def _presence(rest: Rest, finer: Context, there: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Which members of the finer model are present: pieces as their whole rope is."""
    now = dict(zip(rest.scene.parts.members.names, there.tolist(), strict=True))
    return np.array([now.get(n, now.get(n.rpartition(".")[0], True)) for n in finer.member_names], dtype=bool)


def piece_names(scene: Scene) -> dict[str, Field]:
    """Names, drawn positions and ends along the axes of an analysis whose ropes are in pieces."""
    if scene.pieces is None:
        return {}
    joint, member, s = scene.joint_axis, scene.member_axis, scene.structure
    joints = np.array(scene.parts.joints.names, dtype=np.object_)
    members = np.array(scene.parts.members.names, dtype=np.object_)
    ends = np.stack([s.start, s.end], axis=1)
    return {
        joint: Field(joints, "1", "joints, those between pieces included", (joint,)),
        member: Field(members, "1", "members, ropes in pieces", (member,)),
        "position_with_pieces": Field(s.position.T, "m", "drawn position", (joint, "direction")),
        "ends_with_pieces": Field(ends, "1", "joints of its ends, from 0", (member, "end")),
    }
