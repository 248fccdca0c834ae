"""A modal analysis in sentences."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra import eigen
from tautbar.analyses.context import Context, Rest
from tautbar.analyses.words import chosen, direction
from tautbar.model.parts import AXES
from tautbar.records.fields import Field

MOST_MODES = 20


def outcome(context: Context, found: eigen.Modes, fields: Mapping[str, Field]) -> str:
    """The frequencies, each with what moves; failures first."""
    lines = []
    if found.negative:
        joint, way = context.name_direction(found.shape[:, 0])
        lines.append(
            f"NOT A RESULT: the state is unstable ({found.negative} negative eigenvalues; joint {joint} "
            f"gives way in {direction(way)})"
        )
    if not found.complete:
        lines.append("NOT A RESULT: the modes are not proven complete")
    frequency = fields["frequency"].values
    for k in range(min(frequency.size, MOST_MODES)):
        lines.append(_mode_line(context, found, fields, k))
    if frequency.size > MOST_MODES:
        lines.append(f"... and {frequency.size - MOST_MODES} more, in the results file")
    return "\n".join(lines) or "no direction is free and has mass: there are no modes"


def _mode_line(context: Context, found: eigen.Modes, fields: Mapping[str, Field], k: int) -> str:
    joint, way = context.name_direction(found.shape[:, k])
    share = fields["kinetic_energy_share"].values[k]
    names = fields["group"].values
    top = int(np.argmax(share))
    mass = fields["effective_mass"].values[k]
    free = fields["free_mass"].values
    of_mass = ", ".join(f"{a} {100 * m / t:.0f} %" for a, m, t in zip(AXES, mass, free, strict=True) if t > 0)
    f = fields["frequency"].values[k]
    if k < found.negative:
        return f"mode {k + 1}: unstable; joint {joint} in {direction(way)}"
    head = f"mode {k + 1}: {f:.4g} Hz"
    if k < found.negative + found.zero:
        head = f"mode {k + 1}: 0 Hz, nothing holds joint {joint} in {direction(way)}"
    return (
        f"{head}; most motion at {joint} in {direction(way)}; {100 * share[top]:.0f} % of the energy in "
        f"{names[top]}; effective mass {of_mass}"
    )


def audit_lines(found: eigen.Modes) -> tuple[str, ...]:
    """Evidence that the modes are right and that none is missing."""
    n = found.eigenvalue.size
    proof = "complete: " if found.complete else "NOT COMPLETE: "
    return (
        f"{proof}{found.count_below} eigenvalues counted below the last, {n} found",
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
    slack = context.system.structure.can_slack & (rest.axial == 0.0) & ~at_length
    if slack.any():
        notes.append(f"slack members give no stiffness: {chosen(context.member_names, slack)}")
    if found.zero:
        notes.append(
            f"{found.zero} modes at 0 Hz are mechanisms or loose joints; one that tightens as it moves "
            "has a frequency that grows with its amplitude"
        )
    return tuple(notes)
