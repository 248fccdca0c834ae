"""Statical count of the drawing: states of self-stress and mechanisms, and which of these tension stiffens.

S. Pellegrino and C. R. Calladine, Int. J. Solids Struct. 22 (1986) 409-428: with b lines and n free
directions, the rank r of the equilibrium matrix gives b - r states of self-stress and n - r motions
without stretch. C. R. Calladine, Int. J. Solids Struct. 14 (1978) 161-172: a state of self-stress t
stiffens the mechanisms on which sum t/l |sideways|^2 is positive.

Ties and struts count as two-way; a hanging member as one straight line between its ends; springs to
ground as lines; supports, inclined ones too, take directions away.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.definite import held_by, most_positive
from tautbar.algebra.rank import MOST, NullSpaces, left_part, localised, null_spaces, positive_definite
from tautbar.analyses.context import Context
from tautbar.analyses.scene import Scene
from tautbar.mechanics.carriers import carriers, respond
from tautbar.mechanics.lines import Lines, lines, rigid_motions
from tautbar.mechanics.loads import nothing
from tautbar.mechanics.structure import HANGING, STRUT, TIE
from tautbar.records.fields import Field

Array = NDArray[np.float64]
YES, NO, UNDECIDED = "yes", "no", "not decided"
_SEARCHED = 100  # states or mechanisms up to which combinations of states are searched
_ROUNDING = 1e-9  # share of the largest force
_LITTLE = 1e-6  # of tension beside stretching: far below any stiffness, far above rounding


@dataclass(frozen=True, slots=True)
class Stiffening:
    """Whether tension stiffens each mechanism, and which tension: ``by`` is "pretension" or "self-stress".

    ``force`` (N,) [N] is the pretension of the model as the structure holds it, None without;
    ``slack`` (N,) the members that it would leave slack: then nothing is decided.
    """

    answers: tuple[str, ...]  # of the mechanisms with vectors
    overall: str
    by: str
    force: Array | None = None
    slack: NDArray[np.bool_] | None = None


@dataclass(frozen=True, slots=True)
class StaticalCount:
    """Counts, and vectors of at most `MOST` of each; a large structure with more gives samples."""

    lines: int  # members, a hanging one counted once
    springs: int  # to ground
    directions: int  # free ones
    states_of_self_stress: int
    mechanisms: int  # internal ones
    rigid_motions: int
    self_stress: Array  # (S, N), largest 1, tension +
    spring_stress: Array  # (S, springs), likewise
    mechanism: Array  # (M, J, 3), largest move of a joint 1
    rigid_motion: Array  # (R, J, 3), likewise
    stiffening: Stiffening
    nearly: Array  # stretch per move of directions that stretch members hardly at all, rising
    inner_joints: int  # of hanging members in pieces, left out


def statical_count(context: Context) -> StaticalCount:
    """Count of the model as drawn, members and supports that are absent at first left out."""
    scene = context.first_scene()
    hanging = context.parts.members.hanging
    lined = lines(scene.structure, scene.system.freedom, hanging)
    spaces = null_spaces(lined.C)
    rigid = rigid_motions(lined, scene.structure.position)
    moving = localised(_internal(spaces, rigid))
    moves = lined.joint_moves(moving)
    moving = moving / np.sqrt((moves**2).sum(axis=1).max(axis=1, initial=0.0))
    stress = _signed(localised(spaces.left), lined, scene)
    return StaticalCount(
        lines=lined.count,
        springs=lined.springs,
        directions=int(lined.C.shape[1]),
        states_of_self_stress=spaces.left_nullity,
        mechanisms=spaces.nullity - rigid.shape[1],
        rigid_motions=rigid.shape[1],
        self_stress=_of_members(stress[: lined.count, :MOST].T, lined),
        spring_stress=stress[lined.count :, :MOST].T,
        mechanism=_of_joints(moving[:, :MOST], lined, scene),
        rigid_motion=_of_joints(rigid[:, :MOST], lined, scene),
        stiffening=_stiffening(lined, scene, spaces, moving, stress, rigid.shape[1]),
        nearly=spaces.nearly,
        inner_joints=sum(len(rope.joints) for rope in hanging),
    )


def _internal(spaces: NullSpaces, rigid: Array) -> Array:
    """Orthonormal motions without stretch at right angles to the rigid ones."""
    Q = np.linalg.qr(rigid)[0]
    V = spaces.null - Q @ (Q.T @ spaces.null)
    U, s, _ = np.linalg.svd(V, full_matrices=False)
    return U[:, s > 1e-6]  # of vectors of length one: what is left of rigid motions is rounding


def _signed(stress: Array, lined: Lines, scene: Scene) -> Array:
    """States with ties in tension and struts in compression where that can be, largest 1."""
    can = _sense(lined, scene)
    wanted = np.where(can == 0.0, 1e-6, can)  # bars have a say only where no tie or strut has
    sense = np.where(wanted @ stress[: lined.count] < 0.0, -1.0, 1.0)
    return sense * stress


def _of_members(values: Array, lined: Lines) -> Array:
    """Values of lines (..., L) for all members (..., N), zero for those that are not present."""
    padded = np.concatenate([values, np.zeros((*values.shape[:-1], 1))], axis=-1)
    return np.asarray(padded[..., lined.member])


def _of_joints(V: Array, lined: Lines, scene: Scene) -> Array:
    """Moves (M, J, 3) for unknowns (n, M): largest 1, the joints of hanging members moving in line."""
    U = lined.joint_moves(V)
    for rope in scene.parts.members.hanging:
        share = np.arange(1, len(rope.members)) / len(rope.members)
        ends = U[:, :, [rope.start]], U[:, :, [rope.end]]
        U[:, :, rope.joints.start : rope.joints.stop] = ends[0] * (1 - share) + ends[1] * share
    largest = np.sqrt((U * U).sum(axis=1).max(axis=1, initial=0.0))
    if not U.size:
        return np.zeros((0, scene.structure.joints, 3))
    flat = U.reshape(len(U), -1)
    sense = np.sign(flat[np.arange(len(U)), np.abs(flat).argmax(axis=1)])
    return np.asarray((U / (sense * largest)[:, None, None]).transpose(0, 2, 1))


def _stiffening(
    lined: Lines, scene: Scene, spaces: NullSpaces, moving: Array, stress: Array, rigid: int
) -> Stiffening:
    count, states = spaces.nullity - rigid, spaces.left_nullity
    if not states or not count:
        return Stiffening(_all(NO, moving), NO if count else YES, "self-stress")
    given = _given_forces(lined, scene)
    if np.abs(given).max() > 0.0:
        force = _held(lined, scene, given, spaces, stress)
        if force is None:
            return Stiffening(_all(UNDECIDED, moving), UNDECIDED, "pretension")
        if np.abs(force).max() > _ROUNDING * np.abs(given).max():
            return _by_pretension(lined, scene, force, moving, count, rigid)
    if states == 1:
        answers = _by_one_state(lined, scene, moving, stress[:, 0], count, rigid)
    elif max(count, states) <= _SEARCHED:
        answers = _by_any_state(lined, scene, moving, stress)
    else:
        answers = _by_likely_state(lined, scene, moving, count, rigid)
    return Stiffening(answers, _overall(answers), "self-stress")


def _given_forces(lined: Lines, scene: Scene) -> Array:
    """Forces [N] of the lines in the drawing, before anything moves: what their lengths make them carry.

    A hanging member pulls with the share along its chord of what its weight makes it pull.
    """
    s = scene.structure
    weight = nothing(s)._replace(along=s.down[:, None] * (s.m * (s.kind == HANGING)))
    pull = respond(carriers(s, weight), np.zeros((3, s.members))).pull
    at = lined.member >= 0
    along = (pull[:, at] * lined.unit[:, lined.member[at]]).sum(axis=0)
    number = np.bincount(lined.member[at], minlength=lined.count)
    return np.asarray(np.bincount(lined.member[at], along, minlength=lined.count) / number)


def _held(lined: Lines, scene: Scene, given: Array, spaces: NullSpaces, stress: Array) -> Array | None:
    """What remains of the forces given [N] once the joints have moved into balance, to first order.

    The state of self-stress nearest to the forces given in the energy of all lines: (L + springs,).
    None where it is not found.
    """
    s = scene.structure
    flexibility = np.bincount(lined.member[s.present], (s.L0 / s.EA)[s.present], minlength=lined.count)
    k = scene.system.freedom.spring.diagonal()
    grounded = lined.T[np.flatnonzero(k)]
    springs = k[np.flatnonzero(k)][np.diff(grounded.indptr) > 0]
    F = np.concatenate([flexibility, 1.0 / springs])
    N = np.concatenate([given, np.zeros(springs.size)])
    if stress.shape[1] == spaces.left_nullity:
        S = stress
        return np.asarray(S @ np.linalg.solve(S.T @ (F[:, None] * S), S.T @ (F * N)))
    root = np.sqrt(F / F.min())
    C = lined.C.copy()
    C.data = C.data / np.repeat(root, np.diff(C.indptr))
    part = left_part(C, N * root)
    return None if part is None else part / root


def _by_pretension(
    lined: Lines, scene: Scene, force: Array, moving: Array, count: int, rigid: int
) -> Stiffening:
    kind = scene.structure.kind[lined.first]
    N = force[: lined.count]
    least = _ROUNDING * np.abs(N).max()
    slack = ((kind == STRUT) & (least < N)) | (((kind == TIE) | (kind == HANGING)) & (-least > N))
    of_members = _of_members(N, lined)
    if slack.any():
        lost = _of_members(slack.astype(float), lined) > 0
        return Stiffening(_all(UNDECIDED, moving), UNDECIDED, "pretension", of_members, lost)
    answers = _held_by_force(lined, moving, N, count, rigid)
    return Stiffening(answers, _overall(answers), "pretension", of_members)


def _held_by_force(lined: Lines, moving: Array, N: Array, count: int, rigid: int) -> tuple[str, ...]:
    """Whether forces N (L,) stiffen each mechanism; where only samples are known, yes or undecided."""
    if count > moving.shape[1]:
        little = _LITTLE / float(np.abs(N / lined.length).max())
        all_held = positive_definite(lined.C.T @ lined.C + lined.tension_form(little * N), rigid)
        return _all(YES if all_held else UNDECIDED, moving)
    return tuple(YES if held else NO for held in held_by(_forms(lined, moving, N[:, None])[0]))


def _forms(lined: Lines, moving: Array, forces: Array) -> Array:
    """Forms (S, M, M) sum N/l |sideways|^2 over the mechanisms, one for each column of ``forces``."""
    across = lined.sideways(moving)
    out = np.empty((forces.shape[1], moving.shape[1], moving.shape[1]))
    for i, N in enumerate(forces.T):
        some = np.flatnonzero(N)
        D = across[:, some]
        out[i] = np.einsum("clj,clk->jk", D * (N[some] / lined.length[some])[:, None], D, optimize=True)
    return out


def _all(answer: str, moving: Array) -> tuple[str, ...]:
    return (answer,) * int(moving.shape[1])


def _overall(answers: tuple[str, ...]) -> str:
    return YES if all(a == YES for a in answers) else NO if NO in answers else UNDECIDED


def _sense(lined: Lines, scene: Scene) -> Array:
    """Sense of the force that each line can carry (L,): 1 tension, -1 compression, 0 both."""
    kind = scene.structure.kind[lined.first]
    return np.asarray(np.select([kind == STRUT, (kind == TIE) | (kind == HANGING)], [-1.0, 1.0], 0.0))


def _by_one_state(
    lined: Lines, scene: Scene, moving: Array, stress: Array, count: int, rigid: int
) -> tuple[str, ...]:
    """Whether the one state of self-stress, in a sense that ties and struts can carry, stiffens each."""
    N, sense = stress[: lined.count], _sense(lined, scene)
    best = _all(NO, moving)
    for sign in (1.0, -1.0):
        if (sign * sense * N >= -_ROUNDING).all():
            answers = _held_by_force(lined, moving, sign * N, count, rigid)
            best = max(best, answers, key=lambda a: (a.count(YES), a.count(UNDECIDED)))
    return best


def _by_likely_state(lined: Lines, scene: Scene, moving: Array, count: int, rigid: int) -> tuple[str, ...]:
    """Of too many states to search: the one nearest to ties all in tension and struts in compression."""
    sense = _sense(lined, scene)
    N = left_part(lined.C, np.concatenate([sense, np.zeros(lined.springs)]))
    if N is None:
        return _all(UNDECIDED, moving)
    N = N[: lined.count]
    if np.abs(N).max() > _LITTLE and (sense * N >= -_ROUNDING).all():
        answers = _held_by_force(lined, moving, N, count, rigid)
        return tuple(YES if a == YES else UNDECIDED for a in answers)
    return _all(UNDECIDED, moving)


def _by_any_state(lined: Lines, scene: Scene, moving: Array, stress: Array) -> tuple[str, ...]:
    """Whether any combination of states that ties and struts can carry stiffens each mechanism."""
    sides = _sense(lined, scene)[:, None] * stress[: lined.count]
    positive = most_positive(_forms(lined, moving, stress[: lined.count]), sides).positive
    return tuple(UNDECIDED if p is None else YES if p else NO for p in positive)


def count_fields(count: StaticalCount) -> dict[str, Field]:
    """Fields by their path under ``/model``; vectors only where there are any."""
    numbers = {
        "states_of_self_stress": (count.states_of_self_stress, "states of self-stress"),
        "mechanisms": (count.mechanisms, "internal mechanisms"),
        "rigid_motions": (count.rigid_motions, "motions as rigid bodies"),
        "lines": (count.lines, "members, a hanging one counted once"),
        "springs": (count.springs, "springs to ground"),
        "directions": (count.directions, "free directions"),
    }
    out = {name: Field(np.array(value), "1", words) for name, (value, words) in numbers.items()}
    out |= _numbered("self_stress", count.self_stress, ("member",), "force per largest force, tension +")
    out |= _numbered("mechanism", count.mechanism, ("joint", "direction"), "move per largest move")
    out |= _numbered("rigid_motion", count.rigid_motion, ("joint", "direction"), "move per largest move")
    answers = np.array(count.stiffening.answers[:MOST], dtype=np.object_)
    if answers.size:
        words = f"whether {count.stiffening.by} stiffens it"
        out["stiffened"] = Field(answers, "1", words, ("mechanism_number",))
        out["stiffened_by"] = Field(
            np.array(count.stiffening.by, dtype=np.object_), "1", "which tension does"
        )
    if count.stiffening.force is not None:
        out["prestress"] = Field(
            count.stiffening.force, "N", "pretension as held in the drawing", ("member",)
        )
    return {f"statical_count/{path}": field for path, field in out.items()}


def _numbered(name: str, values: Array, axes: tuple[str, ...], words: str) -> dict[str, Field]:
    """A field over counted things and the axis that counts them from 1."""
    if not len(values):
        return {}
    number = f"{name}_number"
    counted = Field(
        np.arange(1, len(values) + 1), "1", f"{name.replace('_', ' ')}, counted from 1", (number,)
    )
    return {number: counted, name: Field(values, "1", words, (number, *axes))}
