"""What is understood of a model, in words: what ``tautbar check`` prints."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from typing import TYPE_CHECKING

from tautbar.analyses.job import prepare
from tautbar.mechanics.structure import build
from tautbar.model.parts import AXES, KINDS, Analysis, Parts, Support

if TYPE_CHECKING:
    from tautbar.model import Model

MANY = 12  # rows of a list, after which the rest is only counted


def summarise(model: Model) -> str:
    """What is understood of a model, in words.

    Parameters
    ----------
    model
        A checked model.

    Returns
    -------
    str
        Joints, members by kind, supports, mass, weight, the largest values as understood, loadings,
        analyses and warnings, in lines of ASCII but for the names in the model.

    Raises
    ------
    ModelError
        If the model has a mistake that shows only in its matrices, such as a mechanism in an
        analysis with small geometry.
    """
    prepare(model)
    parts = model.parts
    sections = {
        "joints": [f"{len(parts.joints)}"],
        "members": list(_members(parts)),
        "supports": [_support(support, parts) for support in parts.supports],
        "mass": list(_masses(parts)),
        "understood": model.echo,
        "loadings": list(_loadings(parts)),
        "analyses": [_analysis(analysis) for analysis in parts.analyses],
        "warnings": model.warnings,
    }
    lines = [parts.title or model.name]
    for label, rows in sections.items():
        lines += _labelled(label, rows or ["none"], all_of=label in ("understood", "warnings"))
    return "\n".join([*lines, "No mistakes found."])


def _labelled(label: str, rows: Sequence[str], all_of: bool) -> Iterator[str]:
    """Rows beside a label; of a long list the first ones and how many more there are."""
    if len(rows) > MANY and not all_of:
        rows = [*rows[: MANY - 1], f"and {len(rows) - MANY + 1} more"]
    for row in rows:
        yield f"  {label:<11} {row}"
        label = ""


def _members(parts: Parts) -> Iterator[str]:
    """How many of each kind; pieces of hanging members count as one."""
    pieces = {piece for rope in parts.members.hanging for piece in rope.members}
    kinds = Counter(KINDS[kind] for k, kind in enumerate(parts.members.kind) if k not in pieces)
    hanging = {"hanging": len(parts.members.hanging)} if parts.members.hanging else {}
    counts = {**{kind: kinds[kind] for kind in KINDS if kinds[kind]}, **hanging}
    yield f"{sum(counts.values())}: " + ", ".join(f"{count} {kind}" for kind, count in counts.items())
    for rope in parts.members.hanging:
        yield f"{rope.name} hangs in {len(rope.members)} pieces"


def _support(support: Support, parts: Parts) -> str:
    joints = list(_few(parts.joints.names[joint] for joint in support.joints))
    if support.along is not None:
        how = "along (" + ", ".join(f"{part:g}" for part in support.along) + ")"
    elif support.springs:
        how = "on springs " + ", ".join(f"{AXES[axis]} {k:g} N/m" for axis, k in support.springs)
    else:
        how = "fixed in " + ", ".join(AXES[axis] for axis in support.fixed)
    return f"{', '.join(joints)}: {how}" + (f" ({support.name})" if support.name else "")


def _few(names: Iterable[str]) -> Iterator[str]:
    names = list(names)
    yield from names[:MANY]
    if len(names) > MANY:
        yield f"and {len(names) - MANY} more"


def _masses(parts: Parts) -> Iterator[str]:
    structure = build(parts)
    members = float((structure.m * structure.L0).sum())
    joints = float(structure.joint_mass.sum())
    yield f"{members + joints:.5g} kg ({members:.5g} kg of members, {joints:.5g} kg of masses)"
    yield f"self-weight {parts.gravity * (members + joints):.5g} N, acting against {AXES[parts.up]}"


def _loadings(parts: Parts) -> Iterator[str]:
    for name, loadings in parts.loadings.items():
        if name in parts.load_cases:
            yield name
        elif len(loadings) == 1:
            yield f"{name} = {loadings[0].acting}"
        else:
            yield f"{name}: {len(loadings)} loadings"


def _analysis(analysis: Analysis) -> str:
    start = analysis.start
    if start is None:
        return f"{analysis.name} ({analysis.kind})"
    return f"{analysis.name} ({analysis.kind}, from {'the drawing' if start.as_drawn else start.analysis})"
