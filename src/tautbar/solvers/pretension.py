"""The least pretension that keeps members taut in every case: sequential linear programming.

Unknown are levels p: the members of a level have L0 = l/(1 + p/EA), l the distance between their joints
in the start shape. Minimised is the largest share of strength that any of them uses in any case, subject
to a tension of at least the margin in every kept member and case. Each step is a linear program (HiGHS,
Huangfu & Hall 2018) inside a trust region, with one elastic slack that makes it always solvable.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import linprog

from tautbar.solvers.lengths import Case, Slopes, State, first_balances, next_balances, slopes

Array = NDArray[np.float64]
Index = NDArray[np.intp]
PENALTY = 1e4  # of a force short of the margin, against a share of strength
MEAN = 1e-4  # weight of the mean share: settles levels that the largest share leaves open
EXACT = 1e-9  # of the force scale: a margin missed by this little is rounding
HELD = 1e-7  # of the force scale: a margin missed by this little is held
SETTLED = 1e-6  # of the merit: a step that promises less ends the search
MOST_EVALUATIONS = 60
STRAIN = 0.2  # levels stay within this of the axial stiffness


@dataclass(frozen=True)
class Levels:
    """Adjustments p (A,) [N]."""

    L0: Array  # (N,) m, of the members that are not adjusted
    EA: Array  # (N,) N
    members: tuple[tuple[int, ...], ...]
    distance: Array  # (N,) m

    def lengths(self, p: Array) -> Array:
        """Unstressed lengths (N,) [m]."""
        out: Array = self.L0.copy()
        for group, level in zip(self.members, p, strict=True):
            m = list(group)
            out[m] = self.distance[m] / (1 + level / self.EA[m])
        return out

    def directions(self, p: Array) -> Array:
        """dL0/dp (N, A) [m/N]."""
        D = np.zeros((self.L0.size, len(self.members)))
        for a, (group, level) in enumerate(zip(self.members, p, strict=True)):
            m = list(group)
            D[m, a] = -self.distance[m] / self.EA[m] / (1 + level / self.EA[m]) ** 2
        return D

    def limits(self) -> Array:
        """Largest size of each level (A,) [N]."""
        return np.array([STRAIN * self.EA[list(g)].min() for g in self.members])


@dataclass(frozen=True)
class Wanted:
    """What is asked: ``kept`` members hold ``margin``; ``strength`` (C,) is of the ``counted`` ones."""

    kept: Index  # (K,)
    margin: float  # N
    counted: Index  # (C,)
    strength: Array  # N


@dataclass(frozen=True)
class Least:
    """Where the programming ended."""

    p: Array  # (A,) N
    L0: Array  # (N,) m
    states: list[State]
    share: float  # the largest tension over its strength
    lowest: Array  # (cases, K) N, tension of the kept members, the smaller of both ends
    short: float  # N, by how much the worst misses the margin
    held: bool
    evaluations: int
    settled: bool  # else the search was cut off while it still gained


@dataclass(frozen=True)
class _Seen:
    p: Array
    states: list[State]
    slopes: list[Slopes]
    low: Array  # (cases x K,) N
    low_slope: Array  # (cases x K, A)
    high: Array  # (cases x C,) shares of strength
    high_slope: Array


def least_levels(
    cases: Sequence[Case], levels: Levels, wanted: Wanted, p: Array, q: Sequence[Array]
) -> Least:
    """The levels that keep taut with the least share of strength, or come nearest to it.

    ``q`` are the joints (n,) [m] of each case in the start shape. The answer is a local one; where
    members of one kind share a level the problem is all but convex (measured: 20 of 20 guyed masts
    agree with an independent search).

    Raises
    ------
    NoBalance
        There is none at the start.
    """
    here = _see(cases, levels, wanted, p, first_balances(cases, levels.lengths(p), q))
    F = max(wanted.margin, float(np.abs(here.low).max()), 1e-300)
    reach, evaluations = 0.3 * max(F, float(np.abs(p).max())), 1
    while evaluations < MOST_EVALUATIONS and reach > 1e-10 * F:
        d, expected = _program(here, wanted, levels.limits(), reach, F)
        now = _merit(here.low, here.high, wanted, F)
        if now - expected <= SETTLED * now:
            break
        tried = next_balances(cases, here.states, here.slopes, levels.lengths(here.p + d), d)
        evaluations += 1
        gained = -np.inf
        if tried is not None:
            new = _see(cases, levels, wanted, here.p + d, tried)
            gained = (now - _merit(new.low, new.high, wanted, F)) / (now - expected)
            if gained > 0.05:
                here = new
        reach *= 2.0 if gained > 0.75 else 1.0 if gained > 0.25 else 0.25
    low = here.low.reshape(len(cases), -1)
    short = max(0.0, wanted.margin - float(low.min()))
    return Least(
        p=here.p,
        L0=levels.lengths(here.p),
        states=here.states,
        share=float(here.high.max()),
        lowest=low,
        short=short,
        held=short <= HELD * F,
        evaluations=evaluations,
        settled=evaluations < MOST_EVALUATIONS,
    )


def _see(cases: Sequence[Case], levels: Levels, wanted: Wanted, p: Array, states: list[State]) -> _Seen:
    D = levels.directions(p)
    by = [slopes(c, s, D) for c, s in zip(cases, states, strict=True)]
    low, low_slope, high, high_slope = [], [], [], []
    for state, slope in zip(states, by, strict=True):
        tension = state.tension
        end = tension[wanted.kept].argmin(axis=1)
        low.append(tension[wanted.kept, end])
        low_slope.append(slope.tension[wanted.kept, end])
        end = tension[wanted.counted].argmax(axis=1)
        high.append(tension[wanted.counted, end] / wanted.strength)
        high_slope.append(slope.tension[wanted.counted, end] / wanted.strength[:, None])
    return _Seen(p, states, by, *(np.concatenate(v) for v in (low, low_slope, high, high_slope)))


def _merit(low: Array, high: Array, wanted: Wanted, F: float) -> float:
    short = max(0.0, wanted.margin - EXACT * F - float(low.min()))
    return float(high.max()) + MEAN * float(high.mean()) + PENALTY * short / F


def _program(here: _Seen, wanted: Wanted, limit: Array, reach: float, F: float) -> tuple[Array, float]:
    """The step (A,) [N] that is best to first order, and the merit expected of it.

    Unknowns: step/F, the largest share, the force short of the margin over F.
    """
    A = here.p.size
    zero, one = np.zeros((here.low.size, 1)), np.ones((here.high.size, 1))
    rows = np.vstack(
        [
            np.hstack([-here.low_slope, zero, zero - 1]),
            np.hstack([here.high_slope * F, -one, 0 * one]),
        ]
    )
    right = np.concatenate([(here.low - wanted.margin) / F, -here.high])
    cost = np.concatenate([MEAN * F * here.high_slope.mean(axis=0), [1.0, PENALTY]])
    low, high = np.maximum(-reach, -limit - here.p) / F, np.minimum(reach, limit - here.p) / F
    bounds = [*zip(low, high, strict=True), (None, None), (0, None)]
    found = linprog(cost, A_ub=rows, b_ub=right, bounds=bounds, method="highs")
    if found.status != 0:
        raise RuntimeError(f"the linear program was not solved: {found.message}")
    d = F * np.asarray(found.x[:A])
    return d, _merit(here.low + here.low_slope @ d, here.high + here.high_slope @ d, wanted, F)
