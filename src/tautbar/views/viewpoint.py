"""Where an onlooker far away stands: the views by name, and the one that suits a structure."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from tautbar.errors import InputError

Array = NDArray[np.float64]
VIEWS = {"front": (0.0, 0.0), "side": (90.0, 0.0), "top": (0.0, 90.0)}  # azimuth, elevation [degrees]
CORNER = (35.5, 20.6)  # degrees: from a corner, a little above
FRAMES = {  # up: the two horizontal axes, to the right and away from who stands in front
    0: ((0.0, 1.0, 0.0), (0.0, 0.0, 1.0)),
    1: ((1.0, 0.0, 0.0), (0.0, 0.0, -1.0)),
    2: ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0)),
}
FLAT = 1e-9  # of the size: a structure thinner than this is plane
LONG = 2.5  # in plan, length over breadth from which depth is drawn obliquely, so that level stays level
DEPTH, SLANT = 0.5, np.pi / 4  # an oblique view draws depth at half its length, rising at 45 degrees
NEARLY = np.radians(10.0)  # a long structure within this of an axis is seen along that axis


def viewpoint(positions: NDArray[Any], up: int, view: str | None) -> tuple[Array, bool]:
    """Directions on paper, to the right and upwards (2, 3), and whether lengths across it are true.

    Parameters
    ----------
    positions
        (J, 3) of the joints.
    up
        The direction that is up, 0 to 2.
    view
        "front", "side", "top", or azimuth and elevation in degrees, such as "30 20"; None: plane
        structures square on, long ones from the front with their depth drawn obliquely, others
        from a corner.

    Raises
    ------
    InputError
        If there is no such view.
    """
    right, away = (np.array(axis) for axis in FRAMES[up])
    upward = np.eye(3)[up]
    if view is not None:
        azimuth, elevation = _angles(view)
        return _turned(right, away, upward, azimuth, elevation), view in VIEWS
    spread = np.ptp(positions, axis=0) if len(positions) else np.zeros(3)
    flat = spread <= FLAT * (float(np.linalg.norm(spread)) or 1.0)
    for name, thin in (("front", away), ("side", right), ("top", upward)):
        if flat[np.abs(thin).argmax()] and flat.sum() == 1:
            return _turned(right, away, upward, *VIEWS[name]), True
    along, length, breadth = _plan(positions, right, away)
    if length > LONG * breadth:
        deep = DEPTH * np.cross(upward, along)
        return np.stack([along + np.cos(SLANT) * deep, upward + np.sin(SLANT) * deep]), True
    return _turned(right, away, upward, *CORNER), False


def _angles(view: str) -> tuple[float, float]:
    if view in VIEWS:
        return VIEWS[view]
    try:
        azimuth, elevation = (float(word) for word in view.split())
    except ValueError:
        raise InputError(
            f'view "{view}": choose front, side, top, or azimuth and elevation in degrees, such as "30 20"'
        ) from None
    return azimuth, elevation


def _turned(right: Array, away: Array, upward: Array, azimuth: float, elevation: float) -> Array:
    a, e = np.radians(azimuth), np.radians(elevation)
    across = np.cos(a) * right + np.sin(a) * away
    deep = np.cos(a) * away - np.sin(a) * right
    view = np.stack([across, np.cos(e) * upward + np.sin(e) * deep])
    return np.round(view, 15)  # an axis seen end-on has no length at all


def _plan(positions: NDArray[Any], right: Array, away: Array) -> tuple[Array, float, float]:
    """Direction in which a structure is longest in plan, its length that way and its breadth."""
    if len(positions) < 2:
        return right, 0.0, 0.0
    plan = positions @ np.stack([right, away]).T
    turn = float(np.arctan2(*np.linalg.eigh(np.cov(plan.T))[1][::-1, 1]))
    quarter = np.pi / 2
    if abs(turn - round(turn / quarter) * quarter) < NEARLY:
        turn = round(turn / quarter) * quarter
    turn = quarter - (quarter - turn) % np.pi  # the same line, pointing to the right
    way = np.array([np.cos(turn), np.sin(turn)])
    length, breadth = np.ptp(plan @ way), np.ptp(plan @ [-way[1], way[0]])
    return way[0] * right + way[1] * away, float(length), float(breadth)
