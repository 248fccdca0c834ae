"""Extremes over every computed step of a march, and when they were met, whatever is stored."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from tautbar.records.fields import Field


class Peaks:
    """Running minimum and maximum of a quantity, each with the time it was first met.

    NaN never counts as an extreme; a value that was never a number stays NaN.

    Parameters
    ----------
    shape
        Shape of the quantity at one step, e.g. (N,) or (J, 3).
    """

    def __init__(self, shape: tuple[int, ...]) -> None:
        self._low = np.full(shape, np.inf)
        self._high = np.full(shape, -np.inf)
        self._low_time = np.full(shape, np.nan)
        self._high_time = np.full(shape, np.nan)

    def update(self, time: float, values: ArrayLike) -> None:
        """Take in the values at ``time`` [s]."""
        now = np.asarray(values)
        for extreme, when, beyond in (
            (self._low, self._low_time, now < self._low),
            (self._high, self._high_time, now > self._high),
        ):
            np.copyto(extreme, now, where=beyond)
            np.copyto(when, time, where=beyond)

    @property
    def low(self) -> NDArray[np.float64]:
        """Least value so far, NaN where there was none."""
        return np.where(np.isnan(self._low_time), np.nan, self._low)

    @property
    def high(self) -> NDArray[np.float64]:
        """Greatest value so far, NaN where there was none."""
        return np.where(np.isnan(self._high_time), np.nan, self._high)

    @property
    def low_time(self) -> NDArray[np.float64]:
        """When the least value was first met [s]."""
        return self._low_time

    @property
    def high_time(self) -> NDArray[np.float64]:
        """When the greatest value was first met [s]."""
        return self._high_time

    def fields(self, prefix: str, unit: str, long_name: str, axes: tuple[str, ...]) -> dict[str, Field]:
        """Fields ``peaks/<prefix>/{min, time_of_min, max, time_of_max}``.

        ``unit``, ``long_name`` and ``axes`` are those of one step of the quantity.
        """
        when = f"time of the {{}} {long_name}"
        return {
            f"peaks/{prefix}/min": Field(self.low, unit, f"least {long_name}", axes),
            f"peaks/{prefix}/time_of_min": Field(self._low_time.copy(), "s", when.format("least"), axes),
            f"peaks/{prefix}/max": Field(self.high, unit, f"greatest {long_name}", axes),
            f"peaks/{prefix}/time_of_max": Field(self._high_time.copy(), "s", when.format("greatest"), axes),
        }
