"""What happens within one step of a path: members that go slack or taut, critical points."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.solvers.path_arc import Arc
from tautbar.solvers.path_correct import Border, Spot, State, correct, examine
from tautbar.solvers.path_family import Family, nearest_zero

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
LIMIT, BIFURCATION, KINK = "limit point", "bifurcation", "kink"
MOST_IN_A_STEP = 12
BESIDE = 1e-6  # of the step
AT_ONCE = 3  # directions watched for losing their stiffness together
WEAK = 1e-3  # of the largest stiffness
ACROSS = 1e-6  # of the growing load: a direction that feels no more of it is at right angles to it
MOST_SETS = 30


@dataclass(frozen=True)
class Critical:
    """A critical point: its kind, the pivots before and after, and the direction (n,) that is free there.

    ``turns`` says whether the load factor turns there; a kink has no direction of its own (None).
    """

    kind: str
    spot: Spot
    negative: tuple[int, int]
    turns: bool
    direction: Array | None


def agreement(family: Family, spot: Spot) -> Array:
    """How far (N,) [m] each member is from leaving the active set, below zero beyond; infinite for bars."""
    sense = family.sense * np.where(spot.on, 1.0, -1.0)
    return np.where(family.switchable, sense * spot.look.stretch.e, np.inf)


def at_their_length(family: Family, spot: Spot) -> Flags:
    """Members (N,) that are neither slack nor taut there."""
    exact = 10 * family.at(spot.f).springs.at_length
    return np.asarray(family.switchable & (np.abs(spot.look.stretch.e) <= exact))


def first_switch(arc: Arc) -> float | None:
    """Distance along the arc at which the first member leaves the active set; None if none does.

    Members that are just at their length at the start are left out: they move as the set wants them to.
    """
    family = arc.family
    fresh = ~at_their_length(family, arc.start.spot)
    exact = family.at(arc.start.spot.f).springs.at_length

    def least(s: float) -> float:
        value = float(agreement(family, arc.at(s))[fresh].min(initial=np.inf))
        return 0.0 if abs(value) <= exact else value

    if least(arc.length) > 0:
        return None
    return arc.root(least, 0.0, arc.length)


def turned_back(arc: Arc) -> bool:
    """Whether a member that was at its length at the start ends the step on the wrong side of it."""
    back = at_their_length(arc.family, arc.start.spot)
    exact = arc.family.at(arc.end.spot.f).springs.at_length
    return bool((agreement(arc.family, arc.end.spot)[back] < -10 * exact).any())


def dips(arc: Arc) -> bool:
    """Whether a member seems to leave the active set within the step and to be back at its end.

    Judged by the cubic through values and slopes at both ends, at its quarter points.
    """
    family = arc.family
    y0, y1 = agreement(family, arc.start.spot), agreement(family, arc.end.spot)
    sense = family.sense * np.where(arc.start.spot.on, 1.0, -1.0)
    stride = float(arc.start.along @ arc.end.along)  # metres along the end's tangent per metre of arc
    m0, m1 = (arc.length * sense * s.stretching for s in (arc.start, arc.end))
    m1 = m1 / max(stride, 0.1)
    inside = family.switchable & (y0 > 0) & (y1 > 0)
    y0, y1, m0, m1 = (v[inside] for v in (y0, y1, m0, m1))
    for t in (0.25, 0.5, 0.75):
        u = 1 - t
        y = u * u * (1 + 2 * t) * y0 + t * u * u * m0 + t * t * (3 - 2 * t) * y1 - t * t * u * m1
        if (y < 0).any():
            return True
    return False


def change_set(family: Family, before: State) -> State | None:
    """Go on from a switch with the set that agrees with the motion it causes; None if there is none.

    ``before`` is the state landed on with its old set. Members that left the set at the landing must go
    on the way they came; those at their length with them must move as their place in the new set says.
    """
    landed = before.spot
    exact = at_their_length(family, landed)
    sense = family.sense
    leaving = exact & (sense * np.where(landed.on, 1.0, -1.0) * before.stretching < 0)
    if not leaving.any():
        return before
    way = np.where(leaving, np.sign(before.stretching), 0.0)
    on: Flags | None = landed.on ^ leaving
    seen = set[bytes]()
    while on is not None and len(seen) < MOST_SETS:
        seen.add(on.tobytes())
        spot = Spot(landed.q, landed.f, on, landed.look, landed.imbalance)
        state = examine(family, spot, before.along)
        pushed = float(way @ state.stretching)
        if pushed < -1e-9 * np.abs(state.stretching).max():
            state = state.turned()
        wrong = exact & ((sense * state.stretching > 0) != on) & (np.abs(state.stretching) > 1e-12)
        if not wrong.any():
            return state
        on = _next_set(on, wrong, seen)
    return None


def first_set(family: Family, spot: Spot, way: float) -> State | None:
    """The state to start from: members just at their length carry or not as the growing load wants."""
    exact, seen = at_their_length(family, spot), set[bytes]()
    on: Flags | None = spot.on
    while on is not None and len(seen) < MOST_SETS:
        seen.add(on.tobytes())
        state = examine(family, Spot(spot.q, spot.f, on, spot.look, spot.imbalance))
        state = state if way > 0 else state.turned()
        wrong = exact & ((family.sense * state.stretching > 0) != on) & (np.abs(state.stretching) > 1e-12)
        if not wrong.any():
            return state
        on = _next_set(on, wrong, seen)
    return None


def _next_set(on: Flags, wrong: Flags, seen: set[bytes]) -> Flags | None:
    """The set with all wrong members changed over, or with one of them where that was tried before."""
    if (on ^ wrong).tobytes() not in seen:
        return on ^ wrong
    for member in np.flatnonzero(wrong):
        one = on.copy()
        one[member] = ~one[member]
        if one.tobytes() not in seen:
            return one
    return None


def kink(before: State, after: State) -> Critical | None:
    """The critical point of a switch at which the count of negative pivots jumps."""
    if before.negative == after.negative:
        return None
    turns = before.rise * after.rise < 0
    return Critical(KINK, before.spot, (before.negative, after.negative), turns, None)


def critical_points(arc: Arc) -> list[tuple[float, Critical]]:
    """Critical points within the step, one active set, in order, with their distance along it.

    They are where the count of negative pivots or the sense of the load factor changes; found on the
    distance by the eigenvalue of the tangent nearest to zero.
    """
    found: list[tuple[float, Critical]] = []
    left, end = 0.0, _signature(arc.end)
    while _signature(arc.state(left)) != end and len(found) < MOST_IN_A_STEP:
        at, right = _next_change(arc, left)
        found += [(at, c) for c in _judged(arc, left, at, right)]
        left = right
    return found


def _signature(state: State) -> tuple[int, bool]:
    return state.negative, state.rise > 0


def _next_change(arc: Arc, left: float) -> tuple[float, float]:
    """Where the signature first differs from that at ``left``, and a distance just beyond.

    Just beyond is past the rounding of the counts: points nearer together than that are one.
    """
    known = _signature(arc.state(left))

    def value(s: float) -> float:
        state = arc.state(s)
        values, vectors = nearest_zero(arc.family.system, state.tangent, AT_ONCE)
        arc.hold(_weak_across(arc, state, values, vectors))
        near = max(abs(float(values[0])), 1e-300)  # never zero: the sign has to say on which side it is
        return near if _signature(state) == known else -near

    at = arc.root(value, left, arc.length)
    return at, min(at + BESIDE * arc.length, arc.length)


def _weak_across(arc: Arc, state: State, values: Array, vectors: Array) -> Array:
    """Those directions (n, m) that have little stiffness and are at right angles to the growing load."""
    p = arc.family.load_rate(state.spot.q, state.spot.f, state.spot.on)
    weak = np.abs(values) <= WEAK * float(np.abs(state.tangent.lower).max())
    across = np.abs(p @ vectors) <= ACROSS * float(np.sqrt(p @ p))
    return vectors[:, weak & across]


def _judged(arc: Arc, left: float, at: float, right: float) -> list[Critical]:
    """The critical point between two states beside it: which kind, which direction."""
    before, after = arc.state(left), arc.state(right)
    here = arc.state(at)
    counts = (before.negative, after.negative)
    turns = (before.rise > 0) != (after.rise > 0)
    many = max(1, abs(counts[1] - counts[0]))
    free = _free_directions(arc, before, here, many)
    p = arc.family.load_rate(here.spot.q, here.spot.f, here.spot.on)
    load = p / (float(np.sqrt(p @ p)) or 1.0)
    if not turns:
        return [Critical(BIFURCATION, here.spot, counts, False, _across(free, load))]
    if many == 1:
        return [Critical(LIMIT, here.spot, counts, True, free[:, 0])]
    # Two at once: the load turns, and the structure may leave across it.
    return [
        Critical(LIMIT, here.spot, counts, True, _unit(free @ (free.T @ load))),
        Critical(BIFURCATION, here.spot, counts, False, _across(free, load)),
    ]


def _free_directions(arc: Arc, before: State, here: State, many: int) -> Array:
    """Orthonormal directions (n, many) that lose their stiffness; what is loose anyway is left out."""
    system, loose = arc.family.system, before.tangent.zero
    vectors = nearest_zero(system, here.tangent, many + loose)[1]
    if loose:
        held = vectors.T @ (system.pattern.to_csc(before.tangent.lower) @ vectors)
        value, mix = np.linalg.eigh(0.5 * (held + held.T))
        vectors = vectors @ mix[:, np.argsort(-np.abs(value))]
    return vectors[:, :many]


def _across(free: Array, load: Array) -> Array:
    """The direction within ``free`` at right angles to the load."""
    if free.shape[1] == 1:
        return free[:, 0]
    return np.asarray(free @ np.linalg.svd((load @ free)[None, :])[2][-1])


def _unit(v: Array) -> Array:
    return v / float(np.sqrt(v @ v))


def land(arc: Arc, border: Border) -> float | None:
    """Distance along the arc at which a condition first holds, None where it does not change sign."""
    start, end = (border.gap(s.spot.q, s.spot.f) for s in (arc.start, arc.end))
    if start == 0.0 or start * end > 0:
        return None

    def value(s: float) -> float:
        spot = arc.at(s)
        return border.gap(spot.q, spot.f)

    return arc.root(value, 0.0, arc.length)


def land_exactly(arc: Arc, s: float, border: Border) -> Spot:
    """The point there with the condition met to rounding."""
    rough = arc.at(s)
    exact = correct(arc.family, rough.on, rough.q, rough.f, border)
    return rough if exact is None else exact
