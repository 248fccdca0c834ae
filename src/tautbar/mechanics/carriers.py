"""All that carries: straight members as springs, and ropes that hang as catenaries, in one answer.

Each member pulls its ends with a vector (3, N): the axial force along a straight member, the mean
pull of a hanging one. The slope of that vector over the member's own vector is a 3x3 block.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics import hanging, members
from tautbar.mechanics.hanging import Hung, Ropes
from tautbar.mechanics.loads import Acting
from tautbar.mechanics.members import Springs, Stretch
from tautbar.mechanics.structure import Structure

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]


class Carriers(NamedTuple):
    """Members under one loading; ``at`` (R,) are the members that hang, in the order of ``ropes``."""

    springs: Springs
    ropes: Ropes | None = None
    at: NDArray[np.intp] = np.zeros(0, dtype=np.intp)


def carriers(structure: Structure, acting: Acting) -> Carriers:
    """Members under a loading. A hanging member that nothing loads along its length is a tie."""
    sp = members.springs(structure, acting.take_up, acting.heating)
    per_length = acting.along * (structure.L0 / sp.L0)  # what is wound up at an end still weighs
    w = np.sqrt((per_length * per_length).sum(axis=0))
    at = np.flatnonzero(structure.hangs & (w > 0))
    if not at.size:
        return Carriers(sp)
    ropes = Ropes(sp.L0[at], structure.EA[at], w[at], per_length[:, at] / w[at])
    k, two_way = sp.k.copy(), sp.two_way.copy()
    k[at], two_way[at] = 0.0, True
    return Carriers(sp._replace(k=k, two_way=two_way), ropes, at)


class Response(NamedTuple):
    """What the members do in one position of their ends."""

    stretch: Stretch
    axial: Array  # (N,) N, greatest along a hanging one
    pull: Array  # (3, N) N, at the end; minus it at the start
    energy: float  # J
    hung: Hung | None

    @property
    def found(self) -> bool:
        """Whether every rope found its shape."""
        return self.hung is None or bool(self.hung.ok.all())


def respond(carriers: Carriers, du: Array, small: bool = False) -> Response:
    """Forces after the member ends moved apart by ``du`` (3, N) [m]; ``small`` linearises geometry."""
    sp = carriers.springs
    st = members.stretch_linear(sp, du) if small else members.stretch(sp, du)
    axial, energy = members.force(sp, st.e), members.energy(sp, st.e)
    pull = axial * st.n
    if carriers.ropes is None:
        return Response(st, axial, pull, energy, None)
    at = carriers.at
    hung = _hang(carriers.ropes, sp.r0[:, at], du[:, at], small)
    axial[at] = hanging.greatest_tension(carriers.ropes, hung)
    pull[:, at] = hung.pull
    return Response(st, axial, pull, energy + float(hung.energy.sum()), hung)


def _hang(ropes: Ropes, r0: Array, du: Array, small: bool) -> Hung:
    if not small:
        return hanging.hang(ropes, r0 + du)
    drawn = hanging.hang(ropes, r0)
    more = members.block_times(drawn.stiffness, du)
    energy = drawn.energy + ((drawn.pull + 0.5 * more) * du).sum(axis=0)
    return drawn._replace(pull=drawn.pull + more, energy=energy)


def tangent(carriers: Carriers, response: Response, on: Flags, across: Array) -> Array:
    """Blocks (6, N) of all members: springs that are ``on``, with stiffness ``across``, and ropes."""
    blocks = members.tangent(response.stretch.n, carriers.springs.k * on, across)
    if response.hung is not None:
        blocks[:, carriers.at] = response.hung.stiffness
    return blocks
