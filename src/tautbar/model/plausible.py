"""Ranges that values of real structures lie in: outside them a unit has probably slipped.

The ranges are ours and wide on purpose. A value outside is warned of, never refused.
"""

from __future__ import annotations

import math
from array import array
from collections.abc import Iterator
from typing import Any

from tautbar.model.echo import quantity_text
from tautbar.model.mistakes import several
from tautbar.model.parts import KINDS, FormFinding, History, Parts, TensionTarget, Tune
from tautbar.model.prestress import prestressed
from tautbar.model.proportion import EXPANSION, MODULUS, disproportionate

_RANGES: dict[str, tuple[float, float, str]] = {  # SI, ends included; zero is never warned of
    "modulus": (*MODULUS, "Pa"),
    "density": (10.0, 25_000.0, "kg/m3"),
    "expansion": (*EXPANSION, "1/K"),
    "yield_strength": (1e5, 1e10, "Pa"),
    "area": (1e-8, 1.0, "m2"),
    "axial_stiffness": (1e2, 1e12, "N"),
    "stiffness": (1.0, 1e12, "N/m"),
    "mass_per_length": (1e-5, 1e5, "kg/m"),
    "radius_of_gyration": (1e-4, 5.0, "m"),
    "retardation_time": (0.0, 1.0, "s"),
    "breaking_force": (1.0, 1e9, "N"),
    "wind_width": (1e-4, 10.0, "m"),
    "pretension": (0.1, 1e9, "N"),
    "tension": (0.1, 1e9, "N"),
    "force": (1e-3, 1e9, "N"),
    "mass": (1e-6, 1e8, "kg"),
    "spring": (1.0, 1e12, "N/m"),
    "temperature change": (0.0, 200.0, "K"),
    "duration": (1e-6, 1e5, "s"),
    "time_step": (1e-8, 10.0, "s"),
    "gravity": (0.1, 30.0, "m/s2"),
    "temperature": (150.0, 500.0, "K"),
    "pressure": (1.0, 1e5, "Pa"),
    "thickness": (1e-4, 0.5, "m"),
    "force density": (1e-2, 1e9, "N/m"),
}
_WORDS = {
    "modulus": "soft plastics to diamond",
    "density": "foam to platinum",
    "expansion": "invar to soft plastics",
}
_LENGTHS = (1e-3, 5e3)  # m, of members
_SLENDER = 400.0  # length over radius of gyration of a bar
_STEPS = 2e6  # of a history


def implausible(parts: Parts, lengths: array[float]) -> Iterator[str]:
    """Warnings about values outside their ranges, or that do not fit each other."""
    for what, key, value in _values(parts):
        low, high, unit = _RANGES[key]
        if value and not low <= abs(value) <= high:
            yield _outside(what, key, value, unit, low, high)
    yield from _member_lengths(parts, lengths)
    yield from _slenderness(parts, lengths)
    yield from _above_yield(parts)
    yield from disproportionate(parts, lengths)
    for analysis in parts.analyses:
        if isinstance(analysis, History):
            yield from _times(analysis, parts)


def _outside(what: str, key: str, value: float, unit: str, low: float, high: float) -> str:
    text = quantity_text(value, unit)
    hint = ", mN is a thousandth of a newton" if unit == "N" and abs(value) < 1 else ""
    range_text = f"the plausible range {quantity_text(low, unit)} to {quantity_text(high, unit)}"
    range_text += f" ({_WORDS[key]})" if key in _WORDS else ""
    return f"{what}: {key} {text} is outside {range_text}: is its unit right{hint}?"


def _values(parts: Parts) -> Iterator[tuple[str, str, float | None]]:
    yield "model", "gravity", parts.gravity
    yield "model", "temperature", parts.temperature
    yield from _fields("material", parts.materials, ("modulus", "density", "expansion", "yield_strength"))
    of_sections: tuple[str, ...] = (
        "area",
        "axial_stiffness",
        "stiffness",
        "mass_per_length",
        "radius_of_gyration",
    )
    of_sections += ("retardation_time", "breaking_force", "wind_width")
    yield from _fields("section", parts.sections, of_sections)
    given_by = {material.name: material.expansion for material in parts.materials}
    own = [s for s in parts.sections if s.expansion != given_by.get(s.material or "")]
    yield from _fields("section", own, ("expansion",))
    for name, force in zip(parts.members.names, parts.members.pretension, strict=True):
        if force == force:
            yield f"member '{name}'", "pretension", force
    for support in parts.supports:
        for _, stiffness in support.springs:
            yield f"support '{support.name}'", "spring", stiffness
    for mass in parts.masses:
        yield "masses", "mass", mass.mass
        yield "masses", "mass_per_length", mass.per_length
    for case in parts.load_cases.values():
        what = f"load case '{case.name}'"
        yield from ((what, "temperature change", change) for _, change in case.temperature_change)
        yield from ((what, "mass", mass) for _, mass in case.masses)
        yield from ((what, "force", max(map(abs, force))) for _, force in case.forces)
        yield from ((what, "pressure", pressure) for wind in case.wind for pressure in wind.pressures)
        for ice in case.ice:
            yield what, "thickness", ice.thickness
            yield what, "density", ice.density
    for event in parts.events.values():
        yield f"event '{event.name}'", "duration", event.duration
        yield from ((f"event '{event.name}'", "force", max(map(abs, f))) for _, f in event.forces)
    for analysis in parts.analyses:
        what = f"analysis '{analysis.name}'"
        if isinstance(analysis, FormFinding):
            yield from ((what, "force density", value) for _, value in analysis.force_densities)
        if isinstance(analysis, Tune):
            tensions = [t.tension for t in analysis.targets if isinstance(t, TensionTarget)]
            yield from ((what, "tension", force) for force in tensions)


def _fields(what: str, things: Any, keys: tuple[str, ...]) -> Iterator[tuple[str, str, float | None]]:
    for thing in things:
        for key in keys:
            yield f"{what} '{thing.name}'", key, getattr(thing, key)


def _member_lengths(parts: Parts, lengths: array[float]) -> Iterator[str]:
    m = parts.members
    low, high = _LENGTHS
    pieces = {i for h in m.hanging for i in h.members}
    strange = [
        name
        for i, (length, name) in enumerate(zip(lengths, m.names, strict=True))
        if not low <= length <= high and i not in pieces
    ]
    if strange:
        range_text = f"the plausible range {low:g} to {high:g} m"
        yield f"members {several(strange)}: length outside {range_text}: is its unit right?"


def _slenderness(parts: Parts, lengths: array[float]) -> Iterator[str]:
    m = parts.members
    radii = [section.radius_of_gyration for section in parts.sections]
    if not any(radii):
        return
    ties = (KINDS.index("tension-only"), KINDS.index("hanging"))
    reach = [_SLENDER * (radius or math.inf) for radius in radii]
    columns = zip(m.kind, m.section, lengths, m.names, strict=True)
    slender = [
        name for kind, section, length, name in columns if length > reach[section] and kind not in ties
    ]
    if slender:
        ratio = f"slenderness above {_SLENDER:g}"
        yield f"members {several(slender)}: {ratio}: they buckle under little compression"


def _above_yield(parts: Parts) -> Iterator[str]:
    strong = [
        parts.members.names[p.member]
        for p in prestressed(parts)
        if abs(p.force) > (p.section.yield_strength or math.inf) * (p.section.area or math.inf)
    ]
    if strong:
        yield f"members {several(strong)}: the force as drawn is above yield"


def _times(analysis: History, parts: Parts) -> Iterator[str]:
    what = f"analysis '{analysis.name}'"
    for key, value in (("duration", analysis.duration), ("time_step", analysis.time_step)):
        low, high, unit = _RANGES[key]
        if not low <= value <= high:
            yield _outside(what, key, value, unit, low, high)
    if analysis.time_step > analysis.duration:
        yield f"{what}: time_step is longer than duration"
    if analysis.duration / analysis.time_step > _STEPS:
        steps = f"{analysis.duration / analysis.time_step:.3g}"
        yield f"{what}: takes {steps} steps: are duration and time_step right?"
    for name in analysis.events:
        if parts.events[name].start >= analysis.duration:
            yield f"{what}: the event '{name}' starts only after its end"
