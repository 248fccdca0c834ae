"""An equilibrium path in sentences."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from tautbar.analyses.context import Context
from tautbar.analyses.growing import Growing
from tautbar.analyses.words import chosen, direction, quantity
from tautbar.model.parts import AXES, EquilibriumPath, StopAt
from tautbar.solvers import path
from tautbar.solvers.path_correct import State
from tautbar.solvers.path_events import BIFURCATION, LIMIT

if TYPE_CHECKING:
    from tautbar.analyses.path import Followed

MOST_POINTS = 12


def stop_words(context: Context, stop_at: StopAt) -> str:
    """Where the path is to end."""
    if stop_at.load_factor is not None:
        return f"load factor {stop_at.load_factor:g}"
    if stop_at.joint is not None:
        where = f"joint {context.joint_names[stop_at.joint]} in {AXES[stop_at.axis]}"
        return f"displacement {quantity(stop_at.displacement, 'm')} of {where}"
    if stop_at.limit_points is not None:
        return f"limit point {stop_at.limit_points}"
    return f"{stop_at.steps} steps"


def no_load(growing: Growing) -> str:
    """Why a path cannot begin: nothing that grows moves anything."""
    return f"no load grows: {growing.growing_loading.acting} moves nothing"


def no_start(growing: Growing, start: State | None) -> str:
    """Why a path cannot begin: the growing load meets no stiffness."""
    advice = (
        "give the analysis constant loads or a start state under which they are taut, "
        "or the members pretension"
    )
    if start is None:
        return f"at the start no set of taut members carries the growing load; {advice}"
    joint, way = growing.scene.name_direction(start.along)
    slack = growing.scene.structure.can_slack & ~start.spot.on
    who = f" (slack: {chosen(growing.scene.parts.members.names, slack)})" if slack.any() else ""
    return f"at the start nothing holds joint {joint} in {direction(way)}{who}; {advice}"


def outcome(followed: Followed, analysis: EquilibriumPath) -> str:
    """The answer, what went wrong first."""
    f = followed.load_factor
    lines = [] if followed.holds else [f"NOT A RESULT: {_fault(followed, analysis)}"]
    lines += _points(followed)
    high, low = int(f.argmax()), int(f.argmin())
    lines.append(f"greatest load factor {f[high]:.6g}" + (f", least {f[low]:.6g}" if f[low] < 0 else ""))
    lines.append(
        f"the path ends at load factor {f[-1]:.6g} after {f.size - 1} steps: {_where(followed, f.size - 1)}"
    )
    return "\n".join(lines + _slack(followed))


def _slack(followed: Followed) -> list[str]:
    """Which members are slack from the start, and which went slack on the way, the first of them when."""
    onset, names = followed.trace.onset, followed.context.member_names
    if not followed.growing.scene.structure.can_slack.any():
        return []
    from_start = onset == followed.load_factor[0]
    went = np.isfinite(onset) & ~from_start
    lines = [f"slack from the start: {chosen(names, from_start)}"] if from_start.any() else []
    if not went.any():
        return [*lines, "no member goes slack on the way"]
    first = int(np.argmin(np.where(went, np.abs(onset), np.inf)))
    when = f"first {names[first]} at load factor {onset[first]:.4g}"
    return [*lines, f"went slack on the way: {chosen(names, went)}; {when}"]


def _fault(followed: Followed, analysis: EquilibriumPath) -> str:
    if followed.lifted is not None:
        return _lift(followed, followed.lifted)
    f = followed.load_factor[-1]
    wanted = stop_words(followed.context, analysis.stop_at)
    joint, way = followed.growing.scene.name_direction(followed.trace.last.along)
    why = {
        path.STUCK: "no balance was found further on, however short the step",
        path.LOOSE: f"beyond it nothing holds joint {joint} in {direction(way)}: the members there are slack",
        path.NO_SET: "beyond it no set of taut members agrees with the motion",
        path.NO_MOTION: "beyond it the growing loads move nothing",
        path.FAR: "the structure has moved by many times its size",
        path.TOO_LONG: "more steps were not tried; a larger step or another stop_at may help",
    }[followed.trace.ending]
    return f"the path does not reach {wanted}; it ends at load factor {f:.6g}: {why}"


def _lift(followed: Followed, at: int) -> str:
    last = followed.load_factor[max(at - 1, 0)]
    return (
        f"a support that only pushes lifts off or is met between load factors {last:.4g} and "
        f"{followed.load_factor[at]:.4g}; the path holds up to there only. Use static analyses beyond, "
        "or stop before"
    )


def _points(followed: Followed) -> list[str]:
    """One line for each critical point."""
    trace = followed.trace
    lines = []
    for name, at, point in zip(followed.names, trace.places, trace.critical, strict=True):
        before, after = point.negative
        text = f"{name} at load factor {point.spot.f:.8g}: {_where(followed, at)}"
        text += f"; negative pivots {before} to {after}"
        if point.direction is not None and point.kind == BIFURCATION:
            joint, way = followed.growing.scene.name_direction(point.direction)
            text += (
                f"; the structure may give way to either side, joint {joint} in {direction(way)}; "
                "the path stays on the branch it came on"
            )
        elif point.turns and point.kind != LIMIT:
            text += "; the load factor turns there"
        lines.append(text)
    more = len(lines) - MOST_POINTS
    return (
        [*lines[:MOST_POINTS], f"... and {more} more critical points, in the results"] if more > 0 else lines
    )


def _where(followed: Followed, at: int) -> str:
    U = followed.displacement[at]
    size = np.sqrt((U * U).sum(axis=0))
    j = int(size.argmax())
    if size[j] == 0:
        return "nothing has moved"
    return f"largest displacement {quantity(size[j], 'm')}, joint {followed.context.joint_names[j]}"


def audit_lines(followed: Followed, analysis: EquilibriumPath) -> tuple[str, ...]:
    """What proves the path."""
    trace = followed.trace
    worst = max(spot.imbalance for spot in trace.spots)
    unstable = int((np.array(trace.negative) > 0).sum())
    lines = [
        f"largest force out of balance at any state: {worst:.1e} of the largest force",
        f"states that are not stable: {unstable} of {len(trace.spots)}",
    ]
    if trace.reached:
        lines.append(f"landed on {stop_words(followed.context, analysis.stop_at)}")
    return tuple(lines)


def warnings(followed: Followed, way: float) -> tuple[str, ...]:
    """What holds, but should be known."""
    found = []
    trace = followed.trace
    if trace.negative[0]:
        found.append(f"the start state is not stable ({trace.negative[0]} negative pivots)")
    if any(p.kind == BIFURCATION for p in trace.critical):
        first = next(p for p in trace.critical if p.kind == BIFURCATION)
        found.append(
            f"beyond the bifurcation at load factor {first.spot.f:.6g} the structure leaves this path unless "
            "something guides it; small imperfections decide the way and may lower the load"
        )
    if way < 0:
        found.append("the load factor asked for is below zero: the growing loads act the other way round")
    return tuple(found)
