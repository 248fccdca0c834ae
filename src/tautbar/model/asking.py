"""The analyses from their checked words: what acts in each, and which state each starts from."""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field
from typing import Any

from tautbar.model.acting import check_factors, notes_of
from tautbar.model.format import AS_DRAWN
from tautbar.model.lookup import Finder
from tautbar.model.mistakes import Mistakes, near
from tautbar.model.parts import (
    Analysis,
    Damping,
    History,
    LoadCase,
    Loading,
    Members,
    Modes,
    StartFrom,
    Static,
    Store,
)
from tautbar.model.positions import Path

_NOT_YET = "is not available in this version"


@dataclass
class Questions:
    """Builds analyses in order; each knows those before it."""

    mistakes: Mistakes
    cases: Mapping[str, LoadCase]
    loadings: Mapping[str, tuple[Loading, ...]]
    events: Collection[str]
    joints: Finder
    members: Finder
    state_matters: str = ""  # why modes must say about which state they are
    kinds: dict[str, str] = field(default_factory=dict)  # of the analyses so far, by name
    results: dict[str, list[str]] = field(default_factory=dict)  # the loadings each has a state for

    def build(self, entries: list[Any]) -> tuple[Analysis, ...]:
        """All analyses that can be made."""
        later = {e["name"]: e["kind"] for e in entries if e is not None and e["name"]}
        found = []
        for i, data in enumerate(entries):
            if data is None:
                continue
            path: Path = ("analyses", i)
            name = data["name"]
            if name in self.kinds:
                self.mistakes.add((*path, "name"), f"the name '{name}' is used twice for analyses")
            if name == AS_DRAWN:
                self.mistakes.add((*path, "name"), f"'{AS_DRAWN}' is no name for an analysis")
            found.append(self._one(data, path, later))
        return tuple(found)

    def _one(self, data: dict[str, Any], path: Path, later: Mapping[str, str]) -> Analysis:
        kind = data["kind"]
        start = self._start(data, path, later)
        common = notes_of(data)
        loads = self._loads(data, path)
        if data["name"]:
            self.kinds[data["name"]] = kind
            self.results[data["name"]] = self._names_of(loads, start)
        if kind == "static":
            return self._static(data, path, start, loads, common)
        if kind == "modes":
            return self._modes(data, path, start, common)
        return self._history(data, path, start, loads, common)

    def _names_of(self, loads: tuple[Loading, ...] | None, start: StartFrom | None) -> list[str]:
        if loads is not None:
            return [loading.name for loading in loads]
        if start is not None and start.loads is None:
            return self.results.get(start.analysis, [])
        return [start.loads] if start is not None and start.loads else ["nothing"]

    def _static(
        self,
        data: dict[str, Any],
        path: Path,
        start: StartFrom | None,
        loads: tuple[Loading, ...] | None,
        common: dict[str, str],
    ) -> Static:
        if "loads" not in data and "from" not in data:
            self.mistakes.add(path, "'loads' is missing: nothing would act", "loads = {} if nothing should")
        return Static(
            data["name"],
            start,
            loads,
            data["geometry"],
            data.get("steps"),
            data["tolerance"],
            data.get("folding") == "allowed",
            **common,
        )

    def _modes(
        self, data: dict[str, Any], path: Path, start: StartFrom | None, common: dict[str, str]
    ) -> Modes:
        if "count" in data and "up_to" in data:
            self.mistakes.add((*path, "up_to"), "count and up_to are given", "give one of them")
        if self.state_matters and "from" not in data:
            statics = [name for name, kind in self.kinds.items() if kind == "static"]
            hint = f'from = "{statics[-1]}"' if statics else "add a static analysis before it, and `from`"
            what = f"{self.state_matters}: `from` must say about which state the modes are"
            self.mistakes.add(path, what, f'{hint}, or from = "{AS_DRAWN}" to insist on the drawing')
        count = None if "up_to" in data else data.get("count", 10)
        return Modes(data["name"], start, count, data.get("up_to"), data["mass"], **common)

    def _history(
        self,
        data: dict[str, Any],
        path: Path,
        start: StartFrom | None,
        loads: tuple[Loading, ...] | None,
        common: dict[str, str],
    ) -> History:
        if loads is not None and len(loads) > 1:
            names = ", ".join(f"'{loading.name}'" for loading in loads[:8])
            self.mistakes.add((*path, "loads"), f"a history has one loading, these are {len(loads)}", names)
        method = data.get("method")
        for key in ("beta", "gamma"):
            if key in data and method != "newmark":
                self.mistakes.add((*path, key), f"'{key}' belongs to method = \"newmark\"")
        return History(
            data["name"],
            data["duration"],
            data["time_step"],
            start,
            self._events(data, path),
            loads,
            method,
            data.get("beta", 0.25),
            data.get("gamma", 0.5),
            data["snap_loss"],
            self._damping(data.get("damping"), (*path, "damping")),
            data["geometry"],
            data.get("mass"),
            self._store(data.get("store"), (*path, "store")),
            data["precision"],
            **common,
        )

    def _events(self, data: dict[str, Any], path: Path) -> tuple[str, ...]:
        named = [name for name in data.get("events") or () if name is not None]
        for i, name in enumerate(data.get("events") or ()):
            if name is not None and name not in self.events:
                self.mistakes.add(
                    (*path, "events", i), f"there is no event '{name}'", near(name, self.events)
                )
            elif named.count(name) > 1:
                self.mistakes.add((*path, "events", i), f"the event '{name}' is named twice")
        return tuple(named)

    def _damping(self, data: dict[str, Any] | None, path: Path) -> Damping | None:
        if data is None or data["ratio"] is None or data["at"] is None:
            return None
        at, ratio = data["at"], data["ratio"]
        ratios = ratio if isinstance(ratio, list) else [ratio] * len(at)
        if None in ratios or None in at:
            return None
        if len(ratios) != len(at):
            self.mistakes.add((*path, "ratio"), f"{len(ratios)} ratios are given for {len(at)} frequencies")
            return None
        if len(at) == 2 and at[0] == at[1]:
            self.mistakes.add((*path, "at"), "both frequencies are the same", "give one, or two that differ")
        elif len(at) == 2 and min(_rayleigh(ratios, at)) < 0:
            what = "these ratios need a negative part of Rayleigh damping, which would feed energy in"
            self.mistakes.add((*path, "ratio"), what, "bring the ratios or frequencies nearer to each other")
        return Damping(tuple(ratios), tuple(at), data.get("mass_part"))

    def _store(self, data: dict[str, Any] | None, path: Path) -> Store:
        if data is None:
            return Store()
        joints = self.joints.find(data["joints"], (*path, "joints")) if "joints" in data else None
        members = self.members.find(data["members"], (*path, "members")) if "members" in data else None
        return Store(data["every"], joints, members)

    def _loads(self, data: dict[str, Any], path: Path) -> tuple[Loading, ...] | None:
        """All loadings of an analysis; None where its start state's loads stay."""
        if "loads" not in data:
            return None
        given = data["loads"]
        found: list[Loading] = []
        for i, item in enumerate(given if isinstance(given, list) else [given]):
            where = (*path, "loads", i) if isinstance(given, list) else (*path, "loads")
            for loading in self._loading(item, where):
                if any(loading.name == other.name for other in found):
                    self.mistakes.add(where, f"the loading '{loading.name}' is in the list twice")
                found.append(loading)
        return tuple(found)

    def _loading(self, item: Any, path: Path) -> tuple[Loading, ...]:
        if isinstance(item, dict):
            factors = check_factors(item, self.cases, path, self.mistakes)
            words = " + ".join(f"{factor:g} {case}" for case, factor in factors.items())
            return (Loading(words or "nothing", factors),)
        if item is None:
            return ()
        if item in self.loadings:
            return self.loadings[item]
        each = [loading for several in self.loadings.values() for loading in several]
        one = tuple(loading for loading in each if loading.name == item)
        if not one:
            known = [*self.loadings, *(loading.name for loading in each)]
            self.mistakes.add(path, f"there is no load case or combination '{item}'", near(item, known))
        return one

    def _start(self, data: dict[str, Any], path: Path, later: Mapping[str, str]) -> StartFrom | None:
        given, path = data.get("from"), (*path, "from")
        if given is None:
            return None
        if given == AS_DRAWN:
            if data["kind"] != "modes":
                self.mistakes.add(
                    path, f"'{AS_DRAWN}' is only for modes", "leave `from` out to start as drawn"
                )
            return StartFrom("", as_drawn=True)
        name = given["analysis"] if isinstance(given, dict) else given
        loads = given.get("loads") if isinstance(given, dict) else None
        if name is None:
            return None
        if name not in self.kinds:
            self._unknown_start(name, data["name"], path, later)
        elif self.kinds[name] != "static":
            what = f"starting from '{name}', which is of kind \"{self.kinds[name]}\", {_NOT_YET}"
            self.mistakes.add(path, what, "start from a static analysis")
        else:
            self._one_loading(name, loads, path)
        return StartFrom(name, loads)

    def _unknown_start(self, name: str, own: str | None, path: Path, later: Mapping[str, str]) -> None:
        if name == own:
            self.mistakes.add(path, "an analysis cannot start from itself")
        elif name in later:
            self.mistakes.add(path, f"'{name}' comes later: an analysis starts from an earlier one")
        else:
            self.mistakes.add(path, f"there is no analysis '{name}'", near(name, self.kinds))

    def _one_loading(self, name: str, loads: str | None, path: Path) -> None:
        """Which of the states of an analysis is meant must be plain."""
        names = self.results[name]
        if loads is None and len(names) > 1:
            shown = ", ".join(f"'{n}'" for n in names[:12]) + (", ..." if len(names) > 12 else "")
            hint = f'write {{ analysis = "{name}", loads = ".." }} with one of {shown}'
            self.mistakes.add(path, f"'{name}' has {len(names)} loadings: say which", hint)
        elif loads is not None and loads not in names:
            self.mistakes.add((*path, "loads"), f"'{name}' has no loading '{loads}'", near(loads, names))


def why_state_matters(members: Members) -> str:
    """Why modes about the drawing would mislead; "" where they do not."""
    if any(members.kind):
        return "members can go slack"
    columns = (members.pretension, members.unstressed_length, members.slack)
    given = any(value == value for column in columns for value in column)
    return "members are pretensioned" if given else ""


def _rayleigh(ratio: list[float], at: list[float]) -> tuple[float, float]:
    """Mass and stiffness coefficients that give two damping ratios at two frequencies [Hz].

    Clough and Penzien, Dynamics of Structures, the section on Rayleigh damping.
    """
    (r1, r2), (w1, w2) = ratio, (2 * math.pi * f for f in at)
    span = w2**2 - w1**2
    return 2 * w1 * w2 * (r1 * w2 - r2 * w1) / span, 2 * (r2 * w2 - r1 * w1) / span
