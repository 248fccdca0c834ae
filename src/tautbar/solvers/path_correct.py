"""Newton's iteration on a path: balance together with one condition that says where on it.

The bordered system [K, -p; c, d] (du, df) = (r, gap) is solved by two solves with one factor of K
(Crisfield 1981). On the arc the condition is the plane at right angles to the tangent at its start
(Ramm 1981), measured by displacements alone.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import NotFinite, Singular
from tautbar.solvers.path_family import Factorised, Family, factorise
from tautbar.solvers.potential import Look

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
TOLERANCE = (
    1e-12  # of the largest force: paths are for load factors to 1e-8, at limits a difference of forces
)
ACCEPTED = 1e-9  # where rounding stalls the iteration
MOST_ITERATIONS = 14


@dataclass(frozen=True)
class Border:
    """The condition c.q + d f = target; ``c`` (n,)."""

    c: Array
    d: float
    target: float

    def gap(self, q: Array, f: float) -> float:
        """What is missing to the target."""
        return self.target - float(self.c @ q) - self.d * f


@dataclass(frozen=True)
class Spot:
    """A point in balance: free unknowns, load factor, the set that carries."""

    q: Array  # (n,) m
    f: float
    on: Flags
    look: Look
    imbalance: float  # largest force out of balance over the scale
    iterations: int = 0


@dataclass(frozen=True)
class State:
    """A spot with its tangent and which way the path goes on from it.

    ``along`` (n,) is the unit direction of the displacements, ``rise`` the load factor per metre along
    it, ``stretching`` (N,) how fast members get longer; ``held`` is false where the tangent holds
    nothing against the growing load.
    """

    spot: Spot
    along: Array
    rise: float  # 1/m
    stretching: Array  # (N,)
    tangent: Factorised
    held: bool

    @property
    def negative(self) -> int:
        return self.tangent.negative

    def turned(self) -> State:
        """The same with the other way along the path."""
        return State(self.spot, -self.along, -self.rise, -self.stretching, self.tangent, self.held)


def ahead(state: State, s: float) -> Border:
    """The plane at right angles to a state's tangent, s [m] along it."""
    return Border(state.along, 0.0, float(state.along @ state.spot.q) + s)


def correct(
    family: Family, on: Flags, q: Array, f: float, border: Border, still: Array | None = None
) -> Spot | None:
    """The point in balance that fulfils a condition, from a guess near it; None if there is none near.

    ``still`` (n, m) are orthonormal directions in which the guess is good already and is not moved:
    beside a bifurcation those without stiffness, along which rounding would be magnified without bound.
    """
    before = np.inf
    for i in range(MOST_ITERATIONS):
        potential = family.fixed(f, on)
        look = potential.look(q)
        if not np.isfinite(look.imbalance):
            return None
        gap, share = border.gap(q, f), look.imbalance / potential.scale(look)
        # The condition is linear: it holds to rounding from the first iteration on.
        if i > 0 and (potential.balanced(look, TOLERANCE) or (share <= ACCEPTED and share > 0.3 * before)):
            return Spot(q, f, on, look, share, i)
        before = share
        try:
            K = factorise(family.system, potential.curvature(look))
        except (NotFinite, Singular):
            return None
        moved = K.solve(np.stack([look.residual, family.load_rate(q, f, on)], axis=1))
        if still is not None:
            moved -= still @ (still.T @ moved)
        df = (gap - float(border.c @ moved[:, 0])) / (float(border.c @ moved[:, 1]) + border.d)
        q, f = q + moved[:, 0] + df * moved[:, 1], f + df
    return None


def spot_at(family: Family, on: Flags, q: Array, f: float) -> Spot:
    """A point known to be in balance."""
    potential = family.fixed(f, on)
    look = potential.look(q)
    return Spot(q, f, on, look, look.imbalance / potential.scale(look))


def examine(family: Family, spot: Spot, toward: Array | None = None) -> State:
    """Tangent, pivots and direction at a spot; ``toward`` (n,) is the way come, None the growing load.

    Raises
    ------
    Singular, NotFinite
        The tangent cannot be factorised, not even nudged.
    """
    system = family.system
    K = factorise(system, family.fixed(spot.f, spot.on).curvature(spot.look))
    p = family.load_rate(spot.q, spot.f, spot.on)
    b = K.solve(p)
    size = float(np.sqrt(b @ b)) or 1.0
    missing = p - system.pattern.to_csc(K.lower) @ b
    held = bool(np.abs(missing).max(initial=0.0) <= 1e-6 * np.abs(p).max(initial=0.0))
    along, rise = b / size, 1.0 / size
    apart = system.apart(along)
    ahead = (spot.look.stretch.n * apart).sum(axis=0)
    ahead = ahead + rise * family.stretch_rate(spot.q, spot.f, spot.on)
    state = State(spot, along, rise, ahead, K, held)
    return state.turned() if toward is not None and float(along @ toward) < 0 else state
