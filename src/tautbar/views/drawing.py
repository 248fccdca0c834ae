"""Structures on paper: members as lines, axes and scale, names that do not cover each other."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.patheffects import withStroke
from matplotlib.transforms import Bbox, ScaledTranslation, Transform
from numpy.typing import NDArray

from tautbar.store import Result
from tautbar.views.quantities import fitting, round_number
from tautbar.views.style import DASHED, INK, PALE
from tautbar.views.viewpoint import viewpoint

Array = NDArray[Any]
Size = tuple[float, float]  # inches
Bent = Mapping[int, Array]  # members drawn as curves: points along each, (P, 3)
AS_PICTURE = 5000  # members above which lines are stored as a picture, or files grow unwieldy
Place = tuple[tuple[float, float], str, str]  # of a name beside its point: offset [pt], anchor
PLACES: tuple[Place, ...] = (
    ((4, 2), "left", "bottom"),
    ((-4, 2), "right", "bottom"),
    ((4, -2), "left", "top"),
    ((-4, -2), "right", "top"),
)
NAME_LOOK: dict[str, Any] = {
    "fontsize": 7,
    "color": INK,
    "path_effects": [withStroke(linewidth=2.0, foreground="white")],
    "zorder": 5,
}
PAGE = 7.2  # in, width of a page
STRIP = 0.55  # in, below a drawing, for its axes and scale
ARM = 0.28  # in, of an axis
BAR = 0.22  # of the width of a drawing: the scale bar, at most
LEAST_BAR = 0.05  # of the size of the structure, where it is hardly wide at all


class Drawing:
    """A structure as seen by an onlooker far away, from where ``view`` says (`viewpoint`).

    With ``as_modelled`` it is the structure of the model also where the analysis cut ropes into pieces.
    """

    def __init__(self, result: Result, view: str | None = None, *, as_modelled: bool = False) -> None:
        model = result.results
        cut = "position_with_pieces" in result and not as_modelled
        self.positions = result.values("position_with_pieces") if cut else model.positions
        self.ends = result.values("ends_with_pieces").astype(np.int64) if cut else model.ends
        self.joints = result.joints if cut else model.joints
        self.members = result.members if cut else model.members
        spread = np.ptp(self.positions, axis=0) if len(self.positions) else np.zeros(3)
        self.size = float(np.linalg.norm(spread)) or 1.0
        self.view, self.true_across = viewpoint(self.positions, model.up, view)

    def seen(self, positions: Array) -> Array:
        """Points (..., 3) on paper, (..., 2)."""
        return positions @ self.view.T

    def lines(
        self, positions: Array, members: Array | slice = slice(None), bent: Bent | None = None, **look: Any
    ) -> LineCollection:
        """Members between joints at ``positions`` (J, 3) as lines, ``bent`` ones as their curves."""
        paths: Any = self.seen(positions)[self.ends[members]]
        if bent:
            which = np.arange(len(self.ends))[members].tolist()
            pairs = zip(which, paths, strict=True)
            paths = [self.seen(bent[k]) if k in bent else path for k, path in pairs]
        collection = LineCollection(list(paths), **look)
        collection.set_rasterized(len(self.members) > AS_PICTURE)
        collection.set_capstyle("round" if look.get("linestyle") is None else "butt")
        return collection

    def corners(self, positions: Array, bent: Bent | None = None) -> Array:
        """Points on paper (P, 2) that a drawing has to have room for."""
        curves = [self.seen(points) for points in (bent or {}).values()]
        return np.concatenate([self.seen(positions), *curves])

    def page(self, aside: float = 0.0, below: float = 0.0, swing: float = 0.0) -> Size:
        """A page on which the structure fills its width, or for tall ones a good height.

        ``aside`` and ``below`` [in] are kept free for what stands beside the drawing; joints move on
        paper by ``swing`` times the size of the structure up and down.
        """
        wide, high = (np.ptp(self.seen(self.positions), axis=0) * 1.12).tolist() if self.joints else (1, 1)
        high += 2.0 * swing * self.size
        extra = 0.55 + STRIP + 0.35 + below  # title, axes and scale, legend
        share = high / wide if wide > 0.0 else np.inf
        height = min(max((PAGE - aside) * share, 1.0), 6.6)
        width = min(PAGE, max(4.8, height / share + aside if share else PAGE))
        return (width, height + extra)


def at_first(result: Result) -> NDArray[np.bool_]:
    """Which members of the model are there at first: all of them in a file that does not say."""
    stored = result.results.file.get("model/members/present")
    return np.ones(len(result.results.members), bool) if stored is None else np.asarray(stored[:] != 0)


def not_at_first(axes: Axes, drawing: Drawing, result: Result, bent: Bent | None = None) -> list[Artist]:
    """Members that come later, where the model puts them: dashed and pale, in the legend."""
    later = np.flatnonzero(~at_first(result))
    if not len(later):
        return []
    look: dict[str, Any] = {"colors": PALE, "linewidths": 1.0, "linestyle": DASHED}
    look["label"] = f"not there at first ({members_counted(result, later)})"
    return [axes.add_collection(drawing.lines(drawing.positions, later, bent, **look))]


def members_counted(result: Result, places: Array) -> int:
    """How many members of the model some are, the pieces of a rope counted as one."""
    whole = {piece: rope for rope, pieces in result.results.ropes.items() for piece in pieces}
    names = [result.results.members[k] for k in places.tolist()]
    return len({whole.get(name, name) for name in names})


def frame(axes: Axes, drawing: Drawing, title: str, corners: Array) -> list[Artist]:
    """Equal scales, room for all points on paper (P, 2), and below the directions and the scale."""
    axes.set_title(title)
    axes.set_aspect("equal", adjustable="datalim")
    axes.set_axis_off()
    axes.update_datalim(corners)
    axes.margins(0.05)
    axes.autoscale_view()
    return [*_directions(axes, drawing), *_scale_bar(axes, drawing, corners)]


def _inches(axes: Axes) -> Transform:
    """Inches from the lower left corner of the axes."""
    corner: Any = axes.transAxes  # any transform will do for a point, whatever the type says
    return _page(axes).dpi_scale_trans + ScaledTranslation(0.0, 0.0, corner)


def _page(axes: Axes) -> Figure:
    figure = axes.figure.figure
    assert isinstance(figure, Figure)
    return figure


def _directions(axes: Axes, drawing: Drawing) -> list[Artist]:
    """The axes x, y, z as seen; one seen end-on is left out."""
    artists: list[Artist] = []
    arms = drawing.view.T * ARM
    origin = np.array([0.12, -STRIP + 0.12]) - np.minimum(arms.min(axis=0), 0.0)
    look: dict[str, Any] = {"transform": _inches(axes), "clip_on": False}
    for name, arm in zip("xyz", arms, strict=True):
        if np.linalg.norm(arm) > 0.05 * ARM:
            end = origin + arm
            artists += axes.plot(*np.transpose([origin, end]), color=INK, linewidth=1.0, **look)
            x, y = (end + 0.09 * arm / np.linalg.norm(arm)).tolist()
            artists.append(axes.text(x, y, name, fontsize=7.5, ha="center", va="center", **look))
    return artists


def _scale_bar(axes: Axes, drawing: Drawing, corners: Array) -> list[Artist]:
    low, high = corners[:, 0].min(), corners[:, 0].max()
    length = round_number(max(BAR * float(high - low), LEAST_BAR * drawing.size))
    figure = _page(axes)
    place = ScaledTranslation(0.0, -STRIP + 0.12, figure.dpi_scale_trans)
    look: dict[str, Any] = {"transform": axes.get_xaxis_transform() + place, "clip_on": False}
    unit = fitting(length, "m")
    words = f"{length / unit.size:g} {unit.sign}" + ("" if drawing.true_across else " across the view")
    bar = axes.plot([high - length, high], [0.0, 0.0], color=INK, linewidth=1.4, marker="|", **look)
    look["transform"] = look["transform"] + ScaledTranslation(0.0, 0.06, figure.dpi_scale_trans)
    return [*bar, axes.text(high, 0.0, words, fontsize=7.5, ha="right", va="bottom", **look)]


def legend_below(axes: Axes) -> None:
    """The legend, under the strip of axes and scale."""
    place = axes.transAxes + ScaledTranslation(0.0, -STRIP, _page(axes).dpi_scale_trans)
    axes.legend(
        loc="upper center", bbox_to_anchor=(0.5, 0.0), bbox_transform=place, ncols=3, borderaxespad=0.2
    )


def put_names(
    axes: Axes,
    points: Array,
    names: Iterable[str],
    taken: list[Bbox],
    places: Iterable[Place] = PLACES,
    **look: Any,
) -> list[Artist]:
    """Write names beside points (P, 2), leaving out those that would cover one of ``taken``.

    Call it last, with the limits of the axes set. ``taken`` grows by the names written. ``places`` are
    tried in turn: offset [pt] and anchor.
    """
    places = tuple(places)
    artists: list[Artist] = []
    for point, name in zip(points, names, strict=True):
        text = axes.annotate(
            name, (point[0], point[1]), (0, 0), textcoords="offset points", **{**NAME_LOOK, **look}
        )
        for offset, side, height in places:
            text.set(position=offset, ha=side, va=height)
            box = text.get_window_extent()
            if not any(box.overlaps(other) for other in taken):
                taken.append(box)
                artists.append(text)
                break
        else:
            text.remove()
    return artists


def spots(axes: Axes, points: Sequence[Any] | Array) -> list[Bbox]:
    """What points (P, 2) cover on the page, once everything else has its place."""
    _page(axes).draw_without_rendering()
    centres = axes.transData.transform(points)
    return [Bbox.from_bounds(x - 2.0, y - 2.0, 4.0, 4.0) for x, y in centres.tolist()]
