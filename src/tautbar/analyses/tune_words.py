"""A tuning in sentences: the lengths found, or why they cannot be."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses import static_words
from tautbar.analyses.context import Context
from tautbar.analyses.cut_list import cut_list_lines, table_gap
from tautbar.analyses.strength import Strength
from tautbar.analyses.tune_problem import Named
from tautbar.analyses.tuned import KeptTaut, ToTargets, Tuned
from tautbar.analyses.words import chosen, listed, quantity
from tautbar.model.parts import Static
from tautbar.solvers.tuning import MET

Array = NDArray[np.float64]
MOST_LINES = 12


def outcome(context: Context, tuned: Tuned) -> str:
    """The answer, or first of all why it is none."""
    lines: list[str] = []
    if tuned.holds:
        if isinstance(tuned, ToTargets):
            lines = _targets_met(tuned)
        if isinstance(tuned, KeptTaut):
            lines = _least(context, tuned)
        lines += _lengths(context, tuned)
    else:
        if isinstance(tuned, ToTargets):
            lines = _not_met(context, tuned)
        if isinstance(tuned, KeptTaut):
            lines = _not_held(context, tuned)
        lines = [f"NOT A RESULT: {text}" for text in lines]
    static = Static(tuned.analysis.name, loads=tuned.analysis.loads)
    return "\n".join([*lines, static_words.outcome(context, static, tuned.solved)])


def _targets_met(tuned: ToTargets) -> list[str]:
    count, worst = len(tuned.named), np.abs(tuned.miss).max()
    what = "the target is met" if count == 1 else f"all {count} targets are met"
    return [f"{what}, to {worst:.1g} of what is wanted, after {tuned.tuning.corrections} corrections"]


def _lengths(context: Context, tuned: Tuned) -> list[str]:
    """Each adjusted member: its length, its change, and its tension under the first loading."""
    if tuned.analysis.cut_list is not None:
        return cut_list_lines(context, tuned)
    first = tuned.solved[0]
    old, N = tuned.problem.rest.scene.structure.L0, first.verdict.look.axial
    lines = []
    for m in tuned.analysis.adjust[:MOST_LINES]:
        change = tuned.L0[m] - old[m]
        word = "longer" if change > 0 else "shorter"
        lines.append(
            f"{context.member_names[m]}: unstressed length {tuned.L0[m]:.4f} m, {quantity(abs(change), 'm')} "
            f"{word} than before; {quantity(N[m], 'N')} under {first.loading.name}"
        )
    more = len(tuned.analysis.adjust) - len(lines)
    return [*lines, f"... and {more} more members, in the results file"] if more else lines


def _least(context: Context, tuned: KeptTaut) -> list[str]:
    steps, p = tuned.ladder, tuned.least.p
    levels = listed([f"{n} {quantity(level, 'N')}" for n, level in zip(steps.names, p, strict=True)])
    if steps.shared:
        head = f"least pretension by levels, in the start shape: {levels}"
    else:
        head = (
            f"pretension in the start shape: {levels}. A local answer: members adjusted singly leave "
            "several, and a lower one may exist"
        )
    return [head, _governing(context, tuned)]


def _governing(context: Context, tuned: KeptTaut) -> str:
    analysis = tuned.analysis
    k, m = _lowest(tuned)
    least = quantity(tuned.lowest[k, m], "N")
    text = (
        f"least tension {least} in {context.member_names[analysis.keep_taut[m]]} "
        f"under {analysis.loads[k].name} (margin {quantity(analysis.margin, 'N')})"
    )
    counted = list(dict.fromkeys((*analysis.adjust, *analysis.keep_taut)))
    N = np.stack([s.verdict.look.axial[counted] for s in tuned.solved])
    breaks = Strength.of(tuned.problem.rest.scene).breaks[counted]
    use = N / breaks if tuned.by_strength else N
    k, m = (int(i) for i in np.unravel_index(int(use.argmax()), use.shape))
    share = f", {100 * use[k, m]:.3g} % of its breaking force" if tuned.by_strength else ""
    name = context.member_names[counted[m]]
    return f"{text}; largest tension {quantity(N[k, m], 'N')} in {name} under {analysis.loads[k].name}{share}"


def _lowest(tuned: KeptTaut) -> tuple[int, int]:
    k, m = np.unravel_index(int(tuned.lowest.argmin()), tuned.lowest.shape)
    return int(k), int(m)


def _not_held(context: Context, tuned: KeptTaut) -> list[str]:
    """Why no pretension keeps all taut."""
    if tuned.met:
        return _pushing(context, tuned)
    analysis, steps = tuned.analysis, tuned.ladder
    k, m = _lowest(tuned)
    name, loading = context.member_names[analysis.keep_taut[m]], analysis.loads[k].name
    short = analysis.margin - tuned.lowest[k, m]
    text = (
        f"no pretension of the adjusted members was found that keeps all taut; the best leaves "
        f"{quantity(tuned.lowest[k, m], 'N')} in {name} under {loading}, {quantity(short, 'N')} short of "
        f"the margin of {quantity(analysis.margin, 'N')}"
    )
    full = np.abs(tuned.least.p) >= 0.999 * steps.levels.limits()
    if full.any():
        text += f"; at its limit (a strain of a fifth): {chosen(steps.names, full)}"
    return [text]


def _not_met(context: Context, tuned: ToTargets) -> list[str]:
    """Which targets are missed, how near they came, and why."""
    tuning = tuned.tuning
    if tuning.met:
        pushing = _pushing(context, tuned)
        if tuned.met or pushing:
            return pushing
        return ["the lengths that meet the targets lead to a balance that the structure does not keep"]
    missed = [
        f"{t.name}: wanted {_said(t, t.target.wanted)}, "
        f"nearest {_said(t, t.target.wanted + tuning.miss[i] * t.target.scale)}"
        for i, t in enumerate(tuned.named)
        if abs(tuning.miss[i]) > MET
    ]
    return [*missed, _why(tuned)]


def _said(named: Named, value: float) -> str:
    return quantity(value, "N") if named.tension else f"{value:.4f} m"


def _why(tuned: ToTargets) -> str:
    tuning = tuned.tuning
    tied = dependent(tuning.slope, tuning.miss * np.array([t.target.scale for t in tuned.named]))
    if tied.sum() > 1:
        names = "; ".join(t.name for t, on in zip(tuned.named, tied, strict=True) if on)
        return f"the targets contradict each other, the lengths move them only together: {names}"
    if tuning.at_limit.any():
        return "a length ran against its limit: it would have to shrink to nothing or grow without end"
    return "no change of the adjusted lengths brings them nearer: what is wanted is out of their reach"


def dependent(slope: Array, miss: Array) -> NDArray[np.bool_]:
    """Targets (T,) whose misses no adjustment can lower, because their sensitivities depend on each other.

    ``slope`` (T, A) of the values over the adjustments, ``miss`` (T,) in the same unit.
    """
    size = np.maximum(np.sqrt((slope * slope).sum(axis=1)), 1e-300)
    U, s, _ = np.linalg.svd(slope / size[:, None])
    null = U[:, int((s > 1e-6 * s.max()).sum()) :]
    weighted = miss / size
    left = null @ (null.T @ weighted)
    if np.sqrt(left @ left) < 0.5 * np.sqrt(weighted @ weighted):
        return np.zeros(miss.size, dtype=bool)
    return np.asarray(np.abs(null).max(axis=1, initial=0.0) > 0.01)


def _pushing(context: Context, tuned: Tuned) -> list[str]:
    """Adjusted or kept ties that hang loose in the answer."""
    out = []
    for k, m in tuned.slack[:MOST_LINES]:
        force = tuned.states[k].look.axial[m]
        name, loading = context.member_names[m], tuned.solved[k].loading.name
        push = (
            f"; to get what is wanted it would have to push with {quantity(-force, 'N')}" if force < 0 else ""
        )
        out.append(f"{name} is slack under {loading}{push}")
    return out


def target_names(context: Context, tuned: Tuned) -> list[str]:
    """What was wanted, one line a target."""
    if isinstance(tuned, ToTargets):
        return [t.name for t in tuned.named]
    margin = quantity(tuned.analysis.margin, "N")
    return [f"{context.member_names[m]} taut with {margin}" for m in tuned.analysis.keep_taut]


def settings(context: Context, tuned: Tuned) -> dict[str, object]:
    """What was asked, for the record."""
    analysis, names = tuned.analysis, context.member_names
    out: dict[str, object] = {
        "from": analysis.start.analysis if analysis.start else "the drawing",
        "adjust": [names[m] for m in analysis.adjust],
        "together": [[names[m] for m in group] for group in analysis.together],
    }
    if isinstance(tuned, ToTargets):
        return out | {"targets": [f"{t.name}: {_said(t, t.target.wanted)}" for t in tuned.named]}
    return out | {"keep_taut": [names[m] for m in analysis.keep_taut], "margin": analysis.margin}


def audit(tuned: Tuned) -> tuple[str, ...]:
    """Evidence of the tuning itself, before that of the static check."""
    work = ""
    if isinstance(tuned, ToTargets):
        work = f"{tuned.tuning.corrections} corrections"
    if isinstance(tuned, KeptTaut):
        work = f"{tuned.least.evaluations} evaluations of all loadings"
    worst = float(np.abs(tuned.miss).max(initial=0.0))
    return (f"checked with the real ties: largest miss {worst:.1e} of what is wanted ({work})",)


def warnings(context: Context, tuned: Tuned) -> tuple[str, ...]:
    """What holds, but should be known."""
    out = [
        f"{name}: from the start shape another balance is reached; the tuned one is stable, but must be "
        "erected into"
        for name in tuned.moved
    ]
    if isinstance(tuned, ToTargets):
        for k, s in enumerate(tuned.solved):
            loose = [m for m in tuned.analysis.adjust if s.slack[m]]
            if k not in tuned.asked and s.verdict.holds and loose:
                names = chosen(context.member_names, loose)
                out.append(f"{s.loading.name}: adjusted members go slack: {names}")
    if isinstance(tuned, KeptTaut) and not tuned.least.settled:
        out.append(
            f"the search was cut off after {tuned.least.evaluations} evaluations; it still gained a little"
        )
    gap = table_gap(context, tuned)
    return (*out, gap) if gap else tuple(out)
