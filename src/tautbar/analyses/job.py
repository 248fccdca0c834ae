"""All analyses of one model: what can only be checked with matrices, and each one's run."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import cached_property
from typing import Protocol

import numpy as np

from tautbar.algebra.null import null_vectors
from tautbar.analyses.buckling import run_buckling
from tautbar.analyses.context import NO_CHANGE, Context
from tautbar.analyses.count import StaticalCount, count_fields, statical_count
from tautbar.analyses.count_words import count_warnings
from tautbar.analyses.drawing import model_fields
from tautbar.analyses.form_finding import run_form_finding
from tautbar.analyses.history import HistoryRun, start_history
from tautbar.analyses.modes import run_modes
from tautbar.analyses.path import run_path
from tautbar.analyses.scene import Scene
from tautbar.analyses.static import run_static
from tautbar.analyses.tune import run_tune
from tautbar.analyses.tune_problem import beyond_reach
from tautbar.analyses.words import direction
from tautbar.errors import AnalysisFailed, Mistake, ModelError
from tautbar.mechanics.carriers import carriers
from tautbar.mechanics.loads import nothing
from tautbar.mechanics.structure import ImpossibleLength
from tautbar.model.parts import Analysis, Loading, Parts, Tune
from tautbar.records.fields import Field, Record

MOST_NAMED = 6


class Readable(Protocol):
    """What a job needs of a model: its parts, and how to name a place in it."""

    @property
    def parts(self) -> Parts: ...

    def mistake(self, path: tuple[str | int, ...], what: str, hint: str = "") -> Mistake: ...


_KINDS: dict[str, Callable[..., Record | HistoryRun]] = {
    "static": run_static,
    "equilibrium-path": run_path,
    "buckling": run_buckling,
    "modes": run_modes,
    "history": start_history,
    "tune": run_tune,
    "form-finding": run_form_finding,
}


class Job:
    """The analyses of one model, run in any order that their start states allow."""

    def __init__(self, parts: Parts) -> None:
        self.context = Context(parts)
        self._analyses = {a.name: a for a in parts.analyses}

    @property
    def model_fields(self) -> Mapping[str, Field]:
        """The model as arrays, for the results file, by path under ``/model``."""
        return {**model_fields(self.context), **count_fields(self.count)}

    @cached_property
    def count(self) -> StaticalCount:
        """States of self-stress and mechanisms of the drawing."""
        return statical_count(self.context)

    @property
    def warnings(self) -> tuple[str, ...]:
        """What shows of the model only with matrices: mechanisms, and what holds them."""
        return count_warnings(self.count, self.context.parts)

    def run(self, name: str) -> Record | HistoryRun:
        """The record of a static or modal analysis, or a history ready to march."""
        return self.do(self._analyses[name])

    def do(self, analysis: Analysis) -> Record | HistoryRun:
        """The same for an analysis that need not be one of the model's."""
        try:
            return _KINDS[analysis.kind](self.context, analysis)
        except AnalysisFailed as failure:
            why = str(failure)
        except ImpossibleLength as wrong:  # of a rope that comes when joints have moved
            why = f"{wrong.name} cannot be put in where its ends are by then: {wrong}"
        return Record(analysis.name, analysis.kind, "failed", f"NOT A RESULT: {why}")


def prepare(model: Readable) -> Job:
    """A job for a model.

    Raises
    ------
    ModelError
        What only shows with arrays: a hanging member whose sag or tension no length gives, take-up or
        cold that leaves a member no length, a mechanism under ``geometry = "small"`` (joints and
        directions are named).
    """
    job = Job(model.parts)
    try:
        scene = job.context.first_scene()
    except ImpossibleLength as wrong:
        raise ModelError([model.mistake(("members", wrong.name, wrong.given), str(wrong))]) from None
    mistakes = [m for i, a in enumerate(model.parts.analyses) for m in _mistakes(model, scene, i, a)]
    if mistakes:
        raise ModelError(mistakes)
    return job


def _mistakes(model: Readable, scene: Scene, i: int, analysis: Analysis) -> list[Mistake]:
    """What is wrong with one analysis that its words alone do not show."""
    found = [
        model.mistake(("analyses", i, "loads"), what)
        for what in _used_up(scene, getattr(analysis, "loads", None))
    ]
    if getattr(analysis, "geometry", "large") == "small":
        found += [model.mistake(("analyses", i, "geometry"), what, hint) for what, hint in mechanisms(scene)]
    if isinstance(analysis, Tune) and analysis.start is None and analysis.change == NO_CHANGE:
        wrong = beyond_reach(analysis, scene)
        found += [model.mistake(("analyses", i, "targets"), what, hint) for what, hint in wrong]
    return found


def _used_up(scene: Scene, loads: tuple[Loading, ...] | Loading | None) -> list[str]:
    """Members that take-up or cold leave no length at all, in words."""
    cases = scene.parts.load_cases
    for loading in (loads,) if isinstance(loads, Loading) else loads or ():
        if not any(cases[c].take_up or cases[c].temperature_change for c in loading.factors):
            continue
        L0 = carriers(scene.structure, scene.acting(loading)).springs.L0
        if L0.size and L0.min() <= 0:
            m = int(L0.argmin())
            name = scene.parts.members.names[m]
            before = scene.structure.L0[m]
            return [f"'{loading.name}' leaves {name} no length: {before:.4g} m would become {L0[m]:.4g} m"]
    return []


def mechanisms(scene: Scene) -> list[tuple[str, str]]:
    """Directions that no member holds in the drawing, in words: what can move, and what would help."""
    system = scene.system
    potential = scene.potential(nothing(scene.structure), small=True)
    K = potential.curvature(potential.look(np.zeros(system.n)), scene.stage.members)
    zero = system.solver.symmetric(K).zero
    if not zero:
        return []
    vectors = null_vectors(K, system.pattern, min(zero, MOST_NAMED), float(np.abs(K).max(initial=0.0)))
    named = [scene.name_direction(v) for v in vectors.T]
    where = "; ".join(f"joint {joint} in {direction(way)}" for joint, way in named)
    more = f" and {zero - len(named)} more" if zero > len(named) else ""
    what = f"a mechanism: nothing holds {where}{more}"
    return [(what, 'add a member or a support there, or use geometry = "large" if tension is to hold it')]
