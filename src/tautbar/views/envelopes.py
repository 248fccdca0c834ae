"""What each member, group or rope saw at most and at least, and which loading or instant governs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tautbar.store import Result
from tautbar.views.quantities import fitting
from tautbar.views.rows import Row, gather
from tautbar.views.states import loading_names, there
from tautbar.views.style import COMPRESSION, INK, TENSION, say_nothing_to_show

Array = NDArray[Any]
MOST_ROWS = 40  # names that can be read on one page
MOST_LETTERS = 44  # of what governs a row
ROOM = 0.08  # of the width, beyond the longest bar


@dataclass(frozen=True, slots=True)
class Envelope:
    """Least and greatest axial force [N] of each member, which gave them, and over what they were taken.

    A member that is never there is NaN. ``low_by`` and ``high_by`` are names of loadings, times or
    steps, "" where there is but one.
    """

    members: tuple[str, ...]
    low: Array
    high: Array
    low_by: Sequence[str]
    high_by: Sequence[str]
    over: str


def envelope(result: Result) -> Envelope:
    """The envelope of axial force over the computed steps of a history, or over loadings or path steps.

    Loadings without a balance have no part in it.
    """
    if "peaks/axial_force/min" in result:
        table = result.peak("axial_force")
        low_by, high_by = (
            [f"at {when:.4g} s" for when in table[f"time_of_{end}"].tolist()] for end in ("min", "max")
        )
        members = tuple(table["member"].tolist())
        low, high = (_of_those_there(result, members, table[end]) for end in ("min", "max"))
        return Envelope(members, low, high, low_by, high_by, "every computed step")
    force = np.asarray(result.values("axial_force"), dtype=float)
    names, words = _places(result, len(force))
    if "converged" in result:
        holds = result.values("converged").astype(bool)
        force, words = force[holds], words if holds.all() else f"{holds.sum()} of {words}"
        names = [name for name, kept in zip(names, holds.tolist(), strict=True) if kept]
    members = tuple(str(name) for name in result.labels("axial_force", 1))
    force = _of_those_there(result, members, force)
    low, low_by = _extreme(force, names, -1.0)
    high, high_by = _extreme(force, names, 1.0)
    return Envelope(members, low, high, low_by, high_by, words)


def _of_those_there(result: Result, members: tuple[str, ...], values: Array) -> Array:
    """Values (..., N), NaN for members that are never there."""
    return np.where(there(result, members), values, np.nan)


def _places(result: Result, count: int) -> tuple[list[str], str]:
    """Names of the rows of a force table, and what they are."""
    many = "s" * (count != 1)
    if "loads" in result:
        names = loading_names(result)
        return names if count > 1 else [""] * count, f"{count} loading{many}"
    if result.kind == "equilibrium-path":
        names = [f"load factor {factor:.4g}" for factor in result.values("load_factor").tolist()]
        return names, f"{count} step{many} of the path"
    return [""] * count, "stored steps"


def _extreme(force: Array, names: list[str], sign: float) -> tuple[Array, list[str]]:
    """Greatest of ``sign`` times the forces (K, N) of each member, with the name of its row; NaN: none."""
    if not force.size:
        return np.full(force.shape[1], np.nan), [""] * force.shape[1]
    signed = np.where(np.isnan(force), -np.inf, sign * force)
    which = signed.argmax(axis=0)
    values = np.take_along_axis(signed, which[np.newaxis], axis=0)[0]
    return np.where(np.isinf(values), np.nan, sign * values), [names[k] for k in which.tolist()]


@dataclass(frozen=True, slots=True)
class Bar:
    """The range of one row of the plot [N] and what governs it."""

    name: str
    low: float
    high: float
    governing: str

    @property
    def size(self) -> float:
        return max(abs(self.low), abs(self.high))


def bars(result: Result, member: str | None = None) -> list[Bar]:
    """A bar for each row of `gather` with a force, the greatest first."""
    whole = envelope(result)
    found = [_bar(whole, row) for row in gather(result, whole.members, member)]
    return sorted((bar for bar in found if bar is not None), key=lambda bar: -bar.size)


def _bar(whole: Envelope, row: Row) -> Bar | None:
    places = [k for k in row.places if np.isfinite(whole.low[k])]
    if not places:
        return None
    least = min(places, key=lambda k: float(whole.low[k]))
    most = max(places, key=lambda k: float(whole.high[k]))
    low, high = float(whole.low[least]), float(whole.high[most])
    which, by = (most, whole.high_by) if abs(high) >= abs(low) else (least, whole.low_by)
    words = [whole.members[which]] if len(row.places) > 1 else []
    return Bar(row.label, low, high, ", ".join([*words, by[which]]).strip(", "))


def forces(axes: Axes, result: Result, *, member: str | None = None) -> list[Artist]:
    """Range of axial force of each member, group or rope, the greatest first, at most 40 of them.

    Beside each bar stands what governs its greatest force: the loading or time, and the member of
    a group or rope. ``member`` opens a group or rope.
    """
    every = bars(result, member)
    if not every:
        return say_nothing_to_show(axes, f"{result.name}: no member has a force to show")
    shown = every[:MOST_ROWS]
    unit = fitting([bar.size for bar in shown], "N")
    low, high = (unit(np.array([getattr(bar, end) for bar in shown])) for end in ("low", "high"))
    rows = np.arange(len(shown))
    single = bool((low == high).all())
    artists = _bars(axes, rows, *((np.minimum(low, 0.0), np.maximum(high, 0.0)) if single else (low, high)))
    for values in (high,) if single else (low, high):
        artists.append(axes.scatter(values, rows, marker="|", s=60, linewidths=1.4, color=INK, zorder=3))
    artists += _governing(axes, shown)
    _room(axes, low, high)
    axes.axvline(0.0, color=INK, linewidth=0.8)
    axes.set_yticks(rows, [bar.name for bar in shown], fontsize=7.5)
    axes.set_ylim(len(shown) - 0.4, -0.6)
    axes.grid(False, axis="y")
    axes.set_xlabel(unit.label("axial force, tension +"))
    words = "axial force" if single else "range of axial force"
    of = f" of {member}" if member else ""
    axes.set_title(f"{result.name}: {words}{of} over {envelope(result).over}{_rest(every, shown)}")
    return artists


def _rest(every: list[Bar], shown: list[Bar]) -> str:
    gathered = any("(" in bar.name for bar in shown)
    words = "\nnumbers in brackets: members in one bar" if gathered else ""
    if len(every) > len(shown):
        words += f"\nthe {len(shown)} of {len(every)} bars with the greatest"
    return words


def _governing(axes: Axes, shown: list[Bar]) -> list[Artist]:
    look: dict[str, Any] = {"xycoords": axes.get_yaxis_transform(), "textcoords": "offset points"}
    look |= {"va": "center", "fontsize": 6.5, "color": "#666666"}
    return [
        axes.annotate(_short(bar.governing), (1.0, row), (6, 0), **look)
        for row, bar in enumerate(shown)
        if bar.governing
    ]


def _short(words: str) -> str:
    return words if len(words) <= MOST_LETTERS else words[: MOST_LETTERS - 3] + "..."


def _room(axes: Axes, low: Array, high: Array) -> None:
    """Limits with room beyond the longest bars, and none on a side without any."""
    least, most = min(float(low.min()), 0.0), max(float(high.max()), 0.0)
    room = ROOM * (most - least or 1.0)
    axes.set_xlim(least - room * (0.4 if least == 0.0 else 1.0), most + room * (0.4 if most == 0.0 else 1.0))


def _bars(axes: Axes, rows: Array, low: Array, high: Array) -> list[Artist]:
    """Bars from low to high, in the colour of compression below zero and of tension above."""
    pressed, pulled = np.minimum(high, 0.0), np.maximum(low, 0.0)
    bars = [
        axes.barh(
            rows, pressed - np.minimum(low, 0.0), left=np.minimum(low, 0.0), height=0.62, color=COMPRESSION
        ),
        axes.barh(rows, np.maximum(high, 0.0) - pulled, left=pulled, height=0.62, color=TENSION),
    ]
    return [patch for bar in bars for patch in bar.patches]
