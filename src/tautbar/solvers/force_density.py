"""Shapes by force densities: with q = N/l given, balance is linear in the positions.

Sources: K. Linkwitz and H.-J. Schek, Ing.-Archiv 40 (1971) 145-158; H.-J. Schek, Comput. Methods Appl.
Mech. Eng. 3 (1974) 115-134 (from memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.null import null_vectors
from tautbar.solvers.potential import Potential
from tautbar.solvers.system import System

Array = NDArray[np.float64]
Index = NDArray[np.intp]
SETTLED = 1e-14  # relative change of the lengths between two rounds
MOST_ROUNDS = 200
OUTGROWN = 100.0  # of the model's size: a member this long is no shape but a fall


@dataclass(frozen=True)
class Shape:
    """A shape in balance under its force densities."""

    q: Array  # (n,) m, free unknowns from the drawing
    length: Array  # (N,) m
    force: Array  # (N,) N
    L0: Array  # (N,) m, unstressed
    rounds: int


class NoShape(ValueError):
    """No shape: ``free`` (n, k) are directions that the force densities do not hold, where they are why.

    ``vanishing`` (N,) are members whose compression would leave them no length.
    """

    def __init__(self, why: str, free: Array | None = None, vanishing: Index | None = None) -> None:
        super().__init__(why)
        self.free, self.vanishing = free, vanishing


def find_shape(
    system: System,
    density: Array,
    potential: Callable[[Array], Potential],
    lengths: Callable[[Array, Array], Array],
) -> Shape:
    """Positions in which force densities and loads balance.

    The matrix is factored once; loads that follow the unstressed lengths (weight) are found again for
    the lengths of each round until these stand still.

    Parameters
    ----------
    density : (N,) N/m
        Axial force over length, tension positive; zero for members that are not there.
    potential : function of L0 (N,) [m]
        What acts for these lengths: its ``force`` and ``held`` are used.
    lengths : function of l (N,) [m] and N (N,) [N]
        The unstressed lengths that carry these forces at these lengths.

    Raises
    ------
    NoShape
        The force densities leave a direction free, or the rounds do not settle.
    """
    s = system.structure
    zero = np.zeros_like(density)
    K = system.member_lower(np.stack([density, density, density, zero, zero, zero])) + system.spring_lower
    factor = system.solver.symmetric(K)
    if factor.zero:
        free = null_vectors(K, system.pattern, min(factor.zero, 6), float(np.abs(K).max(initial=0.0)))
        raise NoShape("the net is singular", free)
    L0 = s.L0
    for rounds in range(1, MOST_ROUNDS + 1):
        now = potential(L0)
        q = factor.solve(now.force - system.freedom.pull(density * (s.r0 + now.held)))
        r = s.r0 + system.apart(q, now.held)
        l = np.sqrt((r * r).sum(axis=0))
        new = lengths(l, density * l)
        if not (new[s.present] > 0).all():
            raise NoShape("a member vanishes", vanishing=np.flatnonzero(s.present & ~(new > 0)))
        change = float(np.abs((new - L0)[s.present] / new[s.present]).max(initial=0.0))
        L0 = np.where(s.present, new, s.L0)
        if change <= SETTLED or (rounds > 1 and np.array_equal(now.force, potential(L0).force)):
            return Shape(q, l, density * l, L0, rounds)
        if not np.isfinite(change) or l.max() > OUTGROWN * s.size:
            break
    raise NoShape("the rounds for the weight do not settle")
