"""The least tension that a hanging rope can have at its lower end."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tautbar.mechanics import catenary

W = 50.0  # N/m


def test_a_level_rope_that_hardly_stretches() -> None:
    """T = w a cosh(x/2a) is least where (x/2a) tanh(x/2a) = 1: x/2a = 1.19968, T/(w x) = 0.75444.

    Both to the stretch of a rope with EA of a million times its weight.
    """
    L0, T = catenary.least_tension(W * 10 * 1e6, W, 10.0, 0.0)
    u = 1.199678640257734
    assert math.cosh(u) / (2 * u) == pytest.approx(0.75444, abs=1e-5)
    assert pytest.approx(W * 10 * math.cosh(u) / (2 * u), rel=2e-6) == T
    assert pytest.approx(10 * math.sinh(u) / u, rel=1e-3) == L0  # the minimum is flat


@pytest.mark.parametrize(
    ("EA", "x", "z"), [(2e3, 10.0, 3.0), (2e7, 10.0, 3.0), (2e3, 2.0, -9.0), (300.0, 8.0, 0.0)]
)
def test_no_length_gives_less_and_a_little_more_is_found(EA: float, x: float, z: float) -> None:
    """Among 300 lengths none pulls less by more than the search's 1e-9; just above it a length is found."""
    L0, T = catenary.least_tension(EA, W, x, z)
    lengths = np.geomspace(0.05, 2.0, 300) * math.hypot(x, z)
    assert min(catenary.lower_end_tension(float(L), EA, W, x, z) for L in lengths) >= T * (1 - 1e-9)
    found = catenary.length_for_tension(T * (1 + 1e-7), EA, W, x, z)
    assert found <= L0
    assert catenary.lower_end_tension(found, EA, W, x, z) == pytest.approx(T * (1 + 1e-7), rel=1e-10)
    with pytest.raises(ValueError, match="least possible tension"):
        catenary.length_for_tension(T * (1 - 1e-7), EA, W, x, z)
