"""Single ropes in a vertical plane: their shape, sag and end tension, and the length that gives them.

Axes: x level, z up, from the start of the rope; w is its weight per unstressed length [N/m]. The curve
is that of `hanging`.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq, minimize_scalar

from tautbar.mechanics import hanging
from tautbar.mechanics.hanging import Hung, Ropes

Array = NDArray[np.float64]
_SHORTEST, _LONGEST = 1e-3, 2.0  # unstressed lengths that are looked at, of the chord


def _hang(L0: float, EA: float, w: float, x: float, z: float) -> tuple[Ropes, Hung]:
    down = np.array([[0.0], [0.0], [-1.0]])
    rope = Ropes(np.array([float(L0)]), np.array([float(EA)]), np.array([float(w)]), down)
    hung = hanging.hang(rope, np.array([[float(x)], [0.0], [float(z)]]))
    if not hung.ok[0]:
        raise ValueError(f"no catenary found: L0 {L0}, EA {EA}, w {w}, x {x}, z {z}")
    return rope, hung


def end_force(L0: float, EA: float, w: float, x: float, z: float) -> tuple[float, float]:
    """Pull of the rope at its start, level and upward along the rope (H >= 0, V) [N].

    Parameters
    ----------
    L0, EA, w : float
        Unstressed length [m], axial stiffness [N], weight per unstressed length [N/m], all above 0.
    x, z : float
        Level distance (>= 0) and rise [m] from start to end.

    Raises
    ------
    ValueError
        The iteration did not close; this should not happen for finite input.
    """
    _, hung = _hang(L0, EA, w, x, z)
    return float(hung.pull[0, 0]), float(hung.V[0] - 0.5 * w * L0)


def points(L0: float, EA: float, w: float, x: float, z: float, count: int) -> Array:
    """Points (3, count) [m] from the start, at equal unstressed distances, both ends included."""
    rope, hung = _hang(L0, EA, w, x, z)
    r = np.array([[float(x)], [0.0], [float(z)]])
    return np.asarray(hanging.curve(rope, hung, np.zeros((3, 1)), r, count)[0].T)


def sag(L0: float, EA: float, w: float, x: float, z: float) -> float:
    """Vertical distance [m] from the middle of the chord down to the rope."""
    rope, hung = _hang(L0, EA, w, x, z)

    def at(share: float) -> Array:
        return hanging.point(rope, hung, share)[:, 0]

    middle = brentq(lambda s: at(s)[0] - 0.5 * max(x, hanging.VERTICAL * L0), 0.0, 1.0, xtol=1e-15)
    return float(0.5 * z - at(middle)[1])


def lower_end_tension(L0: float, EA: float, w: float, x: float, z: float) -> float:
    """Tension [N] at the lower end."""
    start, end = hanging.end_tensions(*_hang(L0, EA, w, x, z))
    return float(start[0] if z >= 0 else end[0])


def length_for_sag(wanted: float, EA: float, w: float, x: float, z: float) -> float:
    """Unstressed length [m] that hangs with the wanted sag [m].

    Raises
    ------
    ValueError
        The rope stretches further than that under its own weight, whatever its length.
    """
    chord = float(np.hypot(x, z))
    return _length_where(lambda L0: sag(L0, EA, w, x, z) - wanted, chord, chord + 4 * wanted)


def length_for_tension(wanted: float, EA: float, w: float, x: float, z: float) -> float:
    """Shortest unstressed length [m] with the wanted tension [N] at the lower end.

    Raises
    ------
    ValueError
        No length gives it: the least possible tension of a hanging rope is larger.
    """
    chord = float(np.hypot(x, z))
    longest, least = least_tension(EA, w, x, z)
    if wanted < least:
        raise ValueError(f"the least possible tension is {least} N")
    return _length_where(lambda L0: wanted - lower_end_tension(L0, EA, w, x, z), chord, longest)


def least_tension(EA: float, w: float, x: float, z: float) -> tuple[float, float]:
    """Unstressed length [m] with the least tension [N] that the lower end can have, and that tension.

    A longer rope hangs deeper and at first pulls less, then more, as it grows heavier.
    """
    chord = float(np.hypot(x, z))
    found = minimize_scalar(
        lambda L0: lower_end_tension(L0, EA, w, x, z),
        bounds=(_SHORTEST * chord, _LONGEST * chord),
        method="bounded",
        options={"xatol": 1e-9 * chord},
    )
    return float(found.x), float(found.fun)


def _length_where(gap: Callable[[float], float], chord: float, longest: float) -> float:
    """Where ``gap`` (rising with the length near the chord) is zero, found by growing outward from taut."""
    low = min(chord, longest)
    while gap(low) > 0:
        low *= 0.5
        if low < _SHORTEST * chord:
            raise ValueError("no unstressed length gives this")
    grid = low + (longest - low) * np.linspace(0.0, 1.0, 65) ** 3
    for a, b in itertools.pairwise(grid):
        if gap(float(b)) >= 0:
            return float(brentq(gap, float(a), float(b), xtol=1e-15 * chord, rtol=1e-15))
    raise ValueError("no unstressed length gives this")
