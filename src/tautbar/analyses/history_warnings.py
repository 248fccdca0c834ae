"""What a history's engineer should know: snaps, viscosity, steps too long, records too short."""

from __future__ import annotations

import numpy as np

from tautbar.analyses.history_facts import Facts
from tautbar.analyses.history_words import largest_displacement
from tautbar.analyses.words import chosen, listed, quantity
from tautbar.mechanics.turn import FOLDED

FEW_STEPS = 10  # in a pulse: then its impulse is held to about 1 %; common practice, no source
MUCH_VISCOSITY = 10.0  # times the wave transit: well beyond the range that makes a snatch determined


def warnings(run: Facts) -> tuple[str, ...]:
    """What holds, but should be known."""
    single = (
        _snaps(run),
        _sluggish(run),
        _ringing(run),
        _folded(run),
        _other_geometry(run),
        _buckled(run),
        _late_peak(run),
        _cold(run),
    )
    f = run.tally.peaks["axial_force"]
    over = run.tally.strength.said(run.context.member_names, f.high, f.low, " at its peak")
    return tuple(w for w in (*single, *over, *_pulse_steps(run), *_cut_events(run)) if w)


def _other_geometry(run: Facts) -> str:
    if not run.rest.small or run.analysis.geometry == "small":
        return ""
    return 'it starts from a state found with geometry = "small", which is not quite in balance here'


def _folded(run: Facts) -> str:
    t = run.tally
    if t.turn <= FOLDED:
        return ""
    name = run.context.member_names[t.turned_member]
    return (
        f"{name} turned {np.rad2deg(t.turn):.0f} degrees from where it is drawn: "
        "if it is not meant to, the structure folded"
    )


def _buckled(run: Facts) -> str:
    if run.tally.buckled is None:
        return ""
    time, member = run.tally.buckled
    return f"{run.context.member_names[member]} is the first past its Euler load, at {time:.6g} s"


def _sluggish(run: Facts) -> str:
    """So much viscosity that it hides slack and takes energy no rope takes."""
    s = run.rest.scene.structure
    transit = s.L0 * np.sqrt(s.m / s.EA)
    ratio = np.where(transit > 0, s.tau / np.where(transit > 0, transit, 1.0), 0.0) * s.can_slack
    if not ratio.size or ratio.max() <= MUCH_VISCOSITY:
        return ""
    m = int(ratio.argmax())
    name = run.context.member_names[m]
    return (
        f"the retardation_time of {name} is {ratio[m]:.3g} times the {quantity(transit[m], 's')} that a wave "
        "takes along it: so much viscosity hides slack and softens snatches; 0.05 to 1 of that is enough"
    )


def _cut_events(run: Facts) -> list[str]:
    """Events that the record does not hold whole."""
    out = []
    for pulse in (run.context.parts.events[name] for name in run.analysis.events):
        end = pulse.start + pulse.duration
        if pulse.start >= run.duration:
            out.append(f"the event {pulse.name} starts at {pulse.start:.6g} s, after the end of the record")
        elif end > run.duration * (1 + 1e-9) and pulse.shape != "ramp":
            out.append(
                f"the record ends at {run.duration:.6g} s, within the event {pulse.name} (to {end:.6g} s)"
            )
    return out


def _snaps(run: Facts) -> str:
    """An undamped snatch has no peak to compute: say so, and what viscosity would give it one."""
    s = run.rest.scene.structure
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


def _ringing(run: Facts) -> str:
    peak = np.nanmax(
        np.abs([run.tally.peaks["axial_force"].high, run.tally.peaks["axial_force"].low]), initial=0.0
    )
    if run.tally.ringing <= 0.1 * peak:
        return ""
    return (
        f"force at the end of a step is up to {quantity(run.tally.ringing, 'N')} off its mean over the step: "
        "stress waves or snaps shorter than the step are not resolved, and peaks of force uncertain by that"
    )


def _pulse_steps(run: Facts) -> list[str]:
    step = run.analysis.time_step
    pulses = [run.context.parts.events[name] for name in run.analysis.events]
    short = [p.name for p in pulses if p.shape != "table" and p.duration < FEW_STEPS * step]
    if not short:
        return []
    least = min(p.duration for p in pulses if p.name in short)
    return [
        f"{listed(short)} lasts fewer than {FEW_STEPS} steps; "
        f"a time_step of at most {quantity(least / FEW_STEPS, 's')} is wanted for the pulse alone"
    ]


def _late_peak(run: Facts) -> str:
    """A record that ends on its peak may not hold the peak."""
    largest = largest_displacement(run)
    if largest is None or largest[3] < 0.98 * run.duration:
        return ""
    when = largest[3]
    return (
        f"the largest displacement comes at the end of the record ({when:.6g} s): "
        "a longer duration may show a larger one"
    )


def _cold(run: Facts) -> str:
    if run.analysis.start is not None or not run.motion.dead.any():
        return ""
    return "the history starts from the drawing with its loads put on at once, not from rest under them"
