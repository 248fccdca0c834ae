"""Cross checks of a whole model: what no single entry shows. They find mistakes, not warnings."""

from __future__ import annotations

import math
import operator
from array import array
from collections import defaultdict
from collections.abc import Container, Iterator
from dataclasses import dataclass, replace

from tautbar.model.mistakes import Mistakes, several
from tautbar.model.parts import AXES, History, Modes, Parts, Section, Vector
from tautbar.model.presence import Presence, presences
from tautbar.model.structure import Drawing

_CLOSE = 1e-9  # of the size of the structure: joints nearer than this are in one place
_PARALLEL = 1e-9  # of the size of a movement


@dataclass
class Soundness:
    """Checks the parts of one model; values that are already known to be wrong are skipped."""

    parts: Parts
    drawing: Drawing
    mistakes: Mistakes
    asked: list[list[str]]  # the events each analysis names, wrong analyses included

    def check(self) -> None:
        """Note every mistake."""
        if not self.parts.joints.names:
            self.mistakes.add((), "the model has no joints", "add [joints] or [tables] joints")
        if not self.parts.members.names and not self.mistakes.at("members"):
            self.mistakes.add((), "the model has no members", "add [[members]] or [tables] members")
        self._places()
        self._lonely_joints()
        self._supported()
        self._masses()
        self._expansion()
        self._widths()
        self._movements()
        self._events()

    def _places(self) -> None:
        """Two joints in one place."""
        j = self.parts.joints
        drawn = len(j) - sum(len(h.joints) for h in self.parts.members.hanging)
        size = max((abs(v) for c in (j.x, j.y, j.z) for v in c if v == v), default=0.0)
        grid = 1 / (size * _CLOSE) if size else 1.0
        seen: dict[tuple[int, int, int], int] = {}
        for i, (x, y, z) in enumerate(zip(j.x[:drawn], j.y, j.z, strict=False)):
            if not (x == x and y == y and z == z):
                continue
            cell = (round(x * grid), round(y * grid), round(z * grid))
            other = seen.setdefault(cell, i)
            if other != i and j.names[other] != j.names[i]:
                what = f"is in the same place as joint '{j.names[other]}'"
                self.mistakes.add(self.drawing.joint_paths[i], what, "use one joint, or move one of them")

    def _lonely_joints(self) -> None:
        used = set(self.parts.members.start) | set(self.parts.members.end)
        for i, path in enumerate(self.drawing.joint_paths):
            if i not in used and self.drawing.joint_names[i] not in self.drawing.meant:
                self.mistakes.add(path, "no member goes to this joint", "remove it, or add a member")

    def _supported(self) -> None:
        """Every part must reach a support, unless parts may float."""
        doubtful = any(p[:1] == ("supports",) and "joints" in p for p, _, _ in self.mistakes.found)
        if self.parts.floating or doubtful or not self.parts.joints.names:
            return
        if not self.parts.supports and not self.mistakes.at("supports"):
            self.mistakes.add((), "nothing is supported", 'add [[supports]], or unsupported = "allowed"')
            return
        for joints in self._loose(Presence()):
            what = f"the part of joints {several(joints)} is not connected to any support"
            hint = 'support it, or allow it to float with unsupported = "allowed"'
            place = self.drawing.joint_paths[self.parts.joints.index[joints[0]]]
            self.mistakes.add(place, what, hint)
        self._stages()

    def _stages(self) -> None:
        """The same wherever members or supports are not there."""
        if self.mistakes.at("analyses") or self.mistakes.at("members") or self.mistakes.at("joints"):
            return
        seen = {Presence()}
        for name, presence in presences(self.parts).items():
            there = replace(presence, masses=frozenset())
            for joints in self._loose(there) if there not in seen else ():
                what = (
                    f"of what is there, the part of joints {several(joints)} is not connected to any support"
                )
                self.mistakes.add(("analyses", name), what, "put in what holds it, or take it away too")
            seen.add(there)

    def _loose(self, presence: Presence) -> Iterator[list[str]]:
        """Names of the joints of each part that no support holds."""
        m, root = self.parts.members, joined(self.parts, presence.members)
        held = {root[j] for s in self.parts.supports if s.name not in presence.supports for j in s.joints}
        loose: dict[int, list[str]] = defaultdict(list)
        for start, end in zip(m.start, m.end, strict=True):
            if start < 0 or end < 0:  # its other end is unknown: this part may be held through it
                held |= {root[j] for j in (start, end) if j >= 0}
        for joint, of in enumerate(root):
            if of not in held:
                loose[of].append(self.parts.joints.names[joint])
        # a single joint has no member: that is said elsewhere, or it is not there yet
        yield from (joints for joints in loose.values() if len(joints) > 1)

    def _masses(self) -> None:
        """Sections must say their mass where a weight or a dynamic analysis needs it."""
        dynamic = next((a for a in self.parts.analyses if isinstance(a, Modes | History)), None)
        weighing = next((c.name for c in self.parts.load_cases.values() if c.self_weight), None)
        if dynamic is not None:
            why = f"the {dynamic.kind} analysis '{dynamic.name}' needs its mass"
        elif weighing is not None:
            why = f"load case '{weighing}' has self_weight"
        else:
            return
        for section in used_sections(self.parts):
            if section.mass_per_length is None and not self._doubtful(section):
                hint = "give density in the material (and area), or mass_per_length; 0 to mean no mass"
                self.mistakes.add(("sections", section.name), f"it has no mass, but {why}", hint)
        if dynamic is not None and not self.mistakes.found and not has_mass(self.parts):
            path = ("analyses", dynamic.name)
            self.mistakes.add(path, "nothing in the model has mass, so nothing can move in time")

    def _doubtful(self, section: Section) -> bool:
        """Is something wrong with a section or its material already?"""
        return self.mistakes.at("sections", section.name) or (
            section.material is not None and self.mistakes.at("materials", section.material)
        )

    def _expansion(self) -> None:
        """A temperature change acts only on members that say how they expand."""
        column = self.parts.members.section
        for name, case in self.parts.load_cases.items():
            lacking: dict[str, str] = {}
            for members, change in case.temperature_change:
                for i in members if change else ():
                    section = self.parts.sections[column[i]] if column[i] >= 0 else None
                    if section is not None and section.expansion is None and not self._doubtful(section):
                        lacking.setdefault(section.name, self.parts.members.names[i])
            for section_name, member in lacking.items():
                what = f"changes the temperature of member '{member}', whose section '{section_name}' has no"
                hint = "give it to the section or its material; expansion = 0 to mean none"
                self.mistakes.add(("load_cases", name), f"{what} expansion", hint)

    def _widths(self) -> None:
        """Wind and ice act only on members that say how wide they are."""
        column = self.parts.members.section
        for name, case in self.parts.load_cases.items():
            acting = [(("wind", i), wind.members) for i, wind in enumerate(case.wind)]
            acting += [(("ice", i), ice.members) for i, ice in enumerate(case.ice)]
            for where, members in acting:
                lacking: dict[str, str] = {}
                for i in members:
                    section = self.parts.sections[column[i]] if column[i] >= 0 else None
                    if section is not None and section.wind_width is None and not self._doubtful(section):
                        lacking.setdefault(section.name, self.parts.members.names[i])
                for section_name, member in lacking.items():
                    what = f"acts on member '{member}', whose section '{section_name}' has no wind_width"
                    hint = "give it to the section; wind_width = 0 to mean none"
                    self.mistakes.add(("load_cases", name, *where), what, hint)

    def _movements(self) -> None:
        """Only held directions can be moved."""
        supports = self.parts.supports
        doubtful = {j for i, s in enumerate(supports) if self.mistakes.at("supports", i) for j in s.joints}
        for name, case in self.parts.load_cases.items():
            for i, (joints, move) in enumerate(case.movements):
                for joint in (j for j in joints if j not in doubtful):
                    free = self._free_part(joint, move) if move is not None else ""
                    if free:
                        what = f"joint '{self.parts.joints.names[joint]}' is not held in {free}"
                        hint = "only directions that a support holds (fixed or along) can be moved"
                        self.mistakes.add(("load_cases", name, "movements", i, "move"), what, hint)

    def _free_part(self, joint: int, move: Vector) -> str:
        """The axes in which a movement goes where nothing holds the joint."""
        here = [s for s in self.parts.supports if joint in s.joints]
        fixed = {axis for s in here for axis in (*s.fixed, s.only_pushes) if axis is not None}
        left = [0.0 if axis in fixed else move[axis] for axis in range(3)]
        size = math.hypot(*left)
        for along in (s.along for s in here if s.along is not None):
            across = math.hypot(
                *(a - along[k] * sum(map(operator.mul, left, along)) for k, a in enumerate(left))
            )
            if across <= _PARALLEL * size:
                return ""
        return " and ".join(AXES[axis] for axis in range(3) if left[axis])

    def _events(self) -> None:
        """An event that no analysis uses was meant for one; a model without analyses may wait."""
        for name in self.parts.events if self.asked else ():
            if not any(name in events for events in self.asked):
                histories = [f"'{a.name}'" for a in self.parts.analyses if isinstance(a, History)]
                hint = "name it in `events` of " + (" or ".join(histories[:4]) or "a history")
                self.mistakes.add(("events", name), "no analysis uses this event", hint)


def joined(parts: Parts, absent: Container[int] = ()) -> array[int]:
    """For each joint a number that joints joined by members have in common."""
    root = array("q", range(len(parts.joints)))

    def top(joint: int) -> int:
        while root[joint] != joint:
            root[joint] = root[root[joint]]
            joint = root[joint]
        return joint

    for i, (start, end) in enumerate(zip(parts.members.start, parts.members.end, strict=True)):
        if start >= 0 and end >= 0 and i not in absent:
            a, b = top(start), top(end)
            if a != b:
                root[max(a, b)] = min(a, b)
    return array("q", [top(joint) for joint in range(len(root))])


def used_sections(parts: Parts) -> Iterator[Section]:
    """The sections that some member has."""
    for position in sorted(set(parts.members.section)):
        if position >= 0:
            yield parts.sections[position]


def has_mass(parts: Parts) -> bool:
    """Has anything mass, in the members, beside them, or in the load cases?"""
    return (
        any(section.mass_per_length for section in used_sections(parts))
        or any(m.mass or m.per_length for m in parts.masses)
        or any(mass for case in parts.load_cases.values() for _, mass in case.masses)
        or any(case.ice for case in parts.load_cases.values())
    )
