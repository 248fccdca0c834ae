"""Load cases times their factors, as arrays: joint forces, movements, lengths and masses."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.structure import Structure
from tautbar.model.parts import Indices, LoadCase, Loading, Parts

Array = NDArray[np.float64]


class Acting(NamedTuple):
    """All that acts in one loading."""

    force: Array  # (3, J) N, weights included
    move: Array  # (3, J) m, of held directions
    take_up: Array  # (N,) m, shortens the unstressed length
    heating: Array  # (N,) expansion x temperature change
    mass: Array  # (J,) kg of the load cases present, once each, whatever their factor

    def between(self, other: Acting, share: float) -> Acting:
        """On the way from this loading to another; masses are the other's."""

        def mixed(a: Array, b: Array) -> Array:
            return np.asarray(a + share * (b - a))

        return Acting(
            mixed(self.force, other.force),
            mixed(self.move, other.move),
            mixed(self.take_up, other.take_up),
            mixed(self.heating, other.heating),
            other.mass,
        )


def nothing(structure: Structure) -> Acting:
    J, N = structure.joints, structure.members
    return Acting(np.zeros((3, J)), np.zeros((3, J)), np.zeros(N), np.zeros(N), np.zeros(J))


def acting(parts: Parts, structure: Structure, loading: Loading) -> Acting:
    """Arrays of a loading: each load case times its factor."""
    total = nothing(structure)
    for name, factor in loading.factors.items():
        if factor != 0.0:
            _add(total, parts.load_cases[name], factor, structure)
    return total


def _add(total: Acting, case: LoadCase, factor: float, s: Structure) -> None:
    for joints, force in case.forces:
        np.add.at(total.force.T, _at(joints), factor * np.array(force))
    for members, q in case.line_loads:
        which = _at(members)
        half = 0.5 * factor * np.outer(s.length[which], q)
        np.add.at(total.force.T, s.start[which], half)
        np.add.at(total.force.T, s.end[which], half)
    for joints, mass in case.masses:
        np.add.at(total.mass, _at(joints), mass)
        np.add.at(total.force.T, _at(joints), factor * mass * s.down)
    if case.self_weight:
        total.force[:] += factor * case.self_weight * own_weight(s)
    for joints, move in case.movements:
        np.add.at(total.move.T, _at(joints), factor * np.array(move))
    for members, length in case.take_up:
        np.add.at(total.take_up, _at(members), factor * length)
    for members, change in case.temperature_change:
        which = _at(members)
        np.add.at(total.heating, which, factor * change * s.expansion[which])


def own_weight(s: Structure) -> Array:
    """Weight of members (by unstressed length, half to each end) and of the model's masses (3, J) [N]."""
    mass = s.joint_mass.copy()
    half = 0.5 * s.m * s.L0
    np.add.at(mass, s.start, half)
    np.add.at(mass, s.end, half)
    return np.outer(s.down, mass)


def _at(indices: Indices) -> NDArray[np.intp]:
    return np.array(indices, dtype=np.intp)
