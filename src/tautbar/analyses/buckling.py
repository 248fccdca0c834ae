"""Linearised buckling about a state, with a look at what the true path would do."""

from __future__ import annotations

import time

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.null import null_vectors
from tautbar.algebra.solver import Factor, NotFinite, NotPositiveDefinite, Singular
from tautbar.analyses.context import Context
from tautbar.analyses.growing import Beginning, Growing, begin
from tautbar.analyses.path import largest_one
from tautbar.analyses.path_words import no_load
from tautbar.analyses.words import changes, chosen, direction
from tautbar.model.parts import Buckling
from tautbar.records.fields import Field, Record
from tautbar.solvers.buckling import Buckled, buckle, stress_change
from tautbar.solvers.path import Stop, start_state, trace
from tautbar.solvers.path_correct import Border
from tautbar.solvers.path_family import Family

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
SOURCES = (
    "linearised buckling (K_0 + lambda K_g) x = 0, K_g from (dN/l)(I - n nT) of a linear step",
    "shift-and-invert Lanczos; completeness by Sylvester's law of inertia",
)
LARGEST_RESIDUAL = 1e-6
PATH_STEPS = 60  # of the path that the lowest factor is held against
NEAR = 0.05  # of a factor: nearer than this the path agrees
SMALLEST_SHARE = 0.1  # the first step of that path, of the lowest factor


def run_buckling(context: Context, analysis: Buckling) -> Record:
    """Load factors smallest in size, sign kept, about the state in balance under the constant loads."""
    began = time.perf_counter()
    beginning = begin(context, analysis)
    growing, family = beginning.growing, beginning.growing.family()
    on = family.carrying(beginning.q, 0.0)
    K0, factor, fault = _tangent(beginning, family, on)
    if factor is None:
        return _record(context, analysis, growing, began, f"NOT A RESULT: {fault}")
    Kg, _ = stress_change(family, beginning.q, on, factor)
    found = buckle(family.system, K0, Kg, factor, analysis.count)
    sound = found.complete and bool((found.residual <= LARGEST_RESIDUAL).all())
    compared = _compare(family, beginning.q, found)
    return _record(
        context,
        analysis,
        growing,
        began,
        _outcome(growing, found, sound),
        _fields(growing, found, compared),
        _audit_lines(found, compared),
        _warnings(context, growing, family, beginning, found, compared),
        sound,
    )


def _record(
    context: Context,
    analysis: Buckling,
    growing: Growing,
    began: float,
    outcome: str,
    fields: dict[str, Field] | None = None,
    audit_lines: tuple[str, ...] = (),
    warnings: tuple[str, ...] = (),
    holds: bool = False,
) -> Record:
    return Record(
        name=analysis.name,
        kind="buckling",
        status="complete" if holds else "failed",
        outcome=outcome,
        acting=growing.acting_words(),
        settings={
            "from": analysis.start.analysis if analysis.start else "the drawing",
            "count": analysis.count,
        }
        | changes(context, analysis.change),
        fields=fields or {},
        audit_lines=audit_lines,
        warnings=warnings,
        sources=SOURCES,
        wall_time=time.perf_counter() - began,
    )


def _tangent(beginning: Beginning, family: Family, on: Flags) -> tuple[Array, Factor | None, str]:
    """Tangent at the state (lower data) and its factor, or why there is none."""
    if beginning.fault:
        return np.zeros(0), None, beginning.fault
    system = family.system
    if system.n == 0:
        return np.zeros(0), None, "nothing can move: every joint is held in every direction"
    if not family.load_rate(beginning.q, 0.0, on).any():
        return np.zeros(0), None, no_load(beginning.growing)
    potential = family.fixed(0.0, on)
    K0 = potential.curvature(potential.look(beginning.q))
    try:
        return K0, system.solver.cholesky(K0), ""
    except NotPositiveDefinite:
        return K0, None, _not_stable(beginning, family, K0)


def _not_stable(beginning: Beginning, family: Family, K0: Array) -> str:
    """Which joint gives way at the start state."""
    system = family.system
    counted = system.solver.symmetric(K0)
    weak = null_vectors(K0, system.pattern, counted.negative + counted.zero or 1, float(np.abs(K0).max()))
    if not weak.size:
        return "the state to start from is at the point of buckling"
    joint, way = beginning.growing.scene.name_direction(weak[:, 0])
    what = "is not stable" if counted.negative else "has no stiffness"
    return (
        f"the state to start from {what}: joint {joint} gives way in {direction(way)}. Buckling is counted "
        "from a stable state: give constant loads or pretension that hold it, or use equilibrium-path"
    )


def _compare(family: Family, q: Array, found: Buckled) -> tuple[float, str] | None:
    """Load factor and kind of the first critical point of the path towards the lowest positive factor.

    The kind is empty, and the factor how far it was followed, where it has none up to there; None where
    there is no positive factor or the path cannot be followed.
    """
    positive = found.factor[found.factor > 0]
    if not positive.size:
        return None
    lowest = float(positive.min())
    goal = (1 + NEAR) * lowest
    try:
        start = start_state(family, q, 0.0)
    except (NotFinite, Singular):
        return None
    if start is None or not start.held:
        return None
    border = Border(np.zeros(family.system.n), 1.0, goal)
    walked = trace(family, start, SMALLEST_SHARE * lowest, Stop(border, most=PATH_STEPS, at_loss=True))
    # A limit point, a bifurcation, or a kink at which the structure loses its stability.
    lost = [p for p in walked.critical if p.negative[1] > p.negative[0]]
    if lost:
        return lost[0].spot.f, lost[0].kind
    return (goal, "") if walked.reached else None


def _fields(growing: Growing, found: Buckled, compared: tuple[float, str] | None) -> dict[str, Field]:
    scene = growing.scene
    joints = scene.structure.joints
    spread = scene.system.freedom.spread
    shapes = [largest_one(spread, x).T for x in found.shape.T]
    shape = np.stack(shapes) if shapes else np.zeros((0, joints, 3))
    path = np.nan if compared is None else compared[0]
    return {
        **scene.present,
        "load_factor": Field(found.factor, "1", "factor on the growing loads", ("mode",)),
        "shape": Field(
            np.ascontiguousarray(shape),
            "1",
            "shape, largest component 1",
            ("mode", scene.joint_axis, "direction"),
        ),
        "audit/residual": Field(found.residual, "1", "|K0 x + f Kg x| / |K0 x|", ("mode",)),
        "audit/counted": Field(np.array(found.counted), "1", "factors no larger than the last, by pivots"),
        "audit/path_load_factor": Field(
            np.array(path),
            "1",
            "first critical point of the true path, or how far it was followed without one",
        ),
    }


def _outcome(growing: Growing, found: Buckled, sound: bool) -> str:
    if not sound:
        return (
            f"NOT A RESULT: {found.counted} load factors are counted where {found.factor.size} were found, "
            "or one of them is not accurate"
        )
    if not found.factor.size:
        return "no load factor of either sign makes the state buckle"
    lines = []
    for i, value in enumerate(found.factor):
        joint, way = growing.scene.name_direction(found.shape[:, i])
        way = way / np.sqrt(way @ way)
        lines.append(f"load factor {value:.6g}: joint {joint} goes most, in {direction(way)}")
    if not (found.factor > 0).any():
        lines.append(
            "all are below zero: the state buckles only if the growing loads act the other way round"
        )
    return "\n".join(lines)


def _audit_lines(found: Buckled, compared: tuple[float, str] | None) -> tuple[str, ...]:
    lines = [
        f"load factors found {found.factor.size}, counted by negative pivots {found.counted}",
        f"largest residual {found.residual.max(initial=0.0):.1e}",
    ]
    if compared is not None and compared[1]:
        lines.append(f"the true path has its first {compared[1]} at load factor {compared[0]:.6g}")
    elif compared is not None:
        lines.append(f"the true path has no critical point up to load factor {compared[0]:.6g}")
    else:
        lines.append("the true path was not compared")
    return tuple(lines)


def _warnings(
    context: Context,
    growing: Growing,
    family: Family,
    beginning: Beginning,
    found: Buckled,
    compared: tuple[float, str] | None,
) -> tuple[str, ...]:
    """Ties as they are at the start, and where the true path differs."""
    lines = []
    if family.switchable.any():
        slack = family.switchable & ~family.carrying(beginning.q, 0.0)
        names = chosen(context.member_names, slack) if slack.any() else "none"
        lines.append(
            "members that carry one sense of force only count as they are at the start "
            f"(slack there: {names}); loads that make them slack or taut need equilibrium-path"
        )
    positive = found.factor[found.factor > 0]
    if not positive.size:
        return tuple(lines)
    lowest = float(positive.min())
    if compared is None:
        lines.append("whether the true path agrees was not found out: compare with equilibrium-path")
    elif not compared[1]:
        lines.append(
            f"the true path passes the lowest load factor {lowest:.4g} without losing its stability up to "
            f"{compared[0]:.4g}: the structure stiffens as it is loaded; use equilibrium-path"
        )
    elif abs(lowest / compared[0] - 1) > NEAR:
        lines.append(
            f"the true path loses its stability at load factor {compared[0]:.4g} ({compared[1]}): linearised "
            f"buckling gives {lowest / compared[0]:.2g} times that. equilibrium-path governs"
        )
    return tuple(lines)
