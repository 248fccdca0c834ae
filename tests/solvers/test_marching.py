"""The loop over time: landing, numbering, halving and its limits, with steppers made for the purpose."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest

from tautbar.errors import NotConverged
from tautbar.solvers.march import GOOD_STEPS, MAX_HALVINGS, march, step_times
from tautbar.solvers.motion import StepNotConverged


def motion_with(*corners):
    return SimpleNamespace(events=SimpleNamespace(landings=lambda _step: np.array(corners, dtype=float)))


class Recorder:
    """A stepper that keeps what was asked, and refuses steps longer than ``most`` inside a stretch."""

    def __init__(self, most=np.inf, trouble=(0.0, np.inf)):
        self.most, self.trouble, self.asked = most, trouble, []

    def step(self, motion, now, t):
        dt = t - now.t
        self.asked.append((now.t, t))
        if dt > self.most * (1 + 1e-9) and self.trouble[0] <= now.t < self.trouble[1]:
            raise StepNotConverged
        return SimpleNamespace(state=SimpleNamespace(t=t))


def go(stepper, times, *corners):
    first = SimpleNamespace(state=SimpleNamespace(t=0.0))
    return list(march(motion_with(*corners), stepper, first, np.asarray(times)))


def test_times_come_from_numbers_and_include_the_end():
    times = step_times(0.35, 0.1)
    assert times == pytest.approx([0, 0.1, 0.2, 0.3, 0.35])
    assert times[-1] == 0.35
    assert step_times(3.0, 0.001)[-1] == 3.0
    assert step_times(3.0, 0.001).size == 3001, "3/0.001 rounds up to a hair above 3000"
    assert step_times(1.0, 5.0) == pytest.approx([0.0, 1.0])


def test_every_regular_instant_and_every_corner_is_landed_on_exactly():
    done = go(Recorder(), step_times(0.35, 0.1), 0.0, 0.13, 0.2, 0.3 + 1e-12, 0.34)
    assert [m.step.state.t for m in done] == [0.0, 0.1, 0.13, 0.2, 0.30000000000000004, 0.34, 0.35]
    assert [m.number for m in done] == [0, 1, None, 2, 3, None, 4]


def test_a_hard_stretch_is_halved_and_the_step_restored_after():
    stepper = Recorder(most=0.03, trouble=(0.15, 0.25))
    done = go(stepper, step_times(1.0, 0.1))
    times = [m.step.state.t for m in done]
    assert np.diff(times).min() == pytest.approx(0.025)
    assert np.diff(times)[-1] == pytest.approx(0.1), "restored"
    assert [m.step.state.t for m in done if m.number is not None] == list(step_times(1.0, 0.1))
    assert max(m.halvings for m in done) == 2
    assert done[-1].halvings == 0


def test_halving_is_kept_for_some_good_steps():
    """Restoring at once would fail, halve and fail again."""
    stepper = Recorder(most=0.05, trouble=(0.1, 0.15))
    done = go(stepper, step_times(0.6, 0.1))
    halved = [m for m in done if m.halvings == 1]
    assert len(halved) >= GOOD_STEPS - 1


def test_a_step_that_never_balances_ends_the_march_with_its_past_kept():
    stepper = Recorder(most=1e-9, trouble=(0.2, np.inf))
    first = SimpleNamespace(state=SimpleNamespace(t=0.0))
    steps = march(motion_with(), stepper, first, step_times(1.0, 0.1))
    assert [next(steps).step.state.t for _ in range(3)] == pytest.approx([0.0, 0.1, 0.2])
    with pytest.raises(NotConverged, match=r"from 0\.2 s to .* finds no balance, even at 1/256"):
        next(steps)
    assert min(b - a for a, b in stepper.asked) == pytest.approx(0.1 / 2**MAX_HALVINGS)
