"""A history in sentences: peaks, slack, the ledger, and what to mistrust."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from tautbar.analyses.words import chosen, listed, quantity
from tautbar.model.parts import AXES

if TYPE_CHECKING:
    from tautbar.analyses.history import HistoryRun

FEW_STEPS = (
    10  # in a pulse: a half-sine sampled by 10 steps has its impulse to 1 %, common practice, no source
)


def outcome(run: HistoryRun, faults: list[str], status: str) -> str:
    """The answer, failures first."""
    lines = [f"NOT A RESULT: {fault}{_advice(run)}" for fault in faults]
    if status == "interrupted":
        lines.append(f"interrupted at {run.tally.time:.6g} s of {run.duration:.6g} s")
    return "\n".join([*lines, *_peaks(run), *_slack(run)])


def _advice(run: HistoryRun) -> str:
    if run.failure:
        return ""
    if run.choices.method == "newmark":
        return '; take shorter steps, or method = "energy-conserving"'
    return "; take shorter steps"


def _largest_displacement(run: HistoryRun) -> tuple[float, int, int, float] | None:
    """Size [m], joint, axis and time [s] of the largest displacement component; None where nothing moves."""
    u = run.tally.peaks["displacement"]
    size = np.maximum(np.abs(u.low), np.abs(u.high))
    if not size.size or not np.nanmax(size) > 0:
        return None
    joint, axis = (int(i) for i in np.unravel_index(int(np.nanargmax(size)), size.shape))
    upward = abs(u.high[joint, axis]) >= abs(u.low[joint, axis])
    time = (u.high_time if upward else u.low_time)[joint, axis]
    return float(size[joint, axis]), joint, axis, float(time)


def _peaks(run: HistoryRun) -> list[str]:
    f = run.tally.peaks["axial_force"]
    lines = []
    largest = _largest_displacement(run)
    if largest:
        size, joint, axis, time = largest
        name = run.context.joint_names[joint]
        lines.append(f"largest displacement {quantity(size, 'm')} at {name} in {AXES[axis]} at {time:.6g} s")
    for extreme, word in ((f.high, "tension"), (-f.low, "compression")):
        if extreme.size and np.nanmax(extreme) > 0:
            m = int(np.nanargmax(extreme))
            when = f.high_time[m] if word == "tension" else f.low_time[m]
            name = run.context.member_names[m]
            lines.append(f"greatest {word} {quantity(extreme[m], 'N')} in {name} at {when:.6g} s")
    return lines


def _slack(run: HistoryRun) -> list[str]:
    if not run.context.system.structure.can_slack.any():
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
            f"taut again at {hardest[2]:.6g} s; {len(snatched)} snatches in all"
        )
    return lines


def audit_lines(run: HistoryRun) -> tuple[str, ...]:
    """Evidence: the ledger in joules, and how hard the steps were."""
    t = run.tally

    def joules(value: float) -> str:
        return quantity(value if abs(value) > 1e-12 * t.turned_over else 0.0, "J")

    caught = f"; the method took {joules(t.dissipated)} where slack members tightened"
    lines = [
        f"energy ledger: {t.left_over:.1e} left over of {joules(t.turned_over)} turned over",
        f"events put in {joules(t.event_work)}; damping took {joules(t.damped)}"
        + (caught if run.context.system.structure.can_slack.any() else ""),
        f"{t.steps} steps, {t.iterations} iterations ({run.choices.method}, {run.context.system.solver.name})"
        + (f", halved up to {t.halvings} times" if t.halvings else ""),
    ]
    if run.analysis.damping is not None:
        parts = run.choices.rayleigh
        lines.append(
            f"Rayleigh damping: mass part {parts.mass_part:.3g} 1/s"
            + ("" if run.choices.mass_part else " (left out: something can go slack or move freely)")
            + f", stiffness part {parts.stiffness_part:.3g} s, against the tangent at the start"
        )
    return tuple(lines)


def warnings(run: HistoryRun) -> tuple[str, ...]:
    """What holds, but should be known."""
    return tuple(
        w for w in (_snaps(run), _ringing(run), *_pulse_steps(run), _late_peak(run), _cold(run)) if w
    )


def _snaps(run: HistoryRun) -> str:
    """An undamped snatch has no peak to compute: say so, and what viscosity would give it one."""
    s = run.context.system.structure
    snapped = sorted({e[0] for e in run.tally.slack.episodes() if np.isfinite(e[2]) and s.tau[e[0]] == 0.0})
    if not snapped:
        return ""
    transit = (s.L0 * np.sqrt(s.m / s.EA))[snapped]
    transit = transit[transit > 0]
    hint = ""
    if transit.size:
        hint = f", between {quantity(0.05 * transit.max(), 's')} and {quantity(transit.min(), 's')} here"
    return (
        f"{chosen(run.context.member_names, snapped, 4)} snapped taut without viscosity: the peak of such "
        "a snatch is not a determined number. Give the section a retardation_time of 0.05 to 1 of the time "
        f"a wave takes along one piece, L0 sqrt(m/EA){hint}"
    )


def _ringing(run: HistoryRun) -> str:
    peak = np.nanmax(
        np.abs([run.tally.peaks["axial_force"].high, run.tally.peaks["axial_force"].low]), initial=0.0
    )
    if run.tally.ringing <= 0.1 * peak:
        return ""
    return (
        f"force at the end of a step is up to {quantity(run.tally.ringing, 'N')} off its mean over the step: "
        "stress waves or snaps shorter than the step are not resolved, and peaks of force uncertain by that"
    )


def _pulse_steps(run: HistoryRun) -> list[str]:
    step = run.analysis.time_step
    pulses = [run.context.parts.events[name] for name in run.analysis.events]
    short = [p.name for p in pulses if p.shape != "table" and p.duration < FEW_STEPS * step]
    if not short:
        return []
    least = min(p.duration for p in pulses if p.name in short)
    return [
        f"{listed(short)} lasts fewer than {FEW_STEPS} steps; "
        f"a time_step of {quantity(least / FEW_STEPS, 's')} would do"
    ]


def _late_peak(run: HistoryRun) -> str:
    """A record that ends on its peak may not hold the peak."""
    largest = _largest_displacement(run)
    if largest is None or largest[3] < 0.98 * run.duration:
        return ""
    when = largest[3]
    return (
        f"the largest displacement comes at the end of the record ({when:.6g} s): "
        "a longer duration may show a larger one"
    )


def _cold(run: HistoryRun) -> str:
    if run.analysis.start is not None or not run.motion.dead.any():
        return ""
    return "the history starts from the drawing with its loads put on at once, not from rest under them"
