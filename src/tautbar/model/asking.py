"""The analyses from their checked words, in order: what each starts from, and the three kinds that
find states of rest, modes and motion."""

from __future__ import annotations

import math
from collections.abc import Callable, Collection
from dataclasses import dataclass
from typing import Any

from tautbar.model.acting import notes_of
from tautbar.model.asking_path import build_buckling, build_form_finding, build_path
from tautbar.model.asking_tune import build_tune
from tautbar.model.format_asking import AS_DRAWN
from tautbar.model.inquiry import Inquiry, Site
from tautbar.model.loadings import Loads, joined
from tautbar.model.mistakes import Mistakes, near, several
from tautbar.model.parts import (
    Analysis,
    Buckling,
    Damping,
    EquilibriumPath,
    FormFinding,
    History,
    Indices,
    Loading,
    Members,
    Modes,
    Static,
    Store,
)
from tautbar.model.positions import Path
from tautbar.model.presence import Things
from tautbar.model.starting import Left, Starts


@dataclass
class Questions:
    """Builds analyses in order; each knows those before it."""

    mistakes: Mistakes
    site: Site
    loads: Loads
    things: Things
    starts: Starts
    events: Collection[str]

    def build(self, entries: list[Any]) -> tuple[Analysis, ...]:
        """All analyses that can be made."""
        later = {e["name"]: e["kind"] for e in entries if e is not None and e["name"]}
        return tuple(
            self._one(data, ("analyses", i), later) for i, data in enumerate(entries) if data is not None
        )

    def _one(self, data: dict[str, Any], path: Path, later: dict[str, str]) -> Analysis:
        name = data["name"]
        if name in self.starts.left or name in self.starts.unsure:
            self.mistakes.add((*path, "name"), f"the name '{name}' is used twice for analyses")
        if name == AS_DRAWN:
            self.mistakes.add((*path, "name"), f"'{AS_DRAWN}' is no name for an analysis")
        start = self.starts.read(data, path, later)
        before = self.starts.presence(start)
        change = self.things.change(data, path, before if self.starts.sure(start) else None)
        presence = before.changed(change)
        common = {"name": name, "start": start, "change": change, **notes_of(data)}
        asked = Inquiry(
            self.mistakes, self.site, self.loads, self.starts, data, path, start, presence, common
        )
        analysis = self._made(asked)
        if self.mistakes.at(*path) or not self.starts.sure(start):
            self.starts.unsure.add(name)
        elif name:
            self.starts.left[name] = Left(data["kind"], self._states(analysis), presence)
        return analysis

    def _made(self, asked: Inquiry) -> Analysis:
        if asked.data["kind"] == "history":
            return _history(asked, self.events)
        return _BUILDERS[asked.data["kind"]](asked)

    def _states(self, analysis: Analysis) -> tuple[Loading, ...]:
        """The loadings that an analysis leaves a state of rest under."""
        if isinstance(analysis, Static):
            return tuple(self._states_of_static(analysis))
        if isinstance(analysis, EquilibriumPath):
            return (joined(analysis.loads.name, analysis.constant, analysis.loads),)
        if isinstance(analysis, FormFinding):
            return (analysis.loads,)
        return () if isinstance(analysis, Modes | History | Buckling) else analysis.loads

    def _states_of_static(self, analysis: Static) -> list[Loading]:
        found = []
        for carried in self.starts.loadings(analysis.start):
            for loading in (carried,) if analysis.loads is None else analysis.loads:
                lost = [self.site.members.names[i] for i in analysis.lose_in_turn]
                names = [f"{loading.name}, without {member}" for member in lost] or [loading.name]
                found += [Loading(name, loading.factors) for name in names]
        return found


def _static(asked: Inquiry) -> Static:
    data = asked.data
    if "loads" not in data and "from" not in data:
        asked.wrong((), "'loads' is missing: nothing would act", "loads = {} if nothing should")
    return Static(
        loads=asked.loads.all(data, asked.path),
        geometry=data["geometry"],
        steps=data.get("steps"),
        tolerance=data["tolerance"],
        folding=data.get("folding") == "allowed",
        lose_in_turn=_lost(asked),
        pieces=asked.pieces(),
        **asked.common,
    )


def _lost(asked: Inquiry) -> Indices:
    names = asked.data.get("lose_in_turn")
    found = asked.members(names, "lose_in_turn")
    pieces = {m: whole.name for whole in asked.site.wholes.all if whole.in_pieces for m in whole.members}
    for rope in dict.fromkeys(pieces[m] for m in found if m in pieces):
        what = f"'{rope}' is in pieces, of which one after the other would be lost"
        hint = f'lose it with without = ["{rope}"], or give its pieces to analyses instead of to the member'
        asked.wrong(("lose_in_turn",), what, hint)
    return found


def _modes(asked: Inquiry) -> Modes:
    data = asked.data
    if "count" in data and "up_to" in data:
        asked.wrong(("up_to",), "count and up_to are given", "give one of them")
    why = why_state_matters(asked.site.columns)
    if why and "from" not in data:
        statics = [name for name, left in asked.starts.left.items() if left.kind == "static"]
        hint = f'from = "{statics[-1]}"' if statics else "add a static analysis before it, and `from`"
        what = f"{why}: `from` must say about which state the modes are"
        asked.wrong((), what, f'{hint}, or from = "{AS_DRAWN}" to insist on the drawing')
    return Modes(
        count=None if "up_to" in data else data.get("count", 10),
        up_to=data.get("up_to"),
        mass=data["mass"],
        pieces=asked.pieces("a modal analysis"),
        **asked.common,
    )


def why_state_matters(members: Members) -> str:
    """Why modes about the drawing would mislead; "" where they do not."""
    if any(members.kind):
        return "members can go slack"
    columns = (members.pretension, members.unstressed_length, members.slack)
    given = any(value == value for column in columns for value in column)
    return "members are pretensioned" if given else ""


def _history(asked: Inquiry, events: Collection[str]) -> History:
    data = asked.data
    loads = asked.loads.all(data, asked.path)
    if loads is not None and len(loads) > 1:
        what = f"a history has one loading, these are {len(loads)}"
        asked.wrong(("loads",), what, several([loading.name for loading in loads]))
    for key in ("beta", "gamma"):
        if key in data and data.get("method") != "newmark":
            asked.wrong((key,), f"'{key}' belongs to method = \"newmark\"")
    return History(
        duration=data["duration"],
        time_step=data["time_step"],
        events=_events(asked, events),
        loads=loads,
        method=data.get("method"),
        beta=data.get("beta", 0.25),
        gamma=data.get("gamma", 0.5),
        snap_loss=data["snap_loss"],
        damping=_damping(asked),
        geometry=data["geometry"],
        mass=data.get("mass"),
        store=_store(asked),
        precision=data["precision"],
        pieces=asked.pieces("a history"),
        **asked.common,
    )


def _events(asked: Inquiry, events: Collection[str]) -> tuple[str, ...]:
    given = asked.data.get("events") or ()
    named = [name for name in given if name is not None]
    for i, name in enumerate(given):
        if name is not None and name not in events:
            asked.wrong(("events", i), f"there is no event '{name}'", near(name, events))
        elif named.count(name) > 1:
            asked.wrong(("events", i), f"the event '{name}' is named twice")
    return tuple(named)


def _damping(asked: Inquiry) -> Damping | None:
    data = asked.data.get("damping")
    if data is None or data["ratio"] is None or data["at"] is None:
        return None
    at, ratio = data["at"], data["ratio"]
    ratios = ratio if isinstance(ratio, list) else [ratio] * len(at)
    if None in ratios or None in at:
        return None
    if len(ratios) != len(at):
        asked.wrong(("damping", "ratio"), f"{len(ratios)} ratios are given for {len(at)} frequencies")
        return None
    if len(at) == 2 and at[0] == at[1]:
        asked.wrong(("damping", "at"), "both frequencies are the same", "give one, or two that differ")
    elif len(at) == 2 and min(_rayleigh(ratios, at)) < 0:
        what = "these ratios need a negative part of Rayleigh damping, which would feed energy in"
        asked.wrong(("damping", "ratio"), what, "bring the ratios or frequencies nearer to each other")
    return Damping(tuple(ratios), tuple(at), data.get("mass_part"))


def _rayleigh(ratio: list[float], at: list[float]) -> tuple[float, float]:
    """Mass and stiffness coefficients that give two damping ratios at two frequencies [Hz].

    Clough and Penzien, Dynamics of Structures, the section on Rayleigh damping.
    """
    (r1, r2), (w1, w2) = ratio, (2 * math.pi * f for f in at)
    span = w2**2 - w1**2
    return 2 * w1 * w2 * (r1 * w2 - r2 * w1) / span, 2 * (r2 * w2 - r1 * w1) / span


def _store(asked: Inquiry) -> Store:
    data, site, path = asked.data.get("store"), asked.site, (*asked.path, "store")
    if data is None:
        return Store()
    joints = site.joints.find(data["joints"], (*path, "joints")) if "joints" in data else None
    members = site.members.find(data["members"], (*path, "members")) if "members" in data else None
    return Store(data["every"], joints, members)


_BUILDERS: dict[str, Callable[[Inquiry], Analysis]] = {
    "static": _static,
    "modes": _modes,
    "equilibrium-path": build_path,
    "buckling": build_buckling,
    "tune": build_tune,
    "form-finding": build_form_finding,
}
