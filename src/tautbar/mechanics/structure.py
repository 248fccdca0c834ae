"""The structure as arrays: joints, members, what is held. Built once from the parts of a model.

Layout: a vector over joints is (3, J), over members (3, N), component first, so that kernels run
along contiguous memory. Symbols: l drawn length, L0 unstressed length, r from start to end of a member.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics import catenary
from tautbar.model.parts import Hanging, Parts, Section

Array = NDArray[np.float64]
BAR, TIE, STRUT = 0, 1, 2  # positions in `model.parts.KINDS`


@dataclass(frozen=True)
class Structure:
    """Arrays over J joints and N members, SI."""

    position: Array  # (3, J) m, drawn
    start: NDArray[np.intp]  # (N,) joint
    end: NDArray[np.intp]  # (N,)
    kind: NDArray[np.int8]  # (N,) BAR, TIE or STRUT
    r0: Array  # (3, N) m, drawn, start to end
    length: Array  # (N,) m, drawn
    EA: Array  # (N,) N
    L0: Array  # (N,) m, unstressed
    stretch0: Array  # (N,) m, drawn length less L0, free of the cancellation in that difference
    m: Array  # (N,) kg per metre of unstressed length
    expansion: Array  # (N,) 1/K, 0 where not given
    tau: Array  # (N,) s, Kelvin-Voigt retardation time
    joint_mass: Array  # (J,) kg, lumped at joints always
    down: Array  # (3,) m/s2, gravity
    size: float  # m, the largest extent of the drawing

    @property
    def joints(self) -> int:
        return int(self.position.shape[1])

    @property
    def members(self) -> int:
        return self.start.size

    @property
    def can_slack(self) -> NDArray[np.bool_]:
        """Which members carry only one sense of force, (N,)."""
        return np.asarray(self.kind != BAR)


def build(parts: Parts) -> Structure:
    """Arrays of a checked model; hanging members are laid along their curves.

    Raises
    ------
    ValueError
        A hanging member's sag or tension is possible for no length (checked earlier by the model).
    """
    position = np.array([parts.joints.x, parts.joints.y, parts.joints.z], dtype=float).reshape(3, -1)
    m = parts.members
    start, end = (np.array(a, dtype=np.intp) for a in (m.start, m.end))
    given = [np.array(a, dtype=float) for a in (m.pretension, m.unstressed_length, m.slack)]
    section = np.array(m.section, dtype=np.intp)
    down = np.zeros(3)
    down[parts.up] = -parts.gravity
    whole = {h.name: _hang(h, parts.sections[m.section[h.members[0]]], position, down) for h in m.hanging}
    r0 = position[:, end] - position[:, start]
    length = np.sqrt((r0 * r0).sum(axis=0))
    EA, L0, stretch0 = _lengths(parts.sections, section, length, *given)
    for h in m.hanging:
        piece = whole[h.name] / len(h.members)
        L0[h.members.start : h.members.stop] = piece
        stretch0[h.members.start : h.members.stop] = length[h.members.start : h.members.stop] - piece
    return Structure(
        position=position,
        start=start,
        end=end,
        kind=np.array(m.kind, dtype=np.int8),
        r0=r0,
        length=length,
        EA=EA,
        L0=L0,
        stretch0=stretch0,
        m=_of_section(parts.sections, section, "mass_per_length"),
        expansion=_of_section(parts.sections, section, "expansion"),
        tau=_of_section(parts.sections, section, "retardation_time"),
        joint_mass=_joint_mass(parts, start, end, length),
        down=down,
        size=float(np.ptp(position, axis=1).max(initial=0.0)) or 1.0,
    )


def _of_section(sections: tuple[Section, ...], section: NDArray[np.intp], key: str) -> Array:
    values = np.array([getattr(s, key) or 0.0 for s in sections], dtype=float)
    return np.asarray(values[section]) if section.size else np.zeros(0)


def _lengths(
    sections: tuple[Section, ...],
    section: NDArray[np.intp],
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
    stretch = np.where(np.isnan(slack), stretch, -slack)
    stretch = np.where(np.isnan(unstressed), stretch, l - unstressed)
    L0 = np.where(np.isnan(unstressed), l - stretch, unstressed)
    return np.where(by_EA, EA, k * L0), L0, stretch


def _joint_mass(parts: Parts, start: NDArray[np.intp], end: NDArray[np.intp], l: Array) -> Array:
    """Masses of the model at joints [kg], (J,); those along members half to each end."""
    mass = np.zeros(len(parts.joints))
    for given in parts.masses:
        np.add.at(mass, np.array(given.joints, dtype=np.intp), given.mass)
        which = np.array(given.members, dtype=np.intp)
        half = 0.5 * given.per_length * l[which]
        np.add.at(mass, start[which], half)
        np.add.at(mass, end[which], half)
    return mass


def _hang(rope: Hanging, section: Section, position: Array, down: Array) -> float:
    """Lay the joints of a hanging member along its curve in ``position``; return its unstressed length.

    Under its own weight: the exact elastic catenary, the pieces equal parts of its unstressed length.
    A rope without weight, or one already shorter than its chord by more than its weight matters, is
    straight there by the same formula.
    """
    g = float(np.abs(down).max())
    w = (section.mass_per_length or 0.0) * g
    r = position[:, rope.end] - position[:, rope.start]
    chord = float(np.sqrt(r @ r))
    up = -down / g if g > 0 else np.zeros(3)
    z = float(r @ up)
    level = r - z * up
    x = float(np.sqrt(level @ level))
    s = np.arange(1, len(rope.members)) / len(rope.members)
    inner = slice(rope.joints.start, rope.joints.stop)
    if w == 0.0:
        stiff = section.axial_stiffness or (section.stiffness or 0.0) * chord
        L0 = rope_length_without_weight(rope, stiff, chord)
        position[:, inner] = position[:, [rope.start]] + r[:, None] * s
        return L0
    EA = section.axial_stiffness or (section.stiffness or 0.0) * chord
    L0 = _rope_length(rope, EA, w, x, z, chord)
    curve = catenary.points(L0, EA, w, x, z, s * L0)
    across = level / x if x > 0 else np.zeros(3)
    position[:, inner] = position[:, [rope.start]] + across[:, None] * curve[0] + up[:, None] * curve[1]
    return L0


def rope_length_without_weight(rope: Hanging, EA: float, chord: float) -> float:
    """Unstressed length [m] of a hanging member that has no weight; a sag has no meaning then."""
    return {
        "pretension": chord / (1 + rope.value / EA),
        "unstressed_length": rope.value,
        "slack": chord + rope.value,
    }[rope.given]


def _rope_length(rope: Hanging, EA: float, w: float, x: float, z: float, chord: float) -> float:
    if rope.given == "sag":
        return catenary.length_for_sag(rope.value, EA, w, x, z)
    if rope.given == "pretension":
        return catenary.length_for_tension(rope.value, EA, w, x, z)
    return rope.value if rope.given == "unstressed_length" else chord + rope.value
