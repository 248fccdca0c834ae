"""Hanging members as the curves they are, and the plot of one rope seen from the side."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tautbar.store import Result
from tautbar.store.layout import UnknownName
from tautbar.views.quantities import Shown, fitting
from tautbar.views.states import loading_names, loading_place, titled
from tautbar.views.style import DASHES, INK, PALE, SERIES, say_nothing_to_show

Array = NDArray[Any]
MOST_NAMED = 7  # curves with a colour and a name of their own
TOGETHER = 0.03  # of the span: ends nearer than this have their names in one place


def curves(result: Result, place: int, moved: Array, scale: float) -> dict[int, Array]:
    """Points (P, 3) along each hanging member of a state, by member.

    Joints are drawn displaced by ``scale`` times what ``moved`` (J, 3) says; the ends of a rope go
    with them, and what it hangs below its chord stays to scale.
    """
    if "rope_curve/position" not in result:
        return {}
    ends = result.results.ends
    bent: dict[int, Array] = {}
    for k, member in enumerate(result.values("rope_curve/member").tolist()):
        points = np.asarray(result["rope_curve/position"][place, k], dtype=float)
        along = np.linspace(0.0, 1.0, len(points))[:, np.newaxis]
        start, end = moved[ends[member]]
        carried = points + (scale - 1.0) * ((1.0 - along) * start + along * end)
        if np.isfinite(carried).all():
            bent[member] = carried
    return bent


@dataclass(frozen=True, slots=True)
class _Side:
    """One rope of one loading as seen from its side: distances and heights of points along it [m]."""

    member: str
    loading: str
    along: Array
    height: Array
    lowest: tuple[float, float]
    tension: tuple[float, float]  # N, at the start and the end
    ends: tuple[str, str]

    @property
    def drop(self) -> Array:
        """How far the rope hangs below the straight line between its ends [m]."""
        line = np.interp(self.along, self.along[[0, -1]], self.height[[0, -1]])
        return np.asarray(line - self.height)

    @property
    def sag(self) -> float:
        """Its greatest drop [m]: that of the parabola through the three points nearest to it.

        Negative where it is farther above the straight line than below, as wind can blow it.
        """
        sign = 1.0 if self.drop.max() >= -self.drop.min() else -1.0
        away = sign * self.drop
        k = int(np.clip(away.argmax(), 1, len(away) - 2))
        a, b, c = np.polyfit(self.along[k - 1 : k + 2] - self.along[k], away[k - 1 : k + 2], 2)
        return sign * float(c - b * b / (4.0 * a) if a < 0.0 else away.max())


def rope_curve(
    axes: Axes,
    result: Result,
    *,
    below: Axes | None = None,
    member: str | None = None,
    loading: str | None = None,
) -> list[Artist]:
    """Hanging members from the side, to scale, with lowest point, sag and end tensions.

    ``member`` names one, drawn for every loading unless ``loading`` names one, or a group of them;
    by default the one farthest from its chord. In ``below`` stands how far they hang below the straight line.
    """
    sides = _sides(result, member, loading)
    if not sides:
        return say_nothing_to_show(axes, f"{result.name}: no rope has a curve in this loading")
    single = len({side.member for side in sides}) == 1
    unit = fitting([float(np.ptp(way)) for side in sides for way in (side.along, side.height)], "m")
    drop = fitting(np.concatenate([side.drop for side in sides]), "m")
    artists: list[Artist] = []
    for k, side in enumerate(sides):
        look: dict[str, Any] = {"color": SERIES[k % len(SERIES)], "linestyle": DASHES[k % len(DASHES)]}
        words = _words(side, side.loading if single else side.member, drop) if k < MOST_NAMED else None
        if k >= MOST_NAMED:
            look = {"color": PALE, "linestyle": "-", "zorder": 1}
        ends = np.array([0, -1])
        chord: dict[str, Any] = {"color": PALE, "linewidth": 0.8, "zorder": 1}
        artists += axes.plot(unit(side.along[ends]), unit(side.height[ends]), **chord)
        artists += axes.plot(unit(side.along), unit(side.height), label=words, **look)
        spot = {"marker": "v", "markersize": 6, "markeredgecolor": "white", "color": look["color"]}
        artists += axes.plot([unit(side.lowest[0])], [unit(side.lowest[1])], **spot)
        if below is not None:
            artists += below.plot(unit(side.along), drop(side.drop), **look)
    artists += _end_names(axes, sides, unit)
    _finish(axes, below, result, sides, unit, drop)
    return artists


def _sides(result: Result, member: str | None, loading: str | None) -> list[_Side]:
    hanging = [result.results.members[k] for k in result.values("rope_curve/member").tolist()]
    names = loading_names(result)
    places = range(len(names)) if loading is None else [loading_place(result, loading)]
    if member is None:
        every = [side for name in hanging for side in _of(result, name, hanging, places, names)]
        if not every:
            return []
        member = max(every, key=lambda side: abs(side.sag)).member
    group = [name for name in result.members_of(member) if name in hanging]
    if not group and member not in hanging:
        raise UnknownName("hanging member or group of them", member, hanging)
    if group:
        places = places if loading is not None else [0]
    return [side for name in group or [member] for side in _of(result, name, hanging, places, names)]


def _of(result: Result, name: str, hanging: list[str], places: Any, names: list[str]) -> list[_Side]:
    rope, member = hanging.index(name), result.results.members.index(name)
    sides = []
    for place in places:
        points = np.asarray(result["rope_curve/position"][place, rope], dtype=float)
        if not np.isfinite(points).all():
            continue
        low = np.asarray(result["rope_curve/lowest_point"][place, rope], dtype=float)
        along, height = _from_the_side(result, points, points)
        spot = _from_the_side(result, points, low[np.newaxis])
        tension = np.asarray(result["end_tension"][place, member], dtype=float).tolist()
        ends = tuple(result.results.joints[k] for k in result.results.ends[member].tolist())
        sides.append(_Side(name, names[place], along, height, (spot[0][0], spot[1][0]), tuple(tension), ends))
    return sides


def _from_the_side(result: Result, rope: Array, points: Array) -> tuple[Array, Array]:
    """Distance [m] in plan from the start of a rope towards its end, and height [m], of points (P, 3)."""
    up = result.results.up
    plan = np.delete(rope[-1] - rope[0], up)
    length = float(np.linalg.norm(plan))
    way = plan / length if length > 0.0 else np.array([1.0, 0.0])
    return np.delete(points - rope[0], up, axis=1) @ way, points[:, up]


def _words(side: _Side, name: str, drop: Shown) -> str:
    first, last = (fitting(tension, "N").text(tension) for tension in side.tension)
    low = fitting(side.lowest[1], "m").text(side.lowest[1])
    hang = f"sag {drop.text(side.sag)}"
    if side.sag < 0.0:
        hang = f"blown above its chord by {drop.text(-side.sag)}"
    return f"{name}: {hang}, lowest point at {low}, {first} at {side.ends[0]}, {last} at {side.ends[1]}"


def _end_names(axes: Axes, sides: list[_Side], unit: Shown) -> list[Artist]:
    """Names of the joints at the ends, those in one place together."""
    span = max(float(np.ptp(side.along)) + float(np.ptp(side.height)) for side in sides) or 1.0
    at: dict[tuple[int, int], tuple[tuple[float, float], list[str]]] = {}
    for side in sides:
        for k, name in zip((0, -1), side.ends, strict=True):
            x, y = float(side.along[k]), float(side.height[k])
            spot = (round(x / span / TOGETHER), round(y / span / TOGETHER))
            names = at.setdefault(spot, ((float(unit(x)), float(unit(y))), []))[1]
            if name not in names:
                names.append(name)
    look: dict[str, Any] = {"textcoords": "offset points", "fontsize": 8, "color": INK, "ha": "center"}
    return [axes.annotate(", ".join(names), place, (0, 6), **look) for place, names in at.values()]


def _finish(
    axes: Axes, below: Axes | None, result: Result, sides: list[_Side], unit: Shown, drop: Shown
) -> None:
    members = list(dict.fromkeys(side.member for side in sides))
    loadings = list(dict.fromkeys(side.loading for side in sides))
    which = members[0] if len(members) == 1 else f"{len(members)} ropes"
    over = titled(result, loadings[0]) if len(loadings) == 1 else f"{result.name}: {len(loadings)} loadings"
    axes.set_title(f"{over}\n{which} from the side, to scale; lowest point marked")
    axes.set_aspect("equal", adjustable="datalim")
    axes.margins(0.08)
    axes.set_ylabel(unit.label("height"))
    last = axes if below is None else below
    last.set_xlabel(unit.label("distance in plan"))
    if below is not None:
        above = any(side.sag < 0.0 for side in sides)
        below.set_ylabel(drop.label("below the chord" + ", above -" * above))
        below.invert_yaxis()
        below.margins(x=0.08)
    last.legend(*axes.get_legend_handles_labels(), loc="upper center", bbox_to_anchor=(0.5, -0.28), ncols=1)
