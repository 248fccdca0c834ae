"""What is understood of a model, in words: what ``tautbar check`` prints."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Iterator, Sequence
from typing import TYPE_CHECKING

from tautbar.analyses.count_words import count_lines, stiffened
from tautbar.analyses.job import Job, prepare
from tautbar.analyses.words import listed
from tautbar.mechanics.loads import acting
from tautbar.mechanics.structure import Stage, build
from tautbar.model.echo import quantity_text
from tautbar.model.parts import AXES, KINDS, Analysis, Change, Loading, Parts, Support

if TYPE_CHECKING:
    from tautbar.model import Model

MANY = 12  # rows of a list, after which the rest is only counted
WARNED = 3  # mechanisms that are warned of one by one, being named already
ALL_OF = ("statics", "understood", "warnings")


def summarise(model: Model) -> str:
    """What is understood of a model, in words.

    Parameters
    ----------
    model
        A checked model.

    Returns
    -------
    str
        Joints, members by kind, supports, mass, weight, the statical count, the largest values
        as understood, loadings, analyses and warnings, in lines of ASCII but for the names in the model.

    Raises
    ------
    ModelError
        If the model has a mistake that shows only in its matrices, such as a mechanism in an
        analysis with small geometry.
    """
    job, parts = prepare(model), model.parts
    sections = {
        "joints": list(_joints(parts)),
        "members": list(_members(parts)),
        "supports": [_support(support, parts) for support in parts.supports],
        "mass": list(_masses(parts)),
        "statics": count_lines(job.count, parts),
        "understood": model.echo,
        "loadings": list(_loadings(parts)),
        "analyses": [_analysis(analysis, parts) for analysis in parts.analyses],
        "warnings": (*model.warnings, *_warnings(job, parts)),
    }
    lines = [parts.title or model.name]
    for label, rows in sections.items():
        lines += _labelled(label, rows or ["none"], all_of=label in ALL_OF)
    return "\n".join([*lines, "No mistakes found."])


def _labelled(label: str, rows: Sequence[str], all_of: bool) -> Iterator[str]:
    """Rows beside a label; of a long list the first ones and how many more there are."""
    if len(rows) > MANY and not all_of:
        rows = [*rows[: MANY - 1], f"and {len(rows) - MANY + 1} more"]
    for row in rows:
        yield f"  {label:<11} {row}"
        label = ""


def _joints(parts: Parts) -> Iterator[str]:
    between = sum(len(rope.joints) for rope in parts.members.hanging)
    yield f"{len(parts.joints)}" + (f", {between} of them between pieces of ropes" if between else "")


def _members(parts: Parts) -> Iterator[str]:
    """How many of each kind, how ropes hang, and who comes later; a rope in pieces is one member."""
    m = parts.members
    pieces = {piece for rope in m.hanging for piece in rope.members}
    kinds = Counter(KINDS[kind] for k, kind in enumerate(m.kind) if k not in pieces)
    kinds["hanging"] += len(m.hanging)
    counts = {kind: kinds[kind] for kind in KINDS if kinds[kind]}
    yield f"{sum(counts.values())}: " + ", ".join(f"{count} {kind}" for kind, count in counts.items())
    ropes = defaultdict(list)
    for k, kind in enumerate(m.kind):
        if KINDS[kind] == "hanging":
            ropes["hanging as one curve"].append(m.names[k])
    for rope in m.hanging:
        ropes[f"hanging in {len(rope.members)} pieces"].append(rope.name)
    yield from (f"{how}: {listed(names, MANY)}" for how, names in ropes.items())
    if m.absent:
        yield f"absent at first: {listed(_named(m.absent, parts), MANY)}"


def _named(members: Iterable[int], parts: Parts) -> list[str]:
    """Names of members, of the pieces of a rope its name."""
    ropes = {piece: rope.name for rope in parts.members.hanging for piece in rope.members}
    return list(dict.fromkeys(ropes.get(k, parts.members.names[k]) for k in members))


def _support(support: Support, parts: Parts) -> str:
    joints = list(_few(parts.joints.names[joint] for joint in support.joints))
    how = []
    if support.fixed:
        how.append("fixed in " + ", ".join(AXES[axis] for axis in support.fixed))
    if support.along is not None:
        how.append("fixed along (" + ", ".join(f"{part:g}" for part in support.along) + ")")
    if support.springs:
        springs = (f"{AXES[axis]} {quantity_text(k, 'N/m')}" for axis, k in support.springs)
        how.append("on springs " + ", ".join(springs))
    if support.only_pushes is not None:
        how.append(f"only pushed up in {AXES[support.only_pushes]}, free to lift off")
    notes = [support.name] * bool(support.name) + ["absent at first"] * support.absent
    return f"{', '.join(joints)}: {'; '.join(how)}" + (f" ({', '.join(notes)})" if notes else "")


def _few(names: Iterable[str]) -> Iterator[str]:
    names = list(names)
    yield from names[:MANY]
    if len(names) > MANY:
        yield f"and {len(names) - MANY} more"


def _masses(parts: Parts) -> Iterator[str]:
    """Mass of the structure and its weight, then what load cases bring, and what comes later."""
    structure = build(parts, Stage.first(parts))
    members = float((structure.m * structure.L0).sum())
    joints = float(structure.joint_mass.sum())
    yield f"{members + joints:.5g} kg ({members:.5g} kg of members, {joints:.5g} kg of masses)"
    yield f"self-weight {parts.gravity * (members + joints):.5g} N, acting against {AXES[parts.up]}"
    brought = {}
    for name in parts.load_cases:
        case = acting(parts, structure, Loading(name, {name: 1.0}))
        brought[name] = float(case.mass.sum() + (case.coat * structure.L0).sum())
    told = [f"{name} {mass:.5g} kg" for name, mass in brought.items() if mass]
    if told:
        yield f"more where load cases act, once whatever their factor: {', '.join(_few(told))}"
    later = [mass.name for mass in parts.masses if mass.absent]
    if later:
        yield f"absent at first: {', '.join(_few(later))}"


def _loadings(parts: Parts) -> Iterator[str]:
    for name, loadings in parts.loadings.items():
        if name in parts.load_cases:
            yield name
        elif len(loadings) == 1:
            yield f"{name} = {loadings[0].acting}"
        else:
            yield f"{name}: {len(loadings)} loadings"


def _analysis(analysis: Analysis, parts: Parts) -> str:
    start, told = analysis.start, [analysis.kind]
    if start is not None:
        told.append(f"from {'the drawing' if start.as_drawn else start.analysis}")
    told += _stages(analysis.change, parts)
    pieces = getattr(analysis, "pieces", None)
    if pieces:
        told.append(f"hanging members in {pieces} pieces")
    return f"{analysis.name} ({', '.join(told)})"


def _stages(change: Change, parts: Parts) -> Iterator[str]:
    """Who goes and who comes."""
    for word, members, others in (
        ("without", change.without_members, (*change.without_supports, *change.without_masses)),
        ("with", change.with_members, (*change.with_supports, *change.with_masses)),
    ):
        names = [*_named(members, parts), *others]
        if names:
            yield f"{word} {listed(names)}"


def _warnings(job: Job, parts: Parts) -> Iterator[str]:
    """Warnings of the count; many mechanisms are named under it, so that they are only counted."""
    if job.count.mechanisms <= WARNED:
        yield from job.warnings
        return
    overall = stiffened(job.count, job.count.stiffening.overall, parts).replace("stiffens it", "stiffens all")
    yield f"{job.count.mechanisms} mechanisms that no member resists (see statics): {overall}"
    yield from (w for w in job.warnings if "mechanism" not in w)
