"""At which share of the load each member that ends slack went slack on the way."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Rest
from tautbar.analyses.reach import at_share
from tautbar.mechanics import members
from tautbar.mechanics.loads import Acting
from tautbar.model.parts import Static

Array = NDArray[np.float64]
STEPS = 10  # of the load, evenly; then states at the crossings predicted between them
ROUNDS = 12  # of prediction, each from the states of the last
MOST_CROSSINGS = 40  # states added a round
SETTLED = 1e-6  # of the load: a crossing predicted this near a known state is known
LARGEST = 5_000  # members: larger models are traced only if the analysis asks for load steps


def slack_onset(analysis: Static, start: Rest, target: Acting, q: Array) -> Array:
    """Load factor (N,) from the start's loading (0) to the target (1), whose state is ``q`` (n,).

    NaN for members that are not slack at the end, and everywhere where the way was not traced: a
    large model, or a state on the way without balance.
    """
    s = start.scene.structure
    way = _Way(analysis, start, target, q)
    ended = s.can_slack & ~members.taut(start.scene.potential(target).springs, way.end_elongation)
    unknown = np.full(s.members, np.nan)
    if not ended.any() or (s.members > LARGEST and not analysis.steps):
        return unknown
    steps = analysis.steps or STEPS
    if not all(way.add(float(share)) for share in np.arange(1, steps) / steps):
        return unknown
    for _ in range(ROUNDS):
        if not way.refine(ended):
            break
    return np.where(ended, way.first_crossing(), np.nan)


class _Way:
    """States at shares of the load, in order, with how loose each member is in them."""

    def __init__(self, analysis: Static, start: Rest, target: Acting, q: Array) -> None:
        self.analysis, self.start, self.target = analysis, start, target
        self.sigma = start.scene.potential(target).springs.sigma
        self.shares = [0.0, 1.0]
        self.states = [start.q, q]
        self.loose = [self._looseness(0.0, start.q), self._looseness(1.0, q)]

    @property
    def end_elongation(self) -> Array:
        """Elongation (N,) [m] in the target's state."""
        return -self.sigma * self.loose[-1]

    def _looseness(self, share: float, q: Array) -> Array:
        """How much each member is too long (N,) [m], below zero where taut."""
        acting = self.start.acting.between(self.target, share) if share < 1.0 else self.target
        return -self.sigma * self.start.scene.potential(acting).look(q).stretch.e

    def add(self, share: float) -> bool:
        """Find the state at a share of the load from the known one before it; False where there is none."""
        at = int(np.searchsorted(self.shares, share))
        found = at_share(self.analysis, self.start, self.target, share, self.states[at - 1], patient=False)
        if found.converged:
            self.shares.insert(at, share)
            self.states.insert(at, found.q)
            self.loose.insert(at, self._looseness(share, found.q))
        return found.converged

    def refine(self, ended: NDArray[np.bool_]) -> bool:
        """Add a state at each crossing predicted so far; False where all are known already."""
        predicted = np.unique(np.round(self.first_crossing()[ended], 9))
        known = np.array(self.shares)
        wanted = [p for p in predicted if 0.0 < p < 1.0 and np.abs(known - p).min() > SETTLED]
        return sum(self.add(float(share)) for share in wanted[:MOST_CROSSINGS]) > 0

    def first_crossing(self) -> Array:
        """Share at which each member first turns slack (N,); 0 where it starts so.

        Extrapolated from the two taut states before: once slack, a member flaps out fast, and a
        straight line to there would meet zero far too early. Halfway where that leads past the slack one.
        """
        shares, loose = np.array(self.shares), np.array(self.loose)
        slack = loose > 0
        first = np.where(slack.any(axis=0), slack.argmax(axis=0), len(shares) - 1)
        b, column = np.maximum(first - 1, 0), np.arange(loose.shape[1])
        earlier = np.where(b > 0, b - 1, first)  # with one taut state only, the line to the slack one
        run = shares[earlier] - shares[b]
        slope = (loose[earlier, column] - loose[b, column]) / np.where(run == 0, 1.0, run)
        ahead = np.where(slope > 0, -loose[b, column] / np.where(slope > 0, slope, 1.0), np.inf)
        width = shares[first] - shares[b]
        inside = (ahead >= 0) & (ahead < width)
        return np.where(first == 0, 0.0, shares[b] + np.where(inside, ahead, 0.5 * width))
