"""How far bars and struts have turned from where they are drawn."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.structure import BAR, STRUT, Structure

FOLDED = np.deg2rad(30.0)  # a bar that turned more than this is part of another structure than the drawn one


def greatest_turn(structure: Structure, n: NDArray[np.float64]) -> tuple[float, int]:
    """Greatest angle [rad] of a bar or strut from its drawn direction, and that member (-1: there is none).

    Parameters
    ----------
    n : (3, N)
        Unit vectors of the members now.
    """
    s = structure
    stiff = np.flatnonzero(s.present & ((s.kind == BAR) | (s.kind == STRUT)))
    if not stiff.size:
        return 0.0, -1
    drawn, now = s.r0[:, stiff] / s.length[stiff], n[:, stiff]
    across = np.cross(drawn, now, axis=0)
    angle = np.arctan2(np.sqrt((across * across).sum(axis=0)), (drawn * now).sum(axis=0))
    worst = int(angle.argmax())
    return float(angle[worst]), int(stiff[worst])
