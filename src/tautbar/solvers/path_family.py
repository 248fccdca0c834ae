"""The balance of a structure over a load factor, with one fixed set of members that carry.

With the set fixed (the *active set*) the forces are smooth in the joint positions: a tie of the set is
followed through e = 0 as if it could push, one outside it carries nothing. Where the sign of e no
longer agrees with the set, the path has to change over to another set.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import Singular, SymmetricFactor
from tautbar.mechanics import members
from tautbar.mechanics.structure import STRUT
from tautbar.solvers.potential import Look, Potential
from tautbar.solvers.system import System

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
NUDGE = 1e-10  # of the largest stiffness, added to the diagonal where a matrix has no inverse
SPAN = 1e-4  # of the load factor (or of one), for differences over it


@dataclass(frozen=True)
class Family:
    """Potentials by load factor.

    ``force_rate`` (n,) [N] is how the joint forces grow with the factor where nothing else does, else
    None: movements, lengths and loads along hanging ropes enter by central differences.
    """

    system: System
    at: Callable[[float], Potential]
    force_rate: Array | None

    @property
    def switchable(self) -> Flags:
        """Members (N,) that carry one sense of force only."""
        return self.system.structure.can_slack

    @property
    def sense(self) -> Array:
        """+1, or -1 for members that only push, (N,)."""
        return np.where(self.system.structure.kind == STRUT, -1.0, 1.0)

    def fixed(self, factor: float, on: Flags) -> Potential:
        """The potential at a load factor with the members ``on`` (N,) carrying, whatever their sign."""
        potential = self.at(factor)
        springs = potential.springs
        held = self.switchable
        smooth = springs._replace(k=np.where(held & ~on, 0.0, springs.k), two_way=springs.two_way | held)
        return replace(potential, carriers=potential.carriers._replace(springs=smooth))

    def carrying(self, q: Array, factor: float) -> Flags:
        """Members (N,) whose elongation lets them carry, those just at their length included."""
        potential = self.at(factor)
        return members.taut(potential.springs, potential.look(q).stretch.e) & self.switchable

    def load_rate(self, q: Array, factor: float, on: Flags) -> Array:
        """Slope of the residual over the load factor (n,) [N]."""
        if self.force_rate is not None:
            return self.force_rate
        up, down, span = self._beside(q, factor, on)
        return (up.residual - down.residual) / (2 * span)

    def stretch_rate(self, q: Array, factor: float, on: Flags) -> Array:
        """Slope of the elongations over the load factor (N,) [m], joints where they are."""
        if self.force_rate is not None:
            return np.zeros(on.size)
        up, down, span = self._beside(q, factor, on)
        return (up.stretch.e - down.stretch.e) / (2 * span)

    def _beside(self, q: Array, factor: float, on: Flags) -> tuple[Look, Look, float]:
        span = SPAN * max(1.0, abs(factor))
        up, down = (self.fixed(factor + d, on).look(q) for d in (span, -span))
        return up, down, span


@dataclass(frozen=True)
class Factorised:
    """A tangent with its factor, nudged by ``shift`` [N/m] on the diagonal where it is singular."""

    lower: Array
    factor: SymmetricFactor
    shift: float
    negative: int
    zero: int

    def solve(self, b: Array) -> Array:
        return self.factor.solve(b)


def factorise(system: System, lower: Array) -> Factorised:
    """Factor of a tangent, singular or not; the counts are those of the matrix as it is."""
    factor = system.solver.symmetric(lower)
    if not factor.zero:
        return Factorised(lower, factor, 0.0, factor.negative, 0)
    shift = NUDGE * float(np.abs(lower).max(initial=0.0)) or 1.0
    for _ in range(20):
        nudged = lower.copy()
        nudged[system.pattern.diagonal] += shift
        other = system.solver.symmetric(nudged)
        if not other.zero:
            return Factorised(lower, other, shift, factor.negative, factor.zero)
        shift *= 3.0
    raise Singular("no small change of the diagonal gives the tangent an inverse")


def nearest_zero(system: System, of: Factorised, count: int) -> tuple[Array, Array]:
    """Eigenvalues (m,) [N/m] of a tangent nearest to zero, nearest first, and their vectors (n, m).

    Subspace iteration with the inverse (Bathe & Wilson 1973).
    """
    n = system.n
    size = min(n, count + 3)
    x = np.linalg.qr(np.random.default_rng(0).standard_normal((n, size)))[0]
    value = np.zeros(size)
    for _ in range(40):
        y = of.solve(x)
        inverse, mix = np.linalg.eigh(0.5 * (x.T @ y + y.T @ x))
        order = np.argsort(-np.abs(inverse))
        # Beside a nearly singular direction the others may be lost in rounding: infinitely stiff.
        inverse = np.where(inverse == 0.0, 1e-300, inverse)
        last, value = value, 1.0 / inverse[order] - of.shift
        if abs(value[0] - last[0]) <= 1e-12 * abs(value[0]):
            return value[:count], (x @ mix[:, order])[:, :count]
        x = np.linalg.qr(y @ mix[:, order])[0]
    return value[:count], x[:, :count]
