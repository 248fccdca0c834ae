"""The loop over time: the only place that decides how far each step goes.

Times come from step numbers, never from summing; the end and every corner of an event are landed on.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.errors import NotConverged
from tautbar.solvers.motion import Motion, Step, StepNotConverged, Stepper

Array = NDArray[np.float64]
MAX_HALVINGS = 8  # to 1/256 of the step asked for; beyond that suspect the model
GOOD_STEPS = 4  # before a halved step is doubled again


class Marched(NamedTuple):
    """A computed step; ``number`` is that of the regular step it completes, else None."""

    step: Step
    number: int | None
    halvings: int


def step_times(duration: float, time_step: float) -> Array:
    """Regular instants [s] from 0 to the end, the last step shortened where needed."""
    count = max(1, int(np.ceil(duration / time_step - 1e-9)))
    times: Array = time_step * np.arange(count + 1.0)
    times[-1] = duration
    return times


def march(motion: Motion, stepper: Stepper, first: Step, times: Array) -> Iterator[Marched]:
    """Yield the start, then every computed step up to the last of ``times``.

    Raises
    ------
    NotConverged
        A step failed even at 1/256 of its length; all steps before it were yielded.
    """
    yield Marched(first, 0, 0)
    corners = motion.events.landings(float(times[1] - times[0]))
    latest, pace = first, _Pace()
    for number in range(1, times.size):
        for end in _landings(times[number - 1], times[number], corners):
            for step in _cross(motion, stepper, latest, end, pace):
                done = number if step.state.t == times[number] else None
                yield Marched(step, done, pace.halvings)
                latest = step


def _landings(t0: float, t1: float, corners: Array) -> Array:
    """Corners strictly inside a regular step, and its end; corners within rounding of either are them."""
    tiny = 1e-9 * (t1 - t0)
    inside = corners[(corners > t0 + tiny) & (corners < t1 - tiny)]
    return np.append(inside, t1)


class _Pace:
    """How far steps are halved now, kept from one stretch of time to the next."""

    def __init__(self) -> None:
        self.halvings = 0
        self.good = 0


def _cross(motion: Motion, stepper: Stepper, step: Step, end: float, pace: _Pace) -> Iterator[Step]:
    """Steps from ``step`` to the instant ``end``, halved where they fail and doubled after good ones."""
    start, whole = step.state.t, 2**MAX_HALVINGS
    done = 0
    while done < whole:
        ticks = whole >> pace.halvings
        t = end if done + ticks == whole else start + (end - start) * (done + ticks) / whole
        try:
            step = stepper.step(motion, step.state, t)
        except StepNotConverged:
            _halve(pace, step.state.t, t)
            continue
        done += ticks
        pace.good += 1
        if pace.halvings and pace.good >= GOOD_STEPS and done % (2 * ticks) == 0:
            pace.halvings, pace.good = pace.halvings - 1, 0
        yield step


def _halve(pace: _Pace, t0: float, t1: float) -> None:
    if pace.halvings == MAX_HALVINGS:
        raise NotConverged(
            f"the step from {t0:.6g} s to {t1:.6g} s finds no balance, even at 1/{2**MAX_HALVINGS} of the "
            "step asked for; look at the members that snap there, or give them a retardation_time"
        )
    pace.halvings, pace.good = pace.halvings + 1, 0
