"""What acts: supports, masses, load cases, combinations and events from their checked words."""

from __future__ import annotations

import itertools
import math
from array import array
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from tautbar.model.format import AXES
from tautbar.model.lookup import Finder, is_pattern, matching
from tautbar.model.mistakes import Mistakes, near
from tautbar.model.parts import Hanging, Indices, LoadCase, Loading, Mass, Pulse, Support, Vector
from tautbar.model.positions import Path

_MOST_LOADINGS = 100_000
_ZERO = (0.0, 0.0, 0.0)


def notes_of(data: dict[str, Any]) -> dict[str, str]:
    """The note and the source that a table has."""
    return {key: data[key] or "" for key in ("note", "source") if key in data}


@dataclass
class Actions:
    """Builds what acts on the joints and members that the finders know."""

    mistakes: Mistakes
    joints: Finder
    members: Finder
    hanging: tuple[Hanging, ...]
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
            if not {"fixed", "along", "springs"} & data.keys():
                self.mistakes.add(path, "holds nothing", 'give fixed = ["x"], along or springs')
            found.append(
                Support(
                    name,
                    self.joints.find(data["joints"], (*path, "joints")),
                    tuple(dict.fromkeys(AXES.index(a) for a in data.get("fixed") or () if a)),
                    self._along(data, path),
                    self._springs(data.get("springs") or {}, path),
                    **notes_of(data),
                )
            )
        return tuple(found)

    def _along(self, data: dict[str, Any], path: Path) -> Vector | None:
        along = data.get("along")
        if along is None:
            return None
        size = math.hypot(*along)
        if size == 0:
            self.mistakes.add((*path, "along"), "has no direction: all its components are zero")
            return None
        return (along[0] / size, along[1] / size, along[2] / size)

    def _springs(self, data: dict[str, Any], path: Path) -> tuple[tuple[int, float], ...]:
        for axis in data:
            if axis in AXES and AXES.index(axis) not in self.axes:
                self.mistakes.add((*path, "springs", axis), f"{axis} is not a direction of this plane model")
        return tuple((AXES.index(a), k) for a, k in data.items() if a in AXES and k is not None)

    def masses(self, entries: list[Any]) -> tuple[Mass, ...]:
        """Masses at joints and along members."""
        found = []
        for i, data in enumerate(entries):
            if data is None:
                continue
            path: Path = ("masses", i)
            keys = {"joints", "mass", "members", "per_length"} & data.keys()
            if keys not in ({"joints", "mass"}, {"members", "per_length"}):
                self.mistakes.add(path, "is not whole", "give joints and mass, or members and per_length")
            found.append(
                Mass(
                    self.joints.find(data.get("joints"), (*path, "joints")),
                    self.members.find(data.get("members"), (*path, "members")),
                    data.get("mass", 0.0),
                    data.get("per_length", 0.0),
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
            if self.temperature is None:
                what = "the model does not say at which temperature its lengths are given"
                self.mistakes.add((*path, "temperature"), what, 'add temperature = "10 degC" to the model')
                return ()
            change = absolute - self.temperature
        everyone = tuple(range(len(self.members.index)))
        return () if change is None else ((everyone, change),)

    def _take_up(self, data: dict[str, Any], path: Path) -> tuple[tuple[Indices, float], ...]:
        """Take-up; of a hanging member named as a whole each piece takes its share."""
        found: list[tuple[Indices, float]] = []
        for i, entry in enumerate(data.get("take_up") or ()):
            if entry is None:
                continue
            length, names = entry.get("length") or 0.0, entry.get("members") or []
            left = dict.fromkeys(self.members.find(names, (*path, "take_up", i, "members")))
            for h in self.hanging:
                if any(_names_whole(name, h.name) for name in names):
                    found.append((tuple(h.members), length / len(h.members)))
                    for piece in h.members:
                        left.pop(piece, None)
            if left:
                found.append((tuple(left), length))
        return tuple(found)

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


def _names_whole(name: str, hanging: str) -> bool:
    return name == hanging or (is_pattern(name) and bool(matching(name, [hanging])))


def _columns(table: Any) -> tuple[array[float], array[float]]:
    rows = [row for row in table or () if isinstance(row, list) and None not in row]
    return array("d", [row[0] for row in rows]), array("d", [row[1] for row in rows])


def build_loadings(
    cases: Mapping[str, Any], combinations: dict[str, Any], mistakes: Mistakes
) -> dict[str, tuple[Loading, ...]]:
    """Loadings by the name of a load case, a combination (one) or a family (many)."""
    found: dict[str, tuple[Loading, ...]] = {name: (Loading(name, {name: 1.0}),) for name in cases}
    for name, data in combinations.items():
        path: Path = ("combinations", name)
        if name in cases:
            mistakes.add(path, f"'{name}' is the name of a load case too")
        if data is None:
            found.setdefault(name, ())
        elif isinstance(data.get("in_turn"), list) or isinstance(data.get("always"), dict):
            found[name] = _family(name, data, cases, mistakes)
        else:
            found[name] = (Loading(name, check_factors(data, cases, path, mistakes)),)
    return found


def check_factors(
    data: dict[str, Any] | None, cases: Mapping[str, Any], path: Path, mistakes: Mistakes
) -> dict[str, float]:
    """Factors of load cases that are known; patterns are refused (they would sum)."""
    good = {}
    for name, factor in (data or {}).items():
        if is_pattern(name):
            what = f"a pattern ('{name}') is not allowed here: all that match it would act together"
            mistakes.add((*path, name), what, "name the load cases, or use a family with in_turn")
        elif name not in cases:
            mistakes.add((*path, name), f"there is no load case '{name}'", near(name, cases))
        elif factor is not None:
            good[name] = factor
    return good


def _family(
    name: str, data: dict[str, Any], cases: Mapping[str, Any], mistakes: Mistakes
) -> tuple[Loading, ...]:
    path: Path = ("combinations", name)
    always = check_factors(data.get("always"), cases, (*path, "always"), mistakes)
    tables = [
        _choices(table, cases, (*path, "in_turn", i), mistakes)
        for i, table in enumerate(data.get("in_turn") or ())
    ]
    _refuse_twice(always, tables, path, mistakes)
    if math.prod(map(len, tables)) > _MOST_LOADINGS:
        mistakes.add(path, f"gives more than {_MOST_LOADINGS} loadings")
        return ()
    loadings = []
    for choice in itertools.product(*tables):
        words = ", ".join(f"{case} {factor:g}" for case, factor in choice)
        loadings.append(Loading(f"{name}: {words}", {**always, **dict(choice)}))
    return tuple(loadings)


def _choices(
    table: dict[str, Any] | None, cases: Mapping[str, Any], path: Path, mistakes: Mistakes
) -> list[tuple[str, float]]:
    found: list[tuple[str, float]] = []
    for name, given in (table or {}).items():
        factors = given if isinstance(given, list) else [given]
        named = matching(name, cases) if is_pattern(name) else [name] if name in cases else []
        if not named:
            pattern = f"the pattern '{name}' matches no load case"
            what = pattern if is_pattern(name) else f"there is no load case '{name}'"
            mistakes.add((*path, name), what, near(name, cases))
        found += [(case, f) for case in named for f in factors if f is not None and (case, f) not in found]
    return found


def _refuse_twice(
    always: Mapping[str, float], tables: list[list[tuple[str, float]]], path: Path, mistakes: Mistakes
) -> None:
    seen = dict.fromkeys(always, "always")
    for i, table in enumerate(tables):
        for case in dict.fromkeys(case for case, _ in table):
            if case in seen:
                what = f"load case '{case}' is in {seen[case]} too: a loading takes it once"
                mistakes.add((*path, "in_turn", i), what)
            seen[case] = f"table {i + 1} of in_turn"
