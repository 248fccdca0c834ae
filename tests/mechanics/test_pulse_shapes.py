"""Pulse shapes by their formulas, and exact impulses."""

from __future__ import annotations

import itertools
from array import array

import numpy as np
import pytest
from scipy.integrate import quad

from tautbar.mechanics.pulses import event_forces, shape_of
from tautbar.model.parts import Pulse

T, START = 0.04, 0.1
# Factor over x = t/T inside the pulse, and its mean over the pulse, by hand.
FORMULAS = {
    "rectangle": (lambda x: 1.0, 1.0),
    "half-sine": (lambda x: np.sin(np.pi * x), 2 / np.pi),
    "triangle": (lambda x: 2 * x if x < 0.5 else 2 - 2 * x, 0.5),
    "sawtooth": (lambda x: x, 0.5),
    "versed-sine": (lambda x: (1 - np.cos(2 * np.pi * x)) / 2, 0.5),
    "ramp": (lambda x: x, 0.5),
    "blast": (lambda x: (1 - x) * np.exp(-1.7 * x), (1.7 - 1 + np.exp(-1.7)) / 1.7**2),
    "trapezoid": (lambda x: min(x / 0.25, 1.0, (1 - x) / 0.375), 1 - (0.25 + 0.375) / 2),
}


def pulse(shape, **more):
    return Pulse("p", shape, T, START, ((((0,)), (1.0, 0.0, 0.0)),), rise=0.01, fall=0.015, decay=1.7, **more)


@pytest.mark.parametrize("name", FORMULAS)
def test_values_inside(name):
    formula, _ = FORMULAS[name]
    shape = shape_of(pulse(name))
    for x in (0.03, 0.21, 0.4, 0.61, 0.8, 0.97):
        t = START + x * T
        assert float(shape.at(t, t)) == pytest.approx(formula(x), abs=1e-13)


@pytest.mark.parametrize("name", FORMULAS)
def test_impulse_is_exact(name):
    """Means over the pieces between corners, summed: what steps that land on corners put in."""
    shape, (_, mean) = shape_of(pulse(name)), FORMULAS[name]
    edges = np.unique(np.concatenate([shape.corners, START + T * np.linspace(0, 1, 4)]))
    total = sum(shape.mean(a, b) * (b - a) for a, b in itertools.pairwise(edges))
    assert total == pytest.approx(mean * T, rel=1e-13)


@pytest.mark.parametrize("name", FORMULAS)
def test_nothing_before_and_only_a_ramp_afterwards(name):
    shape = shape_of(pulse(name))
    assert float(shape.at(START - 1e-9, START - 1e-9)) == 0.0
    after = START + T + 1e-9
    assert float(shape.at(after, after)) == (1.0 if name == "ramp" else 0.0)


@pytest.mark.parametrize(("name", "at", "before", "behind"), [
    ("rectangle", START, 0.0, 1.0), ("rectangle", START + T, 1.0, 0.0),
    ("sawtooth", START + T, 1.0, 0.0), ("blast", START, 0.0, 1.0),
])  # fmt: skip
def test_each_side_of_a_jump_has_its_own_value(name, at, before, behind):
    shape = shape_of(pulse(name))
    assert float(shape.at(at, at - 1e-6)) == pytest.approx(before, abs=1e-13)
    assert float(shape.at(at, at + 1e-6)) == pytest.approx(behind, abs=1e-13)


def test_corners_are_where_the_curves_break():
    assert shape_of(pulse("triangle")).corners == pytest.approx([0.1, 0.12, 0.14])
    assert shape_of(pulse("trapezoid")).corners == pytest.approx([0.1, 0.11, 0.125, 0.14])
    assert shape_of(pulse("half-sine")).corners == pytest.approx([0.1, 0.14])


@pytest.mark.parametrize("name", FORMULAS)
def test_curves_too_short_for_the_step_are_crossed_in_ten(name):
    """A half-sine within one step is zero at both of its ends: it must not be stepped over."""
    forces = event_forces([pulse(name)], joints=1)
    curved = name in ("half-sine", "versed-sine", "blast")
    short = forces.landings(T / 9.9)
    assert short.size == (11 if curved else shape_of(pulse(name)).corners.size)
    assert short[[0, -1]] == pytest.approx([START, START + T])
    if curved:
        assert np.diff(short) == pytest.approx(np.full(10, T / 10))
    assert forces.landings(T / 10) == pytest.approx(shape_of(pulse(name)).corners)


def test_trapezoid_without_flat_rise_or_fall():
    """The three degenerate trapezoids are a triangle, a falling and a rising sawtooth."""
    full = Pulse("p", "trapezoid", T, 0.0, (), rise=T / 2, fall=T / 2)
    for t in (0.2 * T, 0.7 * T):
        assert float(shape_of(full).at(t, t)) == pytest.approx(FORMULAS["triangle"][0](t / T), rel=1e-12)
    falling = shape_of(Pulse("p", "trapezoid", T, 0.0, (), rise=0.0, fall=T))
    rising = shape_of(Pulse("p", "trapezoid", T, 0.0, (), rise=T, fall=0.0))
    for t in (0.2 * T, 0.7 * T):
        assert float(falling.at(t, t)) == pytest.approx(1 - t / T, rel=1e-12)
        assert float(rising.at(t, t)) == pytest.approx(t / T, rel=1e-12)


def test_table_is_linear_between_rows_and_nothing_outside():
    times, factors = array("d", [0.0, 0.01, 0.03]), array("d", [0.5, 2.0, -1.0])
    shape = shape_of(Pulse("p", "table", 0.03, START, (), times=times, factors=factors))
    for t in (0.004, 0.017, 0.0299):
        assert float(shape.at(START + t, START + t)) == pytest.approx(np.interp(t, times, factors), abs=1e-12)
    for t in (-0.001, 0.031):
        assert float(shape.at(START + t, START + t)) == 0.0


def test_mean_over_a_step_is_the_integral():
    shape = shape_of(pulse("half-sine"))
    whole, _ = quad(lambda t: float(shape.at(t, t)), 0.11, 0.117, epsabs=1e-15)
    assert shape.mean(0.11, 0.117) == pytest.approx(whole / 0.007, rel=1e-12)


def test_forces_of_several_events_add_up():
    one = Pulse("a", "rectangle", T, 0.0, (((0, 2), (3.0, 0.0, 0.0)), ((2,), (0.0, 1.0, 0.0))))
    two = Pulse("b", "ramp", T, 0.0, (((2,), (0.0, 0.0, -4.0)),))
    forces = event_forces([one, two], joints=3).at(T / 2, T / 2)
    assert pytest.approx(np.array([[3.0, 0, 0], [0, 0, 0], [3.0, 1.0, -2.0]])) == forces.T
    assert event_forces([one, two], 3).landings(T) == pytest.approx([0.0, T])
    assert (event_forces([], 3).at(0.1, 0.1) == np.zeros((3, 3))).all()
