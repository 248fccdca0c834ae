"""The structure as arrays: joints, members, what is held. Built once from the parts of a model.

Layout: a vector over joints is (3, J), over members (3, N), component first, so that kernels run
along contiguous memory. Symbols: l drawn length, L0 unstressed length, r from start to end of a member.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics import catenary
from tautbar.model.parts import Change, Hanging, Parts, Section

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
BAR, TIE, STRUT, HANGING = 0, 1, 2, 3  # positions in `model.parts.KINDS`


class ImpossibleLength(ValueError):
    """A hanging member that no unstressed length makes hang as it is said to; ``name`` is the member's."""

    def __init__(self, name: str, given: str, value: float, least: float | None = None) -> None:
        self.name, self.given = name, given
        unit = "N" if given == "pretension" else "m"
        what = f"no unstressed length gives a {given} of {value:g} {unit} under its own weight"
        possible = "" if least is None else f": with these ends it is at least {least:.6g} {unit}"
        super().__init__(what + possible)


class Stage(NamedTuple):
    """Which members, supports and masses are there, in the order of the model."""

    members: Flags
    supports: tuple[bool, ...]
    masses: tuple[bool, ...]

    @classmethod
    def first(cls, parts: Parts) -> Stage:
        """All but those that are absent until an analysis takes them in."""
        members = np.ones(len(parts.members), dtype=bool)
        members[list(parts.members.absent)] = False
        return cls(
            members, tuple(not s.absent for s in parts.supports), tuple(not m.absent for m in parts.masses)
        )

    def changed(self, parts: Parts, change: Change) -> Stage:
        """The stage after an analysis took some away and put some in."""
        members = self.members.copy()
        members[list(change.without_members)] = False
        members[list(change.with_members)] = True

        def kept(
            now: tuple[bool, ...], names: list[str], out: tuple[str, ...], into: tuple[str, ...]
        ) -> tuple[bool, ...]:
            return tuple((there or n in into) and n not in out for there, n in zip(now, names, strict=True))

        supports = kept(
            self.supports, [s.name for s in parts.supports], change.without_supports, change.with_supports
        )
        masses = kept(self.masses, [m.name for m in parts.masses], change.without_masses, change.with_masses)
        return Stage(members, supports, masses)

    def without(self, member: int) -> Stage:
        """The stage with one more member lost."""
        members = self.members.copy()
        members[member] = False
        return self._replace(members=members)

    @property
    def key(self) -> tuple[bytes, tuple[bool, ...], tuple[bool, ...]]:
        return self.members.tobytes(), self.supports, self.masses


@dataclass(frozen=True)
class Structure:
    """Arrays over J joints and N members, SI. Members that are not present carry and weigh nothing."""

    position: Array  # (3, J) m, drawn
    start: NDArray[np.intp]  # (N,) joint
    end: NDArray[np.intp]  # (N,)
    kind: NDArray[np.int8]  # (N,) BAR, TIE, STRUT or HANGING
    present: Flags  # (N,)
    r0: Array  # (3, N) m, drawn, start to end
    length: Array  # (N,) m, drawn
    EA: Array  # (N,) N
    L0: Array  # (N,) m, unstressed
    stretch0: Array  # (N,) m, drawn length less L0, free of the cancellation in that difference
    m: Array  # (N,) kg per metre of unstressed length
    width: Array  # (N,) m, for the wind
    expansion: Array  # (N,) 1/K, 0 where not given
    tau: Array  # (N,) s, Kelvin-Voigt retardation time
    joint_mass: Array  # (J,) kg, lumped at joints always
    down: Array  # (3,) m/s2, gravity
    up: int  # axis, also where there is no gravity
    size: float  # m, the largest extent of the drawing

    @property
    def joints(self) -> int:
        return int(self.position.shape[1])

    @property
    def members(self) -> int:
        return self.start.size

    @property
    def can_slack(self) -> Flags:
        """Which members carry only one sense of force and have a straight shape, (N,)."""
        return np.asarray(self.present & ((self.kind == TIE) | (self.kind == STRUT)))

    @property
    def hangs(self) -> Flags:
        """Which members hang as one catenary each, (N,)."""
        return np.asarray(self.present & (self.kind == HANGING))


def build(parts: Parts, stage: Stage) -> Structure:
    """Arrays of a checked model; hanging members in pieces are laid along their curves.

    Raises
    ------
    ImpossibleLength
        A hanging member's sag or tension is possible for no length.
    """
    position = np.array([parts.joints.x, parts.joints.y, parts.joints.z], dtype=float).reshape(3, -1)
    m = parts.members
    start, end = (np.array(a, dtype=np.intp) for a in (m.start, m.end))
    section = np.array(m.section, dtype=np.intp)
    down = np.zeros(3)
    down[parts.up] = -parts.gravity
    for rope in m.hanging:
        _hang(rope, parts.sections[m.section[rope.members[0]]], position, down)
    r0 = position[:, end] - position[:, start]
    length = np.sqrt((r0 * r0).sum(axis=0))
    EA, L0, stretch0 = lengths_as_given(parts, position, down)
    return Structure(
        position=position,
        start=start,
        end=end,
        kind=np.array(m.kind, dtype=np.int8),
        present=stage.members,
        r0=r0,
        length=length,
        EA=EA,
        L0=L0,
        stretch0=stretch0,
        m=_of_section(parts.sections, section, "mass_per_length") * stage.members,
        width=_of_section(parts.sections, section, "wind_width"),
        expansion=_of_section(parts.sections, section, "expansion"),
        tau=_of_section(parts.sections, section, "retardation_time"),
        joint_mass=_joint_mass(parts, stage, start, end, length),
        down=down,
        up=parts.up,
        size=float(np.ptp(position, axis=1).max(initial=0.0)) or 1.0,
    )


def lengths_as_given(
    parts: Parts, position: Array, down: Array, which: Flags | None = None
) -> tuple[Array, Array, Array]:
    """EA [N], L0 [m] and stretch l - L0 [m] as the keys of each member say, for joints at ``position``.

    ``position`` (3, J) [m] is the drawing, or where joints are now for members that are put in later:
    those in ``which`` (N,), the only hanging ones whose lengths are then found.
    """
    m, sections = parts.members, parts.sections
    section = np.array(m.section, dtype=np.intp)
    r = position[:, np.array(m.end, dtype=np.intp)] - position[:, np.array(m.start, dtype=np.intp)]
    l = np.sqrt((r * r).sum(axis=0))
    pretension, unstressed, slack = (
        np.array(a, dtype=float) for a in (m.pretension, m.unstressed_length, m.slack)
    )
    kind = np.array(m.kind, dtype=np.int8)
    straight = np.where(kind == HANGING, np.nan, pretension)
    EA, L0, stretch = _lengths(sections, section, kind, l, straight, unstressed, slack)
    wanted = np.ones(len(m), dtype=bool) if which is None else which
    for i in np.flatnonzero((kind == HANGING) & wanted):
        given, value = ("sag", m.sag[i]) if m.sag[i] == m.sag[i] else ("pretension", m.pretension[i])
        if value == value:
            L0[i], _, EA[i] = _unstressed(m.names[i], given, value, sections[section[i]], r[:, i], down)[:3]
            stretch[i] = l[i] - L0[i]
    for rope in (r for r in m.hanging if wanted[r.members.start]):
        ends = position[:, rope.end] - position[:, rope.start]
        own = sections[section[rope.members[0]]]
        at = slice(rope.members.start, rope.members.stop)
        whole, _, EA[at] = _unstressed(rope.name, rope.given, rope.value, own, ends, down)[:3]
        L0[at] = whole / len(rope.members)
        stretch[at] = l[at] - L0[at]
    return EA, L0, stretch


def _of_section(sections: tuple[Section, ...], section: NDArray[np.intp], key: str) -> Array:
    values = np.array([getattr(s, key) or 0.0 for s in sections], dtype=float)
    return np.asarray(values[section]) if section.size else np.zeros(0)


def _lengths(
    sections: tuple[Section, ...],
    section: NDArray[np.intp],
    kind: NDArray[np.int8],
    l: Array,
    pretension: Array,
    unstressed: Array,
    slack: Array,
) -> tuple[Array, Array, Array]:
    """EA [N], L0 [m] and drawn stretch l - L0 [m] of every member, as its section and its keys say.

    Given EA, a pretension N means L0 = l/(1 + N/EA); given a stiffness k, L0 = l - N/k and EA = k L0.
    """
    EA = _of_section(sections, section, "axial_stiffness")
    k = _of_section(sections, section, "stiffness")
    N = np.nan_to_num(pretension)
    by_EA = EA > 0
    strain = np.divide(N, EA, out=np.zeros_like(N), where=by_EA)
    stretch = np.where(by_EA, l * strain / (1 + strain), np.divide(N, k, out=np.zeros_like(N), where=~by_EA))
    # A strut with slack is too short: it touches after that gap. Any other member is too long by it.
    stretch = np.where(np.isnan(slack), stretch, np.where(kind == STRUT, slack, -slack))
    stretch = np.where(np.isnan(unstressed), stretch, l - unstressed)
    L0 = np.where(np.isnan(unstressed), l - stretch, unstressed)
    return np.where(by_EA, EA, k * L0), L0, stretch


def _joint_mass(
    parts: Parts, stage: Stage, start: NDArray[np.intp], end: NDArray[np.intp], l: Array
) -> Array:
    """Masses of the model at joints [kg], (J,); those along members half to each end."""
    mass = np.zeros(len(parts.joints))
    for given, there in zip(parts.masses, stage.masses, strict=True):
        if there:
            np.add.at(mass, np.array(given.joints, dtype=np.intp), given.mass)
            which = np.array(given.members, dtype=np.intp)
            half = 0.5 * given.per_length * l[which] * stage.members[which]
            np.add.at(mass, start[which], half)
            np.add.at(mass, end[which], half)
    return mass


def _hang(rope: Hanging, section: Section, position: Array, down: Array) -> None:
    """Lay the joints of a hanging member along its curve in ``position``.

    Under its own weight: the exact elastic catenary, the pieces equal parts of its unstressed length.
    A rope without weight is straight.
    """
    r = position[:, rope.end] - position[:, rope.start]
    L0, w, EA, x, z = _unstressed(rope.name, rope.given, rope.value, section, r, down)
    count = len(rope.members)
    inner = slice(rope.joints.start, rope.joints.stop)
    if w == 0.0:
        position[:, inner] = position[:, [rope.start]] + np.outer(r, np.arange(1, count) / count)
        return
    up = -down / np.abs(down).max()
    across = (r - z * up) / x if x > 0 else np.zeros(3)
    along, _, rise = catenary.points(L0, EA, w, x, z, count + 1)[:, 1:-1]
    position[:, inner] = position[:, [rope.start]] + np.outer(across, along) + np.outer(up, rise)


def _unstressed(
    name: str, given: str, value: float, section: Section, r: Array, down: Array
) -> tuple[float, float, float, float, float]:
    """Unstressed length [m] as given, weight [N/m], EA [N], level and vertical distance [m] of the ends."""
    g = float(np.abs(down).max())
    chord = float(np.sqrt(r @ r))
    w = (section.mass_per_length or 0.0) * g
    z = float(-(r @ down) / g) if g > 0 else 0.0
    x = float(np.sqrt(max(chord * chord - z * z, 0.0)))
    L0 = chord
    for _ in range(
        1 if section.axial_stiffness else 4
    ):  # given by its stiffness k, EA = k L0 follows the length
        EA = section.axial_stiffness or (section.stiffness or 0.0) * L0
        L0 = _length(name, given, value, chord, EA, w, x, z)
    return L0, w, section.axial_stiffness or (section.stiffness or 0.0) * L0, x, z


def _length(
    name: str, given: str, value: float, chord: float, EA: float, w: float, x: float, z: float
) -> float:
    """Unstressed length [m] of a rope between ends (x, z) apart, as its key says."""
    if given == "unstressed_length":
        return value
    if given == "slack":
        return chord + value
    if given == "pretension" and w == 0:
        return chord / (1 + value / EA)
    wanted = catenary.length_for_sag if given == "sag" else catenary.length_for_tension
    try:
        return wanted(value, EA, w, x, z)
    except ValueError:
        least = catenary.least_tension(EA, w, x, z)[1] if given == "pretension" else None
        raise ImpossibleLength(name, given, value, least) from None
