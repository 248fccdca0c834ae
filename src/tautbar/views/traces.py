"""Plots over time: joints, members and the energy ledger of a history."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tautbar.errors import InputError
from tautbar.records.frames import ENERGY
from tautbar.store import Result
from tautbar.views.quantities import Shown, fitting, thin
from tautbar.views.style import DASHES, SERIES, say_nothing_to_show

Array = NDArray[Any]
STILL = 1e-6  # of the largest component: below it a component is rounding, and not drawn
LEDGER_WORDS = {
    "kinetic": "kinetic",
    "strain": "strain, change",
    "load_potential": "potential of loads, change",
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

    ``member`` gives its axial force; ``joint`` its displacement, or the ``quantity`` named. By default
    the joint that moves most.
    """
    if joint is not None and member is not None:
        raise InputError("choose a joint or a member, not both")
    quantity = quantity or ("displacement" if member is None else "axial_force")
    thing = _thing(result, quantity)
    name = {"joint": joint, "member": member}[thing]
    if name is None and (joint or member):
        raise InputError(f'"{quantity}" is of a {thing}: name a {thing}')
    name = name or _liveliest(result, quantity, thing)
    values = result.at(quantity, **{thing: name})
    values = values[:, np.newaxis] if values.ndim == 1 else values
    words = {"axial_force": "axial force, tension +"}.get(quantity, quantity.replace("_", " "))
    title = f"{result.name}: {quantity.replace('_', ' ')} of {thing} {name}"
    if not len(values):
        return say_nothing_to_show(axes, f"{title}: no step was stored")
    labels = ("x", "y", "z") if values.shape[1] == 3 else ("",)
    unit = fitting(values, str(result[quantity].attrs["units"]))
    artists = _traces(axes, result, values, labels, unit, _peaks(result, quantity, thing, name))
    axes.set_xlabel("time [s]")
    axes.set_ylabel(unit.label(words))
    axes.set_title(title)
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


def _peaks(result: Result, quantity: str, thing: str, name: str) -> Array | None:
    if f"peaks/{quantity}/max" not in result:
        return None
    table = result.peak(quantity)
    return np.asarray(table[table[thing] == name])


def _traces(
    axes: Axes, result: Result, values: Array, labels: tuple[str, ...], unit: Shown, peaks: Array | None
) -> list[Artist]:
    time, largest = result.time, float(np.abs(values).max())
    artists: list[Artist] = []
    for k, label in enumerate(labels):
        if len(labels) > 1 and np.abs(values[:, k]).max() <= STILL * largest:
            continue
        words = label if peaks is None else " ".join([label, _peak_words(peaks[k], unit)]).strip()
        at, shown = thin(time, values[:, k])
        look: dict[str, Any] = {"color": SERIES[k], "linestyle": DASHES[k]}
        artists += axes.plot(at, unit(shown), label=words, **look)
        if peaks is not None:
            ends = ("min", "v"), ("max", "^")
            for end, marker in ends:
                spot = ([peaks[k]["time_of_" + end]], [unit(peaks[k][end])])
                artists += axes.plot(*spot, marker, color=SERIES[k], markersize=7, markeredgecolor="white")
    return artists


def _peak_words(peak: Any, unit: Shown) -> str:
    low, high = (f"{unit.text(float(peak[end]))} at {peak['time_of_' + end]:.4g} s" for end in ("min", "max"))
    return f"from {low} to {high}"


def energy(axes: Axes, result: Result) -> list[Artist]:
    """The energy ledger: what each store gained since the start, what events put in, what was lost."""
    time = result.values("energy/time")
    if not len(time):
        return say_nothing_to_show(axes, f"{result.name}: no step was computed")
    ledger = {name: result.values(f"energy/{name}") for name in ENERGY[1:]}
    for name in ("strain", "load_potential"):
        ledger[name] = ledger[name] - ledger[name][0]
    unit = fitting([np.abs(values).max() for values in ledger.values()], "J")
    artists: list[Artist] = []
    for k, (name, values) in enumerate(ledger.items()):
        if values.any() or name == "unaccounted":
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
