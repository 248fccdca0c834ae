"""Form-finding: the shape that given force densities hold in balance, and a real static check of it."""

from __future__ import annotations

import time

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context, Rest
from tautbar.analyses.scene import Scene
from tautbar.analyses.solved import Solved
from tautbar.analyses.static import fields_of, solve
from tautbar.analyses.static_words import audit_lines, outcome, warnings
from tautbar.analyses.words import changes, chosen, direction, quantity
from tautbar.errors import AnalysisFailed
from tautbar.model.parts import FormFinding, Static
from tautbar.records.fields import Field, Record
from tautbar.solvers.force_density import NoShape, Shape, find_shape
from tautbar.solvers.potential import Potential

Array = NDArray[np.float64]
SOURCES = ("force density method: Linkwitz and Schek 1971; Schek 1974",)


def run_form_finding(context: Context, analysis: FormFinding) -> Record:
    """Find the shape, check it with the real members, and keep it for later analyses.

    Weight follows the unstressed lengths found: the linear solve is repeated until they stand still.
    Line loads, wind and ice keep the size they have on the drawing.

    Raises
    ------
    AnalysisFailed
        A member without a force density; a net that leaves a joint free.
    """
    began = time.perf_counter()
    rest = context.start(analysis.start, analysis.change)
    density = densities(analysis, rest.scene)
    bare = rest.scene.structure.present & np.isnan(density)
    if bare.any():
        raise AnalysisFailed(f"no force density is given for {chosen(context.member_names, bare)}", None)
    shape = _shape(context, analysis, rest.scene, density)
    solved, off = _checked(context, analysis, rest, shape)
    holds = solved.verdict.holds and off <= 1e-6
    if holds:
        context.keep(analysis.name, [solved.rest])
    static = Static(analysis.name, loads=(analysis.loads,))
    said = outcome(context, static, [solved])
    if solved.verdict.holds and not holds:
        said = (
            f"NOT A RESULT: the real members leave the shape found, by {100 * off:.2g} % of its size\n{said}"
        )
    return Record(
        name=analysis.name,
        kind="form-finding",
        status="complete" if holds else "failed",
        outcome="\n".join([said, *_words(context, analysis, rest.scene, shape)]),
        acting=(f"{analysis.loads.name}: {analysis.loads.acting}",),
        settings=_settings(context, analysis) | changes(context, analysis.change),
        fields=fields_of([solved]) | _fields(solved, shape, density),
        audit_lines=(
            f"checked with the real members: joints move by {off:.1e} of the model's size",
            f"{shape.rounds} rounds for the weight of the lengths found",
            *audit_lines(context, static, [solved]),
        ),
        warnings=warnings(context, [solved]),
        sources=SOURCES,
        wall_time=time.perf_counter() - began,
    )


def densities(analysis: FormFinding, scene: Scene) -> Array:
    """Force densities (N,) [N/m], zero for members that are not there, NaN where none is given."""
    q = np.full(scene.structure.members, np.nan)
    for members, value in analysis.force_densities:
        q[list(members)] = value
    return np.where(scene.structure.present, q, 0.0)


def _shape(context: Context, analysis: FormFinding, scene: Scene, density: Array) -> Shape:
    acting = scene.acting(analysis.loads)
    EA = scene.structure.EA

    def lengths(l: Array, N: Array) -> Array:
        """Unstressed lengths of the model that carry N at l under this loading's temperature and take-up."""
        strain = np.divide(N, EA, out=np.zeros_like(N), where=EA > 0)
        carrying = np.where(strain > -1, l / np.where(strain > -1, 1 + strain, 1.0), -1.0)
        return np.asarray(carrying / (1 + acting.heating) + acting.take_up)

    def potential(L0: Array) -> Potential:
        there = scene.with_lengths(L0)
        return there.potential(there.acting(analysis.loads))

    try:
        return find_shape(scene.system, density, potential, lengths)
    except NoShape as fault:
        raise AnalysisFailed(_fault(context, scene, fault), None) from fault


def _fault(context: Context, scene: Scene, fault: NoShape) -> str:
    if fault.free is not None:
        named = [scene.name_direction(v) for v in fault.free.T]
        where = "; ".join(f"joint {joint} in {direction(way)}" for joint, way in named)
        return (
            f"the force densities give a singular net: they leave {where} free. Tension and compression "
            "cancel there, or the joint has no way to a support through members with a force density"
        )
    if fault.vanishing is not None:
        names = chosen(context.member_names, fault.vanishing)
        return f"{names}: compression as large as the axial stiffness leaves no length; give a smaller value"
    return (
        "the weight of the lengths found grows from round to round: the force densities are too small "
        "for the weight"
    )


def _checked(context: Context, analysis: FormFinding, rest: Rest, shape: Shape) -> tuple[Solved, float]:
    """A real static answer from the shape, and how far its joints move from it, over the model's size.

    Bars may lie anywhere relative to the drawing, which is no shape yet.
    """
    scene = rest.scene.with_lengths(shape.L0)
    found = scene.displacement(shape.q, scene.acting(analysis.loads))
    static = Static(analysis.name, loads=(analysis.loads,), folding=True)
    solved = solve(context, static, context.rest_at(scene, analysis.loads, found), analysis.loads)
    return solved, float(np.abs(solved.displacement - found).max(initial=0.0)) / scene.structure.size


def _words(context: Context, analysis: FormFinding, scene: Scene, shape: Shape) -> list[str]:
    there = np.flatnonzero(scene.structure.present)
    if not there.size:
        return []
    low, high = (int(there[i]) for i in (shape.L0[there].argmin(), shape.L0[there].argmax()))
    names = context.member_names
    return [
        f"unstressed lengths from {quantity(shape.L0[low], 'm')} ({names[low]}) to "
        f"{quantity(shape.L0[high], 'm')} ({names[high]}); later analyses may start from this shape "
        f'with from = "{analysis.name}"'
    ]


def _settings(context: Context, analysis: FormFinding) -> dict[str, object]:
    return {
        "from": analysis.start.analysis if analysis.start else "the drawing",
        "force_densities": [
            {"members": [context.member_names[m] for m in members], "value": value}
            for members, value in analysis.force_densities
        ],
    }


def _fields(solved: Solved, shape: Shape, density: Array) -> dict[str, Field]:
    position = solved.scene.structure.position + solved.displacement
    return {
        "unstressed_length": Field(shape.L0, "m", "unstressed length", ("member",)),
        "position": Field(position.T, "m", "position found", ("joint", "direction")),
        "force_density": Field(density, "N/m", "axial force over length", ("member",)),
    }
