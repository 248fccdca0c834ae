"""The largest values as understood: a slip in a unit shows here first."""

from __future__ import annotations

import math
from array import array
from collections.abc import Iterator

from tautbar.model.parts import Parts

_MULTIPLES = {
    "N": ((1e9, "GN"), (1e6, "MN"), (1e3, "kN"), (1.0, "N"), (1e-3, "mN")),
    "N/m": ((1e6, "MN/m"), (1e3, "kN/m"), (1.0, "N/m")),
    "Pa": ((1e9, "GPa"), (1e6, "MPa"), (1e3, "kPa"), (1.0, "Pa")),
    "m": ((1.0, "m"), (1e-3, "mm")),
}


def echo_of(parts: Parts, lengths: array[float]) -> tuple[str, ...]:
    """One line each, for `check`; quantities that the model does not have are left out."""
    wholes = _wholes(parts, lengths)
    found = []
    for what, unit, candidates in (
        ("largest force", "N", _forces(parts)),
        ("largest line load", "N/m", _line_loads(parts)),
        ("largest wind pressure", "Pa", _pressures(parts)),
        ("longest member", "m", ((length, name) for name, length, _ in wholes)),
        ("largest take-up", "m", _take_up(parts)),
        ("largest movement", "m", _movements(parts)),
        ("largest mass", "kg", _masses(parts, wholes)),
    ):
        size, whose = max(candidates, default=(0.0, ""))
        if size > 0:
            found.append(f"{what}: {quantity_text(size, unit)} ({whose})")
    return tuple(found)


def quantity_text(value: float, unit: str) -> str:
    """A value in SI in a readable multiple: ``40 kN``."""
    multiples = _MULTIPLES.get(unit, ((1.0, unit),))
    factor, unit = next((m for m in multiples if abs(value) >= m[0]), multiples[-1])
    return f"{value / factor:.4g} {unit}"


def _wholes(parts: Parts, lengths: array[float]) -> list[tuple[str, float, float]]:
    """Name, drawn length [m] and mass [kg] of each member, ropes in pieces as wholes."""
    m = parts.members
    per_length = [section.mass_per_length or 0.0 for section in parts.sections]
    pieces = {i for h in m.hanging for i in h.members}
    singly = [range(i, i + 1) for i in range(len(m)) if i not in pieces]
    groups = [(m.names[r.start], r) for r in singly] + [(h.name, h.members) for h in m.hanging]
    return [
        (name, length, length * per_length[m.section[members.start]])
        for name, members in groups
        for length in (sum(lengths[i] for i in members),)
    ]


def _forces(parts: Parts) -> Iterator[tuple[float, str]]:
    for case in parts.load_cases.values():
        for _, force in case.forces:
            yield math.hypot(*force), f"load case '{case.name}'"
    for event in parts.events.values():
        for _, force in event.forces:
            yield math.hypot(*force), f"event '{event.name}'"
    pretensions = [(abs(p), i) for i, p in enumerate(parts.members.pretension) if p == p]
    if pretensions:
        largest, i = max(pretensions)
        yield largest, f"pretension of '{parts.members.names[i]}'"
    for h in parts.members.hanging:
        if h.given == "pretension":
            yield h.value, f"pretension of '{h.name}'"


def _line_loads(parts: Parts) -> Iterator[tuple[float, str]]:
    for case in parts.load_cases.values():
        yield from ((math.hypot(*load), f"load case '{case.name}'") for _, load in case.line_loads)


def _pressures(parts: Parts) -> Iterator[tuple[float, str]]:
    for case in parts.load_cases.values():
        yield from ((max(wind.pressures), f"load case '{case.name}'") for wind in case.wind)


def _take_up(parts: Parts) -> Iterator[tuple[float, str]]:
    """Take-up of members, of a rope in pieces that of all of them."""
    pieces = {i: h for h in parts.members.hanging for i in h.members}
    for case in parts.load_cases.values():
        for members, length in case.take_up:
            rope = pieces.get(members[0])
            name = rope.name if rope else parts.members.names[members[0]]
            yield abs(length) * (len(rope.members) if rope else 1), f"'{name}' in load case '{case.name}'"


def _movements(parts: Parts) -> Iterator[tuple[float, str]]:
    for case in parts.load_cases.values():
        for joints, move in case.movements:
            yield math.hypot(*move), f"joint '{parts.joints.names[joints[0]]}' in load case '{case.name}'"


def _masses(parts: Parts, wholes: list[tuple[str, float, float]]) -> Iterator[tuple[float, str]]:
    yield from ((mass, f"member '{name}'") for name, _, mass in wholes)
    for mass in parts.masses:
        if mass.joints:
            yield mass.mass, f"joint '{parts.joints.names[mass.joints[0]]}'"
    for case in parts.load_cases.values():
        for joints, value in case.masses:
            yield value, f"joint '{parts.joints.names[joints[0]]}' in load case '{case.name}'"
