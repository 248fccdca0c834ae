"""Free swings of large amplitude: pendulums, masses across cables, springs that work one way."""

from __future__ import annotations

from functools import cache
from typing import Any

import numpy as np
import pytest
from published import HELD, crossings, extrapolated, values
from scipy.special import ellipk

import tautbar
from tautbar.analyses.memory import Answer

G = 9.80665
C22, C24 = values("C22"), values("C24")
METHODS = ["energy-conserving", "newmark"]
STEPS = (200, 400)  # a period; extrapolated
ANGLES = (30, 60, 90, 120, 170)


def pendulums(stiff: float, g: float = G) -> tautbar.Model:
    """Pendulums of 1 m and 1 kg drawn at each angle, their links as tensioned there as gravity will make
    them; EA is ``stiff`` times the weight."""
    at = {f"p{a}": np.deg2rad(a) for a in ANGLES}
    joints = {p: [np.sin(a), float(i), -np.cos(a)] for i, (p, a) in enumerate(at.items())}
    pivots = {f"pivot {p}": [0, float(i), 0] for i, p in enumerate(at)}
    return tautbar.Model(
        gravity=g,
        sections={"link": {"axial_stiffness": stiff * g, "mass_per_length": 0}},
        joints=joints | pivots,
        members=[
            {"name": p, "from": f"pivot {p}", "to": p, "section": "link", "pretension": g * np.cos(a)}
            for p, a in at.items()
        ],
        supports=[{"joints": list(pivots), "fixed": HELD}, {"joints": list(at), "fixed": ["y"]}],
        masses=[{"joints": list(at), "mass": 1.0}],
        load_cases={"weight": {"self_weight": 1.0}},
    )


@cache
def swings(method: str, g: float, steps: int = 8000) -> Answer:
    """0.65 of the period of small swings, which is past the first passage of all angles, in steps of 1/8000
    of it: the methods elongate periods by (omega dt)^2/12 = 5e-8 for small swings, and the links (EA 1e8
    weights) stretch by 3e-8."""
    T0 = 2 * np.pi * np.sqrt(1.0 / g)
    return tautbar.solve_history(
        pendulums(1e8, g), loads="weight", duration=0.65 * T0, time_step=T0 / steps, method=method
    )


def period(answer: Answer, angle: int) -> float:
    """Four times the time to the first passage of the lowest point [s]."""
    x = answer.displacement(f"p{angle}")[:, 0] + np.sin(np.deg2rad(angle))
    return float(4 * crossings(answer["time"], x, answer.joint("velocity", f"p{angle}")[:, 0])[0])


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("angle", ANGLES)
def test_period_of_a_pendulum(angle: int, method: str) -> None:
    """READ in a table (T/T0, six decimals); CLOSED FORM 2/pi K(sin(angle/2)). 1e-6, as the data say."""
    ratio = period(swings(method, G), angle) / (2 * np.pi * np.sqrt(1.0 / G))
    assert ratio == pytest.approx(2 / np.pi * ellipk(np.sin(np.deg2rad(angle) / 2) ** 2), rel=1e-6)
    assert ratio == pytest.approx(C22[f"T/T0 {angle} deg"]["published"], rel=1e-6)


@pytest.mark.parametrize("angle", [30, 60])
def test_period_of_a_pendulum_in_seconds(angle: int) -> None:
    """READ on a university's page, 15 digits for g = 9.81. 1e-6; extrapolated from 400 and 800 steps."""
    found = [period(swings("energy-conserving", 9.81, n), angle) for n in (400, 800)]
    assert extrapolated(*found) == pytest.approx(C22[f"T {angle} deg, g=9.81"]["published"], rel=1e-6)


@pytest.mark.parametrize("method", METHODS)
def test_greatest_tension_of_a_pendulum(method: str) -> None:
    """CLOSED FORM 3 - 2 cos(angle) weights at the lowest point: 1e-6, as the data say."""
    answer = swings(method, G)
    for angle in ANGLES:
        greatest = answer.member("peaks/axial_force/max", f"p{angle}") / G
        assert greatest == pytest.approx(3 - 2 * np.cos(np.deg2rad(angle)), rel=1e-6)
    assert answer.member("peaks/axial_force/max", "p90") / G == pytest.approx(
        C22["max tension/mg at 90 deg"]["published"], rel=1e-6
    )


# ---------------------------------------------------------------- a mass across or along cables (C24)


def across(amplitude: float, T0: float) -> tautbar.Model:
    """100 kg in the middle of two links of 5 m, EA 1 MN, drawn and let go at the amplitude [m]."""
    link = {"section": "link", "kind": "tension-only", "unstressed_length": 5 / (1 + T0 / 1e6)}
    return tautbar.Model(
        plane="xz",
        sections={"link": {"axial_stiffness": 1e6}},
        joints={"A": [-5, 0], "M": [0, amplitude], "B": [5, 0]},
        members=[{"name": "a", "from": "A", "to": "M"} | link, {"name": "b", "from": "M", "to": "B"} | link],
        supports=[{"joints": ["A", "B"], "fixed": ["x", "z"]}],
        masses=[{"joints": ["M"], "mass": 100}],
    )


def free_period(
    model: tautbar.Model, about: float, axis: int, guess: float, steps: int, **more: Any
) -> float:
    """Period [s] of mass M let go where it is drawn, from its passages of rest; ``steps`` a period."""
    answer = tautbar.solve_history(model, duration=1.6 * guess, time_step=guess / steps, **more)
    x = answer.displacement("M")[:, axis] + about
    passed = crossings(answer["time"], x, answer.joint("velocity", "M")[:, axis])
    return float(passed[2] - passed[0])


CONSERVING = {"method": "energy-conserving", "snap_loss": "none"}


@pytest.mark.parametrize(
    ("T0", "quantity", "more"),
    [
        (0, "two-link T0=0, A=0.1: period", CONSERVING),
        (2000, "two-link T0=2000, A=0.1", CONSERVING),
        (20000, "two-link T0=20000, A=0.1", CONSERVING),
        (20000, "two-link T0=20000, A=0.1", {"method": "newmark"}),
    ],
)
def test_mass_across_a_cable(T0: float, quantity: str, more: dict[str, Any]) -> None:
    """CLOSED FORM (exact period by quadrature, 10 digits). 1e-6, as the data say; extrapolated."""
    exact = C24[quantity]["computed"]
    # Newmark's ledger closes to 1e-6 of the motion's energy only at half the step.
    steps = STEPS if more == CONSERVING else tuple(2 * n for n in STEPS)
    found = [free_period(across(0.1, T0), 0.1, 2, exact, n, **more) for n in steps]
    assert extrapolated(*found) == pytest.approx(exact, rel=1e-6)


def test_average_acceleration_loses_the_energy_of_a_cubic_spring() -> None:
    """The hardest of these: its ledger is 1e-4 out at 400 steps a period, and the answer is refused."""
    with pytest.raises(tautbar.AnalysisFailed, match="ledger"):
        free_period(across(0.1, 0), 0.1, 2, 8.29, 400, method="newmark")


def test_cubic_spring() -> None:
    """READ: the integral of 1/sqrt(1 - x^4) is 2.622, hence T A sqrt(c/m) = 7.416 (CLOSED FORM 7.416298709).

    Two links without pretension are a cubic spring c = EA/L^3 for small amplitudes: at A/L = 1e-3 their
    period is 3e-7 off it. 1e-6.
    """
    A = 0.005
    rate = A * np.sqrt(1e6 / 5**3 / 100)
    exact = C24["T A sqrt(c/m), cubic spring"]["computed"]
    found = [free_period(across(A, 0), A, 2, exact / rate, n, **CONSERVING) for n in (400, 800)]
    assert extrapolated(*found) * rate == pytest.approx(exact, rel=1e-6)
    assert round(extrapolated(*found) * rate, 3) == C24["T A sqrt(c/m), cubic spring"]["published"]


def along(amplitude: float, left: dict[str, Any], right: dict[str, Any]) -> tautbar.Model:
    """100 kg between walls 2 m apart, drawn at the amplitude from the middle; a spring [N/m] on each side."""
    springs = [
        {"name": "a", "from": "left", "to": "M"} | left,
        {"name": "b", "from": "M", "to": "right"} | right,
    ]
    return tautbar.Model(
        sections={s["name"]: {"stiffness": s["stiffness"]} for s in springs},
        joints={"left": [-1, 0, 0], "M": [amplitude, 0, 0], "right": [1, 0, 0]},
        members=[{k: v for k, v in s.items() if k != "stiffness"} | {"section": s["name"]} for s in springs],
        supports=[{"joints": ["left", "right"], "fixed": HELD}, {"joints": ["M"], "fixed": ["y", "z"]}],
        masses=[{"joints": ["M"], "mass": 100}],
    )


@pytest.mark.parametrize("amplitude", [0.02, 0.05])
def test_mass_between_opposed_cables(amplitude: float) -> None:
    """CLOSED FORM: one cable goes slack at 10 mm (k 100 kN/m, T0 1 kN). 1e-6, as the data say; the kinks
    leave the method of second order, so that it can be extrapolated."""
    exact = C24[f"opposed cables A={amplitude} m"]["computed"]
    cable = {"kind": "tension-only", "stiffness": 1e5, "unstressed_length": 1 - 1000 / 1e5}
    model = along(amplitude, cable, cable)
    coarse, fine = (free_period(model, amplitude, 0, exact, n, **CONSERVING) for n in STEPS)
    assert (coarse - exact) / (fine - exact) == pytest.approx(4, rel=0.02)
    assert extrapolated(coarse, fine) == pytest.approx(exact, rel=1e-6)


def test_bilinear_oscillator() -> None:
    """RECALLED: Shaw and Holmes (1983), omega = 2 w1 w2/(w1 + w2). 1e-6, as the data say.

    A bar of 40 kN/m and, one way only, a cable of 60 kN/m at its very length: w = 20 and sqrt(1000) rad/s.
    """
    expected = C24["bilinear 2w1w2/(w1+w2)"]["published"]
    assert expected == pytest.approx(2 * 20 * np.sqrt(1000) / (20 + np.sqrt(1000)), rel=1e-9)
    bar = {"stiffness": 4e4, "unstressed_length": 1.0}
    cable = {"kind": "tension-only", "stiffness": 6e4, "unstressed_length": 1.0}
    found = [
        free_period(along(0.02, bar, cable), 0.02, 0, 2 * np.pi / expected, n, **CONSERVING) for n in STEPS
    ]
    assert 2 * np.pi / extrapolated(*found) == pytest.approx(expected, rel=1e-6)
