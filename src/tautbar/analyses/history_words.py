"""A history in sentences: peaks, slack, the ledger, and what to mistrust."""

from __future__ import annotations

import numpy as np

from tautbar.analyses.history_facts import Facts
from tautbar.analyses.words import chosen, quantity
from tautbar.model.parts import AXES


def outcome(run: Facts, faults: list[str], status: str) -> str:
    """The answer, failures first."""
    lines = [f"NOT A RESULT: {fault}" for fault in faults]
    if status == "interrupted":
        lines.append(f"interrupted at {run.tally.time:.6g} s of {run.duration:.6g} s")
    return "\n".join([*lines, *_peaks(run), *_slack(run)])


def largest_displacement(run: Facts) -> tuple[float, int, int, float] | None:
    """Size [m], joint, axis and time [s] of the largest displacement component; None where nothing moves."""
    u = run.tally.peaks["displacement"]
    size = np.maximum(np.abs(u.low), np.abs(u.high))
    if not np.nan_to_num(size).max(initial=0.0) > 0:
        return None
    joint, axis = (int(i) for i in np.unravel_index(int(np.nanargmax(size)), size.shape))
    upward = abs(u.high[joint, axis]) >= abs(u.low[joint, axis])
    time = (u.high_time if upward else u.low_time)[joint, axis]
    return float(size[joint, axis]), joint, axis, float(time)


def _peaks(run: Facts) -> list[str]:
    f = run.tally.peaks["axial_force"]
    lines = []
    largest = largest_displacement(run)
    if largest:
        size, joint, axis, time = largest
        name = run.context.joint_names[joint]
        lines.append(f"largest displacement {quantity(size, 'm')} at {name} in {AXES[axis]} at {time:.6g} s")
    for extreme, word in ((f.high, "tension"), (-f.low, "compression")):
        if np.nan_to_num(extreme).max(initial=0.0) > 0:
            m = int(np.nanargmax(extreme))
            when = f.high_time[m] if word == "tension" else f.low_time[m]
            name = run.context.member_names[m]
            lines.append(f"greatest {word} {quantity(extreme[m], 'N')} in {name} at {when:.6g} s")
    return lines


def _slack(run: Facts) -> list[str]:
    if not run.rest.scene.structure.can_slack.any():
        return []
    episodes = run.tally.slack.episodes()
    if not episodes:
        return ["no member goes slack"]
    members = sorted({e[0] for e in episodes})
    first = episodes[0]
    name = run.context.member_names[first[0]]
    lines = [
        f"slack: {chosen(run.context.member_names, members)}; first {name} "
        + ("from the start" if first[1] == 0.0 else f"at {first[1]:.6g} s")
    ]
    snatched = [e for e in episodes if np.isfinite(e[3])]
    if snatched:
        hardest = max(snatched, key=lambda e: e[3])
        lines.append(
            f"hardest snatch {quantity(hardest[3], 'N')} in {run.context.member_names[hardest[0]]}, "
            f"taut again at {hardest[2]:.6g} s, greatest at {hardest[4]:.6g} s; "
            f"{len(snatched)} snatches in all"
        )
    return lines


def audit_lines(run: Facts) -> tuple[str, ...]:
    """Evidence: the ledger in joules, and how hard the steps were."""
    t = run.tally

    def joules(value: float) -> str:
        return quantity(value if abs(value) > 1e-12 * t.turned_over else 0.0, "J")

    caught = f"; the method took {joules(t.dissipated)} where slack members tightened"
    lines = [
        f"energy ledger: {t.left_over:.1e} left over of {joules(t.turned_over)} turned over",
        f"events put in {joules(t.event_work)}; damping took {joules(t.damped)}"
        + (caught if run.rest.scene.structure.can_slack.any() else ""),
        f"{t.steps} steps, landing on the corners of events, {t.iterations} iterations "
        f"({run.choices.method}, {run.rest.scene.system.solver.name})"
        + (f", halved up to {t.halvings} times" if t.halvings else ""),
    ]
    lines.append(_shape(run))
    if run.analysis.damping is not None:
        lines.append(_damping(run))
    return tuple(lines)


def _shape(run: Facts) -> str:
    t = run.tally
    move = f"greatest move {100 * t.move / run.rest.scene.structure.size:.2g} % of the model's size"
    if t.turned_member < 0:
        return move
    name = run.context.member_names[t.turned_member]
    return f"greatest turn of a bar or strut {np.rad2deg(t.turn):.2g} degrees ({name}); {move}"


def _damping(run: Facts) -> str:
    """The two parts, and the damping ratio that they give at the frequencies asked for."""
    a0, a1 = run.choices.rayleigh
    omega = 2 * np.pi * np.array(run.analysis.damping.at if run.analysis.damping else ())
    gives = ", ".join(f"{100 * (a0 / (2 * w) + a1 * w / 2):.2g} % at {w / (2 * np.pi):.3g} Hz" for w in omega)
    left_out = "" if run.choices.mass_part else " (left out: something can go slack or move freely)"
    return (
        f"Rayleigh damping gives {gives}: mass part {a0:.3g} 1/s{left_out}, stiffness part {a1:.3g} s, "
        "against the tangent at the start"
    )
