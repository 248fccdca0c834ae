"""Plots over time: joints, members and the energy ledger of a history."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tautbar.errors import InputError
from tautbar.records.frames import ENERGY
from tautbar.store import Result
from tautbar.views.quantities import Shown, fitting, thin
from tautbar.views.rows import inside
from tautbar.views.style import DASHES, PALE, SERIES, say_nothing_to_show

Array = NDArray[Any]
STILL = 1e-6  # of the largest: what stays below it is rounding, and not drawn
MOST_LINES = 7  # with a colour of their own
LEDGER_WORDS = {
    "kinetic": "kinetic",
    "stored": "strain and potential of loads, change",
    "event_work": "work of events",
    "damped": "damped",
    "dissipated_by_method": "taken by the method",
    "unaccounted": "left over",
}


def history(
    axes: Axes,
    result: Result,
    *,
    joint: str | None = None,
    member: str | None = None,
    quantity: str | None = None,
) -> list[Artist]:
    """A quantity over time with its peaks over every computed step marked.

    ``member`` gives its axial force, of a group or rope those of its members; ``joint`` its
    displacement, or the ``quantity`` named. By default the joint that moves most.
    """
    if joint is not None and member is not None:
        raise InputError("choose a joint or a member, not both")
    quantity = quantity or ("displacement" if member is None else "axial_force")
    thing = _thing(result, quantity)
    name = {"joint": joint, "member": member}[thing]
    if name is None and (joint or member):
        raise InputError(f'"{quantity}" is of a {thing}: name a {thing}')
    name = name or _liveliest(result, quantity, thing)
    words = {"axial_force": "axial force, tension +"}.get(quantity, quantity.replace("_", " "))
    several = _stored(result, quantity, name) if thing == "member" else []
    what = f"{len(several)} members of" if several else thing
    title = f"{result.name}: {quantity.replace('_', ' ')} of {what} {name}"
    if not len(result.time):
        return say_nothing_to_show(axes, f"{title}: no step was stored")
    lines = _lines(result, quantity, thing, several or [name])
    unit = fitting([line.size for line in lines], str(result[quantity].attrs["units"]))
    artists = _traces(axes, result.time, lines, unit)
    axes.set_xlabel("time [s]")
    axes.set_ylabel(unit.label(words))
    axes.set_title(title + _left_pale(lines))
    axes.set_xlim(0.0, float(result.time[-1]) or None)
    axes.legend(loc="upper center", bbox_to_anchor=(0.5, -0.13), ncols=1)
    return artists


def _thing(result: Result, quantity: str) -> str:
    axes = result.axes(quantity)
    for thing in ("joint", "member"):
        if axes[:2] == ("time", thing):
            return thing
    raise InputError(f'"{quantity}" is not over time, of a joint or member')


def _liveliest(result: Result, quantity: str, thing: str) -> str:
    """The joint or member with the greatest peak, or the first that was stored."""
    names = [str(name) for name in result.labels(quantity, 1)]
    if not names:
        raise InputError(f'"{result.name}" stored "{quantity}" of no {thing}')
    if f"peaks/{quantity}/max" not in result:
        return names[0]
    table = result.peak(quantity)
    table = table[np.isin(table[thing], names)]
    size = np.nan_to_num(np.maximum(np.abs(table["min"]), np.abs(table["max"])))
    return str(table[thing][size.argmax()])


def _stored(result: Result, quantity: str, name: str) -> list[str]:
    """Members of a group or rope that were stored; none if the name is that of a member."""
    labels = [str(label) for label in result.labels(quantity, 1)]
    if name in labels:
        return []
    return [labels[k] for k in inside(result, labels, name)]


@dataclass(frozen=True, slots=True)
class Line:
    """One curve over time, with its least and greatest value over every computed step where known."""

    label: str
    values: Array
    peak: Any | None

    @property
    def size(self) -> float:
        """Its largest value."""
        return float(np.nan_to_num(np.abs(self.values)).max())


def _lines(result: Result, quantity: str, thing: str, names: list[str]) -> list[Line]:
    """A line for each component that moves of one joint or member, or for each of several, largest first."""
    lines = []
    for name in names:
        values = result.at(quantity, **{thing: name})
        parts = values[:, np.newaxis] if values.ndim == 1 else values
        labels = ["x", "y", "z"] if parts.shape[1] == 3 else [name if len(names) > 1 else ""]
        peaks = _peaks(result, quantity, thing, name)
        for k, label in enumerate(labels):
            lines.append(Line(label, parts[:, k], None if peaks is None else peaks[k]))
    if len(names) > 1:
        return sorted(lines, key=lambda line: -line.size)
    largest = max(line.size for line in lines)
    return [line for line in lines if len(lines) == 1 or line.size > STILL * largest] or lines[:1]


def _left_pale(lines: list[Line]) -> str:
    more = len(lines) - MOST_LINES
    return f"\nthe {MOST_LINES} greatest in colour, {more} more pale" if more > 0 else ""


def _peaks(result: Result, quantity: str, thing: str, name: str) -> Array | None:
    if f"peaks/{quantity}/max" not in result:
        return None
    table = result.peak(quantity)
    return np.asarray(table[table[thing] == name])


def _traces(axes: Axes, time: Array, lines: list[Line], unit: Shown) -> list[Artist]:
    artists: list[Artist] = []
    for line in lines[MOST_LINES:]:
        at, shown = thin(time, line.values)
        artists += axes.plot(at, unit(shown), color=PALE, linewidth=0.6, zorder=1)
    for k, line in enumerate(lines[:MOST_LINES]):
        words = line.label if line.peak is None else f"{line.label} {_peak_words(line.peak, unit)}".strip()
        at, shown = thin(time, line.values)
        look: dict[str, Any] = {"color": SERIES[k], "linestyle": DASHES[k]}
        artists += axes.plot(at, unit(shown), label=words, **look)
        if line.peak is not None:
            for end, marker in (("min", "v"), ("max", "^")):
                spot = ([line.peak["time_of_" + end]], [unit(line.peak[end])])
                artists += axes.plot(*spot, marker, color=SERIES[k], markersize=7, markeredgecolor="white")
    return artists


def _peak_words(peak: Any, unit: Shown) -> str:
    low, high = (f"{unit.text(float(peak[end]))} at {peak['time_of_' + end]:.4g} s" for end in ("min", "max"))
    return f"from {low} to {high}"


def energy(axes: Axes, result: Result) -> list[Artist]:
    """The energy ledger: what was gained since the start, what events put in, what was lost.

    Strain energy and the potential of loads stand as one: in a structure under load they exchange
    large amounts that cancel.
    """
    time = result.values("energy/time")
    if not len(time):
        return say_nothing_to_show(axes, f"{result.name}: no step was computed")
    ledger = {name: result.values(f"energy/{name}") for name in ENERGY[1:]}
    stored = ledger.pop("strain") + ledger.pop("load_potential")
    ledger = {"kinetic": ledger.pop("kinetic"), "stored": stored - stored[0], **ledger}
    largest = max(float(np.abs(values).max()) for values in ledger.values())
    unit = fitting(largest, "J")
    artists: list[Artist] = []
    for k, (name, values) in enumerate(ledger.items()):
        if np.abs(values).max() > STILL * largest or name == "unaccounted":
            look: dict[str, Any] = {"color": SERIES[k], "linestyle": DASHES[k], "label": LEDGER_WORDS[name]}
            at, shown = thin(time, values)
            artists += axes.plot(at, unit(shown), **look)
    left = float(np.abs(ledger["unaccounted"]).max())
    axes.set_xlabel("time [s]")
    axes.set_ylabel(unit.label("energy"))
    axes.set_xlim(0.0, float(time[-1]) or None)
    axes.set_title(
        f"{result.name}: energy since the start\ngreatest left over {fitting(left, 'J').text(left)}"
    )
    axes.legend(loc="upper center", bbox_to_anchor=(0.5, -0.13), ncols=3)
    return artists
