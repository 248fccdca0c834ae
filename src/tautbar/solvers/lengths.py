"""How a state of balance changes with unstressed lengths: signed forces and exact sensitivities.

A slack tie has no sensitivity and stops any Newton, so here the members asked for count as two-way:
a tie too long for its place pushes. Where the answer is taut the two models coincide; the caller
checks it with the real ties.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from tautbar.algebra.solver import SymmetricFactor
from tautbar.mechanics import hanging, members
from tautbar.mechanics.carriers import tangent
from tautbar.solvers.equilibrium import descend, find_equilibrium
from tautbar.solvers.potential import Look, Potential
from tautbar.solvers.system import System

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
Index = NDArray[np.intp]
TIGHT, GOOD = 1e-11, 1e-9  # balance aimed at and balance asked for, shares of the largest force


@dataclass(frozen=True)
class Case:
    """One loading of a structure whose unstressed lengths may change.

    Attributes
    ----------
    potential : function of L0 (N,) [m]
        The potential energy with these unstressed lengths, ties as they are.
    grows : (3, N) N/m
        How the weight of a member grows with its unstressed length.
    warmer : (N,)
        Length under this loading's temperature over that at the model's.
    signed : (N,)
        Members that count as two-way.
    """

    potential: Callable[[Array], Potential]
    grows: Array
    warmer: Array
    signed: Flags

    def at(self, L0: Array) -> Potential:
        """The potential energy with signed forces."""
        real = self.potential(L0)
        sp = real.springs
        two_way = sp.two_way | (self.signed & (sp.k > 0))
        return replace(real, carriers=real.carriers._replace(springs=sp._replace(two_way=two_way)))


class State(NamedTuple):
    """Balance of one case at some lengths."""

    potential: Potential
    look: Look

    @property
    def tension(self) -> Array:
        """Tension at the start and end of each member (N, 2) [N]."""
        out = np.stack([self.look.axial, self.look.axial], axis=-1)
        carriers, hung = self.potential.carriers, self.look.response.hung
        if carriers.ropes is not None and hung is not None:
            out[carriers.at] = np.stack(hanging.end_tensions(carriers.ropes, hung), axis=-1)
        return out


class Slopes(NamedTuple):
    """Derivatives of a state over A adjustments."""

    q: Array  # (n, A) m per adjustment
    tension: Array  # (N, 2, A) N per adjustment


def balance(case: Case, L0: Array, q: Array, patient: bool = False) -> State | None:
    """Balance with signed forces, from ``q`` (n,) [m]; None where none is found.

    ``patient``: where a short descent fails, goes by way of the balance with the real ties.
    """
    signed = case.at(L0)
    look = descend(signed, q, TIGHT, cap=0.02, limit=100).look
    if patient and not signed.balanced(look, GOOD):
        real = find_equilibrium(case.potential(L0), q, GOOD)
        look = descend(signed, real.q, TIGHT, cap=0.02, limit=100).look
    return State(signed, look) if signed.balanced(look, GOOD) else None


class NoBalance(ValueError):
    """No balance is found to begin with; ``case`` says in which."""

    def __init__(self, case: int) -> None:
        super().__init__(f"case {case} has no balance")
        self.case = case


def first_balances(cases: Sequence[Case], L0: Array, q: Sequence[Array]) -> list[State]:
    """Balance of every case, each from its ``q`` (n,) [m].

    Raises
    ------
    NoBalance
        One of them has none.
    """
    out = []
    for k, (case, start) in enumerate(zip(cases, q, strict=True)):
        state = balance(case, L0, start, patient=True)
        if state is None:
            raise NoBalance(k)
        out.append(state)
    return out


def next_balances(
    cases: Sequence[Case], states: Sequence[State], by: Sequence[Slopes], L0: Array, change: Array
) -> list[State] | None:
    """Balance of every case after a change (A,) of the adjustments, each from where its slopes lead."""
    out = []
    for case, state, slope in zip(cases, states, by, strict=True):
        there = balance(case, L0, state.look.q + slope.q @ change)
        if there is None:
            return None
        out.append(there)
    return out


def slopes(case: Case, state: State, D: Array) -> Slopes:
    """Derivatives of the nonlinear state, from one factor.

    With the balance P(L0) = f(q, L0): K dq = dP - df at fixed joints, and a tension changes by its own
    term, -EA l/L0^2 for a straight member, and by what its ends move.

    Parameters
    ----------
    D : (N, A) m
        Change of the unstressed lengths for each adjustment.
    """
    potential, look = state
    system, sp = potential.system, potential.springs
    on = members.taut(sp, look.stretch.e)
    N, A = D.shape
    own = _own_pull(case, state, on)
    dpull = own[:, :, None] * D
    rhs = _load_slope(case, system, D) - system.freedom.GT.T @ dpull.reshape(3 * N, A)
    dq = _factor(potential, look).solve(rhs) if system.n else np.zeros((0, A))
    dr = (system.freedom.GT @ dq).reshape(3, N, A)
    blocks = tangent(potential.carriers, look.response, on, look.axial / look.stretch.l)
    for a in range(A):
        dpull[:, :, a] += members.block_times(blocks, dr[:, :, a])
    return Slopes(dq, _tension_slope(case, state, dpull, D))


def _own_pull(case: Case, state: State, on: Flags) -> Array:
    """Change of each member's pull (3, N) for a metre of its unstressed length, ends held."""
    sp, st = state.potential.springs, state.look.stretch
    own = -sp.k * on * st.l / sp.L0 * case.warmer * st.n
    if state.potential.carriers.ropes is not None:
        own[:, state.potential.carriers.at] = _own_rope_pull(case, state)
    return own


def _own_rope_pull(case: Case, state: State) -> Array:
    """The same of hanging members (3, R).

    With (H, V) held the ends of a longer and heavier rope come apart by s'; the ends being held
    instead, the pull changes by minus stiffness times s'. Weight that grows askew to the load turns
    the load, and with it the whole rope.
    """
    carriers = state.potential.carriers
    rope, hung, at = carriers.ropes, state.look.response.hung, carriers.at
    assert rope is not None
    assert hung is not None
    r = state.look.stretch.l[at] * state.look.stretch.n[:, at]
    down, g = rope.down, case.grows[:, at]
    z = -(down * r).sum(axis=0)
    level = r + down * z
    W, heavier = rope.w * rope.L0, (down * g).sum(axis=0)
    T0, T1 = hanging.end_tensions(rope, hung)
    x = np.sqrt((level * level).sum(axis=0))
    u = level / np.where(x > 0, x, 1.0)
    mean = x / rope.L0 - hung.H / rope.EA  # of H/T along the rope
    dx = case.warmer[at] * x / rope.L0
    dx += rope.L0 * heavier / W * (0.5 * hung.H * (1 / T0 + 1 / T1) - mean)
    steeper = 0.5 * ((hung.V + W / 2) / T1 - (hung.V - W / 2) / T0)
    dz = case.warmer[at] * z / rope.L0 - rope.L0 * heavier * 2 * hung.V / (T0 + T1) ** 2 * steeper
    turn = _cross(down, (g - down * heavier) / W)
    apart = dx * u - dz * down + _cross(turn, r)
    return _cross(turn, hung.pull) - members.block_times(hung.stiffness, apart)


def _cross(a: Array, b: Array) -> Array:
    return np.asarray(np.cross(a.T, b.T).T)


def _load_slope(case: Case, system: System, D: Array) -> Array:
    """Change of the joint loads (n, A): half of the weight that a longer member gains goes to each end."""
    s = system.structure
    out = np.zeros((system.n, D.shape[1]))
    for a in range(D.shape[1]):
        half = 0.5 * case.grows * D[:, a] * s.present
        force = np.zeros((3, s.joints))
        np.add.at(force.T, s.start, half.T)
        np.add.at(force.T, s.end, half.T)
        out[:, a] = system.freedom.gather(force)
    return out


def _factor(potential: Potential, look: Look) -> SymmetricFactor:
    """Factor of the tangent; a joint that nothing holds is held by a billionth of the stiffest."""
    system, K = potential.system, potential.curvature(look)
    factor = system.solver.symmetric(K)
    if factor.zero == 0:
        return factor
    diagonal = system.pattern.diagonal
    K[diagonal] += 1e-9 * np.abs(K[diagonal]).max(initial=1.0)
    return system.solver.symmetric(K)


def _tension_slope(case: Case, state: State, dpull: Array, D: Array) -> Array:
    """Change of the end tensions (N, 2, A) from that of the pulls (3, N, A)."""
    n = state.look.stretch.n
    along = (n[:, :, None] * dpull).sum(axis=0)
    out = np.stack([along, along], axis=1)
    carriers, hung = state.potential.carriers, state.look.response.hung
    if carriers.ropes is None or hung is None:
        return out
    rope, at = carriers.ropes, carriers.at
    half = 0.5 * rope.down * rope.w * rope.L0
    dhalf = 0.5 * case.grows[:, at, None] * D[at]
    for end, sign in enumerate((1.0, -1.0)):
        t = hung.pull + sign * half
        T = np.sqrt((t * t).sum(axis=0))
        out[at, end] = ((t / T)[:, :, None] * (dpull[:, at] + sign * dhalf)).sum(axis=0)
    return out


def reached(system: System, adjusted: Index) -> tuple[Flags, Flags]:
    """Free joints (J,) and members (N,) that a change of the adjusted members' lengths can reach.

    Held joints pass nothing on.
    """
    s = system.structure
    free = np.diff(system.freedom.T.indptr).reshape(3, -1).sum(axis=0) > 0
    links = np.flatnonzero(s.present & free[s.start] & free[s.end])
    graph = coo_array((np.ones(links.size), (s.start[links], s.end[links])), shape=(s.joints, s.joints))
    _, part = connected_components(graph, directed=False)
    ends = np.concatenate([s.start[adjusted], s.end[adjusted]])
    joints = free & np.isin(part, part[ends[free[ends]]])
    touched = joints[s.start] | joints[s.end]
    touched[adjusted] = True
    return joints, touched & s.present
