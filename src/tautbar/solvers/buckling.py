"""Linearised buckling: (K_0 + lambda K_g) x = 0 about a state in balance.

K_0 is the tangent there, K_g the change of the tangent's geometric part with the member forces that a
load factor of one adds in a linear step: (dN/l)(I - n nT) for straight members, a difference of
tangents for hanging ones. Solved as -K_g x = mu K_0 x with mu = 1/lambda, the largest |mu| first, by
Lanczos with the factor of K_0 (Ericsson & Ruhe 1980); counts of negative pivots prove it complete.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh
from scipy.sparse.linalg import ArpackNoConvergence, LinearOperator, eigsh

from tautbar.algebra.solver import Factor
from tautbar.mechanics import members
from tautbar.solvers.path_family import SPAN, Family
from tautbar.solvers.system import System

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
DENSE_BELOW = 80
TINY = 1e-300
NOTHING = 1e-11  # of the largest mu: beyond, a load factor is rounding
APART = 1e-6  # relative distance beyond a factor at which pivots are counted


@dataclass(frozen=True)
class Buckled:
    """Load factors (M,) in order of size, shapes (n, M), residuals and the count that proves them."""

    factor: Array
    shape: Array
    residual: Array  # (M,) |K_0 x + lambda K_g x| over |K_0 x|
    counted: int  # factors of both signs no larger than the last, by negative pivots
    complete: bool


def stress_change(family: Family, q: Array, on: Flags, force: Factor) -> tuple[Array, Array]:
    """Lower data of K_g, and the linear step (n,) [m] of a load factor of one.

    Parameters
    ----------
    q : (n,) m
        The state, in balance under the constant loads.
    on : (N,)
        Members that carry.
    force : Factor of the tangent there.
    """
    system = family.system
    step = force.solve(family.load_rate(q, 0.0, on))
    potential = family.fixed(0.0, on)
    look = potential.look(q)
    apart = system.apart(step)
    longer = (look.stretch.n * apart).sum(axis=0)
    # Temperature and take-up change forces with the joints where they are.
    still = np.zeros(on.size)
    if family.force_rate is None:
        up, down = (family.fixed(d, on).look(q).axial for d in (SPAN, -SPAN))
        still = (up - down) / (2 * SPAN)
    more = potential.springs.k * longer + still
    blocks = members.tangent(look.stretch.n, np.zeros(on.size), more / look.stretch.l)
    if potential.carriers.ropes is not None:
        blocks[:, potential.carriers.at] = _rope_change(family, q, on, step)
    return system.member_lower(blocks), step


def _rope_change(family: Family, q: Array, on: Flags, step: Array) -> Array:
    """Slope of the stiffness blocks (6, R) of hanging members over the load factor."""
    system = family.system
    now, ahead = (family.fixed(f, on).carriers.ropes for f in (0.0, 1.0))
    weight = (
        np.inf if now is None or ahead is None else (now.w / np.maximum(np.abs(ahead.w - now.w), TINY)).min()
    )
    far = system.structure.size / max(system.greatest_joint_move(step), TINY)
    span = min(1e-6 * far, SPAN * min(1.0, float(weight)))
    up, down = (_rope_blocks(family, q + d * step, d, on) for d in (span, -span))
    return (up - down) / (2 * span)


def _rope_blocks(family: Family, q: Array, factor: float, on: Flags) -> Array:
    potential = family.fixed(factor, on)
    hung = potential.look(q).response.hung
    return np.zeros((6, 0)) if hung is None else hung.stiffness


def buckle(system: System, K0: Array, Kg: Array, factor: Factor, count: int) -> Buckled:
    """The ``count`` load factors smallest in size, fewer where there are no more.

    Parameters
    ----------
    K0, Kg : (nnz,) lower data; K0 positive definite
    factor : of K0
    """
    if not np.abs(Kg).max(initial=0.0) > 0:
        return Buckled(np.zeros(0), np.zeros((system.n, 0)), np.zeros(0), 0, True)
    wanted = count
    for _ in range(4):
        found = _lowest(system, K0, Kg, factor, wanted)
        size = found.factor.size
        if found.complete or size < wanted:
            return _cut(found, count)
        wanted = min(2 * wanted + 2, system.n)
    return _cut(found, count)


def _cut(found: Buckled, count: int) -> Buckled:
    return Buckled(
        found.factor[:count], found.shape[:, :count], found.residual[:count], found.counted, found.complete
    )


def _lowest(system: System, K0: Array, Kg: Array, factor: Factor, wanted: int) -> Buckled:
    A, B = system.pattern.to_csc(-Kg), system.pattern.to_csc(K0)
    if system.n <= max(DENSE_BELOW, 3 * wanted):
        mu, x = eigh(A.toarray(), B.toarray())
    else:
        inverse = LinearOperator((system.n, system.n), matvec=factor.solve, dtype=float)
        start = np.random.default_rng(0).standard_normal(system.n)
        try:
            mu, x = eigsh(A, min(wanted + 1, system.n - 1), M=B, Minv=inverse, which="LM", v0=start, tol=0)
        except ArpackNoConvergence as stopped:
            mu, x = stopped.eigenvalues, stopped.eigenvectors
    order = np.argsort(-np.abs(mu), kind="stable")
    order = order[np.abs(mu[order]) > NOTHING * np.abs(mu).max(initial=0.0)][:wanted]
    value, x = 1.0 / mu[order], x[:, order]
    force = B @ x
    left = np.linalg.norm(force - (A @ x) * value, axis=0) / np.linalg.norm(force, axis=0)
    counted = _count(system, K0, Kg, float(np.abs(value).max(initial=0.0)) * (1 + APART))
    return Buckled(value, x, left, counted, counted == value.size)


def _count(system: System, K0: Array, Kg: Array, size: float) -> int:
    """How many load factors of either sign are no larger than ``size``, by negative pivots."""
    return sum(system.solver.symmetric(K0 + way * size * Kg).negative for way in (1.0, -1.0))
