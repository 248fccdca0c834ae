"""Static analysis: equilibrium with large displacements and slack members, and what proves it."""

from __future__ import annotations

import time
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context, Rest
from tautbar.analyses.judge import Verdict, judge
from tautbar.analyses.static_words import audit_lines, outcome, warnings
from tautbar.mechanics import members
from tautbar.mechanics.loads import Acting
from tautbar.model.parts import Loading, Static
from tautbar.records.fields import Field, Record
from tautbar.solvers.equilibrium import Descent, find_equilibrium

Array = NDArray[np.float64]
SOURCES = (
    "Newton-Raphson with energy line search; engineering strain, N = EA (l - L0)/L0",
    "Sylvester's law of inertia: stability by the signs of the pivots",
)


@dataclass(frozen=True)
class Solved:
    """One loading of a static analysis, judged. Joint arrays are (3, J)."""

    loading: Loading
    acting: Acting
    verdict: Verdict
    displacement: Array  # m
    reaction: Array  # N
    slack: NDArray[np.bool_]
    loose_length: Array  # (N,) m
    reaction_sum_error: float

    @property
    def rest(self) -> Rest:
        look = self.verdict.look
        loose = tuple(f.vector for f in self.verdict.free if f.nature == "loose")
        return Rest(self.loading, self.acting, look.q, look.stretch, look.axial, loose)


def run_static(context: Context, analysis: Static) -> Record:
    """Solve every loading of a static analysis; the states that hold are kept for later analyses."""
    began = time.perf_counter()
    start = context.start(analysis.start)
    loadings = analysis.loads if analysis.loads is not None else (start.loading,)
    solved = [_solve(context, analysis, start, loading) for loading in loadings]
    if all(s.verdict.holds for s in solved):
        context.states[analysis.name] = [s.rest for s in solved]
    status = "complete" if all(s.verdict.holds for s in solved) else "failed"
    return Record(
        name=analysis.name,
        kind="static",
        status=status,
        outcome=outcome(context, analysis, solved),
        acting=tuple(f"{s.loading.name}: {s.loading.acting}" for s in solved),
        settings=_settings(analysis),
        fields=_fields(solved),
        audit_lines=audit_lines(context, analysis, solved),
        warnings=warnings(context, solved),
        sources=SOURCES,
        wall_time=time.perf_counter() - began,
    )


def _settings(analysis: Static) -> dict[str, object]:
    start = analysis.start.analysis if analysis.start else "the drawing"
    return {
        "from": start,
        "geometry": analysis.geometry,
        "steps": analysis.steps or "as many as it takes",
        "tolerance": analysis.tolerance,
        "folding": "allowed" if analysis.folding else "not allowed",
    }


def _solve(context: Context, analysis: Static, start: Rest, loading: Loading) -> Solved:
    acting = context.acting(loading)
    small = analysis.geometry == "small"
    descent = _reach(context, analysis, start, acting)
    potential = context.potential(acting, small)
    verdict = judge(potential, descent, analysis.tolerance, analysis.folding)
    look = verdict.look
    pull = context.system.joint_pull(look.axial, look.stretch.n)
    displacement = context.displacement(look.q, acting)
    grounded = context.system.freedom.grounded(displacement)
    reaction = context.system.freedom.held_part(pull - acting.force) - grounded
    total = (reaction + acting.force).sum(axis=1)
    largest = max(np.abs(reaction).max(initial=0.0), np.abs(acting.force).max(initial=0.0))
    slack = ~members.taut(potential.springs, look.stretch.e)
    return Solved(
        loading,
        acting,
        verdict,
        displacement,
        reaction,
        slack,
        np.where(slack, np.abs(look.stretch.e), 0.0),
        float(np.abs(total).max() / largest) if largest > 0 else 0.0,
    )


def _reach(context: Context, analysis: Static, start: Rest, target: Acting) -> Descent:
    """Go to the loading in the steps asked for, else at once, else in steps halved as it takes."""
    if analysis.steps:
        return _in_steps(context, analysis, start, target, analysis.steps)
    at_once = _in_steps(context, analysis, start, target, 1)
    if at_once.converged or analysis.geometry == "small":
        return at_once
    stepped = _in_adaptive_steps(context, analysis, start, target)
    return stepped.after(at_once.factorisations) if stepped else at_once


def _in_steps(context: Context, analysis: Static, start: Rest, target: Acting, steps: int) -> Descent:
    q, work = start.q, 0
    for i in range(1, steps + 1):
        descent = _at_share(context, analysis, start, target, i / steps, q)
        q, work = descent.q, work + descent.factorisations
    return descent.after(work - descent.factorisations)


def _in_adaptive_steps(context: Context, analysis: Static, start: Rest, target: Acting) -> Descent | None:
    """Steps of a tenth of the load, halved where one fails, doubled after a good one; None if stuck."""
    q, share, step, work = start.q, 0.0, 0.1, 0
    while step >= 1e-3:
        end = min(1.0, share + step)
        descent = _at_share(context, analysis, start, target, end, q)
        work += descent.factorisations
        if not descent.converged:
            step *= 0.5
            continue
        if end == 1.0:
            return descent.after(work - descent.factorisations, "load steps")
        q, share, step = descent.q, end, 2 * step
    return None


def _at_share(
    context: Context, analysis: Static, start: Rest, target: Acting, share: float, q: Array
) -> Descent:
    """Equilibrium at a share of the way from the start's loading to the target."""
    acting = start.acting.between(target, share) if share < 1.0 else target
    return find_equilibrium(context.potential(acting, analysis.geometry == "small"), q, analysis.tolerance)


def _fields(solved: list[Solved]) -> dict[str, Field]:
    """Arrays of all loadings; a loading that failed has no numbers, only its audit."""
    holds = np.array([s.verdict.holds for s in solved])

    def stack(values: list[Array]) -> Array:
        out = np.stack(values).astype(float)
        out[~holds] = np.nan
        return out

    axial = stack([s.verdict.look.axial for s in solved])
    joint, member = ("loading", "joint", "direction"), ("loading", "member")
    fields = {
        "displacement": Field(
            stack([s.displacement.T for s in solved]), "m", "displacement from the drawn position", joint
        ),
        "axial_force": Field(axial, "N", "axial force, tension positive", member),
        "end_tension": Field(
            np.stack([axial, axial], axis=-1), "N", "tension at the start and end", (*member, "end")
        ),
        "reaction": Field(
            stack([s.reaction.T for s in solved]), "N", "force of supports on the structure", joint
        ),
        "taut": Field(np.stack([~s.slack for s in solved]).astype(np.int8), "1", "1 taut, 0 slack", member),
        "loose_length": Field(
            stack([s.loose_length for s in solved]), "m", "how much a slack member is too long", member
        ),
        "loads": Field(
            np.array([s.loading.name for s in solved], dtype=object), "1", "loading", ("loading",)
        ),
        "converged": Field(holds.astype(np.int8), "1", "1 where the loading has a result", ("loading",)),
    }
    return fields | _envelope(axial, bool(holds.all())) | _audit(solved)


def _envelope(axial: Array, complete: bool) -> dict[str, Field]:
    """Least and greatest axial force over the loadings, and which one gives it; only if all hold."""
    if not complete:
        return {}
    return {
        "envelope/min": Field(axial.min(axis=0), "N", "least axial force of all loadings", ("member",)),
        "envelope/max": Field(axial.max(axis=0), "N", "greatest axial force of all loadings", ("member",)),
        "envelope/argmin": Field(axial.argmin(axis=0), "1", "loading of the least, from 0", ("member",)),
        "envelope/argmax": Field(axial.argmax(axis=0), "1", "loading of the greatest, from 0", ("member",)),
    }


def _audit(solved: list[Solved]) -> dict[str, Field]:
    rows = {
        "force_residual": (
            [s.verdict.residual for s in solved],
            "largest force out of balance, share of scale",
        ),
        "negative_pivots": ([s.verdict.pivots.negative for s in solved], "negative pivots of the tangent"),
        "zero_pivots": ([s.verdict.pivots.zero for s in solved], "zero pivots of the tangent"),
        "reaction_sum_error": ([s.reaction_sum_error for s in solved], "sum of reactions and loads, share"),
        "iterations": ([s.verdict.factorisations for s in solved], "factorisations made"),
        "greatest_turn": ([s.verdict.turn for s in solved], "greatest turn of a bar or strut"),
        "greatest_move": ([s.verdict.move for s in solved], "farthest joint over the model's size"),
    }
    units = {"greatest_turn": "rad"}
    return {
        f"audit/{key}": Field(np.array(values), units.get(key, "1"), words, ("loading",))
        for key, (values, words) in rows.items()
    }
