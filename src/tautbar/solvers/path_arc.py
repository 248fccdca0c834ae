"""One step along a path as a curve: any point on it, and the points where something becomes zero."""

from __future__ import annotations

from bisect import insort
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from tautbar.solvers.path_correct import Spot, State, ahead, correct, examine
from tautbar.solvers.path_family import Family

Array = NDArray[np.float64]


class Lost(Exception):
    """No balance was found at a point inside a step: the step is too long."""


class Arc:
    """The path from a state on, over the distance s [m] along its tangent.

    Points found stay, so that the next one starts from the two beside it.
    """

    def __init__(self, family: Family, start: State, end: State, length: float) -> None:
        self.family, self.start, self.end, self.length = family, start, end, length
        self._still: Array | None = None
        self._found: list[tuple[float, Spot]] = [(0.0, start.spot), (length, end.spot)]

    def at(self, s: float) -> Spot:
        """The point at distance s.

        Raises
        ------
        Lost
        """
        for known, found in self._found:
            if s == known:
                return found
        (q, f), on, plane = self.guess(s), self.start.spot.on, ahead(self.start, s)
        spot = None if self._still is None else correct(self.family, on, q, f, plane, self._still)
        spot = spot or correct(self.family, on, q, f, plane)
        if spot is None:
            raise Lost
        insort(self._found, (s, spot), key=lambda pair: pair[0])
        return spot

    def hold(self, directions: Array) -> None:
        """Keep further points between those found in some directions (n, m), orthonormal."""
        self._still = directions if directions.size else None

    def guess(self, s: float) -> tuple[Array, float]:
        """Between the two points found on either side."""
        after = next(i for i, (known, _) in enumerate(self._found) if known >= s)
        (a, left), (b, right) = self._found[max(after - 1, 0)], self._found[max(after, 1)]
        share = (s - a) / (b - a)
        return left.q + share * (right.q - left.q), left.f + share * (right.f - left.f)

    def state(self, s: float) -> State:
        """The point at distance s with its tangent."""
        if s == 0.0:
            return self.start
        return self.end if s == self.length else examine(self.family, self.at(s), self.start.along)

    def cut(self, s: float, end: State | None = None) -> Arc:
        """The part up to distance s; ``end`` is the state there if it was landed on more exactly."""
        return Arc(self.family, self.start, self.state(s) if end is None else end, s)

    def root(self, value: Callable[[float], float], a: float, b: float) -> float:
        """Where a function of s that changes sign between a and b is zero (Brent 1973)."""
        fine = 1e-14 * self.length
        return float(brentq(value, a, b, xtol=fine, rtol=4 * np.finfo(float).eps, maxiter=200))
