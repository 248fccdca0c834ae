"""Numbers and names in sentences."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from tautbar.model.parts import AXES

_PREFIXES = ((1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "u"))


def quantity(value: float, unit: str) -> str:
    """Three digits and a unit prefix: ``12.3 kN``."""
    if not np.isfinite(value):
        return f"{value} {unit}"
    size = abs(value)
    factor, prefix = next(((f, p) for f, p in _PREFIXES if size >= 0.9995 * f), _PREFIXES[-1])
    if size < 1e-9:
        factor, prefix = 1.0, ""
    return f"{value / factor:.3g} {prefix}{unit}"


def listed(names: Sequence[str], most: int = 6) -> str:
    """Names with commas, the rest counted."""
    shown = ", ".join(names[:most])
    return shown if len(names) <= most else f"{shown} and {len(names) - most} more"


def chosen(names: Sequence[str], which: Iterable[int] | NDArray[np.bool_], most: int = 6) -> str:
    """The names at some indices, or where a mask holds."""
    at = np.asarray(which)
    at = np.flatnonzero(at) if at.dtype == bool else at
    return listed([names[int(i)] for i in at], most)


def direction(vector: NDArray[np.float64]) -> str:
    """A direction in words: an axis, or its components where it is none."""
    size = np.abs(vector)
    if size.max() >= 0.99 * np.sqrt((vector * vector).sum()):
        return AXES[int(size.argmax())]
    parts = (f"{c:+.2f} {a}" for c, a in zip(vector, AXES, strict=True) if abs(c) > 0.05 * size.max())
    return "(" + ", ".join(parts) + ")"
