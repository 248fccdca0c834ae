"""Load cases times their factors, as arrays: forces, loads along members, movements, lengths, masses."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.structure import Structure
from tautbar.model.parts import Indices, LoadCase, Loading, Parts, Wind

Array = NDArray[np.float64]


class Acting(NamedTuple):
    """All that acts in one loading."""

    force: Array  # (3, J) N, half of what is along each member included
    along: Array  # (3, N) N per metre of unstressed length, along each member
    move: Array  # (3, J) m, of held directions
    take_up: Array  # (N,) m, shortens the unstressed length
    heating: Array  # (N,) expansion x temperature change
    mass: Array  # (J,) kg of the load cases present, once each, whatever their factor
    coat: Array  # (N,) kg per metre of unstressed length, ice of the load cases present, likewise

    def between(self, other: Acting, share: float) -> Acting:
        """On the way from this loading to another; masses are the other's."""

        def mixed(a: Array, b: Array) -> Array:
            return np.asarray(a + share * (b - a))

        return Acting(
            mixed(self.force, other.force),
            mixed(self.along, other.along),
            mixed(self.move, other.move),
            mixed(self.take_up, other.take_up),
            mixed(self.heating, other.heating),
            other.mass,
            other.coat,
        )

    def plus(self, other: Acting, factor: float) -> Acting:
        """This loading and a multiple of another; masses of both."""
        return Acting(
            self.force + factor * other.force,
            self.along + factor * other.along,
            self.move + factor * other.move,
            self.take_up + factor * other.take_up,
            self.heating + factor * other.heating,
            self.mass + other.mass,
            self.coat + other.coat,
        )


def nothing(structure: Structure) -> Acting:
    J, N = structure.joints, structure.members
    zero = np.zeros
    return Acting(zero((3, J)), zero((3, N)), zero((3, J)), zero(N), zero(N), zero(J), zero(N))


def acting(parts: Parts, structure: Structure, loading: Loading) -> Acting:
    """Arrays of a loading: each load case times its factor."""
    total = nothing(structure)
    cases = [(parts.load_cases[name], factor) for name, factor in loading.factors.items() if factor != 0.0]
    thickness = np.zeros(structure.members)
    for case, factor in cases:
        _add_to_joints(total, case, factor, structure)
        _add_lengths(total, case, factor, structure)
        _add_along(total, case, factor, structure)
        thickness += _coat(total, case, factor, structure)
    for case, factor in cases:
        for wind in case.wind:
            _blow(total, wind, factor, thickness, structure)
    half = 0.5 * total.along * structure.L0 * structure.present
    np.add.at(total.force.T, structure.start, half.T)
    np.add.at(total.force.T, structure.end, half.T)
    return total


def _add_to_joints(total: Acting, case: LoadCase, factor: float, s: Structure) -> None:
    for joints, force in case.forces:
        np.add.at(total.force.T, _at(joints), factor * np.array(force))
    for joints, mass in case.masses:
        np.add.at(total.mass, _at(joints), mass)
        np.add.at(total.force.T, _at(joints), factor * mass * s.down)
    total.force[:] += factor * case.self_weight * np.outer(s.down, s.joint_mass)
    for joints, move in case.movements:
        np.add.at(total.move.T, _at(joints), factor * np.array(move))


def _add_lengths(total: Acting, case: LoadCase, factor: float, s: Structure) -> None:
    for members, length in case.take_up:
        np.add.at(total.take_up, _at(members), factor * length)
    for members, change in case.temperature_change:
        which = _at(members)
        np.add.at(total.heating, which, factor * change * s.expansion[which])


def _add_along(total: Acting, case: LoadCase, factor: float, s: Structure) -> None:
    """Weight goes by unstressed length, line loads by drawn length."""
    total.along[:] += factor * case.self_weight * np.outer(s.down, s.m)
    for members, q in case.line_loads:
        which = _at(members)
        np.add.at(total.along.T, which, factor * np.outer(s.length[which] / s.L0[which], q))


def _coat(total: Acting, case: LoadCase, factor: float, s: Structure) -> Array:
    """Add weight and mass of ice rings; their thickness on each member [m], (N,)."""
    thickness = np.zeros(s.members)
    for ice in case.ice:
        which = _at(ice.members)
        t = ice.thickness
        per_drawn = ice.density * np.pi * t * (s.width[which] + t)
        mass = per_drawn * s.length[which] / s.L0[which]
        np.add.at(total.coat, which, mass)
        np.add.at(total.along.T, which, factor * np.outer(mass, s.down))
        np.add.at(thickness, which, t)
    return thickness


def _blow(total: Acting, wind: Wind, factor: float, thickness: Array, s: Structure) -> None:
    """Pressure x width x sin^2 of the angle between wind and member, normal to the member.

    The pressure is that of the height of the member's middle, as drawn.
    """
    which = _at(wind.members)
    n = s.r0[:, which] / s.length[which]
    toward = np.array(wind.toward)
    normal = toward[:, None] - (toward @ n) * n  # its size is the sine
    middle = 0.5 * (s.position[:, s.start[which]] + s.position[:, s.end[which]])
    pressure = np.interp(middle[s.up], wind.heights, wind.pressures)
    width = s.width[which] + 2 * thickness[which]
    per_drawn = pressure * width * np.sqrt((normal * normal).sum(axis=0)) * normal
    np.add.at(total.along.T, which, (factor * per_drawn * s.length[which] / s.L0[which]).T)


def _at(indices: Indices) -> NDArray[np.intp]:
    return np.array(indices, dtype=np.intp)
