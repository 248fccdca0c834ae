"""One analysis in memory, without a model-file entry and without a results file."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

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
        return self._pick(path, "member", self.context.member_names.index(name))

    def joint(self, path: str, name: str) -> Array:
        """Values of one joint: those of ``path`` with the joint picked from its axis."""
        return self._pick(path, "joint", self.context.joint_names.index(name))

    def axial_force(self, name: str) -> Array:
        """Axial force of a member [N], over loadings or times."""
        return self.member("axial_force", name)

    def displacement(self, name: str) -> Array:
        """Displacement of a joint [m], (..., 3), over loadings or times."""
        return self.joint("displacement", name)

    def _pick(self, path: str, axis: str, at: int) -> Array:
        field = self.record.fields[path]
        return np.asarray(np.take(field.values, at, axis=field.axes.index(axis)))


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
    return _do(model, Static(name, loads=loadings, **settings), start)  # type: ignore[arg-type]


def find_modes(model: Readable, state: Answer | None = None, **settings: object) -> Answer:
    """Natural modes about a static state, or about the drawing.

    ``settings`` are those of the analysis kind: ``count``, ``up_to`` [Hz], ``mass``.

    Raises
    ------
    AnalysisFailed
        The state is unstable, or the modes are not proven complete.
    """
    return _do(model, Modes("modes", **settings), state)  # type: ignore[arg-type]


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
        **settings,  # type: ignore[arg-type]
    )
    return _do(model, analysis, state)


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
        found = mechanisms(job.context)
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
