"""Plots of the whole structure: as the model puts it, displaced, and as it swings in a mode."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.colors import Normalize
from matplotlib.lines import Line2D
from matplotlib.transforms import Bbox
from numpy.typing import NDArray

from tautbar.errors import InputError
from tautbar.store import Result
from tautbar.store.layout import UnknownName
from tautbar.views.drawing import Drawing, frame, put_names, spots
from tautbar.views.quantities import figures, fitting, nearest, round_number
from tautbar.views.style import AXIAL, DASHES, INK, PALE, SERIES, SLACK

Array = NDArray[Any]
MOST_NAMES = 400  # joints above which names are not even tried
FEW_MEMBERS = 40  # all of which can be named
LONG = 0.2  # of the size of the structure: members that can be named among many
SHOWN_SHARE = 0.08  # of the size of the structure: the largest displacement as drawn, at most
DASHED = (0, (3, 2))
KIND_LOOKS = {  # dash, colour, width
    "bar": ("-", INK, 1.4),
    "tension-only": (DASHES[1], SERIES[1], 1.1),
    "compression-only": (DASHES[2], SERIES[0], 1.6),
}


def structure(axes: Axes, result: Result) -> list[Artist]:
    """Joints and members where the model puts them, members by kind."""
    drawing = Drawing(result)
    kinds = np.asarray(result.results.model("members/kind"))
    artists: list[Artist] = []
    for kind, (dash, colour, width) in KIND_LOOKS.items():
        of_kind = np.flatnonzero(kinds == kind)
        if len(of_kind):
            look = {"linestyle": dash, "colors": colour, "linewidths": width}
            label = f"{kind} ({len(of_kind)})"
            artists.append(
                axes.add_collection(drawing.lines(drawing.positions, of_kind, label=label, **look))
            )
    points = drawing.seen(drawing.positions)
    artists += axes.plot(*points.T, "o", color=INK, markersize=2.5)
    artists += _supports(axes, result, points)
    frame(axes, result.results.title, points)
    _legend_below(axes)
    if len(points) <= MOST_NAMES:
        taken = spots(axes, points)
        artists += put_names(axes, points, drawing.joints, taken, fontweight="bold")
        artists += _member_names(axes, drawing, points, taken)
    return artists


def _member_names(axes: Axes, drawing: Drawing, points: Array, taken: list[Bbox]) -> list[Artist]:
    """Names of all members if they are few, else of the long ones: the others crowd each other."""
    first, second = points[drawing.ends[:, 0]], points[drawing.ends[:, 1]]
    lengths = np.linalg.norm(second - first, axis=1)
    least = 0.0 if len(lengths) <= FEW_MEMBERS else LONG * drawing.size
    named = np.flatnonzero(lengths >= least)
    middles = ((first + second) / 2.0)[named]
    names = [drawing.members[k] for k in named]
    return put_names(axes, middles, names, taken, color="#666666", fontsize=6.5)


def _supports(axes: Axes, result: Result, points: Array) -> list[Artist]:
    held = result.results.file.get("model/supports/held")
    if held is None:
        return []
    directions = np.asarray(held[:], dtype=bool)
    directions = directions[:, ~directions.all(axis=0)]  # a plane model is held out of its plane everywhere
    some = directions.any(axis=1)
    look: dict[str, Any] = {
        "color": SERIES[2],
        "markersize": 7,
        "markerfacecolor": "none",
        "label": "supported joint",
    }
    return list(axes.plot(*points[some].T, "^", **look))


@dataclass(frozen=True, slots=True)
class _State:
    """One state of the structure, in the order of the model; NaN where it was not stored."""

    words: str
    moved: Array  # m, (J, 3)
    force: Array  # N, (N,)
    slack: Array  # (N,)


def displaced(
    axes: Axes,
    result: Result,
    *,
    loading: str | None = None,
    time: float | None = None,
    scale: float | None = None,
) -> list[Artist]:
    """The displaced structure, members coloured by axial force, slack ones dashed.

    ``loading`` names one of a static analysis (the first by default), ``time`` [s] an instant of a
    history (that of the greatest displacement by default); ``scale`` magnifies displacements.
    """
    drawing = Drawing(result)
    state = _state(result, loading, time)
    scale = _scale(state.moved, drawing.size) if scale is None else scale
    place = drawing.positions + scale * state.moved
    artists: list[Artist] = [
        axes.add_collection(drawing.lines(drawing.positions, colors=PALE, linewidths=0.6, zorder=1))
    ]
    known = np.asarray(np.isfinite(place).all(axis=1))
    drawn = known[drawing.ends].all(axis=1) & np.isfinite(state.force)
    artists += _coloured(axes, drawing, place, state.force, np.flatnonzero(drawn & ~state.slack))
    slack = np.flatnonzero(drawn & state.slack)
    if len(slack):
        look = {"colors": SLACK, "linewidths": 1.0, "linestyle": DASHED, "label": f"slack ({len(slack)})"}
        artists.append(axes.add_collection(drawing.lines(place, slack, **look)))
    axes.add_line(Line2D([], [], color=PALE, linewidth=0.8, label="where the model puts it"))
    seen = np.concatenate([drawing.seen(drawing.positions), drawing.seen(place[known])])
    frame(axes, f"{result.name}: {state.words}\n{_moved_words(state.moved, scale)}", seen)
    _legend_below(axes)
    return artists


def _coloured(axes: Axes, drawing: Drawing, place: Array, force: Array, members: Array) -> list[Artist]:
    unit = fitting(force, "N")
    values = unit(force[members])
    largest = float(np.abs(values).max(initial=0.0)) or 1.0
    lines = drawing.lines(
        place,
        members,
        array=values,
        cmap=AXIAL,
        norm=Normalize(-largest, largest),
        linewidths=0.9 + 2.2 * np.abs(values) / largest,
        zorder=3,
    )
    axes.add_collection(lines)
    figure = axes.get_figure()
    if figure is not None:
        bar = figure.colorbar(lines, ax=axes, shrink=0.75, aspect=28, pad=0.02)
        bar.set_label(unit.label("axial force, tension +"))
        bar.outline.set_visible(False)
    return [lines]


def _state(result: Result, loading: str | None, time: float | None) -> _State:
    if result.kind == "history":
        if loading is not None:
            raise InputError(f'"{result.name}" is a history: choose a time, not a loading')
        place = _instant(result, time)
        words = f"at {result['time'][place]:.4g} s"
    else:
        if time is not None:
            raise InputError(f'"{result.name}" has no time: choose a loading')
        names = [str(name) for name in result.values("loads")]
        if loading is not None and loading not in names:
            raise UnknownName("loading", loading, names)
        place = 0 if loading is None else names.index(loading)
        words = names[place]
    moved = _in_model_order(result, "displacement", place, "joint")
    force = _in_model_order(result, "axial_force", place, "member")
    return _State(words, moved, force, _slack(result, place, force))


def _instant(result: Result, time: float | None) -> int:
    stored = result.time
    if not len(stored):
        raise InputError(f'"{result.name}" has no stored step')
    if time is not None:
        return nearest(time, stored, "time", "s")
    if "peaks/displacement/max" not in result:
        return len(stored) - 1
    table = result.peak("displacement").ravel()
    low, high = int(np.nanargmin(table["min"])), int(np.nanargmax(table["max"]))
    row, when = (low, "time_of_min") if -table["min"][low] > table["max"][high] else (high, "time_of_max")
    return int(np.abs(stored - table[when][row]).argmin())


def _in_model_order(result: Result, path: str, place: int, thing: str) -> Array:
    """One row of a dataset for all joints or members of the model, NaN where it was not stored."""
    row = np.asarray(result[path][place], dtype=float)
    names = result.results.joints if thing == "joint" else result.results.members
    if len(row) == len(names):
        return row
    index = {name: k for k, name in enumerate(names)}
    whole = np.full((len(names), *row.shape[1:]), np.nan)
    whole[[index[str(name)] for name in result.labels(path, 1)]] = row
    return whole


def _slack(result: Result, place: int, force: Array) -> Array:
    if "taut" in result:
        return ~np.asarray(result["taut"][place], dtype=bool)
    kinds = np.asarray(result.results.model("members/kind"))
    ties, struts = kinds == "tension-only", kinds == "compression-only"
    return np.asarray((ties & (force <= 0.0)) | (struts & (force >= 0.0)))


def _scale(moved: Array, size: float) -> float:
    largest = float(np.nanmax(np.abs(moved), initial=0.0))
    return round_number(SHOWN_SHARE * size / largest) if 0.0 < largest < SHOWN_SHARE * size else 1.0


def _moved_words(moved: Array, scale: float) -> str:
    lengths = np.linalg.norm(moved, axis=1)
    if not np.isfinite(lengths).any():
        return "no balance was found: there is nothing to show"
    largest = float(np.nanmax(lengths, initial=0.0))
    times = "to scale" if scale == 1.0 else f"shown {scale:g} times"
    return f"greatest displacement {fitting(largest, 'm').text(largest)}, {times}"


def mode(axes: Axes, result: Result, *, mode: int = 1, scale: float = 1.0) -> list[Artist]:
    """A mode shape, both ways of its swing; ``mode`` counts from 1, ``scale`` magnifies what is usual."""
    count = len(result["frequency"])
    if not 1 <= mode <= count:
        raise InputError(f'mode {mode}: "{result.name}" has modes 1 to {count}')
    drawing = Drawing(result)
    shape = np.asarray(result["shape"][mode - 1], dtype=float)
    shape = shape * (
        scale * SHOWN_SHARE * drawing.size / (np.linalg.norm(shape, axis=1).max(initial=0.0) or 1.0)
    )
    one, other = drawing.positions + shape, drawing.positions - shape
    artists: list[Artist] = [
        axes.add_collection(drawing.lines(drawing.positions, colors=PALE, linewidths=0.6)),
        axes.add_collection(drawing.lines(other, colors=SERIES[4], linewidths=0.8, linestyle=DASHED)),
        axes.add_collection(drawing.lines(one, colors=SERIES[0], linewidths=1.4)),
    ]
    frequency = float(result["frequency"][mode - 1])
    both = np.concatenate([drawing.seen(one), drawing.seen(other)])
    frame(
        axes, f"{result.name}: mode {mode}, {figures(frequency, 4)} Hz\nsize of the swing is arbitrary", both
    )
    return artists


def _legend_below(axes: Axes) -> None:
    axes.legend(loc="upper center", bbox_to_anchor=(0.5, 0.0), ncols=4, borderaxespad=0.2)
