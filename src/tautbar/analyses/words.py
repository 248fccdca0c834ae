"""Numbers and names in sentences."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import groupby
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from tautbar.model.parts import AXES, Change

if TYPE_CHECKING:
    from tautbar.analyses.context import Context

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


def listed(names: Sequence[str], most: int = 8) -> str:
    """Names with commas, numbered runs joined (``rod.1-5``), the rest counted."""
    runs = _runs(names)
    if len(runs) <= most:
        return ", ".join(text for text, _ in runs)
    rest = sum(count for _, count in runs[most:])
    return ", ".join(text for text, _ in runs[:most]) + f" and {rest} more"


def _runs(names: Sequence[str]) -> list[tuple[str, int]]:
    """Runs of members of one group numbered without a gap, and how many names each stands for."""

    def line(place: int) -> tuple[str, int]:
        stem, _, number = names[place].rpartition(".")
        return (stem, int(number) - place) if number.isdigit() else (names[place], place)

    out = []
    for _, run in groupby(range(len(names)), key=line):
        found = [names[place] for place in run]
        last = found[-1].rpartition(".")[2]
        out.append((f"{found[0]}-{last}" if len(found) > 1 else found[0], len(found)))
    return out


def chosen(names: Sequence[str], which: Iterable[int] | NDArray[np.bool_], most: int = 8) -> str:
    """The names at some indices, or where a mask holds."""
    at = np.asarray(which)
    at = np.flatnonzero(at) if at.dtype == bool else at
    return listed([names[int(i)] for i in at], most)


def changes(context: Context, change: Change) -> dict[str, object]:
    """What an analysis took away and put in, for its settings."""
    out: dict[str, object] = {}
    for word, member, supports, masses in (
        ("without", change.without_members, change.without_supports, change.without_masses),
        ("with", change.with_members, change.with_supports, change.with_masses),
    ):
        names = [*(context.member_names[m] for m in member), *supports, *masses]
        if names:
            out[word] = names
    return out


def direction(vector: NDArray[np.float64]) -> str:
    """A direction in words: an axis with its sense, or components where it is none."""
    vector = vector / (np.sqrt((vector * vector).sum()) or 1.0)
    size = np.abs(vector)
    if size.max() >= 0.99:
        return AXES[int(size.argmax())]
    parts = (f"{c:+.2f} {a}" for c, a in zip(vector, AXES, strict=True) if abs(c) > 0.05 * size.max())
    return "(" + ", ".join(parts) + ")"
