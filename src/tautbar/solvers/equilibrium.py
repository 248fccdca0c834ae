"""Equilibrium: Newton-Raphson on the potential energy, and the roads to it from a cold start.

Where only ties carry the energy is convex, so any road will do: stiffness graded up. Anything with
bars or struts has several equilibria; there the road matters, and the structure is led down from the
drawing by short steps, then by creep (small implicit steps of an over-damped fall).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import Factor, NotPositiveDefinite
from tautbar.solvers.potential import Look, Potential

Array = NDArray[np.float64]
GRADES = (1e-4, 1e-3, 1e-2, 1e-1, 1.0)
FINE_GRADES = tuple(float(g) for g in np.geomspace(1e-6, 1.0, 13))


@dataclass(frozen=True)
class Descent:
    """Where a descent ended. ``factorisations`` counts the work, ``road`` says in words how it went."""

    look: Look
    converged: bool
    factorisations: int
    road: str = "Newton"
    gave_way: bool = False  # the tangent lost its definiteness somewhere on the way

    @property
    def q(self) -> Array:
        return self.look.q

    def after(self, earlier: int, road: str | None = None) -> Descent:
        """The same with the work of earlier attempts counted."""
        work = self.factorisations + earlier
        return Descent(self.look, self.converged, work, road or self.road, self.gave_way)


def find_equilibrium(potential: Potential, q: Array, tolerance: float) -> Descent:
    """Equilibrium reached from ``q`` (n,) [m]; the caller judges its stability."""
    if potential.small:
        return descend(potential, q, tolerance, cap=np.inf, limit=100)
    if potential.convex:
        return _of_ties(potential, q, tolerance)
    plain = descend(potential, q, tolerance, cap=0.02, limit=60)
    return plain if plain.converged else _creep(potential, q, tolerance).after(plain.factorisations)


def _of_ties(potential: Potential, q: Array, tolerance: float) -> Descent:
    """Ties only: convex. Newton where it is quick, else graded stiffness, finer where that fails."""
    done = descend(potential, q, tolerance, cap=0.25, limit=25)
    for grades, cap in ((GRADES, 0.25), (FINE_GRADES, 0.05)):
        if done.converged:
            return done
        work, at = done.factorisations, q
        for grade in grades:
            last = grade == 1.0
            soft = potential if last else potential.softened(grade)
            done = descend(soft, at, tolerance if last else 1e-3, cap, limit=400)
            work, at = work + done.factorisations, done.q
        done = Descent(done.look, done.converged, work, "graded stiffness")
    return done


def _creep(potential: Potential, q: Array, tolerance: float) -> Descent:
    """Fall slowly from ``q``: minimise E + mu/2 |q - q_k|^2 again and again, then Newton."""
    size = potential.system.structure.size
    look = potential.look(q)
    mu = potential.scale(look) / (0.002 * size)
    work = 0
    for _ in range(600):
        step = descend(potential.anchored(look.q, mu), look.q, 1e-3, cap=0.02, limit=20)
        moved = potential.system.greatest_joint_move(step.q - look.q)
        mu *= 0.5 if moved < 0.02 * size else 1.5
        work += step.factorisations
        look = potential.look(step.q)
        if look.imbalance < 1e-2 * potential.scale(look):
            done = descend(potential, look.q, tolerance, cap=0.02, limit=30)
            work += done.factorisations
            if done.converged:
                return Descent(done.look, True, work, "creep, then Newton", True)
    return Descent(look, False, work, "creep")


def descend(potential: Potential, q: Array, tolerance: float, cap: float, limit: int) -> Descent:
    """Newton-Raphson with a line search on the energy.

    Parameters
    ----------
    cap : float
        Farthest that any joint moves in one iteration, as a share of the model's size.
    limit : int
        Most iterations.
    """
    look = potential.look(q)
    work, gave_way = 0, False
    for iteration in range(limit):
        if potential.balanced(look, tolerance):
            return Descent(look, True, work, gave_way=gave_way)
        factor, tries = _factor(potential, look)
        work += tries
        gave_way |= iteration > 0 and tries > 1
        step = factor.solve(look.residual)
        far = potential.system.greatest_joint_move(step) / (cap * potential.system.structure.size)
        moved = _line_search(potential, look, step if far <= 1.0 else step / far)
        if moved is None:
            break
        look = moved
    return Descent(look, potential.balanced(look, tolerance), work, gave_way=gave_way)


def _factor(potential: Potential, look: Look) -> tuple[Factor, int]:
    """Factor of the tangent where it is positive definite, of the safe form where it is not."""
    solver = potential.system.solver
    try:
        return solver.cholesky(potential.curvature(look)), 1
    except NotPositiveDefinite:
        return solver.cholesky(potential.safe_curvature(look)), 2


def _line_search(potential: Potential, look: Look, step: Array) -> Look | None:
    """The next position along a descent step, or None where none is better.

    Backtracks on the energy by quadratic interpolation; where energy differences are rounding, a
    smaller residual decides instead.
    """
    slope = -float(look.residual @ step)
    rounding = 1e-11 * max(abs(look.energy), look.strain_energy)
    share = 1.0
    for _ in range(40):
        new = potential.look(look.q + share * step)
        if np.isfinite(new.energy):
            if abs(share * slope) < rounding and new.imbalance < look.imbalance:
                return new
            if new.energy <= look.energy + 1e-4 * share * slope:
                return new
            fall = new.energy - look.energy - share * slope
            share *= float(np.clip(-0.5 * share * slope / fall, 0.1, 0.5)) if fall > 0 else 0.5
        else:
            share *= 0.1
    return None
