"""Equilibrium path: all states under constant + factor x growing loads, through limit points."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import NotFinite, Singular
from tautbar.analyses import path_words as words
from tautbar.analyses.context import Context, Rest
from tautbar.analyses.growing import Beginning, Growing, begin
from tautbar.analyses.reach import contact_lost
from tautbar.analyses.words import changes
from tautbar.mechanics.freedom import pushers
from tautbar.model.parts import EquilibriumPath, StopAt
from tautbar.records.fields import Field, Record
from tautbar.solvers.path import Stop, Trace, idle, start_state, trace
from tautbar.solvers.path_correct import Border, State
from tautbar.solvers.path_family import Family

Array = NDArray[np.float64]
SOURCES = (
    "M. A. Crisfield, Comput. Struct. 13 (1981) 55-62; E. Ramm (1981): arc length with tangent predictor",
    "Sylvester's law of inertia: stability and critical points by the signs of the pivots",
    "engineering strain, N = EA (l - L0)/L0",
)


@dataclass(frozen=True)
class Followed:
    """A path with the arrays of its states. Joint arrays are (S, 3, J)."""

    context: Context
    growing: Growing
    trace: Trace
    displacement: Array  # m
    reaction: Array  # N
    names: tuple[str, ...]  # of the critical points, "limit point 1"
    lifted: int | None = None  # state at which a one-way support first pulls

    @property
    def holds(self) -> bool:
        return self.trace.reached and self.lifted is None

    @property
    def load_factor(self) -> Array:
        return np.array([spot.f for spot in self.trace.spots])

    @property
    def axial(self) -> Array:
        """(S, N) N; not a number for a member that is not there."""
        there = self.growing.scene.stage.members
        return np.where(there, np.stack([spot.look.axial for spot in self.trace.spots]), np.nan)


def run_path(context: Context, analysis: EquilibriumPath) -> Record:
    """Follow the path; its critical points and its end are kept for later analyses."""
    began = time.perf_counter()
    beginning = begin(context, analysis)
    growing, family = beginning.growing, beginning.growing.family()
    fault = _cannot(beginning, family)
    start = None if fault else _start(family, beginning.q, analysis)
    if not fault and (start is None or not start.held):
        fault = words.no_start(growing, start)
    if start is not None and idle(family, start):
        fault = fault or words.no_load(growing)
    if fault or start is None:
        return _record(context, analysis, growing, began, f"NOT A RESULT: {fault}", {}, (), ())
    way = _way(analysis)
    found = trace(family, start, abs(analysis.step), _stop(growing, analysis.stop_at))
    followed = follow(context, growing, found)
    if followed.holds:
        context.keep(analysis.name, _rests(followed))
    return _record(
        context,
        analysis,
        growing,
        began,
        words.outcome(followed, analysis),
        _fields(followed),
        words.audit_lines(followed, analysis),
        words.warnings(followed, way),
        followed.holds,
    )


def _record(
    context: Context,
    analysis: EquilibriumPath,
    growing: Growing,
    began: float,
    outcome: str,
    fields: dict[str, Field],
    audit_lines: tuple[str, ...],
    warnings: tuple[str, ...],
    holds: bool = False,
) -> Record:
    return Record(
        name=analysis.name,
        kind="equilibrium-path",
        status="complete" if holds else "failed",
        outcome=outcome,
        acting=growing.acting_words(),
        settings={
            "from": analysis.start.analysis if analysis.start else "the drawing",
            "step": analysis.step,
            "stop_at": words.stop_words(context, analysis.stop_at),
        }
        | changes(context, analysis.change),
        fields=fields,
        audit_lines=audit_lines,
        warnings=warnings,
        sources=SOURCES,
        wall_time=time.perf_counter() - began,
    )


def _cannot(beginning: Beginning, family: Family) -> str:
    """Why there is no path, before it is sought; empty if there may be one."""
    if beginning.fault:
        return beginning.fault
    if family.system.n == 0:
        return "nothing can move: every joint is held in every direction"
    rate = family.load_rate(beginning.q, 0.0, family.carrying(beginning.q, 0.0))
    return "" if rate.any() else words.no_load(beginning.growing)


def _way(analysis: EquilibriumPath) -> float:
    """-1 where the load factor asked for is below zero."""
    wanted = analysis.stop_at.load_factor
    return -1.0 if wanted is not None and wanted < 0 else 1.0


def _start(family: Family, q: Array, analysis: EquilibriumPath) -> State | None:
    try:
        return start_state(family, q, 0.0, _way(analysis))
    except (NotFinite, Singular):
        return None


def _stop(growing: Growing, stop_at: StopAt) -> Stop:
    n = growing.scene.system.n
    if stop_at.load_factor is not None:
        return Stop(Border(np.zeros(n), 1.0, stop_at.load_factor))
    if stop_at.joint is not None:
        joints = growing.scene.structure.joints
        unit = np.zeros((3, joints))
        unit[stop_at.axis, stop_at.joint] = 1.0
        held = [
            growing.scene.held_displacement(growing.acting(f))[stop_at.axis, stop_at.joint]
            for f in (0.0, 1.0)
        ]
        row = growing.scene.free_part(unit)
        return Stop(Border(row, float(held[1] - held[0]), stop_at.displacement - float(held[0])))
    return Stop(limit_points=stop_at.limit_points, steps=stop_at.steps)


def follow(context: Context, growing: Growing, found: Trace) -> Followed:
    """The arrays of a path, and where a support that only pushes should have let go."""
    spots = found.spots
    U = np.stack([growing.displacement(s.q, s.f) for s in spots])
    scene = growing.scene
    pulls = (scene.system.freedom.joint_pull(s.look.response.pull) for s in spots)
    forces = np.stack(
        [
            scene.reaction(pull, growing.acting(s.f).force, u)
            for pull, s, u in zip(pulls, spots, U, strict=True)
        ]
    )
    counts: dict[str, int] = {}
    names = []
    for point in found.critical:
        counts[point.kind] = counts.get(point.kind, 0) + 1
        names.append(f"{point.kind} {counts[point.kind]}")
    lifted = _first_lift(context, growing, found, U, forces)
    return Followed(context, growing, found, U, forces, tuple(names), lifted)


def _first_lift(context: Context, growing: Growing, found: Trace, U: Array, forces: Array) -> int | None:
    """The first state at which a one-way support pulls, or a joint is below one that had let go."""
    scene = growing.scene
    every = pushers(context.parts, scene.stage, scene.structure.joints)
    if not every.any():
        return None
    for i, spot in enumerate(found.spots):
        acting = growing.acting(spot.f)
        lifts, sinks = contact_lost(scene, every, acting, forces[i], U[i], spot.look.axial)
        if lifts.any() or sinks.any():
            return i
    return None


def _rests(followed: Followed) -> list[Rest]:
    """States that later analyses may start from, each under its own name."""
    growing, spots = followed.growing, followed.trace.spots
    named = [*zip(followed.names, followed.trace.places, strict=True), ("end", len(spots) - 1)]
    rests = []
    for name, at in named:
        spot = spots[at]
        acting = growing.acting(spot.f)
        response = growing.scene.potential(acting).look(spot.q).response
        loading = growing.loading(name, spot.f)
        rests.append(Rest(growing.scene, loading, acting, followed.displacement[at], response))
    # Without `at`, a later analysis starts from the end.
    return [rests[-1], *rests[:-1]]


def _fields(followed: Followed) -> dict[str, Field]:
    scene, spots = followed.growing.scene, followed.trace.spots
    joint = ("step", scene.joint_axis, "direction")
    return {
        **scene.present,
        "load_factor": Field(followed.load_factor, "1", "factor on the growing loads", ("step",)),
        "displacement": Field(
            _joint_last(followed.displacement), "m", "displacement from the drawing", joint
        ),
        "axial_force": Field(
            followed.axial, "N", "axial force, tension positive", ("step", scene.member_axis)
        ),
        "reaction": Field(_joint_last(followed.reaction), "N", "force of supports on the structure", joint),
        "negative_pivots": Field(
            np.array(followed.trace.negative), "1", "negative pivots of the tangent", ("step",)
        ),
        "slack_onset": Field(
            followed.trace.onset, "1", "load factor at which a member first went slack", (scene.member_axis,)
        ),
        "audit/force_residual": Field(
            np.array([spot.imbalance for spot in spots]),
            "1",
            "largest force out of balance, share",
            ("step",),
        ),
    } | _critical_fields(followed)


def _critical_fields(followed: Followed) -> dict[str, Field]:
    scene, points = followed.growing.scene, followed.trace.critical
    joints = scene.structure.joints
    axes = ("critical_point", scene.joint_axis, "direction")
    nowhere = np.full((3, joints), np.nan)
    directions = [
        nowhere if p.direction is None else largest_one(scene.system.freedom.spread, p.direction)
        for p in points
    ]
    U = [followed.displacement[i] for i in followed.trace.places]

    def stacked(arrays: list[Array]) -> Array:
        return _joint_last(np.stack(arrays)) if arrays else np.zeros((0, joints, 3))

    return {
        "critical_points/load_factor": Field(
            np.array([p.spot.f for p in points]), "1", "load factor", ("critical_point",)
        ),
        "critical_points/type": Field(
            np.array([p.kind for p in points], dtype=object), "1", "type", ("critical_point",)
        ),
        "critical_points/displacement": Field(stacked(U), "m", "displacement from the drawing", axes),
        "critical_points/direction": Field(
            stacked(directions), "1", "direction without stiffness there, largest joint 1", axes
        ),
    }


def largest_one(spread: Callable[[Array], Array], vector: Array) -> Array:
    """A direction (n,) at all joints (3, J), the largest component +1."""
    U = spread(vector)
    return np.asarray(U / U.flat[int(np.abs(U).argmax())])


def _joint_last(arrays: Array) -> Array:
    return np.ascontiguousarray(arrays.transpose(0, 2, 1))
