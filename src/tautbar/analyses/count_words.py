"""The statical count in sentences: what ``check`` prints and what a run warns of."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.count import NO, UNDECIDED, YES, StaticalCount
from tautbar.analyses.words import chosen, direction, listed
from tautbar.model.parts import Parts

Array = NDArray[np.float64]
NAMED = 6  # mechanisms told one by one
_STATES = 3  # states of self-stress
_TOLD = 3  # joints of a mechanism
_TOLD_MEMBERS = 6
_EQUAL = 1e-6  # of the largest move
_PART = 0.1  # of the largest move or force: what is less is not told


def count_lines(count: StaticalCount, parts: Parts) -> list[str]:
    """Counts, then each mechanism and state of self-stress with the joints or members it is made of."""
    c = count
    lines = [
        ", ".join(
            [
                _number(c.states_of_self_stress, "state of self-stress", "states of self-stress"),
                _number(c.mechanisms, "mechanism"),
                _number(c.rigid_motions, "motion as a rigid body", "motions as rigid bodies"),
            ]
        ),
        _made_of(count),
    ]
    if parts.members.hanging:
        inner = f"; {_number(c.inner_joints, 'joint')} between pieces left out"
        ropes = listed([rope.name for rope in parts.members.hanging])
        lines.append(f"one straight line for each hanging member in pieces ({ropes}){inner}")
    lines += _mechanisms(count, parts)
    lines += _told("motion", c.rigid_motion, c.rigid_motions, parts, as_body)
    lines += _states(count, parts)
    if c.nearly.size:
        nearly = _number(c.nearly.size, "direction")
        lines.append(f"{nearly} nearly free: members stretch {c.nearly[0]:.1g} m or more per metre of move")
    return lines


def _number(count: int, one: str, many: str = "") -> str:
    return f"{count or 'no'} {one if count == 1 else many or one + 's'}"


def _made_of(count: StaticalCount) -> str:
    springs = f" and {_number(count.springs, 'spring')} to ground" if count.springs else ""
    members = _number(count.lines, "member")
    return f"{members}{springs} in {_number(count.directions, 'free direction')}, ties and struts as two-way"


def _mechanisms(count: StaticalCount, parts: Parts) -> Iterator[str]:
    told = list(_told("mechanism", count.mechanism, count.mechanisms, parts, moving))
    answers = count.stiffening.answers[:NAMED]
    for line, answer in zip(told, answers, strict=False):
        yield f"{line}; {stiffened(count, answer, parts)}"
    yield from told[len(answers) :]


def _told(
    word: str, moves: Array, number: int, parts: Parts, said: Callable[[Array, Parts], str]
) -> Iterator[str]:
    for k, U in enumerate(moves[:NAMED], start=1):
        yield f"{word} {k}: {said(U, parts)}"
    if number > min(len(moves), NAMED):
        yield f"and {number - min(len(moves), NAMED)} more"


def moving(U: Array, parts: Parts) -> str:
    """The joints that move most (J, 3) and where: ``B in z, C in x (0.50)``."""
    size = np.sqrt((U * U).sum(axis=1))
    order = np.argsort(-np.round(size, 6), kind="stable")
    most = [j for j in order[: _TOLD + 1] if size[j] > _PART]
    words = [
        f"{parts.joints.names[j]} in {direction(U[j] / size[j])}"
        + ("" if size[j] > 0.995 else f" ({size[j]:.2f})")
        for j in most[:_TOLD]
    ]
    rest = int((size > _PART).sum()) - len(words)
    return ", ".join(words) + (f" and {rest} more" if rest else "")


def as_body(U: Array, parts: Parts) -> str:
    """A motion (J, 3) of a rigid body: a translation, or the joints that move most as it turns."""
    moved = U[np.abs(U).max(axis=1) > _EQUAL]
    if (np.ptp(moved, axis=0) < _EQUAL).all():
        return f"{_number(len(moved), 'joint')} in {direction(moved[0])}"
    return f"turning, {moving(U, parts)}"


def _states(count: StaticalCount, parts: Parts) -> Iterator[str]:
    for k, state in enumerate(count.self_stress[:_STATES], start=1):
        springs = np.abs(count.spring_stress[k - 1]).max(initial=0.0) > _PART
        yield f"self-stress {k}: {_carrying(state, parts)}" + (", and springs to ground" if springs else "")
    more = count.states_of_self_stress - min(len(count.self_stress), _STATES)
    if more:
        yield f"and {more} more"


def _carrying(state: Array, parts: Parts) -> str:
    values: dict[str, float] = {}
    lines = {m: rope.name for rope in parts.members.hanging for m in rope.members}
    for m in np.argsort(-np.round(np.abs(state), 6), kind="stable"):
        if abs(state[m]) <= _PART:
            break
        values.setdefault(lines.get(int(m), parts.members.names[m]), float(state[m]))
    return listed([f"{name} {value:+.2f}" for name, value in values.items()], _TOLD_MEMBERS)


def stiffened(count: StaticalCount, answer: str, parts: Parts) -> str:
    """What tension does for a mechanism."""
    s = count.stiffening
    if s.by == "pretension":
        if s.slack is not None:
            names = chosen(parts.members.names, s.slack)
            return f"not decided whether the pretension given stiffens it: it would leave {names} slack"
        return {
            YES: "the pretension given stiffens it",
            NO: "the pretension given does not stiffen it",
            UNDECIDED: "not decided whether the pretension given stiffens it",
        }[answer]
    if not count.states_of_self_stress:
        return "no self-stress is possible that could stiffen it"
    return {
        YES: "pretension could stiffen it, none is given",
        NO: "no self-stress that its ties and struts can carry stiffens it",
        UNDECIDED: "not decided whether any self-stress stiffens it",
    }[answer]


def count_warnings(count: StaticalCount, parts: Parts) -> tuple[str, ...]:
    """Motions that no member resists in the drawing, and what holds them."""
    out = []
    for U, answer in zip(count.mechanism[:NAMED], count.stiffening.answers, strict=False):
        holds = (
            "" if answer == YES and count.stiffening.by == "pretension" else "; else only large displacements"
        )
        out.append(
            f"mechanism: no member resists {moving(U, parts)}; {stiffened(count, answer, parts)}{holds}"
        )
    more = count.mechanisms - min(len(count.mechanism), NAMED)
    if more:
        overall = stiffened(count, count.stiffening.overall, parts).replace("stiffens it", "stiffens all")
        out.append(f"and {more} more mechanisms; {overall}")
    if count.rigid_motions and not parts.floating:
        free = "; ".join(as_body(U, parts) for U in count.rigid_motion[:NAMED])
        out.append(
            f"{_number(count.rigid_motions, 'motion')} as a rigid body that no support resists: {free}"
        )
    return tuple(out)
