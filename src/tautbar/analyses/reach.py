"""The way to a loading: at once, in load steps, and over supports that only push."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context, Rest
from tautbar.analyses.judge import Verdict, judge
from tautbar.analyses.scene import Scene
from tautbar.analyses.snap import snaps_at
from tautbar.mechanics.freedom import pushers
from tautbar.mechanics.loads import Acting
from tautbar.model.parts import Static
from tautbar.solvers.equilibrium import Descent, descend, find_equilibrium
from tautbar.solvers.potential import Potential

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
NEAR = 40  # iterations: enough from a state of nearly the same load
LIFTED = 1e-9  # of the largest force: a one-way support that pulls more than this lets go


def settle(context: Context, analysis: Static, start: Rest, target: Acting) -> tuple[Scene, Verdict]:
    """Equilibrium under a loading, judged, with one-way supports holding only where they push.

    The set of supports that push is changed and the state found anew until both agree; a set that
    comes back without agreement is told as not converged.
    """
    scene, seen = start.scene, set()
    all_pushing = pushers(context.parts, scene.stage, scene.structure.joints)
    while True:
        start = replace(start, scene=scene)
        descent = _reach(analysis, start, target)
        potential = scene.potential(target, analysis.geometry == "small")
        verdict = judge(potential, descent, analysis.tolerance, analysis.folding)
        pushing = _pushing_now(scene, verdict, target, all_pushing)
        if (pushing == scene.pushing).all():
            return scene, _snap_judged(analysis, start, target, potential, descent, verdict)
        seen.add(scene.pushing.tobytes())
        if pushing.tobytes() in seen:
            return scene, replace(verdict, fault="no steady contact")
        U = scene.displacement(verdict.look.q, target)
        scene = context.restaged(scene, scene.stage, pushing, U)


def _snap_judged(
    analysis: Static, start: Rest, target: Acting, potential: Potential, descent: Descent, verdict: Verdict
) -> Verdict:
    """A state on the far side of a limit point is not what the structure comes to: find that out.

    Looked for where the tangent gave way between the start and the answer; ropes and ties alone have
    one state only.
    """
    suspect = descent.gave_way or descent.road == "load steps"
    if not (verdict.holds and suspect) or analysis.folding or potential.small or potential.convex:
        return verdict
    share = snaps_at(start, target)
    return verdict if share is None else replace(verdict, fault="snapped", snapped_at=share)


def reaction(scene: Scene, verdict: Verdict, acting: Acting) -> Array:
    """Forces of supports on the structure (3, J) [N], springs included."""
    pull = scene.system.freedom.joint_pull(verdict.look.response.pull)
    return scene.reaction(pull, acting.force, scene.displacement(verdict.look.q, acting))


def _pushing_now(scene: Scene, verdict: Verdict, acting: Acting, all_pushing: Flags) -> Flags:
    """One-way supports that should hold: those that push, and those whose joint sinks into them."""
    if not all_pushing.any() or verdict.fault == "not converged":
        return scene.pushing
    U = scene.displacement(verdict.look.q, acting)
    lifts, sinks = contact_lost(
        scene, all_pushing, acting, reaction(scene, verdict, acting), U, verdict.look.axial
    )
    return np.asarray((scene.pushing & ~lifts) | sinks)


def contact_lost(
    scene: Scene, all_pushing: Flags, acting: Acting, force: Array, U: Array, axial: Array
) -> tuple[Flags, Flags]:
    """One-way supports (3, J) that pull though they hold, and those that joints sink into though they do not.

    ``force`` are the reactions [N], ``U`` the displacements [m], all (3, J); ``axial`` (N,) sets the scale.
    """
    scale = max(np.abs(acting.force).max(initial=0.0), np.abs(np.nan_to_num(axial)).max(initial=0.0))
    sunk = scene.settled + acting.move - 1e-12 * scene.structure.size > U
    return scene.pushing & (force < -LIFTED * scale), all_pushing & ~scene.pushing & sunk


def _reach(analysis: Static, start: Rest, target: Acting) -> Descent:
    """Go to the loading in the steps asked for, else at once, else in steps halved as it takes."""
    if analysis.steps:
        return _in_steps(analysis, start, target, analysis.steps)
    at_once = _in_steps(analysis, start, target, 1)
    if at_once.converged or analysis.geometry == "small":
        return at_once
    stepped = _in_adaptive_steps(analysis, start, target)
    return stepped.after(at_once.factorisations) if stepped else at_once


def _in_steps(analysis: Static, start: Rest, target: Acting, steps: int) -> Descent:
    q, work, gave_way = start.q, 0, False
    for i in range(1, steps + 1):
        descent = at_share(analysis, start, target, i / steps, q)
        q, work, gave_way = descent.q, work + descent.factorisations, gave_way or descent.gave_way
    return replace(descent.after(work - descent.factorisations), gave_way=gave_way)


def _in_adaptive_steps(analysis: Static, start: Rest, target: Acting) -> Descent | None:
    """Steps of a tenth of the load, halved where one fails, doubled after a good one; None if stuck."""
    q, share, step, work = start.q, 0.0, 0.1, 0
    while step >= 1e-3:
        end = min(1.0, share + step)
        descent = at_share(analysis, start, target, end, q)
        work += descent.factorisations
        if not descent.converged:
            step *= 0.5
            continue
        if end == 1.0:
            return descent.after(work - descent.factorisations, "load steps")
        q, share, step = descent.q, end, 2 * step
    return None


def at_share(
    analysis: Static, start: Rest, target: Acting, share: float, q: Array, patient: bool = True
) -> Descent:
    """Equilibrium at a share of the way from the start's loading to the target.

    Not ``patient``: near ``q`` or nowhere, without creeping to where the structure might fall.
    """
    acting = start.acting.between(target, share) if share < 1.0 else target
    potential = start.scene.potential(acting, analysis.geometry == "small")
    if patient or potential.convex:
        return find_equilibrium(potential, q, analysis.tolerance)
    return descend(potential, q, analysis.tolerance, cap=0.02, limit=NEAR)
