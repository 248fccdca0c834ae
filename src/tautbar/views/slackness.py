"""When members, groups and ropes were slack, and how hard they snatched."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.colors import to_rgb
from numpy.typing import NDArray

from tautbar.store import Result
from tautbar.views.quantities import Shown, fitting
from tautbar.views.rows import gather, inside
from tautbar.views.style import SLACK, say_nothing_to_show

Array = NDArray[Any]
MOST_ROWS = 40  # names that can be read on one page
PALEST = 0.25  # shade of the least share, so that it is seen


@dataclass(frozen=True, slots=True)
class Spell:
    """A row of the plot: stretches of time with the share of its members that were slack."""

    label: str
    start: Array  # s
    end: Array
    share: Array
    snatch: float  # N, the hardest; NaN: none
    snatch_time: float  # s; NaN: not stored
    to_the_end: bool

    @property
    def time(self) -> float:
        """How long any was slack [s]."""
        return float((self.end - self.start).sum())


def spells(result: Result, member: str | None = None) -> list[Spell]:
    """Rows of members that were slack, the longest first; ``member`` opens a group or rope."""
    episodes = result.slack_episodes
    if not len(episodes):
        return []
    end = float(result["energy/time"][-1])
    ever = set(episodes["member"].tolist())
    slack = [name for name in result.members if name in ever]
    found = [_spell(row.name, episodes, end, result) for row in gather(result, slack, member)]
    return sorted(found, key=lambda spell: (-spell.time, spell.label))


def _spell(name: str, episodes: Array, end: float, result: Result) -> Spell:
    members = [result.members[k] for k in inside(result, result.members, name)]
    own = episodes[np.isin(episodes["member"], members)]
    ends = np.where(np.isnan(own["end"]), end, own["end"])
    able = _able(result, members)
    times, place = np.unique(np.concatenate([own["start"], ends]), return_inverse=True)
    steps = np.zeros(len(times))
    np.add.at(steps, place, np.repeat([1.0, -1.0], len(own)))
    share = np.cumsum(steps)[:-1] / able
    some = share > 0.5 / able
    known = np.isfinite(own["snatch_force"])
    hardest = own[known][own["snatch_force"][known].argmax()] if known.any() else None
    timed = hardest is not None and "time_of_snatch" in (own.dtype.names or ())
    return Spell(
        label=f"{name} ({able})" if able > 1 else name,
        start=times[:-1][some],
        end=times[1:][some],
        share=share[some],
        snatch=float("nan") if hardest is None else float(hardest["snatch_force"]),
        snatch_time=float(hardest["time_of_snatch"]) if hardest is not None and timed else float("nan"),
        to_the_end=bool(np.isnan(own["end"]).any()),
    )


def _able(result: Result, members: list[str]) -> int:
    """How many of some members can go slack: bars in the same group do not count."""
    bars = {
        name
        for name, kind in zip(
            result.results.members, result.results.model("members/kind").tolist(), strict=True
        )
        if kind == "bar"
    }
    return max(1, len(set(members) - bars))


def slack(axes: Axes, result: Result, *, member: str | None = None) -> list[Artist]:
    """When each tie, group or rope was slack; beside it the share of the time and the hardest snatch.

    The shade of a group or rope is the share of its members that were slack; ``member`` opens one.
    """
    every = spells(result, member)
    if not every:
        return say_nothing_to_show(axes, f"{result.name}: no member went slack")
    shown = every[:MOST_ROWS]
    end = float(result["energy/time"][-1])
    unit = fitting([spell.snatch for spell in shown], "N")
    beside: dict[str, Any] = {"xycoords": axes.get_yaxis_transform(), "textcoords": "offset points"}
    artists: list[Artist] = []
    for row, spell in enumerate(shown):
        spans = list(zip(spell.start.tolist(), (spell.end - spell.start).tolist(), strict=True))
        shades = _shades(spell.share)
        look: dict[str, Any] = {"facecolors": shades, "edgecolors": shades, "linewidth": 0.4}
        artists.append(axes.broken_barh(spans, (row - 0.32, 0.64), **look))
        words = _beside(spell, end, unit)
        artists.append(axes.annotate(words, (1.0, row), (6, 0), va="center", fontsize=7.5, **beside))
    axes.set_yticks(range(len(shown)), [spell.label for spell in shown], fontsize=7.5)
    axes.set_ylim(len(shown) - 0.4, -0.6)
    axes.set_xlim(0.0, end)
    axes.grid(False, axis="y")
    axes.set_xlabel("time [s]")
    axes.set_title(_title(result, member, every, shown))
    return artists


def _shades(share: Array) -> list[tuple[float, float, float]]:
    dark = np.array(to_rgb(SLACK))
    weight = np.clip(PALEST + (1.0 - PALEST) * share, 0.0, 1.0)[:, np.newaxis]
    return [tuple(shade) for shade in (1.0 - weight * (1.0 - dark)).tolist()]


def _beside(spell: Spell, end: float, unit: Shown) -> str:
    words = f"{100.0 * spell.time / (end or 1.0):.3g} %"
    if np.isnan(spell.snatch):
        return f"{words}, slack to the end" if spell.to_the_end else words
    when = "" if np.isnan(spell.snatch_time) else f" at {spell.snatch_time:.4g} s"
    return f"{words}, {unit.text(spell.snatch)}{when}"


def _title(result: Result, member: str | None, every: list[Spell], shown: list[Spell]) -> str:
    who = f"members of {member}" if member and result.members_of(member) else (member or "members")
    verb = "was" if member and not result.members_of(member) else "were"
    left_out = len(every) - len(shown)
    some = f", the {len(shown)} longest; {left_out} more went slack" if left_out else ""
    gathered = any("(" in spell.label for spell in shown)
    shade = "shade: share of the members in brackets\n" if gathered else ""
    time = "share of the time (any of them)" if gathered else "share of the time"
    return f"{result.name}: when {who} {verb} slack{some}\n{shade}beside: {time}, hardest snatch"
