"""Structures on paper: one projection, members as lines, names that do not cover each other."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.patheffects import withStroke
from matplotlib.transforms import Bbox
from numpy.typing import NDArray

from tautbar.store import Result
from tautbar.views.style import INK

Array = NDArray[Any]
AZIMUTH, ELEVATION = 0.62, 0.36  # rad: a corner view from a little above
AS_PICTURE = 5000  # members above which lines are stored as a picture, or files grow unwieldy
PLACES: tuple[
    tuple[tuple[float, float], str, str], ...
] = (  # of a name beside its point: offset [pt], anchor
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
FLAT = 1e-9  # of the size: a structure thinner than this is plane


class Drawing:
    """A structure as seen by an onlooker far away.

    Plane structures are seen square on; others from a corner, z up.
    """

    def __init__(self, result: Result) -> None:
        model = result.results
        self.positions = model.positions
        self.ends = model.ends
        self.joints = model.joints
        self.members = model.members
        spread = np.ptp(self.positions, axis=0) if len(self.positions) else np.zeros(3)
        self.size = float(np.linalg.norm(spread)) or 1.0
        self._view = _view(spread <= FLAT * self.size)

    def seen(self, positions: Array) -> Array:
        """Points (..., 3) on paper, (..., 2)."""
        return positions @ self._view.T

    def lines(self, positions: Array, members: Array | slice = slice(None), **look: Any) -> LineCollection:
        """Members between joints at ``positions`` (J, 3) as lines."""
        collection = LineCollection(list(self.seen(positions)[self.ends[members]]), **look)
        collection.set_rasterized(len(self.members) > AS_PICTURE)
        collection.set_capstyle("round" if look.get("linestyle") is None else "butt")
        return collection


def _view(flat: NDArray[np.bool_]) -> NDArray[np.float64]:
    if flat.sum() == 1:
        return np.delete(np.eye(3), int(np.flatnonzero(flat)[0]), axis=0)
    ca, sa, ce, se = np.cos(AZIMUTH), np.sin(AZIMUTH), np.cos(ELEVATION), np.sin(ELEVATION)
    return np.array([[ca, sa, 0.0], [-sa * se, ca * se, ce]])


def frame(axes: Axes, title: str, corners: Array) -> None:
    """Equal scales, no axes, and room for all points on paper (P, 2)."""
    axes.set_title(title)
    axes.set_aspect("equal", adjustable="datalim")
    axes.set_axis_off()
    axes.update_datalim(corners)
    axes.margins(0.06)
    axes.autoscale_view()


def put_names(
    axes: Axes, points: Array, names: Sequence[str], taken: list[Bbox], **look: Any
) -> list[Artist]:
    """Write names beside points (P, 2), leaving out those that would cover one of ``taken``.

    Call it last, with the limits of the axes set. ``taken`` grows by the names written.
    """
    artists: list[Artist] = []
    for point, name in zip(points, names, strict=True):
        text = axes.annotate(
            name, (point[0], point[1]), (0, 0), textcoords="offset points", **{**NAME_LOOK, **look}
        )
        for offset, side, height in PLACES:
            text.set(position=offset, ha=side, va=height)
            box = text.get_window_extent()
            if not any(box.overlaps(other) for other in taken):
                taken.append(box)
                artists.append(text)
                break
        else:
            text.remove()
    return artists


def spots(axes: Axes, points: Array) -> list[Bbox]:
    """What points (P, 2) cover on the page, once everything else has its place."""
    figure = axes.figure.figure
    assert isinstance(figure, Figure)
    figure.draw_without_rendering()
    centres = axes.transData.transform(points)
    return [Bbox.from_bounds(x - 2.0, y - 2.0, 4.0, 4.0) for x, y in centres.tolist()]
