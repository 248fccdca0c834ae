"""Plots of the whole structure: as the model puts it, displaced, and as it swings in a mode."""

from __future__ import annotations

from collections.abc import Mapping
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
from tautbar.views.drawing import (
    Bent,
    Drawing,
    Size,
    at_first,
    frame,
    legend_below,
    members_counted,
    not_at_first,
    put_names,
    spots,
)
from tautbar.views.quantities import figures, fitting, round_number
from tautbar.views.ropes import curves
from tautbar.views.states import state, there, titled
from tautbar.views.style import AXIAL, DASHED, DASHES, INK, PALE, SERIES, SLACK

Array = NDArray[Any]
MOST_NAMES = 400  # joints above which names are not even tried
FEW_MEMBERS = 40  # all of which can be named
LONG = 0.2  # of the size of the structure: members that can be named among many
SHOWN_SHARE = 0.08  # of the size of the structure: the largest displacement as drawn, at most
WIDE = 1.1  # width over height of a drawing from which its colours stand below, not beside
BESIDE, BELOW = 1.1, 0.6  # in, room for the colours
KIND_LOOKS = {  # dash, colour, width
    "bar": ("-", INK, 1.4),
    "tension-only": (DASHES[1], SERIES[1], 1.1),
    "compression-only": (DASHES[2], SERIES[0], 1.6),
    "hanging": (DASHES[3], SERIES[3], 1.1),
}


def page(result: Result, choices: Mapping[str, Any]) -> Size:
    """A page that fits the structure as it is seen."""
    return Drawing(result, choices.get("view")).page()


def page_with_swing(result: Result, choices: Mapping[str, Any]) -> Size:
    """The same with room for a shape that swings both ways."""
    return Drawing(result, choices.get("view")).page(swing=SHOWN_SHARE)


def page_with_colours(result: Result, choices: Mapping[str, Any]) -> Size:
    """The same with room for the colours of forces."""
    drawing = Drawing(result, choices.get("view"))
    room = {"below": BELOW} if _wide(drawing) else {"aside": BESIDE}
    return drawing.page(**room, swing=SHOWN_SHARE / 2.0)


def _wide(drawing: Drawing) -> bool:
    wide, high = np.ptp(drawing.seen(drawing.positions), axis=0).tolist()
    return bool(wide > WIDE * high)


def structure(axes: Axes, result: Result, *, view: str | None = None) -> list[Artist]:
    """Joints and members where the model puts them, members by kind, those not there at first apart.

    ``view`` is "front", "side", "top", or azimuth and elevation in degrees, such as "30 20".
    """
    drawing = Drawing(result, view, as_modelled=True)
    bent = _curves_as_modelled(result, drawing)
    artists = _by_kind(axes, drawing, result, bent) + not_at_first(axes, drawing, result, bent)
    points = drawing.seen(drawing.positions)
    real = _not_between_pieces(drawing, result)
    artists += axes.plot(*points[real].T, "o", color=INK, markersize=2.5)
    artists += _supports(axes, result, points)
    artists += frame(axes, drawing, result.results.title, drawing.corners(drawing.positions, bent))
    legend_below(axes)
    if len(points) <= MOST_NAMES:
        taken = spots(axes, points)
        names = [drawing.joints[k] for k in real]
        artists += put_names(axes, points[real], names, taken, fontweight="bold")
        artists += _member_names(axes, drawing, result, bent, taken)
    return artists


def _by_kind(axes: Axes, drawing: Drawing, result: Result, bent: Bent) -> list[Artist]:
    """Members as lines, one look for each kind; the pieces of a rope count as one."""
    kinds, present = np.asarray(result.results.model("members/kind")), at_first(result)
    artists: list[Artist] = []
    for kind, (dash, colour, width) in KIND_LOOKS.items():
        of_kind = np.flatnonzero((kinds == kind) & present)
        if len(of_kind):
            look = {"linestyle": dash, "colors": colour, "linewidths": width}
            look["label"] = f"{kind} ({members_counted(result, of_kind)})"
            lines = drawing.lines(drawing.positions, of_kind, bent, **look)
            artists.append(axes.add_collection(lines))
    return artists


def _not_between_pieces(drawing: Drawing, result: Result) -> list[int]:
    """Joints but those between the pieces of a rope."""
    place = {name: k for k, name in enumerate(drawing.members)}
    between = {
        int(drawing.ends[place[piece], 1]) for rope in result.results.ropes.values() for piece in rope[:-1]
    }
    return [k for k in range(len(drawing.joints)) if k not in between]


def _curves_as_modelled(result: Result, drawing: Drawing) -> Bent:
    """Hanging members as they hang in the first loading, their ends where the model puts them."""
    if "rope_curve/position" not in result:
        return {}
    return curves(result, 0, np.asarray(result["displacement"][0], dtype=float), 0.0)


def _member_names(
    axes: Axes, drawing: Drawing, result: Result, bent: Bent, taken: list[Bbox]
) -> list[Artist]:
    """Names of all members if they are few, else of the long ones: the others crowd each other.

    A rope in pieces has its name once, in its middle.
    """
    points = drawing.seen(drawing.positions)
    first, second = points[drawing.ends[:, 0]], points[drawing.ends[:, 1]]
    middle = (first + second) / 2.0
    for k, curve in bent.items():
        middle[k] = drawing.seen(curve[len(curve) // 2])
    lengths = np.linalg.norm(second - first, axis=1)
    least = 0.0 if len(lengths) <= FEW_MEMBERS else LONG * drawing.size
    ropes = result.results.ropes
    pieces = {piece for rope in ropes.values() for piece in rope}
    named = [k for k in np.flatnonzero(lengths >= least).tolist() if drawing.members[k] not in pieces]
    place = {name: k for k, name in enumerate(drawing.members)}
    halves = [place[rope[len(rope) // 2]] for rope in ropes.values()]
    names = [*(drawing.members[k] for k in named), *ropes]
    middles = np.concatenate([middle[named], first[halves]])
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


def displaced(
    axes: Axes,
    result: Result,
    *,
    loading: str | None = None,
    time: float | None = None,
    at: str | None = None,
    scale: float | None = None,
    view: str | None = None,
) -> list[Artist]:
    """The displaced structure, members coloured by axial force, slack ones dashed.

    ``loading`` names one of a static analysis (the first by default), ``time`` [s] an instant of a
    history (that of the greatest displacement by default), ``at`` a point of a path ("limit point 1";
    its end by default); ``scale`` magnifies displacements; ``view`` as in `structure`. Members that are
    not there are not drawn.
    """
    drawing = Drawing(result, view)
    shown = state(result, drawing.joints, drawing.members, loading=loading, time=time, at=at)
    scale = _scale(shown.moved, drawing.size) if scale is None else scale
    place = drawing.positions + scale * shown.moved
    bent = {} if shown.loading is None else curves(result, shown.loading, shown.moved, scale)
    known = np.asarray(np.isfinite(place).all(axis=1))
    artists: list[Artist] = [
        axes.add_collection(
            drawing.lines(
                drawing.positions, np.flatnonzero(shown.there), colors=PALE, linewidths=0.6, zorder=1
            )
        )
    ]
    drawn = known[drawing.ends].all(axis=1) & np.isfinite(shown.force) & shown.there
    coloured = np.flatnonzero(drawn & ~shown.slack)
    artists += _coloured(axes, drawing, place, shown.force, coloured, bent)
    slack = np.flatnonzero(drawn & shown.slack)
    if len(slack):
        look = {"colors": SLACK, "linewidths": 1.0, "linestyle": DASHED, "label": f"slack ({len(slack)})"}
        artists.append(axes.add_collection(drawing.lines(place, slack, bent, **look)))
    axes.add_line(Line2D([], [], color=PALE, linewidth=0.8, label="where the model puts it"))
    seen = np.concatenate([drawing.seen(drawing.positions), drawing.corners(place[known], bent)])
    title = f"{titled(result, shown.words)}\n{_moved_words(shown.moved, scale)}"
    artists += frame(axes, drawing, title, seen)
    legend_below(axes)
    return artists


def _coloured(
    axes: Axes, drawing: Drawing, place: Array, force: Array, members: Array, bent: Bent
) -> list[Artist]:
    unit = fitting(force, "N")
    values = unit(force[members])
    largest = float(np.abs(values).max(initial=0.0)) or 1.0
    lines = drawing.lines(
        place,
        members,
        bent,
        array=values,
        cmap=AXIAL,
        norm=Normalize(-largest, largest),
        linewidths=0.9 + 2.2 * np.abs(values) / largest,
        zorder=3,
    )
    axes.add_collection(lines)
    figure = axes.get_figure()
    if figure is not None:
        beside: dict[str, Any] = {"shrink": 0.75, "aspect": 28, "pad": 0.02}
        below: dict[str, Any] = {"location": "bottom", "shrink": 0.6, "aspect": 40, "pad": 0.03}
        bar = figure.colorbar(lines, ax=axes, **(below if _wide(drawing) else beside))
        bar.set_label(unit.label("axial force, tension +"))
        bar.outline.set_visible(False)
    return [lines]


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


def mode(
    axes: Axes, result: Result, *, mode: int = 1, scale: float = 1.0, view: str | None = None
) -> list[Artist]:
    """A shape of vibration or buckling, both ways of its swing, of the members that are there.

    ``mode`` counts from 1, ``scale`` magnifies what is usual; ``view`` as in `structure`.
    """
    count = len(result["shape"])
    if not 1 <= mode <= count:
        raise InputError(f'mode {mode}: "{result.name}" has modes 1 to {count}')
    drawing = Drawing(result, view)
    shape = np.asarray(result["shape"][mode - 1], dtype=float)
    shape = shape * (
        scale * SHOWN_SHARE * drawing.size / (np.linalg.norm(shape, axis=1).max(initial=0.0) or 1.0)
    )
    one, other = drawing.positions + shape, drawing.positions - shape
    drawn = np.flatnonzero(there(result, drawing.members))
    artists: list[Artist] = [
        axes.add_collection(drawing.lines(drawing.positions, drawn, colors=PALE, linewidths=0.6)),
        axes.add_collection(drawing.lines(other, drawn, colors=SERIES[4], linewidths=0.8, linestyle=DASHED)),
        axes.add_collection(drawing.lines(one, drawn, colors=SERIES[0], linewidths=1.4)),
    ]
    both = np.concatenate([drawing.seen(one), drawing.seen(other)])
    title = f"{result.name}: {_mode_words(result, mode)}\nsize of the swing is arbitrary"
    return artists + frame(axes, drawing, title, both)


def _mode_words(result: Result, mode: int) -> str:
    if "frequency" in result:
        return f"mode {mode}, {figures(float(result['frequency'][mode - 1]), 4)} Hz"
    return f"buckling mode {mode}, load factor {figures(float(result['load_factor'][mode - 1]), 4)}"
