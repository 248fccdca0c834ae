"""A static analysis in sentences: its answer, its audit and its warnings."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context
from tautbar.analyses.solved import Solved
from tautbar.analyses.strength import Strength
from tautbar.analyses.words import chosen, direction, listed, quantity
from tautbar.mechanics.structure import HANGING, TIE
from tautbar.model.parts import Static

MOST_LOADINGS = 12


def outcome(context: Context, analysis: Static, solved: list[Solved]) -> str:
    """The answer, failures first."""
    failed = [s for s in solved if not s.verdict.holds]
    lines = [f"NOT A RESULT, {s.loading.name}: {_fault(context, s)}" for s in failed]
    good = [s for s in solved if s.verdict.holds]
    shown = good[:MOST_LOADINGS]
    lines += [f"{s.loading.name}: {_answer(context, s)}" for s in shown]
    if len(good) > len(shown):
        lines.append(f"... and {len(good) - len(shown)} more loadings, in the results file")
    if len(good) > 1:
        lines.append(_governing(context, good))
    return "\n".join(lines)


def _answer(context: Context, s: Solved) -> str:
    parts = [_displacement(context, s), *_forces(context, s), *_supports(context, s)]
    if s.slack.any():
        parts.append(f"slack: {chosen(context.member_names, s.slack)}")
    elif s.scene.structure.can_slack.any():
        parts.append("no member is slack")
    parts.append(_least(context, s))
    return "; ".join(p for p in parts if p) or "nothing moves and nothing is loaded"


def _displacement(context: Context, s: Solved) -> str:
    size = np.sqrt((s.displacement * s.displacement).sum(axis=0)) * s.scene.joints_there
    if not size.size or not size.max() > 0:
        return ""
    j = int(size.argmax())
    way = direction(s.displacement[:, j])
    return f"largest displacement {quantity(size[j], 'm')} at {context.joint_names[j]} in {way}"


def _forces(context: Context, s: Solved) -> list[str]:
    N, out = s.verdict.look.axial, []
    for sign, word in ((1, "tension"), (-1, "compression")):
        if N.size and (sign * N).max() > 1e-12 * np.abs(N).max():
            m = int((sign * N).argmax())
            out.append(f"greatest {word} {quantity(abs(N[m]), 'N')} in {context.member_names[m]}")
    return out


def _least(context: Context, s: Solved) -> str:
    """The least tension of the ties and ropes that are taut: what is nearest to going slack."""
    structure, N = s.scene.structure, s.verdict.look.axial
    pulls = structure.present & ((structure.kind == TIE) | (structure.kind == HANGING)) & ~s.slack
    if pulls.sum() < 2:
        return ""
    m = int(np.where(pulls, N, np.inf).argmin())
    return f"least tension {quantity(N[m], 'N')} in {context.member_names[m]}"


def _supports(context: Context, s: Solved) -> list[str]:
    """The largest reaction, and the largest one that holds the structure down."""
    size = np.sqrt((s.reaction * s.reaction).sum(axis=0))
    if not size.size or not size.max() > 0:
        return []
    j = int(size.argmax())
    way = direction(s.reaction[:, j])
    out = [f"largest reaction {quantity(size[j], 'N')} at {context.joint_names[j]} in {way}"]
    down = -s.reaction[context.parts.up]
    j = int(down.argmax())
    if down[j] > 1e-6 * size.max():
        out.append(f"greatest uplift {quantity(down[j], 'N')} at {context.joint_names[j]}")
    return out


def _governing(context: Context, good: list[Solved]) -> str:
    N = np.stack([s.verdict.look.axial for s in good])
    k, m = np.unravel_index(int(N.argmax()), N.shape)
    name = context.member_names[m]
    text = f"governing: tension {quantity(N[k, m], 'N')} in {name} under {good[k].loading.name}"
    if N.min() < 0:
        k, m = np.unravel_index(int(N.argmin()), N.shape)
        text += f"; compression {quantity(-N[k, m], 'N')} in {context.member_names[m]}"
        text += f" under {good[k].loading.name}"
    return text


def _fault(context: Context, s: Solved) -> str:
    say = {
        "not converged": _unconverged,
        "unstable": _unstable,
        "folded": _folded,
        "no steady contact": _contact,
        "load on nothing": _load_on_nothing,
        "unbalanced": _unbalanced,
        "snapped": _snapped,
    }
    return say[s.verdict.fault](context, s)


def _unconverged(context: Context, s: Solved) -> str:
    force = s.scene.system.freedom.spread(s.verdict.look.residual)
    size = np.sqrt((force * force).sum(axis=0))
    joint = int(size.argmax())
    return (
        f"no equilibrium found; still out of balance by {quantity(size[joint], 'N')} at joint "
        f"{context.joint_names[joint]} in {direction(force[:, joint])}. Look for a part that nothing holds "
        "there, a load that no member can carry, or give the analysis more steps"
    )


def _load_on_nothing(context: Context, s: Solved) -> str:
    names = listed(s.scene.loads_on_nothing(s.acting))
    return f"no member is there to carry the load at {names}: it would fall"


def _unbalanced(context: Context, s: Solved) -> str:
    return (
        f"reactions and loads do not add up: they differ by {100 * s.reaction_sum_error:.2g} % of the largest"
    )


def _snapped(context: Context, s: Solved) -> str:
    v = s.verdict
    return (
        f"the structure snaps through at {v.snapped_at:.4g} of the way to this loading, into a state up to "
        f"{quantity(v.move * s.scene.structure.size, 'm')} from the drawing; an equilibrium-path shows how. "
        'If it may snap, set folding = "allowed"'
    )


def _contact(context: Context, s: Solved) -> str:
    return (
        "supports that only push find no steady state: they lift off and set down in turn. "
        "Look for a support near its lifting load, or hold it down"
    )


def _unstable(context: Context, s: Solved) -> str:
    v = s.verdict
    if v.gives_way is None:
        joint, way = s.scene.name_direction(next(f.vector for f in v.free if f.nature == "unstable"))
        return f"the equilibrium is unstable: joint {joint} gives way in {direction(way)}"
    why = (
        f"{v.pivots.negative} negative pivots" if v.pivots.negative else "ties at their length do not hold it"
    )
    joint, way = s.scene.name_direction(v.gives_way)
    text = f"the equilibrium is unstable ({why}): joint {joint} gives way in {direction(way)}"
    for n in v.neighbours:
        joint, way = s.scene.name_direction(n.descent.q - v.look.q)
        text += (
            f"; a stable one lies {quantity(n.move, 'm')} away (joint {joint} moves in {direction(way)}), "
            f"{quantity(n.energy_below, 'J')} lower"
        )
    return text


def _folded(context: Context, s: Solved) -> str:
    v = s.verdict
    return (
        f"the structure folded: {context.member_names[v.turned_member]} turned {np.rad2deg(v.turn):.0f} "
        f"degrees from where it is drawn (farthest joint {100 * v.move:.0f} % of the model's size). If it is "
        'meant to, set folding = "allowed"'
    )


def audit_lines(context: Context, analysis: Static, solved: list[Solved]) -> tuple[str, ...]:
    """Evidence over all loadings, the worst of each kind."""
    worst = max(solved, key=lambda s: s.verdict.residual)
    lines = [
        f"force residual {worst.verdict.residual:.1e} of the largest force (asked: {analysis.tolerance:g})",
        f"sum of reactions against sum of loads: {max(s.reaction_sum_error for s in solved):.1e}",
        _stability_line(context, solved),
        _shape_line(context, solved),
    ]
    work = sum(s.verdict.factorisations for s in solved)
    roads = listed(sorted({s.verdict.road for s in solved}))
    return (*lines, f"{work} factorisations ({roads}, {solved[0].scene.system.solver.name})")


def _stability_line(context: Context, solved: list[Solved]) -> str:
    unstable = [s.loading.name for s in solved if s.verdict.fault == "unstable"]
    if unstable:
        return f"stability: FAILED for {listed(unstable)}"
    if any(s.verdict.fault == "not converged" for s in solved):
        return "stability: not judged where no equilibrium was found"
    zero = max(s.verdict.pivots.zero for s in solved)
    return "stable: no negative pivots" + (f", {zero} zero" if zero else "")


def _shape_line(context: Context, solved: list[Solved]) -> str:
    turned = max(solved, key=lambda s: s.verdict.turn)
    move = max(s.verdict.move for s in solved)
    text = f"greatest move {100 * move:.2g} % of the model's size"
    if turned.verdict.turned_member >= 0:
        name = context.member_names[turned.verdict.turned_member]
        text = (
            f"greatest turn of a bar or strut {np.rad2deg(turned.verdict.turn):.2g} degrees ({name}); {text}"
        )
    return text


def warnings(context: Context, solved: list[Solved]) -> tuple[str, ...]:
    """What holds, but should be known."""
    found: list[str] = []
    for s in (s for s in solved if s.verdict.holds):
        v, name = s.verdict, s.loading.name
        if v.left_saddle is not None:
            found.append(
                f"{name}: the balance reached first was unstable; the structure gives way by "
                f"{quantity(v.left_saddle, 'm')} to the stable one reported"
            )
        found += [_free_words(s, f.vector, f.nature) for f in v.free]
        if v.move > 0.1:
            found.append(f"{name}: joints move by {100 * v.move:.0f} % of the model's size")
        strength = Strength.of(s.scene)
        found += strength.said(context.member_names, s.verdict.look.axial, s.verdict.look.axial, f": {name}")
    return tuple(dict.fromkeys(found))


def _free_words(s: Solved, vector: NDArray[np.float64], nature: str) -> str:
    joint, way = s.scene.name_direction(vector)
    what = f"{s.loading.name}: joint {joint} is {{}} in {direction(way)}"
    if nature == "loose":
        return what.format("loose") + ": nothing holds it, and nothing pulls it"
    return what.format("held") + " only once it has moved"
