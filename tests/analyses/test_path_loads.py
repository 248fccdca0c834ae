"""Paths under growing loads that are not forces at joints, and paths of hanging ropes."""

from __future__ import annotations

import numpy as np
import pytest

import path_models as models
from tautbar.model.parts import Ice, LoadCase, Parts, Section, StopAt, Support, Wind


def test_temperature_as_the_growing_load() -> None:
    """A free toggle grows: its bars stay without force, l = L0 (1 + f alpha dT) exactly."""
    warm = LoadCase("growing", temperature_change=(((0, 1), 100.0),))
    record = models.path(models.toggle(case=warm), StopAt(load_factor=2.0), step=0.1)
    assert record.status == "complete", record.outcome
    f = record["load_factor"]
    z = np.sqrt((101.0) * (1 + 1e-3 * f) ** 2 - 100.0)
    # Lengths of 10 m to rounding, 1e-15, over a rise of 1 m.
    np.testing.assert_allclose(1.0 + record["displacement"][:, 2, 2], z, atol=1e-12)
    assert f[-1] == 2.0


def test_movement_of_a_support_as_the_growing_load() -> None:
    """Feet drawn apart under a load: the path of the span, at its end against the closed form."""
    apart = LoadCase("growing", movements=(((0,), (-0.02, 0, 0)), ((1,), (0.02, 0, 0))))
    parts = models.toggle(case=apart)
    parts.load_cases["constant"] = LoadCase("constant", forces=(((2,), (0, 0, -100.0)),))  # type: ignore[index]
    record = models.path(parts, StopAt(load_factor=1.0), step=0.1, constant=models.CONSTANT)
    assert record.status == "complete", record.outcome
    z = 1.0 + record["displacement"][-1, 2, 2]
    L, now = np.hypot(10, 1), np.hypot(10.02, z)
    assert 2e6 * (L - now) / L * z / now == pytest.approx(100.0, rel=1e-8)  # bars carry 1e5 times rounding
    np.testing.assert_allclose(record["displacement"][-1, :2, 0], [-0.02, 0.02], rtol=1e-15)


def hanging_rope() -> Parts:
    """A mass on two hanging ropes, pulled sideways: catenaries at both sides."""
    return models.structure(
        {"A": (0, 0, 0), "B": (20, 0, 3), "C": (9, 0, -2)},
        [
            models.member("AC", "hanging", unstressed_length=9.6),
            models.member("CB", "hanging", unstressed_length=12.4),
        ],
        [Support("ends", (0, 1), fixed=(0, 1, 2))],
        {"growing": models.push(2, (100.0, 0, 0)), "constant": LoadCase("constant", 1.0)},
        [Section("rope", axial_stiffness=2e6, mass_per_length=3.0)],
    )


@pytest.mark.parametrize("factor", [0.5, 6.0])
def test_hanging_ropes_take_part(factor: float) -> None:
    parts = hanging_rope()
    record = models.path(parts, StopAt(load_factor=factor), step=0.1, constant=models.CONSTANT)
    assert record.status == "complete", record.outcome
    alone = models.static(parts, factor)
    np.testing.assert_allclose(record["displacement"][-1], alone["displacement"][0], atol=1e-8)
    np.testing.assert_allclose(record["axial_force"][-1], alone["axial_force"][0], rtol=1e-7)


def test_weight_along_hanging_ropes_can_grow() -> None:
    """Ice that grows: the load enters through the catenaries, by differences."""
    parts = hanging_rope()
    parts.load_cases["growing"] = LoadCase("growing", line_loads=(((0, 1), (0, 0, -20.0)),))  # type: ignore[index]
    record = models.path(parts, StopAt(load_factor=3.0), step=0.1, constant=models.CONSTANT)
    assert record.status == "complete", record.outcome
    alone = models.static(parts, 3.0)
    np.testing.assert_allclose(record["axial_force"][-1], alone["axial_force"][0], rtol=1e-7)


def test_wind_that_grows_blows_on_ropes_widened_by_constant_ice() -> None:
    parts = hanging_rope()
    gale = Wind((0, 1), (1.0, 0.0, 0.0), (0.0,), (200.0,))
    ice = LoadCase("constant", self_weight=1.0, ice=(Ice((0, 1), 0.02, 900.0),))
    parts.load_cases.update(growing=LoadCase("growing", wind=(gale,)), constant=ice)  # type: ignore[attr-defined]
    record = models.path(parts, StopAt(load_factor=2.0), step=0.1, constant=models.CONSTANT)
    alone = models.static(parts, 2.0)  # both cases in one loading
    np.testing.assert_allclose(record["axial_force"][-1], alone["axial_force"][0], rtol=1e-7)
    parts.load_cases.update(constant=LoadCase("constant", self_weight=1.0))  # type: ignore[attr-defined]
    bare = models.path(parts, StopAt(load_factor=2.0), step=0.1, constant=models.CONSTANT)
    assert "no load grows" in bare.outcome  # a rope without a width takes no wind
    pushed = (record["reaction"][-1].sum(axis=0) - record["reaction"][0].sum(axis=0))[0]
    # 400 Pa on rings of 40 mm, sin^3 of the angle between wind and chord along it (as drawn).
    chords = np.array([[9.0, -2.0], [11.0, 5.0]])
    l = np.hypot(*chords.T)
    wanted = -400.0 * 0.04 * (l * np.abs(chords[:, 1] / l) ** 3).sum()
    assert pushed == pytest.approx(wanted, rel=1e-9)
