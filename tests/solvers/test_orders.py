"""Measured orders of convergence in time, against closed forms and an outside integrator."""

from __future__ import annotations

import numpy as np
import pytest
from moving import motion_of, run
from scipy.integrate import solve_ivp

import structures
from tautbar.solvers.conserving import EnergyConserving
from tautbar.solvers.newmark import Newmark

METHODS = {"newmark": Newmark, "conserving": lambda: EnergyConserving(capture=False)}


def orders(errors):
    """Between neighbours, each of half the step of the one before."""
    return np.log2(np.array(errors[:-1]) / np.array(errors[1:]))


# A soft bar swinging in a plane: large turns, large strains, both kinds of nonlinearity.
LENGTH, EA, MASS, G = 2.0, 4000.0, 10.0, 9.80665


def pendulum():
    described = structures.words(
        {"hook": (0, 0, 0), "bob": (LENGTH, 0, 0)},
        [structures.member("bar", "hook", "bob", section="soft")],
        sections={"soft": {"axial_stiffness": EA, "mass_per_length": 0.0}},
        supports=[structures.held("hook"), {"joints": ["bob"], "fixed": ["y"]}],
        masses=[{"joints": ["bob"], "mass": MASS}],
    )
    return motion_of(described, "dead")[1]


def pendulum_reference(t):
    def rate(_, y):
        l = np.hypot(y[0], y[1])
        pull = EA * (l / LENGTH - 1) / l / MASS
        return [y[2], y[3], -pull * y[0], -pull * y[1] - G]

    return solve_ivp(rate, (0, t), [LENGTH, 0, 0, 0], method="DOP853", rtol=1e-12, atol=1e-13).y[:, -1]


@pytest.mark.parametrize("method", METHODS)
def test_second_order_on_a_swinging_elastic_bar(method):
    motion, end = pendulum(), 1.6
    reference = pendulum_reference(end)
    errors = []
    for steps in (200, 400, 800):
        last = run(motion, METHODS[method](), np.zeros(2), end / steps * np.arange(steps + 1))[-1].state
        found = np.concatenate([last.q + np.array([LENGTH, 0.0]), last.v])
        errors.append(np.abs(found - reference).max())
    # Orders of smooth problems scatter by a few per cent at these steps.
    assert orders(errors) == pytest.approx([2.0, 2.0], abs=0.1)
    assert errors[-1] < 2e-3


def test_newmark_with_gamma_above_a_half_is_of_first_order():
    """The rule that makes the order: 1/2 exactly. A wrong gamma in any line would break one of the two."""
    motion, end = pendulum(), 0.4
    reference = pendulum_reference(end)
    errors = []
    for steps in (400, 800, 1600):
        last = run(motion, Newmark(0.36, 0.7), np.zeros(2), end / steps * np.arange(steps + 1))[-1].state
        errors.append(np.abs(last.v - reference[2:]).max())
    assert orders(errors)[-1] == pytest.approx(1.0, abs=0.1)


# A mass on a tie without weight: straight flight while slack, a half sine while taut.
DROP, M, K = 0.5, 80.0, 4.0e5 / 4.5


def bounce(t):
    """Height below the hook's slack point and velocity, downward positive, of the closed form."""
    omega = np.sqrt(K / M)
    contact, hit = np.pi / omega, DROP / 3.0
    if t <= hit:
        return -DROP + 3.0 * t, 3.0
    if t <= hit + contact:
        return 3.0 / omega * np.sin(omega * (t - hit)), 3.0 * np.cos(omega * (t - hit))
    return -3.0 * (t - hit - contact), -3.0


def bounce_errors(stepper, steps_list):
    """Greatest error of position and velocity (over omega) at the end, tie slack, taut, slack again."""
    _, motion = motion_of(structures.bouncer(drop=DROP, mass=M) | {"gravity": 0.0})
    errors = []
    for steps in steps_list:
        end = DROP / 3.0 + 1.31 * np.pi / np.sqrt(K / M)
        last = run(motion, stepper(), np.array([-3.0]), end / steps * np.arange(steps + 1))[-1].state
        x, v = bounce(end)
        errors.append(max(abs(-last.q[0] - DROP - x), abs(-last.v[0] - v) / np.sqrt(K / M)))
    return errors


def fitted_order(steps, errors):
    """Slope of a straight line through all of them: kinks make single pairs scatter."""
    return -np.polyfit(np.log(steps), np.log(errors), 1)[0]


STEPS = np.array([53, 97, 151, 263, 431, 769, 1301])


def test_conserving_is_of_second_order_through_kinks():
    """No step lands on the instants of going taut and slack; exact energy keeps the order all the same.

    A contact is entered at any phase of a step, so the errors scatter around their line; 0.3 is what
    seven of them leave of that.
    """
    errors = bounce_errors(lambda: EnergyConserving(capture=False), STEPS)
    assert fitted_order(STEPS, errors) == pytest.approx(2.0, abs=0.3)


def test_capture_keeps_order_two():
    """It loses at most k p1^2/2 a snap, p1 at most the way of one step: second order."""
    errors = bounce_errors(EnergyConserving, STEPS)
    assert fitted_order(STEPS, errors) == pytest.approx(2.0, abs=0.5)


def test_average_acceleration_comes_through_too_and_flies_on_with_nothing_acting():
    """After the bounce no force is left to measure a tolerance by; its order there is erratic, about 2."""
    errors = bounce_errors(Newmark, STEPS)
    assert fitted_order(STEPS, errors) == pytest.approx(2.0, abs=0.5)


def test_a_snap_loses_at_most_what_the_step_can_hold():
    _, motion = motion_of(structures.bouncer(drop=DROP, mass=M) | {"gravity": 0.0})
    omega = np.sqrt(K / M)
    for steps in STEPS:
        dt = 0.3 / steps
        lost = sum(
            s.dissipated for s in run(motion, EnergyConserving(), np.array([-3.0]), dt * np.arange(steps + 1))
        )
        assert 0 <= lost <= M * 3.0**2 * (omega * dt) ** 2 / 2
