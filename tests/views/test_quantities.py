"""Units that fit, figures that read well, and thinning that loses no peak."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tautbar.errors import InputError
from tautbar.views.quantities import figures, fitting, nearest, round_number, thin


@pytest.mark.parametrize(
    ("largest", "unit", "label", "text"),
    [
        (12345.0, "N", "force [kN]", "12.3 kN"),
        (-2.5e6, "N", "force [MN]", "-2.50 MN"),
        (3.0, "N", "force [N]", "3.00 N"),
        (0.028, "m", "force [mm]", "28.0 mm"),
        (1.5, "m", "force [m]", "1.50 m"),
        (2e-6, "m", "force [µm]", "2.00 µm"),
        (0.02, "m/s", "force [mm/s]", "20.0 mm/s"),
        (9.81, "m/s2", "force [m/s²]", "9.81 m/s²"),
        (900.0, "J", "force [J]", "900 J"),
        (5.0, "Hz", "force [Hz]", "5.00 Hz"),
        (0.5, "1", "force [-]", "0.500 -"),
    ],
)
def test_a_unit_fits_the_largest_value(largest, unit, label, text) -> None:
    shown = fitting([0.0, largest, np.nan], unit)
    assert shown.label("force") == label
    assert shown.text(largest) == text


def test_nothing_to_measure_has_a_unit_all_the_same() -> None:
    assert fitting([], "N").sign == "N"
    assert fitting([np.nan], "m").sign == "µm"


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (np.nan, "nan"),
        (999.6, "1000"),
        (123456.0, "123000"),
        (4e-9, "4.00e-09"),
        (0.01234, "0.0123"),
    ],
)
def test_three_figures(value, text) -> None:
    assert figures(value) == text


@given(st.floats(1e-6, 1e6))
def test_round_numbers_are_just_below(value) -> None:
    found = round_number(value)
    # the next of 1, 2, 5, 10 is at most 2.5 times as large
    assert value / 2.5 < found * (1 + 1e-9)
    assert found <= value * (1 + 1e-9)
    assert f"{found:e}"[0] in "125"


@given(st.integers(1, 400), st.integers(1, 30), st.integers(0, 2**31))
def test_thinning_keeps_ends_and_the_extremes_of_every_stretch(count, bins, seed) -> None:
    values = np.random.default_rng(seed).normal(size=count)
    time = np.arange(count) * 0.1
    at, thinned = thin(time, values, bins)
    assert (at[0], at[-1]) == (time[0], time[-1])
    assert (np.diff(at) > 0.0).all()
    assert (thinned == values[np.searchsorted(time, at)]).all()
    assert len(at) <= max(4 * bins + 2, 1)
    if count > 4 * bins:
        edges = np.linspace(0, count, bins + 1).astype(int)
        for first, end in pairwise(edges):
            inside = thinned[(at >= time[first]) & (at <= time[end - 1])]
            assert (inside.min(), inside.max()) == (values[first:end].min(), values[first:end].max())


def test_the_nearest_instant() -> None:
    times = np.array([0.0, 0.1, 0.2])
    assert nearest(0.14, times, "time", "s") == 1
    assert nearest(0.2 + 1e-12, times, "time", "s") == 2  # rounding of what was typed
    with pytest.raises(InputError, match=r"time 0\.3 s is outside what was stored: 0 to 0\.2 s"):
        nearest(0.3, times, "time", "s")
