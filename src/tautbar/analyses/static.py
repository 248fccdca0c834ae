"""Static analysis: equilibrium with large displacements and slack members, and what proves it."""

from __future__ import annotations

import time
from collections.abc import Iterator
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context, Rest
from tautbar.analyses.onset import slack_onset
from tautbar.analyses.pieces import cut, finer_context, piece_names
from tautbar.analyses.reach import reaction, settle
from tautbar.analyses.scene import Scene
from tautbar.analyses.solved import Solved
from tautbar.analyses.static_words import audit_lines, outcome, warnings
from tautbar.analyses.words import changes
from tautbar.mechanics import hanging, members
from tautbar.mechanics.carriers import Response
from tautbar.mechanics.loads import Acting
from tautbar.model.parts import Loading, Static
from tautbar.records.fields import Field, Record

Array = NDArray[np.float64]
CURVE_POINTS = 33
UNBALANCED = 1e-6  # of the largest force: reactions and loads that differ by more contradict the balance
SOURCES = (
    "Newton-Raphson with energy line search; engineering strain, N = EA (l - L0)/L0",
    "Sylvester's law of inertia: stability by the signs of the pivots",
)


def run_static(context: Context, analysis: Static) -> Record:
    """Solve every loading of a static analysis; the states that hold are kept for later analyses."""
    began = time.perf_counter()
    cases = list(_cases(context, analysis))
    whole, context, begun = context, *_in_pieces(context, analysis, cases)
    solved = [solve(context, analysis, rest, loading) for rest, loading in begun]
    holds = all(s.verdict.holds for s in solved)
    if holds:
        whole.keep(analysis.name, [_kept(whole, rest, s) for (rest, _), s in zip(cases, solved, strict=True)])
    return Record(
        name=analysis.name,
        kind="static",
        status="complete" if holds else "failed",
        outcome=outcome(context, analysis, solved),
        acting=tuple(f"{s.loading.name}: {s.loading.acting}" for s in solved),
        settings=_settings(context, analysis),
        fields=fields_of(solved) | piece_names(solved[0].scene),
        audit_lines=audit_lines(context, analysis, solved),
        warnings=warnings(context, solved),
        sources=SOURCES,
        wall_time=time.perf_counter() - began,
    )


def _cases(context: Context, analysis: Static) -> Iterator[tuple[Rest, Loading]]:
    """Every start state with every loading on it, and with every member lost in turn."""
    for rest in context.starts(analysis.start, analysis.change):
        for loading in analysis.loads if analysis.loads is not None else (rest.loading,):
            if not analysis.lose_in_turn:
                yield rest, loading
            for member in analysis.lose_in_turn:
                name = f"{loading.name}, without {context.member_names[member]}"
                yield context.losing(rest, member), Loading(name, loading.factors)


def _in_pieces(
    context: Context, analysis: Static, cases: list[tuple[Rest, Loading]]
) -> tuple[Context, list[tuple[Rest, Loading]]]:
    """The same cases with hanging members in pieces, where the analysis asks for it."""
    finer = finer_context(context, cases[0][0], analysis.pieces)
    if finer is None or analysis.pieces is None:
        return context, cases
    return finer, [(cut(finer, rest, analysis.pieces), loading) for rest, loading in cases]


def _kept(whole: Context, start: Rest, solved: Solved) -> Rest:
    """The state for later analyses: of the model itself, also where ropes were in pieces for this one."""
    if solved.scene.pieces is None:
        return solved.rest
    return whole.rest_at(start.scene, solved.loading, solved.displacement[:, : start.scene.structure.joints])


def _settings(context: Context, analysis: Static) -> dict[str, object]:
    start = analysis.start.analysis if analysis.start else "the drawing"
    return {
        "from": start,
        "geometry": analysis.geometry,
        "steps": analysis.steps or "as many as it takes",
        "tolerance": analysis.tolerance,
        "folding": "allowed" if analysis.folding else "not allowed",
        "pieces": analysis.pieces or "as the model says",
    } | changes(context, analysis.change)


def solve(context: Context, analysis: Static, start: Rest, loading: Loading) -> Solved:
    """Equilibrium of one loading from one start state, with its audit."""
    acting = start.scene.acting(loading)
    scene, verdict = settle(context, analysis, start, acting)
    force = reaction(scene, verdict, acting)
    total = (force + acting.force).sum(axis=1)
    scale = scene.potential(acting).scale(verdict.look)  # where nothing acts, rounding of lengths sets it
    largest = max(np.abs(force).max(initial=0.0), np.abs(acting.force).max(initial=0.0), scale)
    error = float(np.abs(total).max() / largest)
    if verdict.holds and scene.loads_on_nothing(acting):
        verdict = replace(verdict, fault="load on nothing")
    if verdict.holds and error > max(UNBALANCED, 100 * analysis.tolerance):
        verdict = replace(verdict, fault="unbalanced")
    slack = scene.structure.can_slack & ~members.taut(scene.potential(acting).springs, verdict.look.stretch.e)
    onset = np.full(slack.size, np.nan)
    if verdict.holds and slack.any():
        onset = slack_onset(analysis, replace(start, scene=scene), acting, verdict.look.q)
    return Solved(
        loading=loading,
        scene=scene,
        acting=acting,
        verdict=verdict,
        displacement=scene.displacement(verdict.look.q, acting),
        reaction=force,
        slack=slack,
        onset=onset,
        reaction_sum_error=error,
        small=analysis.geometry == "small",
    )


def fields_of(solved: list[Solved]) -> dict[str, Field]:
    """Arrays of all loadings; a loading that failed has no numbers, only its audit.

    A member that is not there has no axial force: it is not a number either.
    """
    holds = np.array([s.verdict.holds for s in solved])
    there = np.stack([s.scene.stage.members for s in solved])

    def stack(values: list[Array]) -> Array:
        out = np.stack(values).astype(float)
        out[~holds] = np.nan
        return out

    axial = np.where(there, stack([s.verdict.look.axial for s in solved]), np.nan)
    ends = stack([_end_tensions(s) for s in solved])
    scene = solved[0].scene
    joint, member = ("loading", scene.joint_axis, "direction"), ("loading", scene.member_axis)
    fields = {
        "displacement": Field(
            stack([s.displacement.T for s in solved]), "m", "displacement from the drawn position", joint
        ),
        "axial_force": Field(axial, "N", "axial force, tension positive", member),
        "end_tension": Field(ends, "N", "tension at the start and end", (*member, "end")),
        "reaction": Field(
            stack([s.reaction.T for s in solved]), "N", "force of supports on the structure", joint
        ),
        "taut": Field(
            np.stack([~s.slack for s in solved]).astype(np.int8) * there, "1", "1 taut, 0 slack", member
        ),
        "present": Field(there.astype(np.int8), "1", "1 where the member is there", member),
        "loose_length": Field(
            stack([s.loose_length for s in solved]), "m", "how much a slack member is too long", member
        ),
        "slack_onset": Field(
            stack([s.onset for s in solved]), "1", "load factor at which a slack member went slack", member
        ),
        "loads": Field(
            np.array([s.loading.name for s in solved], dtype=object), "1", "loading", ("loading",)
        ),
        "converged": Field(holds.astype(np.int8), "1", "1 where the loading has a result", ("loading",)),
    }
    return fields | _envelope(axial, bool(holds.all()), scene.member_axis) | _audit(solved) | _curves(solved)


def _end_tensions(s: Solved) -> Array:
    """Tension at the start and end of each member (N, 2) [N]; along a straight one it is the same."""
    axial = s.verdict.look.axial
    out = np.stack([axial, axial], axis=-1)
    carriers, hung = s.scene.potential(s.acting).carriers, s.verdict.look.response.hung
    if carriers.ropes is not None and hung is not None:
        out[carriers.at] = np.stack(hanging.end_tensions(carriers.ropes, hung), axis=-1)
    return out


def _curves(solved: list[Solved]) -> dict[str, Field]:
    """Points along hanging members and their lowest points, where all loadings have the same ones."""
    each = [rope_curves(s.scene, s.acting, s.displacement, s.verdict.look.response) for s in solved]
    if not each or each[0] is None or any(c is None or c[0].tolist() != each[0][0].tolist() for c in each):
        return {}
    found = [c for c in each if c is not None]
    which, axes = found[0][0], ("loading", "rope")
    return {
        "rope_curve/member": Field(which, "1", "hanging member, counted from 0", ("rope",)),
        "rope_curve/position": Field(
            np.stack([c[1] for c in found]), "m", "points along the rope", (*axes, "point", "direction")
        ),
        "rope_curve/lowest_point": Field(
            np.stack([c[2] for c in found]), "m", "lowest point of the rope", (*axes, "direction")
        ),
    }


def rope_curves(
    scene: Scene, acting: Acting, displacement: Array, response: Response
) -> tuple[NDArray[np.intp], Array, Array] | None:
    """Which members hang (R,), points along them (R, P, 3) and their lowest points (R, 3) [m]."""
    ropes, at = scene.potential(acting).carriers[1:]
    if ropes is None or response.hung is None:
        return None
    now = scene.structure.position + displacement
    start = now[:, scene.structure.start[at]]
    r = now[:, scene.structure.end[at]] - start
    points = hanging.curve(ropes, response.hung, start, r, CURVE_POINTS)
    return at, points, hanging.lowest_point(ropes, response.hung, start, r).T


def _envelope(axial: Array, complete: bool, axis: str) -> dict[str, Field]:
    """Least and greatest axial force over the loadings, and which one gives it; only if all hold."""
    if not complete:
        return {}
    low, high = np.where(np.isnan(axial), np.inf, axial), np.where(np.isnan(axial), -np.inf, axial)
    never = np.isnan(axial).all(axis=0)
    least, greatest = (np.where(never, np.nan, v) for v in (low.min(axis=0), high.max(axis=0)))
    return {
        "envelope/min": Field(least, "N", "least axial force of all loadings", (axis,)),
        "envelope/max": Field(greatest, "N", "greatest axial force of all loadings", (axis,)),
        "envelope/argmin": Field(low.argmin(axis=0), "1", "loading of the least, from 0", (axis,)),
        "envelope/argmax": Field(high.argmax(axis=0), "1", "loading of the greatest, from 0", (axis,)),
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
