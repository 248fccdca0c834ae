"""Checks of what makes members taut or slack as drawn: pretension, lengths and sag."""

from __future__ import annotations

import math
from array import array
from collections.abc import Iterator
from dataclasses import dataclass

from tautbar.model.mistakes import Mistakes
from tautbar.model.parts import KINDS, Hanging, Members, Parts, Section
from tautbar.model.positions import Path
from tautbar.model.structure import Drawing

_ALLOWANCE = 1.01  # sags and least tensions are judged by formulas good to about 1 %
_MOST_STRAIN = 10.0  # of a rope as drawn: beyond what the softest rubber bears
_HANGING = KINDS.index("hanging")
_GIVEN = ("pretension", "unstressed_length", "slack", "sag")


@dataclass(frozen=True)
class Prestressed:
    """A straight member that is not simply as long as drawn, and its force as drawn [N]."""

    member: int
    given: str
    force: float  # NaN where the section is wrong; inf where the length is impossible
    section: Section
    length: float  # as drawn, m


def drawn_length(parts: Parts, start: int, end: int) -> float:
    """Distance of two joints [m]; NaN where one is unknown."""
    if start < 0 or end < 0:
        return math.nan
    j = parts.joints
    return math.dist((j.x[start], j.y[start], j.z[start]), (j.x[end], j.y[end], j.z[end]))


def drawn_lengths(parts: Parts) -> array[float]:
    """Drawn length of each member [m], (N,)."""
    points = list(zip(parts.joints.x, parts.joints.y, parts.joints.z, strict=True))
    ends = zip(parts.members.start, parts.members.end, strict=True)
    return array("d", [math.dist(points[start], points[end]) for start, end in ends])


def prestressed(parts: Parts) -> Iterator[Prestressed]:
    """The straight members with a pretension, unstressed length or slack."""
    m = parts.members
    for given in ("pretension", "unstressed_length", "slack"):
        for i, value in enumerate(getattr(m, given)):
            if value == value and m.section[i] >= 0 and m.kind[i] != _HANGING:
                section = parts.sections[m.section[i]]
                length = drawn_length(parts, m.start[i], m.end[i])
                yield Prestressed(i, given, _force(section, length, given, value), section, length)


def ropes(parts: Parts) -> Iterator[Hanging]:
    """Every hanging member, those that are one catenary as if they were a single piece."""
    yield from parts.members.hanging
    m = parts.members
    for i, kind in enumerate(m.kind):
        if kind == _HANGING:
            given, value = next(
                ((key, v) for key in _GIVEN if (v := getattr(m, key)[i]) == v), ("", math.nan)
            )
            yield Hanging(m.names[i], m.start[i], m.end[i], range(i, i + 1), range(0), given, value)


def _force(section: Section, length: float, given: str, value: float) -> float:
    """Force as drawn: EA (L - L0) / L0, or k (L - L0)."""
    if given == "pretension":
        return value
    unstressed = length + value if given == "slack" else value
    if section.stiffness is not None:
        return section.stiffness * (length - unstressed)
    if section.axial_stiffness is None or not unstressed > 0:
        return math.nan
    return section.axial_stiffness * (length - unstressed) / unstressed


def strength(section: Section) -> float:
    """Breaking force that the end fitting leaves [N]; inf where none is given."""
    if section.breaking_force is None or section.end_factor is None:
        return math.inf
    return section.breaking_force * section.end_factor


def check_lengths(parts: Parts, drawing: Drawing, mistakes: Mistakes) -> None:
    """Note pretensions, lengths and sags that cannot be."""
    later = set(parts.members.absent)  # these are put in between joints that have moved by then
    for p in prestressed(parts):
        problem = _impossible(p, parts.members)
        waits = p.member in later and p.given == "unstressed_length"
        if not problem and not waits and p.force > strength(p.section):
            problem = _too_strong(p.force, p.section)
        if problem:
            mistakes.add((*drawing.paths[p.member], p.given), problem)
    for h in ropes(parts):
        path = drawing.paths[h.members.start] if h.members else ()
        position = parts.members.section[h.members.start] if h.members else -1
        waits = h.given == "unstressed_length" and h.members.start in later
        if position >= 0 and h.start >= 0 and h.end >= 0 and h.value == h.value:
            _check_hanging(parts, h, parts.sections[position], (*path, h.given), mistakes, waits)


def _impossible(p: Prestressed, members: Members) -> str:
    kind = KINDS[members.kind[p.member]]
    if kind == "tension-only" and p.given == "pretension" and p.force < 0:
        return f"a pretension of {_newtons(p.force)} is compression, which a tension-only member cannot carry"
    if kind == "compression-only" and p.force > 0:
        return f"tension as drawn ({_newtons(p.force)}), which a compression-only member cannot carry"
    stiffness = p.section.axial_stiffness
    if p.given == "pretension" and stiffness is not None and p.force <= -stiffness:
        return f"a compression of {_newtons(-p.force)} is more than its axial stiffness: no length gives it"
    spring = p.section.stiffness or math.inf
    if p.given == "pretension" and p.force >= spring * p.length:
        return f"a tension of {_newtons(p.force)} would need an elongation of its whole length"
    return ""


def _too_strong(force: float, section: Section) -> str:
    breaking = f"the breaking force {_newtons(section.breaking_force or 0.0)}"
    if section.end_factor != 1:
        breaking += f" times end_factor {section.end_factor:g}, {_newtons(strength(section))}"
    return f"its force as drawn, {_newtons(force)}, is above {breaking}"


def _newtons(force: float) -> str:
    return f"{force / 1e3:.6g} kN"


def _check_hanging(
    parts: Parts, h: Hanging, section: Section, where: Path, mistakes: Mistakes, waits: bool
) -> None:
    up = parts.up
    columns = (parts.joints.x, parts.joints.y, parts.joints.z)
    rise = abs(columns[up][h.end] - columns[up][h.start])
    chord = drawn_length(parts, h.start, h.end)
    span = math.sqrt(max(chord**2 - rise**2, 0.0))
    weight = (section.mass_per_length or 0.0) * (parts.gravity or 0.0)
    if not weight and not mistakes.at("sections") and not mistakes.at("materials"):
        hint = "give mass_per_length to its section, or use a tension-only member"
        mistakes.add(where, "a hanging member needs weight, its section has no mass or gravity is 0", hint)
        return
    if waits:
        return
    force = h.value if h.given == "pretension" else 0.0
    stiffness = section.axial_stiffness or (section.stiffness or 0.0) * chord
    if h.given == "pretension":
        least = least_tension(span, rise, weight)
        stretch = 1 + (least + weight * rise) / stiffness if stiffness else 1.0  # it weighs less by this
        if h.value * _ALLOWANCE * stretch < least:
            possible = f"about {least / stretch / 1e3:.3g} kN"
            mistakes.add(where, f"with these ends and this weight its lower end pulls at least {possible}")
    elif h.given == "sag":
        if span <= 1e-6 * chord:
            mistakes.add(where, "its ends are above each other, so it cannot have a sag")
            return
        force = weight * chord * span / (8 * h.value) * chord / span / _ALLOWANCE
    elif h.given == "unstressed_length":
        force = _force(section, chord, h.given, h.value)
    less = " (less than possible)" if h.given in ("sag", "unstressed_length") else ""
    if force > strength(section):
        mistakes.add(where, _too_strong(force, section) + less)
    elif stiffness and force > _MOST_STRAIN * stiffness:
        what = f"as drawn it would be stretched by {force / stiffness:.3g} times its length{less}"
        mistakes.add(where, what)


def least_tension(span: float, rise: float, weight: float) -> float:
    """The least tension [N] that the lower end of a hanging rope can have.

    The rope is taken as inextensible: a longer rope between the same ends hangs deeper and at first
    pulls less, then more, as it grows heavier (level ends: 0.754 weight span at least). Searched
    by golden sections over the catenary's parameter.

    Parameters
    ----------
    span, rise
        Horizontal and vertical distance of the ends, m.
    weight
        N/m.
    """
    if span <= 1e-6 * rise:
        return 0.0

    def tension(logarithm: float) -> float:
        a = span * math.exp(logarithm)  # horizontal force / weight
        middle = math.asinh(rise / (2 * a * math.sinh(span / (2 * a))))
        return weight * a * math.cosh(middle - span / (2 * a))

    low, high, golden = math.log(0.02), math.log(1e3), (math.sqrt(5) - 1) / 2
    for _ in range(60):
        left, right = high - golden * (high - low), low + golden * (high - low)
        low, high = (low, right) if tension(left) < tension(right) else (left, high)
    return tension((low + high) / 2)
