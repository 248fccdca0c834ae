"""Warnings: what a model may say but probably does not mean. The run goes on."""

from __future__ import annotations

from array import array
from collections import Counter, defaultdict
from collections.abc import Iterator, Mapping

from tautbar.model.loadings import joined
from tautbar.model.mistakes import several
from tautbar.model.parts import (
    AXES,
    KINDS,
    Analysis,
    Buckling,
    EquilibriumPath,
    FormFinding,
    History,
    Loading,
    Modes,
    Parts,
)
from tautbar.model.plausible import implausible
from tautbar.model.presence import presences
from tautbar.model.proportion import total_mass
from tautbar.model.soundness import has_mass

_STRAIGHT = 1e-3  # rad: two bars that turn by less are drawn as one line
_FORCE_SHARE = 0.05  # of the weight: forces above it should probably be masses


def warnings_of(parts: Parts, lengths: array[float]) -> tuple[str, ...]:
    """All warnings about a model."""
    return (
        *_hinges(parts),
        *_doubled(parts),
        *_held_both_ways(parts),
        *_never_there(parts),
        *_loads_on_nothing(parts),
        *_weightless(parts),
        *_forces_without_mass(parts, lengths),
        *_unused(parts),
        *implausible(parts, lengths),
    )


def _hinges(parts: Parts) -> Iterator[str]:
    """Joints with exactly two bars in one line: a real bar there would bend, not fold."""
    m = parts.members
    at = _members_of_pairs(parts)
    held = {j for s in parts.supports for j in s.joints}
    bar = KINDS.index("bar")
    found = []
    for joint, members in at.items():
        if joint not in held and all(m.kind[i] == bar for i in members):
            ends = [m.end[i] if m.start[i] == joint else m.start[i] for i in members]
            if _in_line(parts, joint, ends[0], ends[1]):
                found.append(parts.joints.names[joint])
    if found:
        yield (
            f"joints {several(found)}: a hinge in a line of bars; bending of a continuous bar is not "
            "modelled, so nothing but tension holds such a joint sideways"
        )


def _members_of_pairs(parts: Parts) -> dict[int, list[int]]:
    """The two members of each joint that has exactly two."""
    m = parts.members
    number = Counter(m.start)
    number.update(m.end)
    at: dict[int, list[int]] = {joint: [] for joint, n in number.items() if n == 2}
    for column in (m.start, m.end):
        for i, joint in enumerate(column):
            if joint in at:
                at[joint].append(i)
    return at


def _in_line(parts: Parts, joint: int, first: int, second: int) -> bool:
    if first == second:
        return False
    j = parts.joints
    a, b = ([c[other] - c[joint] for c in (j.x, j.y, j.z)] for other in (first, second))
    cross = (a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0])
    sizes = sum(v * v for v in a) * sum(v * v for v in b)
    opposite = sum(p * q for p, q in zip(a, b, strict=True)) < 0
    return opposite and sum(v * v for v in cross) < _STRAIGHT**2 * sizes


def _doubled(parts: Parts) -> Iterator[str]:
    """Members given twice between the same joints, unless one comes only later."""
    seen: dict[tuple[int, int], int] = {}
    m = parts.members
    pairs, absent = [], set(m.absent)
    for i, (start, end) in enumerate(zip(m.start, m.end, strict=True)):
        if i in absent:
            continue
        other = seen.setdefault((start, end) if start < end else (end, start), i)
        if other != i:
            pairs.append(f"{m.names[other]}' and '{m.names[i]}")
    if pairs:
        yield f"members {several(pairs)} join the same two joints: is one of each pair too many?"


def _held_both_ways(parts: Parts) -> Iterator[str]:
    """A support that only pushes, at a joint that another one holds along that axis."""
    there = [s for s in parts.supports if not s.absent]
    for pushing in there:
        for other in there:
            both = [parts.joints.names[j] for j in pushing.joints if j in other.joints]
            if pushing.only_pushes is not None and pushing.only_pushes in other.fixed and both:
                yield (
                    f"joints {several(both)}: support '{other.name}' holds {AXES[pushing.only_pushes]} both "
                    f"ways, so '{pushing.name}' never lets go"
                )


def _never_there(parts: Parts) -> Iterator[str]:
    """What is declared absent, and never put in."""
    changes = [analysis.change for analysis in parts.analyses]
    put_in = {i for change in changes for i in change.with_members}
    names = [parts.members.names[i] for i in parts.members.absent if i not in put_in]
    supports = {name for change in changes for name in change.with_supports}
    names += [s.name for s in parts.supports if s.absent and s.name not in supports]
    masses = {name for change in changes for name in change.with_masses}
    names += [m.name for m in parts.masses if m.absent and m.name not in masses]
    if names and changes:
        yield f"{several(names)}: declared absent, and no analysis puts them in"


def _loads_on_nothing(parts: Parts) -> Iterator[str]:
    """Forces and masses at joints whose members are not there: the ground takes them."""
    m, presence = parts.members, presences(parts)
    for analysis in parts.analyses:
        absent = presence[analysis.name].members
        if not absent:
            continue
        there = {j for i in range(len(m)) if i not in absent for j in (m.start[i], m.end[i])}
        for case in dict.fromkeys(c for loading in _named_in(analysis) for c in loading.factors):
            loads = parts.load_cases[case]
            at = [j for joints, _ in (*loads.forces, *loads.masses) for j in joints if j not in there]
            names = [parts.joints.names[j] for j in dict.fromkeys(at)]
            if names:
                what = f"analysis '{analysis.name}': load case '{case}' acts on joints {several(names)}"
                yield f"{what}, which no member goes to there: those loads are lost"


def _weightless(parts: Parts) -> Iterator[str]:
    """Loadings without self-weight, where there is weight."""
    if not has_mass(parts) or not parts.gravity:
        return
    for analysis in parts.analyses:
        if isinstance(analysis, FormFinding):  # nets are often shaped without their weight
            continue
        lacking = [
            loading.name
            for loading in _loads_of(analysis) or ()
            if not any(f * parts.load_cases[case].self_weight for case, f in loading.factors.items())
        ]
        if lacking:
            where = f"analysis '{analysis.name}'"
            yield f"{where}: no self-weight acts in {several(lacking)}, though there is mass"


def _loads_of(analysis: Analysis) -> tuple[Loading, ...] | None:
    """What acts together in an analysis; None where it is what its start state carries."""
    if isinstance(analysis, Modes):
        return None
    if isinstance(analysis, EquilibriumPath | Buckling):
        return (joined(analysis.loads.name, analysis.constant, analysis.loads),)
    return (analysis.loads,) if isinstance(analysis, FormFinding) else analysis.loads


def _named_in(analysis: Analysis) -> tuple[Loading, ...]:
    """The loadings that an analysis names, each by itself."""
    if isinstance(analysis, EquilibriumPath | Buckling):
        return (analysis.loads,) if analysis.constant is None else (analysis.loads, analysis.constant)
    return _loads_of(analysis) or ()


def _forces_without_mass(parts: Parts, lengths: array[float]) -> Iterator[str]:
    """Downward forces that stand for things with mass, in an analysis where only mass moves."""
    by_name: dict[str, Analysis] = {a.name: a for a in parts.analyses}
    for analysis in parts.analyses:
        if not isinstance(analysis, Modes | History):
            continue
        for loading in acting_loads(analysis, by_name):
            weight = total_mass(parts, lengths) * parts.gravity
            down = _force_down(parts, lengths, loading)
            if weight and down > _FORCE_SHARE * weight:
                yield (
                    f"analysis '{analysis.name}': forces downward of {down / 1e3:.4g} kN act where no mass "
                    f"is given, {down / weight:.0%} of the weight; forces have no inertia: "
                    "give what hangs there as `masses`"
                )


def acting_loads(analysis: Analysis, by_name: Mapping[str, Analysis]) -> tuple[Loading, ...]:
    """What acts in an analysis: its own loads, else those its start state carries."""
    own = _loads_of(analysis)
    if own is not None:
        return own
    start = analysis.start
    if start is None or start.as_drawn:
        return ()
    inherited = acting_loads(by_name[start.analysis], by_name)
    chosen = (start.loads or "").split(", without ")[0]
    return tuple(loading for loading in inherited if chosen in ("", loading.name))


def _force_down(parts: Parts, lengths: array[float], loading: Loading) -> float:
    """Sum of downward forces at joints, and along members, that have no mass of their own, N."""
    cases = parts.load_cases
    heavy_joints = {j for mass in parts.masses for j in mass.joints}
    heavy_joints |= {j for case in cases.values() for joints, _ in case.masses for j in joints}
    heavy_members = {i for mass in parts.masses for i in mass.members}
    down: dict[int, float] = defaultdict(float)
    along = 0.0
    for name, factor in loading.factors.items():
        for joints, force in cases[name].forces:
            for joint in joints:
                down[joint] -= factor * force[parts.up]
        for members, per_length in cases[name].line_loads:
            loaded = sum(lengths[i] for i in members if i not in heavy_members)
            along -= factor * per_length[parts.up] * loaded
    at_joints = sum(force for joint, force in down.items() if force > 0 and joint not in heavy_joints)
    return at_joints + max(along, 0.0)


def _unused(parts: Parts) -> Iterator[str]:
    """Load cases and combinations that no analysis uses; a model without analyses may wait."""
    if not parts.analyses:
        return
    loadings = [loading for a in parts.analyses for loading in _named_in(a)]
    names = {loading.name for loading in loadings}
    cases = {case for loading in loadings for case in loading.factors}
    for name, several_of in parts.loadings.items():
        if name in parts.load_cases:
            if name not in cases:
                yield f"load case '{name}' is used by no analysis"
        elif not any(loading.name in names for loading in several_of):
            yield f"combination '{name}' is used by no analysis"
