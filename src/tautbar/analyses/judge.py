"""The audit of a static state: balance, stability, and whether it is still the structure as drawn."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.structure import TIE
from tautbar.solvers.equilibrium import Descent
from tautbar.solvers.potential import Look, Potential
from tautbar.solvers.stability import (
    SMALL_MOVE,
    FreeDirection,
    Neighbour,
    Pivots,
    count_pivots,
    leave_saddle,
    probe_zero_pivots,
)

Array = NDArray[np.float64]
FOLDED = np.deg2rad(30.0)


@dataclass(frozen=True)
class Verdict:
    """What the audit of one static state found.

    ``fault`` is empty for a state that holds, else one of "not converged", "unstable", "folded".
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
    if pivots.negative or pivots.one_sided:
        neighbours = leave_saddle(potential, descent.look, tolerance)
        size = potential.system.structure.size
        near = [n for n in neighbours if n.move <= SMALL_MOVE * size]
        if near:
            descent, left = near[0].descent.after(descent.factorisations), near[0].move
            pivots = count_pivots(potential, descent.look)
    fault = "unstable" if pivots.negative else ""
    free: list[FreeDirection] = []
    if pivots.zero and not fault:
        free = probe_zero_pivots(potential, descent.look, pivots.zero, tolerance)
        fault = "unstable" if any(f.nature == "unstable" for f in free) else ""
    return _verdict(potential, descent, fault, pivots, folding, tuple(free), left, tuple(neighbours))


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
    turn, member = _greatest_turn(potential, look)
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


def _greatest_turn(potential: Potential, look: Look) -> tuple[float, int]:
    """Greatest angle [rad] of a bar or strut from its drawn direction, and that member (-1: none)."""
    s = potential.system.structure
    stiff = np.flatnonzero(s.kind != TIE)
    if not stiff.size:
        return 0.0, -1
    drawn, now = s.r0[:, stiff] / s.length[stiff], look.stretch.n[:, stiff]
    across = np.cross(drawn.T, now.T)
    angle = np.arctan2(np.sqrt((across * across).sum(axis=1)), (drawn * now).sum(axis=0))
    worst = int(angle.argmax())
    return float(angle[worst]), int(stiff[worst])
