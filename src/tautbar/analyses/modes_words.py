"""A modal analysis in sentences."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra import eigen
from tautbar.analyses.context import Context, Rest
from tautbar.analyses.scene import Scene
from tautbar.analyses.words import chosen, direction
from tautbar.model.parts import AXES
from tautbar.records.fields import Field

MOST_MODES = 20
RESIDUAL = 1e-6  # of |K x|: far above what converged modes leave, far below what matters


def outcome(scene: Scene, found: eigen.Modes, fields: Mapping[str, Field], up_to: float | None) -> str:
    """The frequencies, each with what moves, as a table; failures first."""
    lines = []
    if found.negative > 0:
        joint, way = scene.name_direction(found.shape[:, 0])
        lines.append(
            f"NOT A RESULT: the state is unstable ({found.negative} negative eigenvalues; joint {joint} "
            f"gives way in {direction(way)})"
        )
    if found.negative < 0:
        lines.append("NOT A RESULT: rounding hides whether the state is stable: its pivots cannot be counted")
    if not found.complete:
        lines.append("NOT A RESULT: the modes are not proven complete")
    elif not proven(found):
        lines.append("NOT A RESULT: the modes do not satisfy their equation, or are not orthogonal")
    count = found.eigenvalue.size
    if not count:
        none = "no direction is free and has mass: there are no modes"
        return "\n".join([*lines, none if up_to is None else f"no mode up to {up_to:g} Hz"])
    return "\n".join([*lines, *_table(scene, found, fields)])


def _table(scene: Scene, found: eigen.Modes, fields: Mapping[str, Field]) -> list[str]:
    """One line a mode: frequency, effective mass in each direction, most energy, most motion."""
    free = fields["free_mass"].values
    axes = [d for d in range(3) if free[d] > 0]
    head = ["mode", "      Hz", *(f"mass {AXES[d]}" for d in axes), "most energy in", "most motion at"]
    rows = [_row(scene, found, fields, k, axes) for k in range(min(found.eigenvalue.size, MOST_MODES))]
    widths = [max(len(r[c]) for r in [head, *rows]) for c in range(len(head))]
    text = [
        "  ".join(
            v.rjust(w) if c < 2 + len(axes) else v.ljust(w)
            for c, (v, w) in enumerate(zip(r, widths, strict=True))
        )
        for r in [head, *rows]
    ]
    more = found.eigenvalue.size - len(rows)
    taken = fields["effective_mass"].values.sum(axis=0)
    total = ", ".join(f"{AXES[d]} {free[d]:.4g} kg, {100 * taken[d] / free[d]:.0f} % in these" for d in axes)
    rest = [f"... and {more} more modes, in the results file"] if more else []
    return [*(t.rstrip() for t in text), *rest, f"mass free to move: {total}"]


def _row(scene: Scene, found: eigen.Modes, fields: Mapping[str, Field], k: int, axes: list[int]) -> list[str]:
    joint, way = scene.name_direction(found.shape[:, k])
    share, names = fields["kinetic_energy_share"].values[k], fields["group"].values
    mass, free = fields["effective_mass"].values[k], fields["free_mass"].values
    top = int(np.argmax(share))
    unstable = max(found.negative, 0)
    f = fields["frequency"].values[k]
    word = "unstable" if k < unstable else "0" if k < unstable + found.zero else f"{f:.4g}"
    return [
        str(k + 1),
        word,
        *(f"{100 * mass[d] / free[d]:.0f} %" for d in axes),
        f"{names[top]} {100 * share[top]:.0f} %",
        f"{joint} in {direction(way)}",
    ]


def proven(found: eigen.Modes) -> bool:
    """Complete, orthogonal, and solutions of their equation as far as rounding lets one see."""
    allowed = np.maximum(RESIDUAL, 1e3 * found.residual_floor)
    return found.complete and found.orthogonality <= RESIDUAL and bool((found.residual <= allowed).all())


def audit_lines(found: eigen.Modes) -> tuple[str, ...]:
    """Evidence that the modes are right and that none is missing."""
    proof = "complete: " if found.complete else "NOT COMPLETE: "
    return (
        f"{proof}{found.count_below} eigenvalues counted below the last, {found.eigenvalue.size} found",
        f"residual |K x - w2 M x| / |K x| at most {found.residual.max(initial=0.0):.1e}",
        f"orthogonality to {found.orthogonality:.1e}",
    )


def warnings(
    context: Context, rest: Rest, found: eigen.Modes, at_length: NDArray[np.bool_]
) -> tuple[str, ...]:
    """Frequencies that hold only for one sense of motion, or only at zero amplitude."""
    notes = []
    if at_length.any():
        names = chosen(context.member_names, at_length)
        notes.append(f"frequencies hold only for motion that tightens {names}: at the point of going slack")
    slack = rest.scene.structure.can_slack & (rest.axial == 0.0) & ~at_length
    if slack.any():
        notes.append(f"slack members give no stiffness: {chosen(context.member_names, slack)}")
    if found.zero > 0:
        named = [scene_name(rest.scene, found, k) for k in range(min(found.zero, 6))]
        notes.append(
            f"{found.zero} modes at 0 Hz are mechanisms or loose joints ({', '.join(dict.fromkeys(named))}); "
            "one that tightens as it moves has a frequency that grows with its amplitude"
        )
    return tuple(notes)


def scene_name(scene: Scene, found: eigen.Modes, k: int) -> str:
    """The joint that moves most in a zero mode, with its direction."""
    joint, way = scene.name_direction(found.shape[:, max(found.negative, 0) + k])
    return f"{joint} in {direction(way)}"
