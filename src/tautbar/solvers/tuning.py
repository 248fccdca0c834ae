"""Unstressed lengths that give wanted tensions and positions: Gauss-Newton on exact sensitivities.

More targets than adjustments: least squares, each target weighed by the change of length that would
meet it alone. Fewer: the least change from the lengths to begin with.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.solvers.lengths import Case, Slopes, State, first_balances, next_balances, slopes

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
MET = 1e-7  # of the wanted tension, or of the model's size: a miss this small is none
FINE = 1e-10  # the same, where iteration stops
SHORTEST, LONGEST = 0.01, 100.0  # of the distance between a member's joints in the start shape
LARGEST_STEP = 0.2  # relative change of a length in one correction
MOST_CORRECTIONS = 100
LEAST_CHANGE = 30  # corrections that also look for the least change; later ones only for the targets
SAME = 1e-9  # of the largest: a singular value this small is none


@dataclass(frozen=True)
class Target:
    """One thing wanted under one case: the greatest tension at some member ends, or a joint's position.

    ``ends`` are (member, 0 for its start or 1 for its end); ``row`` is axis x J + joint, and ``offset``
    where the joint is with all free unknowns zero [m]. ``scale`` is what a miss is measured by.
    """

    case: int
    wanted: float
    scale: float
    ends: tuple[tuple[int, int], ...] = ()
    row: int = -1
    offset: float = 0.0

    def value(self, state: State) -> float:
        """Tension [N] or position [m]."""
        if self.ends:
            tension = state.tension
            return max(float(tension[e]) for e in self.ends)
        U = state.potential.system.freedom.spread(state.look.q)
        return float(U.ravel()[self.row]) + self.offset

    def slope(self, state: State, by: Slopes) -> Array:
        """Its derivatives (A,)."""
        if self.ends:
            tension = state.tension
            member, end = max(self.ends, key=lambda e: float(tension[e]))
            return np.asarray(by.tension[member, end])
        return np.asarray((state.potential.system.freedom.T[[self.row]] @ by.q)[0])


@dataclass(frozen=True)
class Ratios:
    """Adjustments x (A,): each multiplies the unstressed lengths of its members by 1 + x."""

    L0: Array  # (N,) m, at x = 0
    members: tuple[tuple[int, ...], ...]
    distance: Array  # (N,) m, between a member's joints in the start shape

    def lengths(self, x: Array) -> Array:
        """Unstressed lengths (N,) [m]."""
        out: Array = self.L0.copy()
        for group, ratio in zip(self.members, x, strict=True):
            out[list(group)] *= 1 + ratio
        return out

    def directions(self) -> Array:
        """dL0/dx (N, A) [m]."""
        D = np.zeros((self.L0.size, len(self.members)))
        for a, group in enumerate(self.members):
            D[list(group), a] = self.L0[list(group)]
        return D

    def limits(self) -> tuple[Array, Array]:
        """Least and greatest x (A,)."""
        ratio = [self.distance[list(g)] / self.L0[list(g)] for g in self.members]
        low = [max(SHORTEST * r.max(), 1e-6) - 1 for r in ratio]
        return np.array(low), np.array([LONGEST * r.min() - 1 for r in ratio])


@dataclass(frozen=True)
class Tuning:
    """Where the corrections ended. ``untouched`` are targets that no adjustment influences."""

    x: Array  # (A,)
    L0: Array  # (N,) m
    states: list[State]
    miss: Array  # (T,) value less wanted, over each target's scale
    slope: Array  # (T, A) of the values over the adjustments
    at_limit: Flags  # (A,) adjustments that ran against a limit
    corrections: int
    untouched: tuple[int, ...] = ()

    @property
    def met(self) -> bool:
        return not self.untouched and bool((np.abs(self.miss) <= MET).all())


@dataclass(frozen=True)
class _Look:
    x: Array
    states: list[State]
    slopes: list[Slopes]
    values: Array


def tune(
    cases: Sequence[Case],
    ratios: Ratios,
    targets: Sequence[Target],
    x: Array,
    home: Array,
    q: Sequence[Array],
) -> Tuning:
    """Adjust lengths until the targets are met, or as nearly as they can be.

    Parameters
    ----------
    x, home : (A,)
        Where to start, and from where the least change is measured.
    q : (n,) [m] for each case
        Joints in the start shape.

    Raises
    ------
    NoBalance
        There is none at the start.
    """
    here = _seen(cases, ratios, targets, x, first_balances(cases, ratios.lengths(x), q))
    wanted, scale = (np.array([getattr(t, key) for t in targets]) for key in ("wanted", "scale"))
    J, largest = _jacobian(targets, here), np.zeros(len(targets))
    untouched = _untouched(cases, targets, here, J)
    corrections = 0
    while corrections < MOST_CORRECTIONS:
        largest = np.maximum(largest, np.sqrt((J * J).sum(axis=1)))
        miss = here.values - wanted
        if untouched:
            break
        weight = 1 / np.maximum(np.sqrt((J * J).sum(axis=1)), 1e-3 * largest)
        low, high = ratios.limits()
        near = home if corrections < LEAST_CHANGE else here.x
        step, null = _step(weight[:, None] * J, weight * miss, here.x, near, low, high)
        if np.abs(step).max() <= 1e-14 or ((np.abs(miss) <= FINE * scale).all() and null <= 1e-9):
            break
        new = _along(cases, ratios, targets, here, step, weight, wanted, null)
        if new is None:
            break
        here, J = new, _jacobian(targets, new)
        corrections += 1
    low, high = ratios.limits()
    return Tuning(
        x=here.x,
        L0=ratios.lengths(here.x),
        states=here.states,
        miss=(here.values - wanted) / scale,
        slope=J,
        at_limit=(here.x <= low) | (here.x >= high),
        corrections=corrections,
        untouched=untouched,
    )


def _seen(
    cases: Sequence[Case], ratios: Ratios, targets: Sequence[Target], x: Array, states: list[State]
) -> _Look:
    D = ratios.directions()
    by = [slopes(c, s, D) for c, s in zip(cases, states, strict=True)]
    return _Look(x, states, by, np.array([t.value(states[t.case]) for t in targets]))


def _jacobian(targets: Sequence[Target], here: _Look) -> Array:
    return np.stack([t.slope(here.states[t.case], here.slopes[t.case]) for t in targets])


def _untouched(cases: Sequence[Case], targets: Sequence[Target], here: _Look, J: Array) -> tuple[int, ...]:
    """Targets that doubling every adjusted length would move by less than a millionth, or by rounding."""
    stiffest = max(float(s.potential.system.structure.EA.max()) for s in here.states)
    found = []
    for k, t in enumerate(targets):
        size = max(abs(t.scale), abs(here.values[k])) if t.ends else t.scale
        if np.abs(J[k]).max() <= 1e-6 * size + (1e-12 * stiffest if t.ends else 0.0):
            found.append(k)
    return tuple(found)


def _step(J: Array, miss: Array, x: Array, near: Array, low: Array, high: Array) -> tuple[Array, float]:
    """The correction (A,) within the limits, and the size of its part that moves no target.

    Of all that meet the targets best to first order, the one that ends nearest to ``near``.
    """
    free = np.ones(x.size, dtype=bool)
    step, null = np.zeros(x.size), 0.0
    while free.any():
        U, s, Vt = np.linalg.svd(J[:, free], full_matrices=False)
        keep = s > SAME * s.max(initial=0.0)
        fixed = J[:, ~free] @ step[~free]
        best = -Vt[keep].T @ ((U.T[keep] @ (miss + fixed)) / s[keep])
        away = (near - x)[free]
        home = away - Vt[keep].T @ (Vt[keep] @ away)
        step[free], null = best + home, float(np.sqrt(home @ home))
        over = free & ((x + step < low) | (x + step > high))
        if not over.any():
            break
        step[over] = np.clip(x + step, low, high)[over] - x[over]
        free &= ~over
    share = min(1.0, LARGEST_STEP / max(float(np.abs(step / (1 + x)).max()), 1e-300))
    return share * step, share * null


def _along(
    cases: Sequence[Case],
    ratios: Ratios,
    targets: Sequence[Target],
    here: _Look,
    step: Array,
    weight: Array,
    wanted: Array,
    null: float,
) -> _Look | None:
    """The first point back along the step where the misses fall, or None.

    A part of the step that moves no target to first order may cost a miss of second order.
    """

    def missed(values: Array) -> float:
        return float(np.sqrt((((values - wanted) * weight) ** 2).sum()))

    before, share = missed(here.values), 1.0
    for _ in range(24):
        x = here.x + share * step
        states = next_balances(cases, here.states, here.slopes, ratios.lengths(x), share * step)
        if states is not None:
            values = np.array([t.value(states[t.case]) for t in targets])
            if missed(values) <= max((1 - 1e-4 * share) * before, 0.1 * share * null):
                return _seen(cases, ratios, targets, x, states)
        share *= 0.5
    return None
