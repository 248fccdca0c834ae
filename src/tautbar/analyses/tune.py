"""Tuning: unstressed lengths for wanted tensions or positions, or the least pretension that keeps taut.

Inside, ties count as two-way; the answer is then solved again with the real ties, from the start shape,
and judged. What fails that is no answer.
"""

from __future__ import annotations

import time
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses import tune_words as words
from tautbar.analyses.context import Context
from tautbar.analyses.cut_list import cut_list_fields
from tautbar.analyses.solved import Solved
from tautbar.analyses.static import fields_of, solve
from tautbar.analyses.static_words import audit_lines, warnings
from tautbar.analyses.tune_problem import (
    Problem,
    beyond_reach,
    first_guess,
    first_levels,
    ladder,
    pose,
    ratios,
    scenes_now,
    targets,
    wanted_of,
)
from tautbar.analyses.tuned import KeptTaut, ToTargets, Tuned
from tautbar.analyses.words import changes
from tautbar.errors import AnalysisFailed
from tautbar.model.parts import Static, Tune
from tautbar.records.fields import Field, Record
from tautbar.solvers.lengths import NoBalance, State
from tautbar.solvers.pretension import least_levels
from tautbar.solvers.tuning import tune

Array = NDArray[np.float64]
SAME_STATE = 1e-6  # of the model's size: two balances nearer than this are one
MOST_ROUNDS = 4  # of one-way supports that let go or set down
SOURCES = (
    "Gauss-Newton on exact sensitivities of the nonlinear state (one factor a state)",
    "least pretension: sequential linear programming with a trust region (HiGHS)",
)


def run_tune(context: Context, analysis: Tune) -> Record:
    """Tune, check with the real ties, and keep the lengths and states for later analyses.

    Raises
    ------
    AnalysisFailed
        A target that no adjustment influences, or no balance to begin with.
    """
    began = time.perf_counter()
    rest = context.start(analysis.start, analysis.change)
    lost = beyond_reach(analysis, rest.scene)
    if lost:
        raise AnalysisFailed("; ".join(f"{what} ({hint})" for what, hint in lost), None)
    try:
        tuned = _tuned(context, pose(analysis, rest))
    except NoBalance as fault:
        loading = analysis.loads[fault.case].name
        what = f"no balance found under {loading} with the lengths to begin with"
        raise AnalysisFailed(what, None) from fault
    if tuned.holds:
        context.keep(analysis.name, [s.rest for s in tuned.solved])
    static = Static(analysis.name, loads=analysis.loads)
    return Record(
        name=analysis.name,
        kind="tune",
        status="complete" if tuned.holds else "failed",
        outcome=words.outcome(context, tuned),
        acting=tuple(f"{s.loading.name}: {s.loading.acting}" for s in tuned.solved),
        settings=words.settings(context, tuned) | changes(context, analysis.change),
        fields=fields_of(tuned.solved) | _fields(context, tuned) | cut_list_fields(context, tuned),
        audit_lines=(*words.audit(tuned), *audit_lines(context, static, tuned.solved)),
        warnings=(*words.warnings(context, tuned), *warnings(context, tuned.solved)),
        sources=SOURCES,
        wall_time=time.perf_counter() - began,
    )


def _tuned(context: Context, problem: Problem) -> Tuned:
    """The answer, with the one-way supports and the slack ties that the real structure has under it."""
    for _ in range(MOST_ROUNDS):
        tuned = _least(context, problem) if problem.analysis.keep_taut else _to_targets(context, problem)
        other = scenes_now(problem, [s.scene for s in tuned.solved])
        if other is None and isinstance(tuned, KeptTaut) and tuned.loose_elsewhere:
            # Inside it would push, and so make others seem better off than they are.
            other = problem.signing_kept_only()
        if other is None:
            break
        problem = other
    return tuned


def _to_targets(context: Context, problem: Problem) -> ToTargets:
    named, adjusting = targets(context, problem), ratios(problem)
    start, home = first_guess(problem, adjusting)
    found = tune(problem.cases, adjusting, [t.target for t in named], start, home, problem.q)
    if found.untouched:
        names = "; ".join(named[k].name for k in found.untouched)
        what = f"no adjustment influences the {names}: adjust other members, or leave the target out"
        raise AnalysisFailed(what, None)
    solved, moved = _checked(context, problem, found.L0, found.states)
    return ToTargets(problem, found.L0, found.states, solved, moved, found, tuple(named))


def _least(context: Context, problem: Problem) -> KeptTaut:
    steps, (wanted, by_strength) = ladder(context, problem), wanted_of(problem)
    start = first_levels(problem, steps.levels)
    found = least_levels(problem.cases, steps.levels, wanted, start, problem.q)
    solved, moved = _checked(context, problem, found.L0, found.states)
    return KeptTaut(problem, found.L0, found.states, solved, moved, found, steps, by_strength)


def _checked(
    context: Context, problem: Problem, L0: Array, states: Sequence[State]
) -> tuple[list[Solved], tuple[str, ...]]:
    """Real static answers under every loading, and the loadings that first went elsewhere.

    Solved from the start shape; where that ends in another balance than the tuned one, again from the
    tuned one, whose stability is judged.
    """
    static = Static(problem.analysis.name, loads=problem.analysis.loads)
    rest, solved, moved = problem.rest, [], []
    for scene, loading, state in zip(problem.scenes, problem.analysis.loads, states, strict=True):
        there = scene.with_lengths(L0)
        tuned = there.displacement(state.look.q, there.acting(loading))
        found = solve(context, static, context.rest_at(there, rest.loading, rest.displacement), loading)
        if not _is_at(found, tuned):
            second = solve(context, static, context.rest_at(there, loading, tuned), loading)
            if _is_at(second, tuned):
                moved.append(loading.name)
            if _is_at(second, tuned) or not found.verdict.holds:
                found = second
        solved.append(found)
    return solved, tuple(moved)


def _is_at(solved: Solved, displacement: Array) -> bool:
    off = np.abs(solved.displacement - displacement).max(initial=0.0)
    return solved.verdict.holds and bool(off <= SAME_STATE * solved.scene.structure.size)


def _fields(context: Context, tuned: Tuned) -> dict[str, Field]:
    first, target = tuned.solved[0], ("target",)
    position = first.scene.structure.position + first.displacement
    fields = {
        "unstressed_length": Field(tuned.L0, "m", "unstressed length", ("member",)),
        "position": Field(position.T, "m", "position under the first loading", ("joint", "direction")),
        "target_miss": Field(tuned.miss, "1", "miss over what was wanted, or over the model's size", target),
        "target_name": Field(_text(words.target_names(context, tuned)), "1", "what was wanted", target),
    }
    if isinstance(tuned, KeptTaut):
        fields["level"] = Field(tuned.least.p, "N", "pretension in the start shape", ("level",))
        fields["level_name"] = Field(_text(tuned.ladder.names), "1", "whose level", ("level",))
    if isinstance(tuned, ToTargets):
        for what, tension, unit in (("tension", True, "N"), ("position", False, "m")):
            mine = np.array([t.tension == tension for t in tuned.named])
            off = np.where(mine, tuned.off, np.nan)
            fields[f"{what}_miss"] = Field(off, unit, f"{what} less what was wanted", target)
    return fields


def _text(names: Sequence[str]) -> NDArray[np.object_]:
    return np.array(list(names), dtype=object)
