"""Natural frequencies and mode shapes about a state, proven complete by the inertia count."""

from __future__ import annotations

import time
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra import eigen
from tautbar.analyses.context import Context, Rest
from tautbar.analyses.modes_words import audit_lines, outcome, proven, warnings
from tautbar.analyses.pieces import balanced, begin, piece_names
from tautbar.analyses.scene import Scene
from tautbar.analyses.words import changes
from tautbar.mechanics import members
from tautbar.mechanics.mass import kinetic_energy_by_member
from tautbar.mechanics.product import Product
from tautbar.model.parts import Modes
from tautbar.records.fields import Field, Record

Array = NDArray[np.float64]
SOURCES = (
    "consistent mass (m L0/6)[[2, 1], [1, 2]] in all directions, or half the mass at each end",
    "shift-and-invert Lanczos; completeness by Sylvester's law of inertia (Sturm count)",
)


def run_modes(context: Context, analysis: Modes) -> Record:
    """Modes of the tangent at the state the analysis starts from."""
    began = time.perf_counter()
    changed = changes(context, analysis.change)
    begun = begin(context, analysis.start, analysis.change, None, analysis.pieces)
    drawn = analysis.start is None or analysis.start.as_drawn
    context, rest, said = begun if drawn else balanced(begun, analysis.name)
    scene, lumped = rest.scene, analysis.mass == "lumped"
    M = Product(scene.system.free_mass(scene.system.joint_mass(rest.acting, lumped)))
    K, one_sided = _tangent(rest)
    up_to = None if analysis.up_to is None else (2 * np.pi * analysis.up_to) ** 2
    found = eigen.lowest_modes(
        K,
        scene.system.lower_of(M.matrix),
        scene.system.pattern,
        count=analysis.count if up_to is None else None,
        up_to=up_to,
        solver=scene.system.solver,
    )
    fields = _fields(context, rest, found, M, lumped)
    return Record(
        name=analysis.name,
        kind="modes",
        status="complete" if proven(found) and found.negative == 0 else "failed",
        outcome=outcome(scene, found, fields, analysis.up_to),
        acting=(f"{rest.loading.name}: {rest.loading.acting}",),
        settings={
            "from": analysis.start.analysis if analysis.start else "the drawing",
            "count": "all up to the limit" if up_to is not None else analysis.count,
            "up_to": "none" if analysis.up_to is None else analysis.up_to,
            "mass": analysis.mass,
            "pieces": analysis.pieces or "as the model says",
        }
        | changed,
        fields=fields | piece_names(rest.scene),
        audit_lines=audit_lines(found),
        warnings=(*said, *warnings(context, rest, found, one_sided)),
        sources=SOURCES,
        wall_time=time.perf_counter() - began,
    )


def _tangent(rest: Rest) -> tuple[Array, NDArray[np.bool_]]:
    """Tangent stiffness at the state, and which ties are just at their length there.

    About a state of small geometry: the drawn directions, with the forces of the state.
    """
    potential = rest.scene.potential(rest.acting, rest.small)
    look = potential.look(rest.q)
    sp, e = potential.springs, look.stretch.e
    K = replace(potential, stressed=True).curvature(look)
    return K, members.taut(sp, e) & ~members.firmly_taut(sp, e)


def _fields(context: Context, rest: Rest, found: eigen.Modes, M: Product, lumped: bool) -> dict[str, Field]:
    system = rest.scene.system
    value = found.eigenvalue
    unstable = max(found.negative, 0)  # -1 where it could not be counted
    zero = np.arange(value.size) < unstable + found.zero
    frequency = np.sqrt(np.where(zero, 0.0, np.maximum(value, 0.0))) / (2 * np.pi)
    frequency[:unstable] = np.nan
    shape = np.stack([system.freedom.spread(x) for x in found.shape.T]) if value.size else np.zeros((0, 3, 1))
    factor = np.asarray(found.shape.T @ (M @ _rigid(rest.scene)))
    names, share = _energy_shares(context, rest, shape, found, M, lumped)
    mode, joint = ("mode",), ("mode", rest.scene.joint_axis, "direction")
    return {
        "frequency": Field(frequency, "Hz", "natural frequency", mode),
        "eigenvalue": Field(value, "rad2/s2", "square of the circular frequency", mode),
        "shape": Field(shape.transpose(0, 2, 1), "1", "shape, generalised mass 1 kg", joint),
        "participation_factor": Field(factor, "kg^0.5", "participation factor", ("mode", "direction")),
        "effective_mass": Field(factor**2, "kg", "effective mass", ("mode", "direction")),
        "free_mass": Field(_free_mass(rest.scene, M), "kg", "mass free to move", ("direction",)),
        "kinetic_energy_share": Field(
            share, "1", "share of kinetic energy by member group", ("mode", "group")
        ),
        **rest.scene.present,
        "group": Field(np.array(names, dtype=object), "1", "member group, joint masses last", ("group",)),
        "audit/residual": Field(found.residual, "1", "|K x - w2 M x| / |K x|", mode),
        "audit/orthogonality": Field(np.array(found.orthogonality), "1", "largest of |x.M x - 1|"),
        "audit/sturm_count": Field(np.array(found.count_below), "1", "eigenvalues counted below the last"),
        "audit/zero_modes": Field(np.array(found.zero), "1", "modes without stiffness"),
        "audit/negative": Field(np.array(found.negative), "1", "unstable modes"),
    }


def _rigid(scene: Scene) -> Array:
    """Free part of a unit translation in each direction (n, 3)."""
    J = scene.structure.joints
    return np.stack([scene.free_part(np.outer(d, np.ones(J))) for d in np.eye(3)], axis=1)


def _free_mass(scene: Scene, M: Product) -> Array:
    one = _rigid(scene)
    return np.asarray((one * (M @ one)).sum(axis=0))


def _energy_shares(
    context: Context, rest: Rest, shape: Array, found: eigen.Modes, M: Product, lumped: bool
) -> tuple[list[str], Array]:
    """Share of each mode's kinetic energy in each group of members (mass at joints: the last column)."""
    groups = context.parts.members.groups
    names = [*groups, "masses"]
    share = np.zeros((len(shape), len(names)))
    for k, U in enumerate(shape):
        by_member = kinetic_energy_by_member(rest.scene.structure, rest.acting.coat, U, lumped)
        total = float(found.shape[:, k] @ (M @ found.shape[:, k])) or 1.0
        share[k, :-1] = [by_member[list(which)].sum() / total for which in groups.values()]
        share[k, -1] = 1.0 - by_member.sum() / total
    return names, share
