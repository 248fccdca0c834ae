"""The elastic catenary: a rope of unstressed length L0 hanging in equilibrium under its own weight.

Sources: H. M. Irvine, Cable Structures, MIT Press 1981, ch. 1 (the curve); the end forces are found
as the minimum of the complementary energy, which is convex, so that a damped Newton cannot fail.
Axes: x level, z up, from the start of the rope; w is its weight per unstressed length [N/m].
"""

from __future__ import annotations

import itertools
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

Array = NDArray[np.float64]


def _h_asinh(y: float, H: float) -> float:
    """H asinh(y/H), with its limit 0 at H = 0."""
    return float(H * np.arcsinh(y / H)) if H > 0 else 0.0


def _span(H: float, V: float, L0: float, EA: float, w: float) -> Array:
    """Where the rope ends, (x, z) [m], when (H, V) [N] pulls at its start and H, V + w L0 at its end."""
    V1 = V + w * L0
    x = H * L0 / EA + (_h_asinh(V1, H) - _h_asinh(V, H)) / w
    z = (V + 0.5 * w * L0) * L0 / EA + (np.hypot(H, V1) - np.hypot(H, V)) / w
    return np.array([x, z])


def _complementary_energy(H: float, V: float, L0: float, EA: float, w: float) -> float:
    """Integral of T + T^2/(2 EA) along the rope [J], whose gradient over (H, V) is `_span`."""
    V1 = V + w * L0
    tension = 0.5 * (V1 * np.hypot(H, V1) - V * np.hypot(H, V) + H * (_h_asinh(V1, H) - _h_asinh(V, H)))
    return float(tension / w + (H * H * L0 + (V1**3 - V**3) / (3 * w)) / (2 * EA))


def _flexibility(H: float, V: float, L0: float, EA: float, w: float) -> Array:
    """Derivative of `_span` over (H, V) [m/N], (2, 2), symmetric and positive definite."""
    V1 = V + w * L0
    T0, T1 = np.hypot(H, V), np.hypot(H, V1)
    cross = H * (1 / T1 - 1 / T0) / w
    log = (np.arcsinh(V1 / H) - np.arcsinh(V / H)) / w
    return np.array(
        [[L0 / EA + log - (V1 / T1 - V / T0) / w, cross], [cross, L0 / EA + (V1 / T1 - V / T0) / w]]
    )


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
    if x <= 1e-12 * max(L0, abs(z)):
        return 0.0, _vertical_pull(L0, EA, w, z)
    H, V = _first_guess(L0, EA, w, x, z)
    aim: Array = np.array([x, z], dtype=float)
    scale = max(L0, x, abs(z))
    for _ in range(200):
        gap = aim - _span(H, V, L0, EA, w)
        if np.abs(gap).max() <= 4e-15 * scale:
            break
        step = np.asarray(np.linalg.solve(_flexibility(H, V, L0, EA, w), gap), dtype=np.float64)
        H, V, moved = _damped(H, V, step, aim, L0, EA, w)
        if not moved:
            break
    if np.abs(aim - _span(H, V, L0, EA, w)).max() > 1e-9 * scale:
        raise ValueError(f"no catenary found: L0 {L0}, EA {EA}, w {w}, x {x}, z {z}")
    return H, V


def _damped(
    H: float, V: float, step: Array, aim: Array, L0: float, EA: float, w: float
) -> tuple[float, float, bool]:
    """One step down the complementary energy, H kept above zero; False when rounding stops it."""

    def energy(h: float, v: float) -> float:
        return _complementary_energy(h, v, L0, EA, w) - h * float(aim[0]) - v * float(aim[1])

    now = energy(H, V)
    share = 1.0 if H + step[0] > 0.1 * H else -0.9 * H / float(step[0])
    gap = float(np.abs(aim - _span(H, V, L0, EA, w)).max())
    for _ in range(60):
        h, v = H + share * float(step[0]), V + share * float(step[1])
        nearer = float(np.abs(aim - _span(h, v, L0, EA, w)).max()) < gap
        if nearer or energy(h, v) < now:
            return h, v, True
        share *= 0.5
    return H, V, False


def _first_guess(L0: float, EA: float, w: float, x: float, z: float) -> tuple[float, float]:
    """Inextensible catenary for a rope longer than its chord, straight elastic rope for a shorter one."""
    chord = float(np.hypot(x, z))
    if chord * (1 + 1e-6) < L0:
        ratio = np.sqrt((L0 - z) * (L0 + z)) / x
        top = np.log(2 * ratio) + np.log(np.log(2 * ratio) + 1) + 2
        lam = brentq(lambda a: np.sinh(a) / a - ratio, 1e-9, float(top))
        H = w * x / (2 * lam)
        return float(H), float(0.5 * w * (z / np.tanh(lam) - L0))
    T = EA * max(chord / L0 - 1, 0.0) + w * L0 * np.sqrt(chord / L0) / np.sqrt(24 * 1e-3)
    return float(T * x / chord), float(T * z / chord - 0.5 * w * L0)


def _vertical_pull(L0: float, EA: float, w: float, z: float) -> float:
    """V [N] of a rope with its ends in one plumb line: hanging straight, or doubled back."""

    def gap(V: float) -> float:
        return float(_span(0.0, V, L0, EA, w)[1]) - z

    reach = w * L0 + EA * (abs(z) / L0 + 1)
    return float(brentq(gap, -reach - w * L0, reach, xtol=1e-14 * reach, rtol=1e-14))


def points(L0: float, EA: float, w: float, x: float, z: float, s: Array) -> Array:
    """Points of the curve, (2, len(s)) [m] from the start, at unstressed distances ``s`` [m] along it."""
    H, V = end_force(L0, EA, w, x, z)
    return np.stack([_span(H, V, float(d), EA, w) if d > 0 else np.zeros(2) for d in s], axis=1)


def sag(L0: float, EA: float, w: float, x: float, z: float) -> float:
    """Vertical distance [m] from the middle of the chord down to the rope."""
    H, V = end_force(L0, EA, w, x, z)
    middle = brentq(lambda d: _span(H, V, d, EA, w)[0] - 0.5 * x, 0.0, L0, xtol=1e-15 * L0, rtol=1e-15)
    return float(0.5 * z - _span(H, V, middle, EA, w)[1])


def lower_end_tension(L0: float, EA: float, w: float, x: float, z: float) -> float:
    """Tension [N] at the lower end."""
    H, V = end_force(L0, EA, w, x, z)
    return float(np.hypot(H, V if z >= 0 else V + w * L0))


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
    return _length_where(lambda L0: wanted - lower_end_tension(L0, EA, w, x, z), chord, 2 * chord)


def _length_where(gap: Callable[[float], float], chord: float, longest: float) -> float:
    """Where ``gap`` (rising with the length near the chord) is zero, found by growing outward from taut."""
    low = chord
    while gap(low) > 0:
        low *= 0.5
        if low < 1e-3 * chord:
            raise ValueError("no unstressed length gives this")
    grid = low + (longest - low) * np.linspace(0.0, 1.0, 65) ** 3
    for a, b in itertools.pairwise(grid):
        if gap(float(b)) >= 0:
            return float(brentq(gap, float(a), float(b), xtol=1e-15 * chord, rtol=1e-15))
    raise ValueError("no unstressed length gives this")
