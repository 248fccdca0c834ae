"""Is an equilibrium stable? Pivots counted; saddles left both ways; loose directions told apart."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.eigen import lowest_modes
from tautbar.algebra.null import null_vectors
from tautbar.algebra.solver import NotPositiveDefinite
from tautbar.mechanics import members
from tautbar.solvers.equilibrium import Descent, descend
from tautbar.solvers.potential import Look, Potential

Array = NDArray[np.float64]
SMALL_MOVE = 0.1  # of the model's size: a state this near a saddle is the structure's own answer
MOST_PROBES = 6


@dataclass(frozen=True)
class Pivots:
    """Signs of the tangent's pivots. ``one_sided``: ties at the point of going slack hold it up."""

    negative: int
    zero: int
    one_sided: bool


@dataclass(frozen=True)
class Neighbour:
    """A stable state found on one side of a saddle."""

    descent: Descent
    energy_below: float  # J, under the saddle's
    move: float  # m, farthest joint from the saddle


@dataclass(frozen=True)
class FreeDirection:
    """A direction (n,) in which the tangent offers no resistance, and what a probe found there.

    ``nature`` is "loose" (energy unchanged), "held by second order" or "unstable".
    """

    vector: Array
    nature: str


def count_pivots(potential: Potential, look: Look) -> Pivots:
    """Pivots of the tangent, ties exactly at their length taken as taut; then without those ties."""
    sp, e = potential.springs, look.stretch.e
    on, firm = members.taut(sp, e), members.firmly_taut(sp, e)
    negative, zero = _signs(potential, potential.curvature(look, on))
    if (on == firm).all():
        return Pivots(negative, zero, False)
    without = sum(_signs(potential, potential.curvature(look, firm)))
    return Pivots(negative, zero, without > negative + zero)


def _signs(potential: Potential, K: Array) -> tuple[int, int]:
    """Negative and zero pivots; a Cholesky factor that exists is the quicker proof that there are none."""
    try:
        potential.system.solver.cholesky(K)
    except NotPositiveDefinite:
        factor = potential.system.solver.symmetric(K)
        return factor.negative, factor.zero
    return 0, 0


def leave_saddle(potential: Potential, look: Look, tolerance: float) -> list[Neighbour]:
    """Stable states on both sides of a saddle, along its lowest modes; nearest first.

    Behind a saddle may lie another, with fewer negative pivots; goes down all of them on either side.
    """
    deep = 5 + count_pivots(potential, look).negative
    found: list[Neighbour] = []
    for sense in (1.0, -1.0):
        here, work = look, 0
        for _ in range(deep):
            down = _fall(potential, here, sense, tolerance)
            if down is None or not down.converged:
                break
            here, work = down.look, work + down.factorisations
            if count_pivots(potential, here).negative == 0:
                move = potential.system.greatest_joint_move(here.q - look.q)
                found.append(Neighbour(down.after(work), look.energy - here.energy, move))
                break
    return sorted(found, key=lambda n: n.move)


def falls_away(potential: Potential, look: Look) -> bool:
    """Does the energy fall along the lowest mode, to either side?"""
    return any(_down_the_mode(potential, look, sense) is not None for sense in (1.0, -1.0))


def _fall(potential: Potential, look: Look, sense: float, tolerance: float) -> Descent | None:
    """Go along the lowest mode while the energy falls, then descend from the lowest point."""
    best = _down_the_mode(potential, look, sense)
    if best is None:
        return None
    # Short steps: the answer wanted is the nearest valley, not the deepest.
    down = descend(potential, best.q, tolerance, cap=0.02, limit=300)
    return down if down.look.energy < look.energy else None


def _down_the_mode(potential: Potential, look: Look, sense: float) -> Look | None:
    """The lowest point along the lowest mode before the energy rises; None where it rises at once."""
    firm = members.firmly_taut(potential.springs, look.stretch.e)
    z = softest(potential, potential.curvature(look, firm))
    z = sense * z / potential.system.greatest_joint_move(z)
    size = potential.system.structure.size
    enough = look.energy - 1e-13 * max(abs(look.energy), look.strain_energy)  # a fall beyond rounding
    # A rod may catch after a tenth of a millimetre, or of a micron where it is cut to its place.
    reach = 1e-6 * size
    best = potential.look(look.q + reach * z)
    while best.energy >= enough and reach > 1e-9 * size:
        reach *= 0.1
        best = potential.look(look.q + reach * z)
    if best.energy >= enough:
        return None
    while reach < 2 * size:
        reach *= 2
        tried = potential.look(look.q + reach * z)
        if tried.energy >= best.energy:
            break
        best = tried
    return best


def softest(potential: Potential, K: Array) -> Array:
    """The direction (n,) of least stiffness of a tangent (lower data)."""
    pattern = potential.system.pattern
    unit = np.zeros(pattern.nnz)
    unit[pattern.diagonal] = 1.0
    return np.asarray(lowest_modes(K, unit, pattern, count=1).shape[:, 0])


def probe_zero_pivots(potential: Potential, look: Look, count: int, tolerance: float) -> list[FreeDirection]:
    """What happens along the directions that the tangent leaves free, at most `MOST_PROBES` of them."""
    K, pattern = potential.curvature(look), potential.system.pattern
    vectors = null_vectors(K, pattern, min(count, MOST_PROBES), float(np.abs(K).max(initial=0.0)))
    return [FreeDirection(z, _nature(potential, look, z, tolerance)) for z in vectors.T]


def _nature(potential: Potential, look: Look, z: Array, tolerance: float) -> str:
    """Move to both sides by a thousandth of the size, find balance again, and compare."""
    away = 1e-3 * potential.system.structure.size
    z = away * z / potential.system.greatest_joint_move(z)
    rounding = 1e-9 * max(look.strain_energy, away * potential.scale(look))
    stayed = []
    for side in (z, -z):
        down = descend(potential, look.q + side, tolerance, cap=0.02, limit=60)
        if down.look.energy < look.energy - rounding:
            return "unstable"
        level = down.look.energy <= look.energy + rounding
        moved = potential.system.greatest_joint_move(down.q - look.q)
        stayed.append(level and moved > 0.3 * away)
    return "loose" if any(stayed) else "held by second order"
