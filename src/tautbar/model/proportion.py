"""Values that do not fit each other: a unit has probably slipped, though each alone could be right.

The bounds are ours and wide: moduli and expansions as material handbooks list them for metals, glass
and stone; stiffness for its mass from rubber (30 to 100 m/s as the speed of sound along it) to the
stiffest carbon fibre (20 km/s).
"""

from __future__ import annotations

import math
from array import array
from collections import defaultdict
from collections.abc import Iterable, Iterator

from tautbar.model.echo import quantity_text
from tautbar.model.mistakes import several
from tautbar.model.parts import Material, Parts, Section
from tautbar.model.prestress import prestressed

MODULUS = (5e7, 1e12)  # Pa
EXPANSION = (1e-7, 3e-4)  # 1/K
_DENSE = 2500.0  # kg/m3: from here on metals, glass and stone, no rope or plastic
_OF_DENSE = 1e10  # Pa, the least modulus of these (lead has 16 GPa)
_OF_DENSE_EXPANSION = (2e-7, 4e-5)  # 1/K (invar 1e-6, zinc 3e-5)
_LIKE_STEEL = (7000.0, 9000.0)  # kg/m3: iron, steel, tin, brass, copper, nickel
_OF_STEEL = (4e10, 3e11)  # Pa, of these, steel ropes by their metal area included
_STEEL = 2.1e11 / 7850  # N m/kg, modulus over density
_SPEEDS = (300.0, 25e3)  # m/s, of sound along a member
_BREAKING = (1e-3, 1.0)  # strain at the breaking force: glass 0.02, steel ropes 0.01 to 0.03, nylon 0.3
_YIELD = 0.3  # strain at the yield strength: steel 0.002, nylon fibre 0.2
_STRETCHED = 0.05  # as drawn
_LONG = 2.0  # unstressed over drawn length
_SHARE = 0.02  # of a member's length, that take-up and movements stay below
_WEIGHTS = 100.0  # times the weight of everything, that a force stays below


def disproportionate(parts: Parts, lengths: array[float]) -> Iterator[str]:
    """Warnings about values that do not fit each other."""
    for material in parts.materials:
        yield from _material(material)
    sound = {m.name for m in parts.materials if not any(_material(m)) and _within(m.modulus, MODULUS)}
    for section in parts.sections:
        if section.material is None or section.material in sound:
            yield from _section(section)
    yield from _lengths_as_drawn(parts)
    yield from _take_up(parts, lengths)
    yield from _movements(parts, lengths)
    yield from _forces(parts, lengths)


def _within(value: float, bounds: tuple[float, float]) -> bool:
    return bounds[0] <= value <= bounds[1]


def _percent(share: float) -> str:
    return f"{100 * share:.2g} %"


def _material(material: Material) -> Iterator[str]:
    """A modulus and an expansion that no material of this density has."""
    what, density, modulus = f"material '{material.name}'", material.density or 0.0, material.modulus
    of = f"with density {density:.4g} kg/m3"
    bounds = _OF_STEEL if _within(density, _LIKE_STEEL) else (_OF_DENSE, MODULUS[1])
    if density >= _DENSE and _within(modulus, MODULUS) and not _within(modulus, bounds):
        usual = f"metals of that density have {bounds[0] / 1e9:g} to {bounds[1] / 1e9:g} GPa (steel 210 GPa)"
        if bounds is not _OF_STEEL:
            usual = f"metals, glass and stone have {_OF_DENSE / 1e9:g} GPa or more"
        yield f"{what}: modulus {quantity_text(modulus, 'Pa')} {of}: {usual}: is its unit right?"
    elif _within(modulus, MODULUS) and (material.yield_strength or 0.0) > _YIELD * modulus:
        strength = material.yield_strength or 0.0
        at = f"yields at {quantity_text(strength, 'Pa')}, with modulus {quantity_text(modulus, 'Pa')}"
        yield f"{what}: {at} a strain of {_percent(strength / modulus)}: are both units right?"
    expansion = material.expansion
    known = expansion and _within(abs(expansion), EXPANSION)
    if density >= _DENSE and known and not _within(abs(expansion or 0.0), _OF_DENSE_EXPANSION):
        low, high = _OF_DENSE_EXPANSION
        yield (
            f"{what}: expansion {expansion:g} 1/K {of}: metals, glass and stone have {low:g} to {high:g} 1/K "
            "(steel 1.2e-05 1/K): is its unit right?"
        )


def _section(section: Section) -> Iterator[str]:
    """A stiffness that does not fit the mass or the breaking force."""
    stiffness, mass = section.axial_stiffness, section.mass_per_length
    if stiffness is None:
        return
    what = f"section '{section.name}': axial_stiffness {quantity_text(stiffness, 'N')}"
    speed = math.sqrt(stiffness / mass) if mass and section.area is None else _SPEEDS[0]
    if not _within(speed, _SPEEDS):
        like = "is as soft as rubber" if speed < _SPEEDS[0] else "is stiffer than any material"
        steel = quantity_text(_STEEL * (mass or 0.0), "N")
        yield f"{what} {like} for its {mass:.4g} kg/m (steel: {steel}): are both units right?"
        return
    strain = (section.breaking_force or 0.0) / stiffness
    if strain and not _within(strain, _BREAKING):
        breaking = quantity_text(section.breaking_force or 0.0, "N")
        at = f"it would break at a strain of {_percent(strain)}"
        yield f"{what} with breaking_force {breaking}: {at}: are both units right?"


def _lengths_as_drawn(parts: Parts) -> Iterator[str]:
    """Members that are far too short or too long for where they are drawn."""
    names = parts.members.names
    given = [p for p in prestressed(parts) if p.length == p.length]
    short = [p for p in given if p.force > _STRETCHED * (p.section.axial_stiffness or math.inf)]
    if short:
        share = f"stretched by more than {_percent(_STRETCHED)} as drawn"
        yield f"members {several([names[p.member] for p in short])}: {share}: are length and stiffness right?"
    long = [p.member for p in given if _unstressed(parts, p.member, p.length) > _LONG * p.length]
    if long:
        share = f"more than {_LONG:g} times as long as drawn"
        yield f"members {several([names[i] for i in long])}: {share}: is the unit of the length right?"


def _unstressed(parts: Parts, member: int, drawn: float) -> float:
    """The length that a loose member was given [m]; 0 where none was."""
    given, slack = parts.members.unstressed_length[member], parts.members.slack[member]
    return given if given == given else drawn + slack if slack == slack else 0.0


def _take_up(parts: Parts, lengths: array[float]) -> Iterator[str]:
    """Take-up that is much of a member's length."""
    for case in parts.load_cases.values():
        shares = {i: length / lengths[i] for members, length in case.take_up for i in members if lengths[i]}
        most = max(shares, key=lambda i: abs(shares[i]), default=-1)
        if most >= 0 and abs(shares[most]) > _SHARE:
            name, length = whole_of(parts, lengths, most)
            share = abs(shares[most])
            of = f"{_percent(share)} of the length of '{name}' ({length:.4g} m)"
            what = f"load case '{case.name}': take_up of {quantity_text(share * length, 'm')}"
            yield f"{what} is {of}: is its unit right?"


def _movements(parts: Parts, lengths: array[float]) -> Iterator[str]:
    """Movements of supports that are much of the length of the members there."""
    for case in parts.load_cases.values():
        reach = _longest_at(parts, lengths, (j for joints, _ in case.movements for j in joints))
        for joints, move in case.movements:
            size = math.hypot(*move)
            far = [j for j in joints if size > _SHARE * reach.get(j, (math.inf, ""))[0]]
            if far:
                length, name = reach[far[0]]
                yield (
                    f"load case '{case.name}': joint '{parts.joints.names[far[0]]}' moves by "
                    f"{quantity_text(size, 'm')}, {_percent(size / length)} of the length of '{name}' "
                    f"({length:.4g} m): is its unit right?"
                )


def _longest_at(parts: Parts, lengths: array[float], joints: Iterable[int]) -> dict[int, tuple[float, str]]:
    """Length [m] and name of the longest member, ropes as wholes, at each of the joints."""
    wanted, found = set(joints), dict[int, tuple[float, str]]()
    if wanted:
        for i, ends in enumerate(zip(parts.members.start, parts.members.end, strict=True)):
            for joint in wanted.intersection(ends):
                name, length = whole_of(parts, lengths, i)
                found[joint] = max(found.get(joint, (0.0, "")), (length, name))
    return found


def whole_of(parts: Parts, lengths: array[float], member: int) -> tuple[str, float]:
    """Name and drawn length [m] of a member, or of the rope that it is a piece of."""
    for rope in parts.members.hanging:
        if member in rope.members:
            return rope.name, sum(lengths[i] for i in rope.members)
    return parts.members.names[member], lengths[member]


def _forces(parts: Parts, lengths: array[float]) -> Iterator[str]:
    """Forces many times as large as the weight of everything."""
    weight = total_mass(parts, lengths) * parts.gravity
    acting = [(f"load case '{c.name}'", c.forces) for c in parts.load_cases.values()]
    acting += [(f"event '{e.name}'", e.forces) for e in parts.events.values()]
    for what, forces in acting:
        size, joints = max(((math.hypot(*f), joints) for joints, f in forces), default=(0.0, ()))
        if weight and size > _WEIGHTS * weight:
            of = f"{size / weight:.0f} times the weight of everything ({quantity_text(weight, 'N')})"
            at = f"on joint '{parts.joints.names[joints[0]]}'"
            yield f"{what}: a force of {quantity_text(size, 'N')} {at} is {of}: is its unit right?"


def total_mass(parts: Parts, lengths: array[float]) -> float:
    """Mass of everything [kg], load cases included; members by their drawn length."""
    m = parts.members
    per_length = [section.mass_per_length or 0.0 for section in parts.sections]
    total = sum(per_length[section] * length for section, length in zip(m.section, lengths, strict=True))
    for mass in parts.masses:
        along = sum(lengths[i] for i in mass.members)
        total += mass.mass * len(mass.joints) + mass.per_length * along
    return total + sum(by_case(parts).values())


def by_case(parts: Parts) -> dict[str, float]:
    """Mass [kg] that each load case brings with it, of those that bring any."""
    found: dict[str, float] = defaultdict(float)
    for case in parts.load_cases.values():
        for joints, mass in case.masses:
            found[case.name] += mass * len(joints)
    return {name: mass for name, mass in found.items() if mass}
