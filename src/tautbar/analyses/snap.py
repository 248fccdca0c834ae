"""Did the structure snap through on the way to a static answer?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tautbar.algebra.solver import NotFinite, Singular
from tautbar.analyses.context import Rest
from tautbar.mechanics.loads import Acting
from tautbar.solvers.path import Stop, start_state, trace
from tautbar.solvers.path_correct import Border
from tautbar.solvers.path_events import LIMIT
from tautbar.solvers.path_family import Family

AT_REST = 1e-6  # of the largest force: only from a state in balance is there a path to follow
MOST_STEPS = 200


def snaps_at(start: Rest, target: Acting) -> float | None:
    """Share of the way from the start's loading to the target at which the load can grow no further.

    Follows the equilibrium path from the start state; None where it reaches the target, or where no
    path can be followed to a limit point.
    """
    potential = start.scene.potential(start.acting)
    if not potential.balanced(potential.look(start.q), AT_REST):
        return None
    family = _family(start, target)
    try:
        state = start_state(family, start.q, 0.0)
    except (Singular, NotFinite):
        return None
    if state is None:
        return None
    there = Border(np.zeros(potential.system.n), 1.0, 1.0)
    found = trace(family, state, 0.1, Stop(there, limit_points=1, most=MOST_STEPS))
    limits = [point.spot.f for point in found.critical if point.kind == LIMIT]
    return limits[0] if limits and 0.0 < limits[0] < 1.0 else None


def _family(start: Rest, target: Acting) -> Family:
    scene, before = start.scene, start.acting
    if all(np.array_equal(a, b) for a, b in zip(before[1:5], target[1:5], strict=True)):
        base = scene.potential(before)
        rate = scene.system.freedom.gather(target.force - before.force)
        return Family(scene.system, lambda f: replace(base, force=base.force + f * rate), rate)
    return Family(scene.system, lambda f: scene.potential(before.between(target, f)), None)
