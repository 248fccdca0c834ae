"""Load factor against displacement along an equilibrium path."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tautbar.errors import InputError
from tautbar.store import Result
from tautbar.store.layout import DIRECTIONS
from tautbar.views.drawing import Place, put_names, spots
from tautbar.views.quantities import Shown, figures, fitting
from tautbar.views.states import critical_names
from tautbar.views.style import DASHED, INK, SERIES, say_nothing_to_show

Array = NDArray[Any]
MARKS = {"limit point": ("o", SERIES[1]), "bifurcation": ("D", SERIES[2])}
OTHER_MARK = ("s", SERIES[3])
MOST_NAMED = 16  # critical points with their names beside them
PLACES: tuple[Place, ...] = tuple(  # for a name, the near ones first: offset [pt] and anchor
    ((side * across, rise), "left" if side > 0 else "right", "center")
    for across, rises in ((9, (7, -7)), (14, (20, -20)), (20, (34, -34)), (26, (48, -48)), (32, (62, -62)))
    for rise in rises
    for side in (1, -1)
)


def path(
    axes: Axes, result: Result, *, joint: str | None = None, direction: str | None = None
) -> list[Artist]:
    """Load factor against the displacement of a joint, critical points by type and name.

    ``joint`` and ``direction`` ("x", "y" or "z") name the displacement; by default the one that is
    greatest, of all joints or of the joint. Where the equilibrium is unstable the line is dashed.
    """
    factors = result.values("load_factor")
    if not len(factors):
        return say_nothing_to_show(axes, f"{result.name}: no step was computed")
    joint, axis = _component(result, joint, direction)
    moved = result.displacement(joint)[:, axis]
    unit = fitting(moved, "m")
    artists = _stretches(axes, result, unit(moved), factors)
    artists += axes.plot(unit(moved[:1]), factors[:1], "o", color=INK, markersize=4, label="start")
    artists += _critical(axes, result, joint, axis, unit)
    axes.axhline(0.0, color=INK, linewidth=0.6, zorder=1)
    axes.set_xlabel(unit.label(f"displacement of {joint} in {DIRECTIONS[axis]}"))
    axes.set_ylabel("load factor [-]")
    axes.margins(0.08)
    last = f"{len(factors) - 1} steps to load factor {figures(float(factors[-1]), 4)}"
    axes.set_title(f"{result.name}: load factor along the path\n{last}")
    axes.legend(loc="upper center", bbox_to_anchor=(0.5, -0.13), ncols=3)
    return artists + _critical_names(axes, result, joint, axis, unit)


def _component(result: Result, joint: str | None, direction: str | None) -> tuple[str, int]:
    """The joint and axis asked for, or those with the greatest displacement."""
    if direction is not None and direction not in DIRECTIONS:
        raise InputError(f'direction "{direction}": choose x, y or z')
    names = [str(name) for name in result.labels("displacement", 1)]
    if joint is None:
        size = np.abs(np.nan_to_num(result.values("displacement"))).max(axis=0)
        if direction is not None:
            axis = DIRECTIONS.index(direction)
            return names[int(size[:, axis].argmax())], axis
        place, most = divmod(int(size.argmax()), size.shape[1])
        return names[place], most
    size = np.abs(np.nan_to_num(result.displacement(joint))).max(axis=0)
    return joint, int(size.argmax()) if direction is None else DIRECTIONS.index(direction)


def _stretches(axes: Axes, result: Result, moved: Array, factors: Array) -> list[Artist]:
    """The path, dashed where a tangent pivot is negative."""
    pivots = result.values("negative_pivots") if "negative_pivots" in result else np.zeros(len(factors))
    unstable = np.maximum(pivots[:-1], pivots[1:]) > 0
    artists: list[Artist] = []
    edges = [0, *(np.flatnonzero(np.diff(unstable)) + 1).tolist(), len(unstable)]
    named: set[bool] = set()
    for first, end in pairwise(edges):
        if end > first:
            loose = bool(unstable[first])
            look: dict[str, Any] = {"linestyle": DASHED if loose else "-", "color": SERIES[0]}
            words = None if loose in named else "unstable" if loose else "stable"
            named.add(loose)
            part = slice(first, end + 1)
            artists += axes.plot(moved[part], factors[part], marker=".", markersize=3, label=words, **look)
    return artists


def _critical(axes: Axes, result: Result, joint: str, axis: int, unit: Shown) -> list[Artist]:
    names = critical_names(result)
    if not names:
        return []
    factors = result.values("critical_points/load_factor")
    moved = result.at("critical_points/displacement", joint=joint)[:, axis]
    kinds = result.values("critical_points/type").tolist()
    artists: list[Artist] = []
    for kind in dict.fromkeys(kinds):
        marker, colour = MARKS.get(kind, OTHER_MARK)
        own = [k for k, other in enumerate(kinds) if other == kind]
        look: dict[str, Any] = {"color": colour, "markersize": 7, "markerfacecolor": "none", "zorder": 4}
        artists += axes.plot(
            unit(moved[own]), factors[own], marker, label=f"{kind} ({len(own)})", markeredgewidth=1.5, **look
        )
    return artists


def _critical_names(axes: Axes, result: Result, joint: str, axis: int, unit: Shown) -> list[Artist]:
    """Names and load factors beside the critical points, with a thin line where there is no room near."""
    names = critical_names(result)[:MOST_NAMED]
    if not names:
        return []
    factors = result.values("critical_points/load_factor")[: len(names)]
    moved = result.at("critical_points/displacement", joint=joint)[: len(names), axis]
    points = np.stack([unit(moved), factors], axis=1)
    taken = spots(axes, points)
    artists: list[Artist] = []
    for point, name, factor in zip(points, names, factors.tolist(), strict=True):
        colour = MARKS.get(name.rpartition(" ")[0], OTHER_MARK)[1]
        line = {"arrowstyle": "-", "color": colour, "linewidth": 0.6, "shrinkB": 4.0}
        look: dict[str, Any] = {"fontsize": 7.5, "color": colour, "arrowprops": line}
        artists += put_names(
            axes, point[np.newaxis], [f"{name}, {figures(factor, 4)}"], taken, PLACES, **look
        )
    return artists
