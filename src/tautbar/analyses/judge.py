"""The audit of a static state: balance, stability, and whether it is still the structure as drawn."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.members import firmly_taut
from tautbar.mechanics.turn import FOLDED, greatest_turn
from tautbar.solvers.equilibrium import Descent
from tautbar.solvers.potential import Look, Potential
from tautbar.solvers.stability import (
    SMALL_MOVE,
    FreeDirection,
    Neighbour,
    Pivots,
    count_pivots,
    falls_away,
    leave_saddle,
    probe_zero_pivots,
    softest,
)

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Verdict:
    """What the audit of one static state found.

    ``fault`` is empty for a state that holds, else one of "not converged", "unstable", "folded",
    "no steady contact", "load on nothing", "unbalanced", "snapped".
    """

    look: Look
    fault: str
    pivots: Pivots
    residual: float  # largest force out of balance over the scale
    factorisations: int
    road: str
    turn: float  # rad, of the bar or strut that turned most
    turned_member: int
    move: float  # farthest joint over the model's size
    free: tuple[FreeDirection, ...] = ()
    left_saddle: float | None = None  # m moved to leave a saddle for this state
    neighbours: tuple[Neighbour, ...] = ()
    snapped_at: float | None = None  # share of the load at which the structure snaps through
    gives_way: Array | None = None  # (n,) direction of least stiffness of an unstable state

    @property
    def holds(self) -> bool:
        return not self.fault


def judge(potential: Potential, descent: Descent, tolerance: float, folding: bool) -> Verdict:
    """Audit the end of a static solve; a saddle is left, both ways, before it is called unstable."""
    if not descent.converged:
        return _verdict(potential, descent, "not converged", Pivots(0, 0, False), folding)
    pivots = count_pivots(potential, descent.look)
    left: float | None = None
    neighbours: list[Neighbour] = []
    falls = False  # pivots that ties at their length make positive hold no side that slackens them
    if pivots.negative or pivots.one_sided:
        neighbours = leave_saddle(potential, descent.look, tolerance)
        size = potential.system.structure.size
        near = [n for n in neighbours if n.move <= SMALL_MOVE * size]
        if near:
            descent, left = near[0].descent.after(descent.factorisations), near[0].move
            pivots = count_pivots(potential, descent.look)
        falls = not near and falls_away(potential, descent.look)
    fault = "unstable" if pivots.negative or falls else ""
    gives_way = None
    if fault:
        firm = firmly_taut(potential.springs, descent.look.stretch.e)
        gives_way = softest(potential, potential.curvature(descent.look, firm))
    free: list[FreeDirection] = []
    if pivots.zero and not fault:
        free = probe_zero_pivots(potential, descent.look, pivots.zero, tolerance)
        fault = "unstable" if any(f.nature == "unstable" for f in free) else ""
    found = _verdict(potential, descent, fault, pivots, folding, tuple(free), left, tuple(neighbours))
    return replace(found, gives_way=gives_way)


def _verdict(
    potential: Potential,
    descent: Descent,
    fault: str,
    pivots: Pivots,
    folding: bool,
    free: tuple[FreeDirection, ...] = (),
    left: float | None = None,
    neighbours: tuple[Neighbour, ...] = (),
) -> Verdict:
    look, system = descent.look, potential.system
    turn, member = greatest_turn(system.structure, look.stretch.n)
    if not fault and turn > FOLDED and not folding:
        fault = "folded"
    return Verdict(
        look=look,
        fault=fault,
        pivots=pivots,
        residual=look.imbalance / potential.scale(look),
        factorisations=descent.factorisations,
        road=descent.road,
        turn=turn,
        turned_member=member,
        move=system.greatest_joint_move(look.q) / system.structure.size,
        free=free,
        left_saddle=left,
        neighbours=neighbours,
    )
