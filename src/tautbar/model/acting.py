"""What acts: supports, masses, load cases, combinations and events from their checked words."""

from __future__ import annotations

import math
from array import array
from collections.abc import Mapping
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

from tautbar.model.lookup import Finder, Wholes
from tautbar.model.mistakes import Mistakes
from tautbar.model.parts import AXES, Ice, Indices, LoadCase, Mass, Pulse, Support, Vector, Wind
from tautbar.model.positions import Path


def notes_of(data: dict[str, Any]) -> dict[str, str]:
    """The note and the source that a table has."""
    return {key: data[key] or "" for key in ("note", "source") if key in data}


@dataclass
class Actions:
    """Builds what acts on the joints and members that the finders know."""

    mistakes: Mistakes
    joints: Finder
    members: Finder
    wholes: Wholes
    axes: tuple[int, ...]
    temperature: float | None = None

    def supports(self, entries: list[Any]) -> tuple[Support, ...]:
        """Supports, in the order given."""
        found, names = [], set()
        for i, data in enumerate(entries):
            if data is None:
                continue
            path: Path = ("supports", i)
            name = data.get("name") or f"support {i + 1}"
            if name in names:
                self.mistakes.add((*path, "name"), f"the name '{name}' is used twice for supports")
            names.add(name)
            if not {"fixed", "along", "springs", "only_pushes"} & data.keys():
                self.mistakes.add(path, "holds nothing", 'give fixed = ["x"], along, springs or only_pushes')
            fixed = tuple(dict.fromkeys(AXES.index(a) for a in data.get("fixed") or () if a))
            along = self._along(data, path)
            springs = self._springs(data.get("springs") or {}, path)
            found.append(
                Support(
                    name,
                    self.joints.find(data["joints"], (*path, "joints")),
                    fixed,
                    along,
                    springs,
                    self._only_pushes(data.get("only_pushes"), fixed, along, springs, path),
                    data.get("absent", False) is not False,
                    **notes_of(data),
                )
            )
        return tuple(found)

    def _only_pushes(
        self,
        given: str | None,
        fixed: Indices,
        along: Vector | None,
        springs: tuple[tuple[int, float], ...],
        path: Path,
    ) -> int | None:
        """The axis a support pushes along, which it may not hold in another way too."""
        if given is None:
            return None
        axis, where = AXES.index(given), (*path, "only_pushes")
        held = {
            "fixed": axis in fixed,
            "along": along is not None and along[axis] != 0,
            "springs": any(axis == a for a, _ in springs),
        }
        if axis not in self.axes:
            self.mistakes.add(where, f"{given} is not a direction of this plane model")
        for key in (key for key, holds in held.items() if holds):
            what = f"'{key}' holds {given} both ways, only_pushes one way"
            self.mistakes.add(where, what, f"leave {given} out of one of them")
        return axis

    def _along(self, data: dict[str, Any], path: Path) -> Vector | None:
        return self._direction(data.get("along"), (*path, "along"))

    def _direction(self, given: Vector | None, path: Path) -> Vector | None:
        """The unit vector along a vector."""
        if given is None:
            return None
        size = math.hypot(*given)
        if size == 0:
            self.mistakes.add(path, "has no direction: all its components are zero")
            return None
        return (given[0] / size, given[1] / size, given[2] / size)

    def _springs(self, data: dict[str, Any], path: Path) -> tuple[tuple[int, float], ...]:
        for axis in data:
            if axis in AXES and AXES.index(axis) not in self.axes:
                self.mistakes.add((*path, "springs", axis), f"{axis} is not a direction of this plane model")
        return tuple((AXES.index(a), k) for a, k in data.items() if a in AXES and k is not None)

    def masses(self, entries: list[Any]) -> tuple[Mass, ...]:
        """Masses at joints and along members."""
        found, names = [], set()
        for i, data in enumerate(entries):
            if data is None:
                continue
            path: Path = ("masses", i)
            name = data.get("name") or f"mass {i + 1}"
            if name in names:
                self.mistakes.add((*path, "name"), f"the name '{name}' is used twice for masses")
            names.add(name)
            keys = {"joints", "mass", "members", "per_length"} & data.keys()
            if keys not in ({"joints", "mass"}, {"members", "per_length"}):
                self.mistakes.add(path, "is not whole", "give joints and mass, or members and per_length")
            found.append(
                Mass(
                    self.joints.find(data.get("joints"), (*path, "joints")),
                    self.members.find(data.get("members"), (*path, "members")),
                    data.get("mass", 0.0),
                    data.get("per_length", 0.0),
                    name,
                    data.get("absent", False) is not False,
                    **notes_of(data),
                )
            )
        return tuple(found)

    def load_cases(self, words: dict[str, Any]) -> dict[str, LoadCase]:
        """Load cases by name."""
        return {
            name: self._load_case(name, {} if data is None else data, ("load_cases", name))
            for name, data in words.items()
        }

    def _load_case(self, name: str, data: dict[str, Any], path: Path) -> LoadCase:
        return LoadCase(
            name,
            data.get("self_weight") or 0.0,
            self._each(data, "masses", self.joints, "mass", path),
            self._each(data, "forces", self.joints, "force", path),
            self._each(data, "line_loads", self.members, "per_length", path),
            self._temperature(data, path),
            self._each(data, "movements", self.joints, "move", path),
            self._take_up(data, path),
            self._wind(data, path),
            self._ice(data, path),
            **notes_of(data),
        )

    def _each(
        self, data: dict[str, Any], key: str, finder: Finder, value: str, path: Path
    ) -> tuple[tuple[Indices, Any], ...]:
        """The entries of a list: whom it concerns, and the value for each."""
        found = []
        where = f"{finder.what}s"
        for i, entry in enumerate(data.get(key) or ()):
            if entry is not None:
                named = finder.find(entry.get(where), (*path, key, i, where))
                found.append((named, entry.get(value)))
        return tuple(found)

    def _temperature(self, data: dict[str, Any], path: Path) -> tuple[tuple[Indices, float], ...]:
        change, absolute = data.get("temperature_change"), data.get("temperature")
        if "temperature" in data and "temperature_change" in data:
            self.mistakes.add(
                (*path, "temperature"), "temperature and temperature_change are given", "give one"
            )
        if isinstance(change, list):
            return self._each(data, "temperature_change", self.members, "change", path)
        if absolute is not None:
            if self.temperature is None and self.mistakes.at("temperature"):
                return ()
            if self.temperature is None:
                what = "the model does not say at which temperature its lengths are given"
                self.mistakes.add((*path, "temperature"), what, 'add temperature = "10 degC" to the model')
                return ()
            change = absolute - self.temperature
        everyone = tuple(range(len(self.members.index)))
        return () if change is None else ((everyone, change),)

    def _take_up(self, data: dict[str, Any], path: Path) -> tuple[tuple[Indices, float], ...]:
        """Take-up; of a rope named as a whole each of its members takes its share."""
        found: list[tuple[Indices, float]] = []
        for i, entry in enumerate(data.get("take_up") or ()):
            if entry is None:
                continue
            length, names = entry.get("length") or 0.0, entry.get("members") or []
            left = dict.fromkeys(self.members.find(names, (*path, "take_up", i, "members")))
            for whole in self.wholes.named(names):
                if all(member in left for member in whole.members):
                    found += [(members, length * share) for members, share in whole.shares]
                    for member in whole.members:
                        del left[member]
            if left:
                found.append((tuple(left), length))
        return tuple(found)

    def _wind(self, data: dict[str, Any], path: Path) -> tuple[Wind, ...]:
        found = []
        for i, entry in enumerate(data.get("wind") or ()):
            if entry is None:
                continue
            where = (*path, "wind", i)
            members = self.members.find(entry["members"], (*where, "members"))
            toward = self._direction(entry["toward"], (*where, "toward"))
            heights, pressures = self._pressure(entry["pressure"], (*where, "pressure"))
            found.append(Wind(members, toward or (0.0, 0.0, 0.0), heights, pressures))
        return tuple(found)

    def _pressure(self, given: Any, path: Path) -> tuple[tuple[float, ...], tuple[float, ...]]:
        """Heights and pressures; a single pressure is that of every height."""
        if not isinstance(given, list):
            return ((0.0,), (given,)) if given is not None else ((), ())
        rows = [row for row in given if row is not None and None not in row]
        for (low, _), (high, _) in pairwise(rows):
            if not high > low:
                self.mistakes.add(path, f"heights must rise, {high:g} m follows {low:g} m")
                break
        return tuple(row[0] for row in rows), tuple(row[1] for row in rows)

    def _ice(self, data: dict[str, Any], path: Path) -> tuple[Ice, ...]:
        return tuple(
            Ice(
                self.members.find(entry["members"], (*path, "ice", i, "members")),
                entry["thickness"] or 0.0,
                entry["density"] or 0.0,
            )
            for i, entry in enumerate(data.get("ice") or ())
            if entry is not None
        )

    def events(self, words: dict[str, Any], tables: Mapping[str, Any]) -> dict[str, Pulse]:
        """Events by name; ``tables`` are the (times, factors) of those with a CSV table."""
        return {
            name: self._pulse(name, data, ("events", name), tables.get(name))
            for name, data in words.items()
            if data is not None
        }

    def _pulse(self, name: str, data: dict[str, Any], path: Path, table: Any) -> Pulse:
        times, factors = table if table is not None else _columns(data.get("table"))
        shape = data["shape"]
        if shape is not None:
            self._pulse_keys(shape, data, path)
        for k in range(1, len(times)):
            if not times[k] > times[k - 1]:
                self.mistakes.add(
                    (*path, "table"), f"times must increase, {times[k]:g} s follows {times[k - 1]:g} s"
                )
                break
        duration = times[-1] if shape == "table" and times else data.get("duration", 0.0)
        return Pulse(
            name,
            shape,
            duration,
            data["start"],
            self._each(data, "forces", self.joints, "force", path),
            data.get("rise", 0.0),
            data.get("fall", 0.0),
            data.get("decay", 0.0),
            times,
            factors,
            **notes_of(data),
        )

    def _pulse_keys(self, shape: str, data: dict[str, Any], path: Path) -> None:
        own = {"trapezoid": ("rise", "fall"), "blast": ("decay",), "table": ("table",)}
        for of, keys in own.items():
            for key in keys:
                if key in data and shape != of:
                    self.mistakes.add(
                        (*path, key), f'\'{key}\' belongs to the shape "{of}", this is "{shape}"'
                    )
                elif shape == of and key not in data and key != "decay":
                    self.mistakes.add(path, f"'{key}' is missing", f'the shape "{shape}" needs it')
        if shape == "table" and "duration" in data:
            self.mistakes.add((*path, "duration"), "the table says how long the pulse is", "leave it out")
        elif shape != "table" and "duration" not in data:
            self.mistakes.add(path, "'duration' is missing", "how long the pulse lasts")
        ramps = (data.get("rise") or 0.0) + (data.get("fall") or 0.0)
        if data.get("duration") is not None and ramps > data["duration"]:
            self.mistakes.add((*path, "duration"), f"is shorter than rise and fall together ({ramps:g} s)")


def _columns(table: Any) -> tuple[array[float], array[float]]:
    rows = [row for row in table or () if isinstance(row, list) and None not in row]
    return array("d", [row[0] for row in rows]), array("d", [row[1] for row in rows])
