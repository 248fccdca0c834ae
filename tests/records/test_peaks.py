"""Running extremes against the whole history at once."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from tautbar.records.peaks import Peaks

SERIES = arrays(float, st.tuples(st.integers(1, 12), st.integers(1, 3)), elements=st.floats(-9, 9, width=16))


@given(SERIES)
def test_extremes_and_their_first_times_are_those_of_the_whole_history(series: np.ndarray) -> None:
    peaks = Peaks(series.shape[1:])
    for step, row in enumerate(series):
        peaks.update(0.5 * step, row)
    found = {
        path.rpartition("/")[2]: f.values for path, f in peaks.fields("a", "N", "x", ("member",)).items()
    }
    # exact: values are copied, never computed
    assert (found["min"] == series.min(axis=0)).all()
    assert (found["max"] == series.max(axis=0)).all()
    assert (found["time_of_min"] == 0.5 * series.argmin(axis=0)).all()
    assert (found["time_of_max"] == 0.5 * series.argmax(axis=0)).all()


def test_not_a_number_is_no_extreme_wherever_it_comes() -> None:
    peaks = Peaks((2,))
    for time, value in enumerate((np.nan, 3.0, np.nan, -1.0)):
        peaks.update(time, [value, np.nan])
    fields = peaks.fields("f", "N", "force", ("member",))
    values = [fields[f"peaks/f/{key}"].values for key in ("min", "time_of_min", "max", "time_of_max")]
    np.testing.assert_array_equal([v[0] for v in values], [-1.0, 3.0, 3.0, 1.0])
    assert np.isnan([v[1] for v in values]).all()


def test_fields_say_what_they_are() -> None:
    fields = Peaks((4, 3)).fields("displacement", "m", "displacement", ("joint", "direction"))
    assert {path: (f.unit, f.axes) for path, f in fields.items()} == {
        "peaks/displacement/min": ("m", ("joint", "direction")),
        "peaks/displacement/time_of_min": ("s", ("joint", "direction")),
        "peaks/displacement/max": ("m", ("joint", "direction")),
        "peaks/displacement/time_of_max": ("s", ("joint", "direction")),
    }
    assert fields["peaks/displacement/max"].long_name == "greatest displacement"


def test_fields_stay_as_they_were_when_the_march_goes_on() -> None:
    peaks = Peaks(())
    peaks.update(0.0, 1.0)
    fields = peaks.fields("f", "N", "force", ())
    peaks.update(1.0, 2.0)
    assert fields["peaks/f/max"].values == 1.0
    assert fields["peaks/f/time_of_max"].values == pytest.approx(0.0, abs=0.0)
