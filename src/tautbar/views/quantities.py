"""Numbers as people read them: a fitting unit for an axis, and thinning that keeps every peak."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from tautbar.errors import InputError

_SIZES: dict[str, tuple[tuple[float, float, str], ...]] = {  # unit: (from, one of it in SI, its sign)
    "N": ((1e6, 1e6, "MN"), (1e3, 1e3, "kN"), (0.0, 1.0, "N")),
    "J": ((1e6, 1e6, "MJ"), (1e3, 1e3, "kJ"), (0.0, 1.0, "J")),
    "m": ((1.0, 1.0, "m"), (1e-5, 1e-3, "mm"), (0.0, 1e-6, "µm")),
    "m/s": ((0.1, 1.0, "m/s"), (0.0, 1e-3, "mm/s")),
    "s": ((0.5, 1.0, "s"), (0.0, 1e-3, "ms")),
    "m/s2": ((0.0, 1.0, "m/s²"),),
}


@dataclass(frozen=True, slots=True)
class Shown:
    """A unit to show values in."""

    size: float  # one of it in SI
    sign: str

    def __call__(self, values: Any) -> Any:
        """Values in this unit."""
        return np.asarray(values) / self.size

    def label(self, quantity: str) -> str:
        """Text of an axis."""
        return f"{quantity} [{self.sign}]"

    def text(self, value: float) -> str:
        """One value with its sign and unit, three figures."""
        return f"{figures(value / self.size)} {self.sign}"


def fitting(values: ArrayLike, unit: str) -> Shown:
    """The unit that suits the largest of some values given in SI."""
    magnitudes = np.abs(np.asarray(values, dtype=float))
    finite = magnitudes[np.isfinite(magnitudes)]
    largest = float(finite.max()) if finite.size else 0.0
    for least, size, sign in _SIZES.get(unit, ()):
        if largest >= least:
            return Shown(size, sign)
    return Shown(1.0, "-" if unit == "1" else unit)


def figures(value: float, count: int = 3) -> str:
    """A number to ``count`` figures, without an exponent where it is of common size."""
    if value == 0.0 or not math.isfinite(value):
        return f"{value:g}"
    place = count - 1 - math.floor(math.log10(abs(value)))
    if -3 <= place <= 6:
        return f"{round(value, place):.{max(place, 0)}f}"
    return f"{value:.{count - 1}e}"


def round_number(value: float) -> float:
    """The largest of 1, 2 and 5 times a power of ten that is not above a positive value."""
    power = 10.0 ** math.floor(math.log10(value))
    return max(step * power for step in (1.0, 2.0, 5.0) if step * power <= value * (1.0 + 1e-12))


def thin(
    time: NDArray[Any], values: NDArray[Any], bins: int = 1500
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The first, last, least and greatest sample of each of ``bins`` stretches of a long history.

    A line through them covers the same pixels as one through all (T,) samples, peaks included.
    """
    if len(time) <= 4 * bins:
        return np.asarray(time, dtype=float), np.asarray(values, dtype=float)
    edges = np.linspace(0, len(time), bins + 1).astype(int)
    kept = {0, len(time) - 1}
    for first, end in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        part = values[first:end]
        kept |= {first, end - 1, first + int(part.argmin()), first + int(part.argmax())}
    places = np.array(sorted(kept))
    return np.asarray(time[places], dtype=float), np.asarray(values[places], dtype=float)


def nearest(wanted: float, known: NDArray[Any], thing: str, unit: str) -> int:
    """Place of the value nearest to the one wanted. Raises InputError outside the range."""
    low, high = float(known[0]), float(known[-1])
    slip = 1e-9 * max(abs(low), abs(high))
    if not low - slip <= wanted <= high + slip:
        raise InputError(f"{thing} {wanted:g} {unit} is outside what was stored: {low:g} to {high:g} {unit}")
    return int(np.abs(known - wanted).argmin())
