"""The largest force, length and mass as understood: a slip in a unit shows here first."""

from __future__ import annotations

import math
from array import array
from collections.abc import Iterator

from tautbar.model.parts import Parts


def echo_of(parts: Parts, lengths: array[float]) -> tuple[str, ...]:
    """One line each, for `check`; quantities that the model does not have are left out."""
    found = []
    for what, unit, candidates in (
        ("largest force", "N", _forces(parts)),
        ("longest member", "m", zip(lengths, parts.members.names, strict=True)),
        ("largest mass", "kg", _masses(parts, lengths)),
    ):
        size, whose = max(candidates, default=(0.0, ""))
        if size > 0:
            found.append(f"{what}: {quantity_text(size, unit)} ({whose})")
    return tuple(found)


def quantity_text(value: float, unit: str) -> str:
    """A value in SI in a readable multiple: ``40 kN``."""
    if unit == "N":
        multiples = ((1e6, "MN"), (1e3, "kN"), (1.0, "N"), (1e-3, "mN"))
        factor, unit = next((m for m in multiples if abs(value) >= m[0]), multiples[-1])
        value /= factor
    return f"{value:.4g} {unit}"


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


def _masses(parts: Parts, lengths: array[float]) -> Iterator[tuple[float, str]]:
    per_length = [section.mass_per_length or 0.0 for section in parts.sections]
    masses = [
        per_length[section] * length for section, length in zip(parts.members.section, lengths, strict=True)
    ]
    heaviest = max(masses)
    yield heaviest, f"member '{parts.members.names[masses.index(heaviest)]}'"
    for mass in parts.masses:
        if mass.joints:
            yield mass.mass, f"joint '{parts.joints.names[mass.joints[0]]}'"
    for case in parts.load_cases.values():
        for joints, value in case.masses:
            yield value, f"joint '{parts.joints.names[joints[0]]}' in load case '{case.name}'"
