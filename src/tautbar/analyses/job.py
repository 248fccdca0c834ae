"""All analyses of one model: what can only be checked with matrices, and each one's run."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Protocol

import numpy as np

from tautbar.algebra.null import null_vectors
from tautbar.analyses.context import Context
from tautbar.analyses.drawing import model_fields
from tautbar.analyses.history import HistoryRun, start_history
from tautbar.analyses.modes import run_modes
from tautbar.analyses.static import run_static
from tautbar.analyses.words import direction
from tautbar.errors import Mistake, ModelError
from tautbar.model.parts import Analysis, Modes, Parts, Static
from tautbar.records.fields import Field, Record

MOST_NAMED = 6


class Readable(Protocol):
    """What a job needs of a model: its parts, and how to name a place in it."""

    @property
    def parts(self) -> Parts: ...

    def mistake(self, path: tuple[str | int, ...], what: str, hint: str = "") -> Mistake: ...


class Job:
    """The analyses of one model, run in any order that their start states allow."""

    def __init__(self, parts: Parts) -> None:
        self.context = Context(parts)
        self._analyses = {a.name: a for a in parts.analyses}

    @property
    def model_fields(self) -> Mapping[str, Field]:
        """The model as arrays, for the results file, by path under ``/model``."""
        return model_fields(self.context)

    def run(self, name: str) -> Record | HistoryRun:
        """The record of a static or modal analysis, or a history ready to march."""
        return self.do(self._analyses[name])

    def do(self, analysis: Analysis) -> Record | HistoryRun:
        """The same for an analysis that need not be one of the model's."""
        if isinstance(analysis, Static):
            return run_static(self.context, analysis)
        if isinstance(analysis, Modes):
            return run_modes(self.context, analysis)
        return start_history(self.context, analysis)


def prepare(model: Readable) -> Job:
    """A job for a model.

    Raises
    ------
    ModelError
        An analysis with ``geometry = "small"`` would move a mechanism: joints and directions are named.
    """
    job = Job(model.parts)
    mistakes = [
        model.mistake(("analyses", i, "geometry"), what, hint)
        for i, analysis in enumerate(model.parts.analyses)
        if getattr(analysis, "geometry", "large") == "small"
        for what, hint in mechanisms(job.context)
    ]
    if mistakes:
        raise ModelError(mistakes)
    return job


def mechanisms(context: Context) -> list[tuple[str, str]]:
    """Directions that no member holds in the drawing, in words: what can move, and what would help."""
    system = context.system
    potential = context.potential(context.drawn().acting, small=True)
    K = potential.curvature(potential.look(np.zeros(system.n)), np.ones(system.structure.members, dtype=bool))
    zero = system.solver.symmetric(K).zero
    if not zero:
        return []
    vectors = null_vectors(K, system.pattern, min(zero, MOST_NAMED), float(np.abs(K).max(initial=0.0)))
    named = [context.name_direction(v) for v in vectors.T]
    where = "; ".join(f"joint {joint} in {direction(way)}" for joint, way in named)
    more = f" and {zero - len(named)} more" if zero > len(named) else ""
    what = f"a mechanism: nothing holds {where}{more}"
    return [(what, 'add a member or a support there, or use geometry = "large" if tension is to hold it')]
