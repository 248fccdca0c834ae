"""Equilibrium paths by arc length, through limit points, snap-through and snap-back.

Cylindrical arc length (displacements alone measure it) with the tangent as predictor; the step that was
accepted is searched for members that go slack or taut and for critical points. At a switch the path
starts anew with the other active set.

Sources: M. A. Crisfield, Comput. Struct. 13 (1981) 55-62; E. Ramm, in Nonlinear Finite Element Analysis
in Structural Mechanics, Springer 1981, 63-89; count of negative pivots: J. J. Sylvester 1852.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import NotFinite, Singular
from tautbar.solvers import path_events as events
from tautbar.solvers.path_arc import Arc, Lost
from tautbar.solvers.path_correct import Border, Spot, State, ahead, correct, examine, spot_at
from tautbar.solvers.path_events import Critical
from tautbar.solvers.path_family import Family

Array = NDArray[np.float64]
SWING = 0.2  # rad, wanted between the tangents of two points
FARTHEST = 0.03  # of the model's size: most that a joint moves in a step
BEND = 0.03  # of the load factors met so far: wanted error of the predictor
RISE = 0.8  # of the load factors met so far: most that the load factor is predicted to change in a step
WANTED_ITERATIONS = 4
SHORTEST = 1e-7  # of the first step
FAR_AWAY = 50.0  # times the model's size: nothing is sought beyond
IDLE = 1e-13  # of the model's size: a load factor of one that moves joints by less moves nothing
REACHED, STUCK, LOOSE, NO_SET, FAR, TOO_LONG, NO_MOTION = (
    "reached",
    "stuck",
    "loose",
    "no set",
    "far away",
    "too many steps",
    "no motion",
)


@dataclass(frozen=True)
class Stop:
    """Where a path ends: at a condition (load factor or displacement), or after so many limit points
    or steps; ``at_loss``: where stability is lost first. ``most`` steps are a guard."""

    border: Border | None = None
    limit_points: int | None = None
    steps: int | None = None
    at_loss: bool = False
    most: int = 2000

    def ends(self, before: list[Critical], point: Critical) -> bool:
        """Whether a critical point after some others is the end."""
        if self.at_loss and point.negative[1] > point.negative[0]:
            return True
        limits = sum(c.kind == events.LIMIT for c in (*before, point))
        return point.kind == events.LIMIT and limits == self.limit_points


@dataclass
class Trace:
    """A path as found: points in order, the critical ones among them, and how it ended.

    ``last`` is the state reached, with the way on from it;
    ``negative`` counts the negative pivots on the way to each point (at a critical point itself they are
    rounding); ``places`` says at which point each critical point is; ``onset`` (N,) is the load factor at
    which each member first went slack, NaN for those that never did.
    """

    spots: list[Spot]
    last: State
    negative: list[int]
    onset: Array
    critical: list[Critical] = field(default_factory=list)
    places: list[int] = field(default_factory=list)
    ending: str = ""

    @property
    def reached(self) -> bool:
        return self.ending == REACHED

    @property
    def range(self) -> float:
        """How much the load factor varied so far."""
        f = [spot.f for spot in self.spots]
        return max(f) - min(f)


@dataclass(frozen=True)
class _Stride:
    """One step, cut where it has to end: a member switches there, or the path stops."""

    arc: Arc
    critical: list[tuple[float, Critical]]
    switches: bool
    stops: bool


def start_state(family: Family, q: Array, f: float, way: float = 1.0) -> State | None:
    """The state to start a path from, given a position in balance; ``way`` -1: with the load shrinking.

    None where no set of members that carry agrees with the motion the load causes.

    Raises
    ------
    Singular, NotFinite
        The tangent cannot be factorised, not even nudged.
    """
    return events.first_set(family, spot_at(family, family.carrying(q, f), q, f), way)


def idle(family: Family, state: State) -> bool:
    """Whether the growing load moves nothing from there, so that a path cannot be measured by motion."""
    return bool(abs(state.rise) * IDLE * family.system.structure.size > 1.0) or not state.along.any()


def trace(family: Family, start: State, step: float, stop: Stop) -> Trace:
    """Follow the path from a state that `start_state` gave; ``step`` is the first one of the load factor."""
    return _Walk(family, start, step, stop).go()


class _Walk:
    """A path being followed: the state at hand, the length of the next step, and what was found."""

    def __init__(self, family: Family, start: State, step: float, stop: Stop) -> None:
        self.family, self.stop, self.step = family, stop, step
        off = family.switchable & ~start.spot.on
        onset = np.where(off, start.spot.f, np.nan)
        self.trace = Trace([start.spot], start, [start.negative], onset)
        self.length = min(step / max(abs(start.rise), 1e-300), self._farthest(start))
        self.shortest = SHORTEST * self.length

    def go(self) -> Trace:
        """Steps until an ending."""
        border = self.stop.border
        if border is not None and border.gap(self.trace.last.spot.q, self.trace.last.spot.f) == 0.0:
            self.trace.ending = REACHED
        while not self.trace.ending:
            length = self.length
            try:
                self._take(self._stride(length))
            except (Lost, NotFinite, Singular):
                self.length = 0.4 * length
                if self.length < self.shortest:
                    self.trace.ending = STUCK
        return self.trace

    def _farthest(self, state: State) -> float:
        system = self.family.system
        return FARTHEST * system.structure.size / system.greatest_joint_move(state.along)

    @property
    def _range(self) -> float:
        return max(self.trace.range, self.step)

    def _stride(self, length: float) -> _Stride:
        """The next step, searched and cut; sets the length of the one after it.

        Raises
        ------
        Lost, NotFinite, Singular
            The step is too long.
        """
        here = self.trace.last
        f = here.spot.f + length * here.rise
        spot = correct(self.family, here.spot.on, here.spot.q + length * here.along, f, ahead(here, length))
        if spot is None:
            raise Lost
        there = examine(self.family, spot, here.along)
        arc = Arc(self.family, here, there, length)
        if not self._close(here, there, f) or events.dips(arc) or events.turned_back(arc):
            raise Lost
        switch = events.first_switch(arc)
        if switch is not None:
            arc = arc.cut(switch)
        arc, stops = self._cut_at_stop(arc)
        critical = events.critical_points(arc)
        self.length = self._next_length(here, there, f, length)
        return self._cut_at_critical(_Stride(arc, critical, switch is not None and not stops, stops))

    def _close(self, here: State, there: State, predicted: float) -> bool:
        """Whether the point found is on the same stretch of path as the predictor."""
        turned = float(here.along @ there.along)
        return turned > 0.8 and abs(there.spot.f - predicted) <= 8 * BEND * self._range

    def _next_length(self, here: State, there: State, predicted: float, length: float) -> float:
        """By iterations, turn of the tangent and bend of the load over the step just made."""
        swing = float(np.arccos(np.clip(here.along @ there.along, -1.0, 1.0)))
        bend = abs(there.spot.f - predicted) / (BEND * self._range)
        factor = min(
            2.0,
            float(np.sqrt(WANTED_ITERATIONS / max(there.spot.iterations, 1))),
            SWING / max(swing, 1e-9),
            float(np.sqrt(1.0 / max(bend, 1e-9))),
        )
        return self._bounded(length * max(factor, 0.3), there)

    def _bounded(self, length: float, state: State) -> float:
        steepest = RISE * self._range / max(abs(state.rise), 1e-300)
        return max(min(length, steepest, self._farthest(state)), self.shortest)

    def _cut_at_stop(self, arc: Arc) -> tuple[Arc, bool]:
        border = self.stop.border
        at = None if border is None else events.land(arc, border)
        if border is None or at is None:
            return arc, False
        spot = events.land_exactly(arc, at, border)
        return arc.cut(at, examine(self.family, spot, arc.start.along)), True

    def _cut_at_critical(self, stride: _Stride) -> _Stride:
        """Ends at the critical point that was asked for."""
        before = list(self.trace.critical)
        for i, (s, point) in enumerate(stride.critical):
            if self.stop.ends(before, point):
                return _Stride(stride.arc.cut(s), stride.critical[: i + 1], False, True)
            before.append(point)
        return stride

    def _take(self, stride: _Stride) -> None:
        """Record a step: what happens on it, its end, and how to go on from there."""
        arc = stride.arc
        for s, critical in stride.critical:
            self._record(arc.state(s), critical.negative[0])
            self._mark(critical)
        ended_at_limit = stride.stops and bool(stride.critical) and stride.critical[-1][0] == arc.length
        if not ended_at_limit:
            self._record(arc.end, arc.end.negative)
        self.trace.last = arc.end
        if stride.switches:
            self._switch(arc.end)
        if stride.stops:
            self.trace.ending = REACHED
        if not self.trace.ending:
            self._guard()

    def _record(self, state: State, negative: int) -> None:
        if self.stop.steps is None or len(self.trace.spots) <= self.stop.steps:
            self.trace.spots.append(state.spot)
            self.trace.negative.append(negative)

    def _mark(self, critical: Critical) -> None:
        if self.stop.steps is None or len(self.trace.spots) <= self.stop.steps + 1:
            self.trace.critical.append(critical)
            self.trace.places.append(len(self.trace.spots) - 1)

    def _switch(self, landed: State) -> None:
        """Start anew with the other active set."""
        after = events.change_set(self.family, landed)
        if after is None:
            self.trace.ending = NO_SET
            return
        slack = self.family.switchable & landed.spot.on & ~after.spot.on & np.isnan(self.trace.onset)
        self.trace.onset[slack] = landed.spot.f
        point = events.kink(landed, after)
        if point is not None:
            ends = self.stop.ends(self.trace.critical, point)
            self._mark(point)
            if ends:
                self.trace.ending = REACHED
        self.trace.last = after
        if not self.trace.ending and not after.held:
            self.trace.ending = LOOSE
        if not self.trace.ending and idle(self.family, after):
            self.trace.ending = NO_MOTION
        if self.trace.ending:
            return
        self.length = self._bounded(min(self.length, 0.1 * self._range / max(abs(after.rise), 1e-300)), after)

    def _guard(self) -> None:
        """End after the steps asked for, far away, or after very many steps."""
        count = len(self.trace.spots) - 1
        system = self.family.system
        if self.stop.steps is not None and count >= self.stop.steps:
            self.trace.ending = REACHED
        elif system.greatest_joint_move(self.trace.last.spot.q) > FAR_AWAY * system.structure.size:
            self.trace.ending = FAR
        elif count >= self.stop.most:
            self.trace.ending = TOO_LONG
