"""How frequencies and tensions change with pretension, over the analyses of one file."""

from __future__ import annotations

import textwrap
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tautbar.errors import InputError
from tautbar.store import Result
from tautbar.store.layout import UnknownName
from tautbar.views.quantities import figures, fitting
from tautbar.views.rows import gather
from tautbar.views.states import loading_names
from tautbar.views.style import DASHES, SERIES, say_nothing_to_show

Array = NDArray[Any]
MOST_MODES = 7
MOST_GROUPS = 7
MARKERS = "osD^v<>"
LETTERS = 72  # of a line of the title


@dataclass(frozen=True, slots=True)
class Level:
    """Modes about one state: frequencies (M,) [Hz] and the axial force (N,) [N] they were found at.

    ``acting`` is what acts, loads and their factors; ``absent`` the members that are not there.
    """

    modes: str
    state: str
    acting: str
    absent: frozenset[str]
    frequency: Array
    force: Array


def levels(result: Result) -> list[Level]:
    """The modes analyses of the file that differ from one of them by their pretension, one a state.

    The state of a modes analysis is the static, tuned or found shape that it starts from. Only states
    with the same loads acting and the same members there are comparable.
    """
    own = _level(result)
    found: dict[str, Level] = {}
    for other in result.results.values() if own is not None else ():
        level = _level(other)
        if own and level and (level.acting, level.absent) == (own.acting, own.absent):
            found.setdefault(level.state, level)
    return list(found.values())


def _level(modes: Result) -> Level | None:
    """The state of a modes analysis, None where it is not known."""
    if modes.kind != "modes" or modes.status != "complete" or "frequency" not in modes:
        return None
    start = modes.results.get(str(modes.settings.get("from", "")))
    if start is None or "axial_force" not in start or "loads" not in start:
        return None
    place = _loading_of(modes, start)
    name = f"{start.name} ({loading_names(start)[place]})" if len(start["loads"]) > 1 else start.name
    force = np.asarray(start["axial_force"][place], dtype=float)
    members = modes.results.members
    if len(force) != len(members):
        return None
    absent = _whole(modes, [members[k] for k in np.flatnonzero(np.isnan(force)).tolist()])
    if "present" in modes:
        there = zip(modes.labels("present", 0), modes.values("present").tolist(), strict=True)
        if absent != _whole(modes, [str(label) for label, present in there if not present]):
            return None  # members came or went since: the forces are of another structure
    words = "".join(modes.acting[:1]).removeprefix(f"{start.values('loads')[place]}: ")
    return Level(modes.name, name, words, absent, modes.values("frequency"), force)


def _whole(modes: Result, names: list[str]) -> frozenset[str]:
    """Names with ropes in place of their pieces."""
    ropes = {piece: rope for rope, pieces in modes.ropes.items() for piece in pieces}
    return frozenset(ropes.get(name, name) for name in names)


def _loading_of(modes: Result, start: Result) -> int:
    """Which loading of its start a modes analysis is about; what acts is named first in its words."""
    words = modes.acting[0] if modes.acting else ""
    names = [str(name) for name in start.values("loads")]
    fitting_names = [name for name in names if words.startswith(f"{name}:")]
    return names.index(max(fitting_names, key=len)) if fitting_names else 0


def sensitivity(
    axes: Axes,
    result: Result,
    *,
    below: Axes | None = None,
    member: str | None = None,
    mode: int | None = None,
) -> list[Artist]:
    """Frequencies, and in ``below`` tensions of groups, against the tension of one member.

    Each modes analysis of the file about a state with the same loads and members is a point, at the
    state that it starts from. ``member`` is the one
    whose tension is the measure (by default the tie whose tension differs most), ``mode`` picks one
    frequency (the first seven by default); modes are numbered by frequency at each point.
    """
    known = levels(result)
    if len(known) < 2:
        return say_nothing_to_show(axes, f"{result.name}: no two modes analyses under the same loads")
    place = _measure(result, known, member)
    known.sort(key=lambda level: float(level.force[place]))
    tension = np.array([level.force[place] for level in known])
    unit = fitting(tension, "N")
    artists = _frequencies(axes, known, unit(tension), mode)
    name = result.results.members[place]
    words = unit.label(f"axial force of {name}, tension +")
    axes.set_ylabel("frequency [Hz]")
    title = (f"frequencies and tensions against the tension of {name}", _states(known))
    axes.set_title("\n".join(textwrap.fill(line, LETTERS) for line in title))
    axes.legend(loc="center left", bbox_to_anchor=(1.0, 0.5))
    if below is None:
        axes.set_xlabel(words)
        return artists
    below.sharex(axes)
    below.set_xlabel(words)
    return artists + _tensions(below, result, known, unit(tension))


def _measure(result: Result, known: list[Level], member: str | None) -> int:
    """Place of the member whose tension is the measure."""
    force = np.array([level.force for level in known])
    everywhere = np.isfinite(force).all(axis=0)
    names = result.results.members
    if member is not None:
        inside = [names.index(name) for name in result.members_of(member) if name in names]
        if member not in names and not inside:
            raise UnknownName("member", member, names)
        place = names.index(member) if member in names else inside[0]
        if not everywhere[place]:
            raise InputError(f'member "{names[place]}" is not there in these states')
        return place
    kinds = result.results.model("members/kind")
    ties = np.isin(kinds, ["tension-only", "hanging"]) & everywhere
    change = np.ptp(np.where(everywhere, force, 0.0), axis=0)
    return int(np.where(ties, change, -1.0).argmax()) if ties.any() else int(change.argmax())


def _states(known: list[Level]) -> str:
    names = [level.state for level in known]
    shown = ", ".join(names[:4]) + (f" and {len(names) - 4} more" if len(names) > 4 else "")
    under = f" under {known[0].acting}" if known[0].acting else ""
    return f"at {len(known)} states{under}: {shown}"


def _frequencies(axes: Axes, known: list[Level], tension: Array, mode: int | None) -> list[Artist]:
    most = max(len(level.frequency) for level in known)
    if mode is not None and not 1 <= mode <= most:
        raise InputError(f"mode {mode}: there are modes 1 to {most}")
    artists: list[Artist] = []
    for k in range(min(most, MOST_MODES)) if mode is None else [mode - 1]:
        values = [level.frequency[k] if k < len(level.frequency) else np.nan for level in known]
        look = _look(k)
        words = f"mode {k + 1}: {figures(float(values[0]))} to {figures(float(values[-1]))} Hz"
        artists += axes.plot(tension, values, label=words, **look)
    axes.margins(0.08)
    if mode is None:
        axes.set_ylim(bottom=0.0)
    return artists


def _tensions(axes: Axes, result: Result, known: list[Level], tension: Array) -> list[Artist]:
    """Greatest tension of each group, rope or member, of those that change most."""
    names = result.results.members
    force = np.array([level.force for level in known])
    rows = []
    for row in gather(result, names):
        own = np.where(np.isnan(force[:, row.places]), -np.inf, force[:, row.places]).max(axis=1)
        own = np.where(np.isinf(own), np.nan, own)
        if np.nanmax(np.append(own, 0.0)) > 0.0:
            rows.append((row.label, own))
    rows.sort(key=lambda row: -float(np.ptp(row[1][np.isfinite(row[1])])))
    unit = fitting([np.nanmax(own) for _, own in rows] or [0.0], "N")
    artists: list[Artist] = []
    for k, (label, own) in enumerate(rows[:MOST_GROUPS]):
        artists += axes.plot(tension, unit(own), label=label, **_look(k))
    axes.set_ylabel(unit.label("greatest tension"))
    axes.margins(0.08)
    axes.set_ylim(bottom=0.0)
    axes.legend(loc="center left", bbox_to_anchor=(1.0, 0.5))
    return artists


def _look(k: int) -> dict[str, Any]:
    place = k % len(SERIES)
    return {
        "color": SERIES[place],
        "linestyle": DASHES[place],
        "marker": MARKERS[place],
        "markersize": 4.5,
    }
