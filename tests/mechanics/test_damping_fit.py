"""Rayleigh damping meets the ratios it was given."""

from __future__ import annotations

import numpy as np
import pytest

from tautbar.mechanics.damping import rayleigh
from tautbar.model.parts import Damping


def ratio_at(c, hertz):
    omega = 2 * np.pi * hertz
    return c.mass_part / (2 * omega) + c.stiffness_part * omega / 2


@pytest.mark.parametrize("ratio", [(0.02,), (0.02, 0.05)])
def test_both_frequencies_get_their_ratio(ratio):
    c = rayleigh(Damping(ratio, (2.0, 20.0)), with_mass_part=True)
    assert ratio_at(c, 2.0) == pytest.approx(ratio[0], rel=1e-12)
    assert ratio_at(c, 20.0) == pytest.approx(ratio[-1], rel=1e-12)


def test_without_the_mass_part_the_highest_frequency_is_met():
    c = rayleigh(Damping((0.02, 0.05), (20.0, 2.0)), with_mass_part=False)
    assert c.mass_part == 0.0
    assert ratio_at(c, 20.0) == pytest.approx(0.02, rel=1e-12)


def test_one_frequency_is_met_at_its_least():
    c = rayleigh(Damping((0.03,), (5.0,)), with_mass_part=True)
    assert ratio_at(c, 5.0) == pytest.approx(0.03, rel=1e-12)
    assert min(ratio_at(c, 4.9), ratio_at(c, 5.1)) > ratio_at(c, 5.0)


def test_no_damping_is_none():
    assert rayleigh(None, True) == (0.0, 0.0)
