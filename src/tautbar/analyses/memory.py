"""One analysis in memory, without a model-file entry and without a results file."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from difflib import get_close_matches
from numbers import Real
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context
from tautbar.analyses.history import HistoryRun
from tautbar.analyses.job import Job, Readable, mechanisms
from tautbar.errors import AnalysisFailed, InputError, ModelError
from tautbar.model.parts import Analysis, Damping, History, Loading, Modes, Parts, StartFrom, Static
from tautbar.records.fields import Field, Record
from tautbar.records.frames import ENERGY, ENERGY_NAMES

Array = NDArray[np.generic]


Rule = tuple[str, Callable[[Any], bool]]  # what is wanted, in words; whether a value is that


def _one_of(*words: str) -> Rule:
    return " or ".join(f'"{w}"' for w in words), lambda v: v in words


def _above(least: float) -> Rule:
    return f"a number above {least:g}", lambda v: _is_number(v) and v > least


def _is_number(value: object) -> bool:
    return isinstance(value, Real) and not isinstance(value, bool)


_WHOLE: Rule = ("a whole number above 0", lambda v: isinstance(v, int) and not isinstance(v, bool) and v > 0)
_GEOMETRY = _one_of("large", "small")
STATIC_SETTINGS: Mapping[str, Rule] = {
    "geometry": _GEOMETRY,
    "steps": _WHOLE,
    "tolerance": ("a number between 0 and 1", lambda v: _is_number(v) and 0 < v < 1),
    "folding": ("true or false", lambda v: isinstance(v, bool)),
    "pieces": _WHOLE,
}
MODES_SETTINGS: Mapping[str, Rule] = {
    "count": _WHOLE,
    "up_to": _above(0),
    "mass": _one_of("consistent", "lumped"),
    "pieces": _WHOLE,
}
HISTORY_SETTINGS: Mapping[str, Rule] = {
    "method": _one_of("newmark", "energy-conserving"),
    "beta": _above(0),
    "gamma": ("a number of at least 0.5", lambda v: _is_number(v) and v >= 0.5),
    "snap_loss": _one_of("capture", "none"),
    "geometry": _GEOMETRY,
    "mass": _one_of("consistent", "lumped"),
    "pieces": _WHOLE,
}


@dataclass(frozen=True)
class Answer:
    """What an analysis found, in memory. Arrays are SI; ``answer["axial_force"]`` is the whole one."""

    record: Record
    context: Context

    def __getitem__(self, path: str) -> Array:
        return self.record[path]

    def __str__(self) -> str:
        return self.record.outcome

    def member(self, path: str, name: str) -> Array:
        """Values of one member: those of ``path`` with the member picked from its axis."""
        return self._pick(path, "member", _place("member", name, self.context.member_names))

    def joint(self, path: str, name: str) -> Array:
        """Values of one joint: those of ``path`` with the joint picked from its axis."""
        return self._pick(path, "joint", _place("joint", name, self.context.joint_names))

    def axial_force(self, name: str) -> Array:
        """Axial force of a member [N], over loadings or times."""
        return self.member("axial_force", name)

    def displacement(self, name: str) -> Array:
        """Displacement of a joint [m], (..., 3), over loadings or times."""
        return self.joint("displacement", name)

    def _pick(self, path: str, axis: str, at: int) -> Array:
        field = self.record.fields[path]
        return np.asarray(np.take(field.values, at, axis=field.axes.index(axis)))


def _place(what: str, name: str, names: Sequence[str]) -> int:
    if name not in names:
        near = get_close_matches(name, names, 1, 0.6)
        raise InputError(f"no {what} is called {name!r}" + (f"; did you mean {near[0]!r}?" if near else ""))
    return names.index(name)


def solve_static(
    model: Readable, loads: str | Mapping[str, float], *, start: Answer | None = None, **settings: object
) -> Answer:
    """Equilibrium under a load case, combination or family by name, or under cases with factors.

    Parameters
    ----------
    start : Answer of an earlier static analysis, optional
        Where to start from; the drawing without loads otherwise.
    **settings
        Of the analysis kind: ``geometry``, ``steps``, ``tolerance``, ``folding``.

    Raises
    ------
    AnalysisFailed
        It found no equilibrium, or an unstable or folded one; its ``record`` tells.
    InputError
        No such load case or combination.
    ModelError
        ``geometry = "small"`` on a mechanism.
    """
    loadings = _loadings(model.parts, loads)
    name = loads if isinstance(loads, str) else loadings[0].name
    return _do(model, Static(name, loads=loadings, **_checked(settings, STATIC_SETTINGS)), start)


def find_modes(model: Readable, state: Answer | None = None, **settings: object) -> Answer:
    """Natural modes about a static state, or about the drawing.

    ``settings`` are those of the analysis kind: ``count``, ``up_to`` [Hz], ``mass``.

    Raises
    ------
    AnalysisFailed
        The state is unstable, or the modes are not proven complete.
    """
    return _do(model, Modes("modes", **_checked(settings, MODES_SETTINGS)), state)


def solve_history(
    model: Readable,
    state: Answer | None = None,
    *,
    events: Sequence[str] = (),
    duration: float,
    time_step: float,
    loads: str | Mapping[str, float] | None = None,
    damping: Damping | None = None,
    **settings: object,
) -> Answer:
    """Transient response from a static state, or from the drawing with its loads put on at once.

    ``duration`` and ``time_step`` in seconds; every step is kept. Further ``settings`` are those of the
    analysis kind: ``method``, ``beta``, ``gamma``, ``snap_loss``, ``geometry``, ``mass``.

    Raises
    ------
    AnalysisFailed
        A step found no balance, or the energy ledger does not close.
    InputError
        No such event or loading.
    """
    _checked({"duration": duration, "time_step": time_step}, {"duration": _above(0), "time_step": _above(0)})
    unknown = [e for e in events if e not in model.parts.events]
    if unknown:
        raise InputError(f"no event is called {unknown[0]!r}; there are: {', '.join(model.parts.events)}")
    loadings = None if loads is None else _loadings(model.parts, loads)[:1]
    analysis = History(
        "history",
        duration,
        time_step,
        events=tuple(events),
        loads=loadings,
        damping=damping,
        precision="double",
        **_checked(settings, HISTORY_SETTINGS),
    )
    return _do(model, analysis, state)


def _checked(settings: Mapping[str, object], known: Mapping[str, Rule]) -> dict[str, Any]:
    """The settings, if each is known and sound."""
    for key, value in settings.items():
        if key not in known:
            near = get_close_matches(key, known, 1, 0.6)
            hint = f"did you mean {near[0]}?" if near else f"there are: {', '.join(known)}"
            raise InputError(f"no setting is called {key!r}; {hint}")
        wanted, sound = known[key]
        if value is not None and not sound(value):
            raise InputError(f"{key} = {value!r}: {wanted} is wanted")
    return dict(settings)


def _loadings(parts: Parts, loads: str | Mapping[str, float]) -> tuple[Loading, ...]:
    if isinstance(loads, str):
        if loads not in parts.loadings:
            known = ", ".join(parts.loadings) or "none"
            raise InputError(f"no load case or combination is called {loads!r}; there are: {known}")
        return parts.loadings[loads]
    unknown = [case for case in loads if case not in parts.load_cases]
    if unknown:
        raise InputError(f"no load case is called {unknown[0]!r}; there are: {', '.join(parts.load_cases)}")
    return (Loading(" + ".join(f"{f:g} {c}" for c, f in loads.items()), dict(loads)),)


def _do(model: Readable, analysis: Analysis, start: Answer | None) -> Answer:
    job = Job(model.parts)
    if start is not None:
        if len(start.context.states[start.record.name]) > 1:
            raise InputError(f"{start.record.name!r} holds several loadings; solve for the one to start from")
        job.context.states.update(start.context.states)
        analysis = replace(analysis, start=StartFrom(start.record.name))
    if getattr(analysis, "geometry", "large") == "small":
        found = mechanisms(job.context.first_scene())
        if found:
            raise ModelError([model.mistake((), what, hint) for what, hint in found])
    done = job.do(analysis)
    record = _marched(done) if isinstance(done, HistoryRun) else done
    if record.status != "complete":
        raise AnalysisFailed(record.outcome, record)
    return Answer(record, job.context)


def _marched(run: HistoryRun) -> Record:
    """All stored steps of a history as arrays in its record."""
    times: list[float] = []
    kept: dict[str, list[Array]] = {path: [] for path in run.streamed}
    energy: list[tuple[float, ...]] = []
    for frame in run.frames():
        energy.append(frame.energy)
        if frame.values is not None:
            times.append(frame.time)
            for path, values in frame.values.items():
                kept[path].append(values)
    record = run.record()
    fields = dict(record.fields)
    fields["time"] = Field(np.array(times), "s", "time", ("time",))
    for path, form in run.streamed.items():
        fields[path] = Field(np.array(kept[path]), form.unit, form.long_name, form.axes)
    for name, column in zip(ENERGY, np.array(energy).T, strict=True):
        fields[f"energy/{name}"] = Field(
            column, "s" if name == "time" else "J", ENERGY_NAMES[name], ("step",)
        )
    return replace(record, fields=fields)
