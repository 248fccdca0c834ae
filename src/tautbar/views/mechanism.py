"""Plot of a mechanism of the drawing, or of a motion as a rigid body: what moves without stretching."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tautbar.errors import InputError
from tautbar.store import Result
from tautbar.views.drawing import (
    Drawing,
    Size,
    at_first,
    frame,
    legend_below,
    not_at_first,
    put_names,
    spots,
)
from tautbar.views.shapes import SHOWN_SHARE
from tautbar.views.style import DASHED, INK, PALE, SERIES, TENSION

Array = NDArray[Any]
ARROW = 0.1  # of the largest move: joints that move less get no arrow
ARROWS = 60  # those that move most
NAMES = 12  # of the joints that move most
COUNT = "model/statical_count/"
ANSWERS = {  # tension, answer: in words
    ("pretension", "yes"): "the pretension given stiffens it",
    ("pretension", "no"): "the pretension given does not stiffen it",
    ("pretension", "not decided"): "not decided whether the pretension given stiffens it",
    ("self-stress", "yes"): "pretension could stiffen it, none is given",
    ("self-stress", "no"): "no self-stress stiffens it",
    ("self-stress", "not decided"): "not decided whether any self-stress stiffens it",
}


def has_mechanism(result: Result) -> bool:
    """Whether the model of the file can move without stretching any member."""
    return any(COUNT + name in result.results.file for name in ("mechanism", "rigid_motion"))


def page(result: Result, choices: Mapping[str, Any]) -> Size:
    """A page for the structure as modelled."""
    return Drawing(result, choices.get("view"), as_modelled=True).page(below=0.2)


def mechanism(
    axes: Axes, result: Result, *, mode: int = 1, scale: float = 1.0, view: str | None = None
) -> list[Artist]:
    """A mechanism of the drawing, whatever the analysis: arrows at joints, members as they move.

    ``mode`` counts from 1, motions as rigid bodies after the internal mechanisms; ``scale`` magnifies
    what is usual; ``view`` as in `structure`.
    """
    drawing = Drawing(result, view, as_modelled=True)
    move, words = _chosen(result, mode)
    move = move * (scale * SHOWN_SHARE * drawing.size)
    moved = drawing.positions + move
    other = drawing.positions - move
    present = np.flatnonzero(at_first(result))
    looks: list[tuple[str, Array, dict[str, Any]]] = [
        ("the other way", other, {"colors": PALE, "linewidths": 0.8}),
        ("as drawn", drawing.positions, {"colors": INK, "linewidths": 1.0}),
        ("moved one way", moved, {"colors": SERIES[0], "linewidths": 1.1, "linestyle": DASHED}),
    ]
    artists: list[Artist] = [
        axes.add_collection(drawing.lines(place, present, label=label, zorder=rank, **look))
        for rank, (label, place, look) in enumerate(looks, start=1)
    ]
    artists += not_at_first(axes, drawing, result)
    joints = _most_moved(move)
    artists += _arrows(axes, drawing.seen(drawing.positions)[joints], drawing.seen(moved)[joints])
    both = np.concatenate([drawing.seen(moved), drawing.seen(other)])
    artists += frame(axes, drawing, f"{result.results.title}: {words}\nsize of the move is arbitrary", both)
    legend_below(axes)
    named = joints[:NAMES]
    points = drawing.seen(moved)[named]
    artists += put_names(axes, points, [drawing.joints[j] for j in named], spots(axes, points))
    return artists


def _chosen(result: Result, mode: int) -> tuple[Array, str]:
    """Moves (J, 3), largest 1, and their title."""
    file = result.results.file
    found = {name: file.get(COUNT + name) for name in ("mechanism", "rigid_motion")}
    sizes = {name: 0 if data is None else len(data) for name, data in found.items()}
    inner, both = sizes["mechanism"], sum(sizes.values())
    if not 1 <= mode <= both:
        raise InputError(f"mode {mode}: the model has mechanisms and motions as rigid bodies 1 to {both}")
    if mode > inner:
        move = found["rigid_motion"][mode - inner - 1]
        words = f"motion as a rigid body {mode - inner} of {int(file[COUNT + 'rigid_motions'][()])}"
        return np.asarray(move), words
    answers = file[COUNT + "stiffened"]
    by = str(file[COUNT + "stiffened_by"].asstr()[()])
    said = ANSWERS[by, str(answers.asstr()[mode - 1])]
    if not int(file[COUNT + "states_of_self_stress"][()]):
        said = "no self-stress is possible that could stiffen it"
    total = int(file[COUNT + "mechanisms"][()])
    return np.asarray(found["mechanism"][mode - 1]), f"mechanism {mode} of {total}\n{said}"


def _most_moved(move: Array) -> NDArray[np.intp]:
    """Joints that move visibly, the one that moves most first."""
    size = np.linalg.norm(move, axis=1)
    order = np.argsort(-np.round(size / size.max(), 6), kind="stable")[:ARROWS]
    return np.asarray(order[size[order] >= ARROW * size.max()])


def _arrows(axes: Axes, start: Array, end: Array) -> list[Artist]:
    look = {"arrowstyle": "-|>", "color": TENSION, "linewidth": 1.3, "shrinkA": 0.0, "shrinkB": 0.0}
    return [
        axes.annotate("", xy=tuple(b), xytext=tuple(a), arrowprops=look, zorder=4)
        for a, b in zip(start.tolist(), end.tolist(), strict=True)
        if np.hypot(b[0] - a[0], b[1] - a[1]) > 0.0
    ]
