"""What each member saw at most and at least, and when it was slack."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tautbar.store import Result
from tautbar.views.quantities import fitting
from tautbar.views.style import COMPRESSION, INK, SLACK, TENSION, say_nothing_to_show

Array = NDArray[Any]
MOST_ROWS = 40  # names that can be read on one page


@dataclass(frozen=True, slots=True)
class Envelope:
    """Least and greatest axial force [N] of each member, and over what it was taken."""

    members: tuple[str, ...]
    low: Array
    high: Array
    over: str


def envelope(result: Result) -> Envelope:
    """The envelope of axial force over the computed steps of a history, or over the loadings.

    Loadings without a balance have no part in it.
    """
    if "peaks/axial_force/min" in result:
        table = result.peak("axial_force")
        return Envelope(tuple(table["member"].tolist()), table["min"], table["max"], "every computed step")
    force = np.asarray(result.values("axial_force"), dtype=float)
    words = "stored steps" if result.kind == "history" else f"{len(force)} loading{'s' * (len(force) != 1)}"
    if "converged" in result:
        holds = result.values("converged").astype(bool)
        force, words = force[holds], words if holds.all() else f"{holds.sum()} of {words}"
    members = tuple(str(name) for name in result.labels("axial_force", 1))
    if not len(force):
        nothing = np.full(len(members), np.nan)
        return Envelope(members, nothing, nothing, words)
    return Envelope(members, force.min(axis=0), force.max(axis=0), words)


def forces(axes: Axes, result: Result) -> list[Artist]:
    """Range of axial force of each member, the greatest first, at most 40 members."""
    whole = envelope(result)
    greatest = np.nan_to_num(np.maximum(np.abs(whole.low), np.abs(whole.high)))
    if not len(greatest):
        return say_nothing_to_show(axes, "no member's force was stored")
    order = np.argsort(-greatest, kind="stable")[:MOST_ROWS]
    unit = fitting(greatest, "N")
    low, high = unit(whole.low[order]), unit(whole.high[order])
    rows = np.arange(len(order))
    single = bool((low == high).all())
    artists = _bars(axes, rows, *((np.minimum(low, 0.0), np.maximum(high, 0.0)) if single else (low, high)))
    for values in (high,) if single else (low, high):
        artists.append(axes.scatter(values, rows, marker="|", s=60, linewidths=1.4, color=INK, zorder=3))
    axes.use_sticky_edges = False
    axes.margins(x=0.04)
    axes.axvline(0.0, color=INK, linewidth=0.8)
    axes.set_yticks(rows, [whole.members[k] for k in order], fontsize=7.5)
    axes.set_ylim(len(order) - 0.4, -0.6)
    axes.grid(False, axis="y")
    axes.set_xlabel(unit.label("axial force, tension +"))
    some = (
        ""
        if len(order) == len(greatest)
        else f"\nthe {len(order)} of {len(greatest)} members with the greatest"
    )
    words = "axial force" if single else "range of axial force"
    axes.set_title(f"{result.name}: {words} over {whole.over}{some}")
    return artists


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


def slack(axes: Axes, result: Result) -> list[Artist]:
    """When each tie was slack; beside it the share of the time and the hardest snatch."""
    episodes = result.slack_episodes
    if not len(episodes):
        return say_nothing_to_show(axes, f"{result.name}: no member went slack")
    end = float(result["energy/time"][-1])
    table = _worst_first(result, episodes)
    unit = fitting(episodes["snatch_force"], "N")
    artists: list[Artist] = []
    for row, (member, share) in enumerate(table):
        own = episodes[episodes["member"] == member]
        spans = [(e["start"], (end if np.isnan(e["end"]) else e["end"]) - e["start"]) for e in own]
        look: dict[str, Any] = {"facecolors": SLACK, "edgecolors": SLACK, "linewidth": 0.6}
        artists.append(axes.broken_barh(spans, (row - 0.32, 0.64), **look))
        words = _beside(share, own["snatch_force"], unit)
        beside: dict[str, Any] = {"xycoords": axes.get_yaxis_transform(), "textcoords": "offset points"}
        artists.append(axes.annotate(words, (1.0, row), (6, 0), va="center", fontsize=7.5, **beside))
    axes.set_yticks(range(len(table)), [member for member, _ in table], fontsize=7.5)
    axes.set_ylim(len(table) - 0.4, -0.6)
    axes.set_xlim(0.0, end)
    axes.grid(False, axis="y")
    axes.set_xlabel("time [s]")
    left_out = len(set(episodes["member"].tolist())) - len(table)
    some = f", the {len(table)} longest; {left_out} more went slack" if left_out else ""
    axes.set_title(f"{result.name}: when members were slack{some}\nbeside: share of the time, hardest snatch")
    return artists


def _worst_first(result: Result, episodes: Array) -> list[tuple[str, float]]:
    """Members and their share of the time slack, the longest first, as many as can be read."""
    shares = dict(zip(result.labels("slack_share", 0), result.values("slack_share").tolist(), strict=True))
    members = sorted(set(episodes["member"].tolist()), key=lambda name: (-shares[name], name))
    return [(name, shares[name]) for name in members[:MOST_ROWS]]


def _beside(share: float, snatches: Array, unit: Any) -> str:
    known = snatches[np.isfinite(snatches)]
    words = f"{100.0 * share:.3g} %"
    return f"{words}, {unit.text(float(known.max()))}" if len(known) else f"{words}, slack to the end"
