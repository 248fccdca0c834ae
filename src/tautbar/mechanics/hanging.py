"""Ropes that hang as one exact elastic catenary each, all at once.

The end force is taken as its mean over both ends: the pull of a tie, t (3,); the other half of the
rope's weight then goes to each end as a load, as for every member. t is the slope of a potential,
t = dE/dr, E(r) = max over (H, V) of H x + V z - C(H, V) with C the complementary energy; its second
derivative is the inverse of the flexibility. C is convex, so a damped Newton finds (H, V) always.

Sources: H. M. Irvine, Cable Structures, MIT Press 1981, ch. 1; H. B. Jayaraman and W. C. Knudson,
Comput. Struct. 14 (1981) 301-309 (end forces by iteration on the flexibility, from memory). All
differences are written so that nothing cancels as the weight goes to zero.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
EPS = float(np.finfo(float).eps)


class Ropes(NamedTuple):
    """Catenaries under one loading, (R,)."""

    L0: Array  # m, unstressed
    EA: Array  # N
    w: Array  # N/m of unstressed length, along `down`
    down: Array  # (3, R) unit vector of the weight, or of weight and wind together

    def some(self, which: NDArray[np.bool_]) -> Ropes:
        return Ropes(self.L0[which], self.EA[which], self.w[which], self.down[:, which])


class Hung(NamedTuple):
    """Catenaries in one position of their ends."""

    H: Array  # (R,) N, level pull
    V: Array  # (R,) N, mean vertical pull: V - w L0/2 at the start, V + w L0/2 at the end
    pull: Array  # (3, R) N, mean pull along the rope from start to end
    stiffness: Array  # (6, R) N/m, dpull/dr as xx, yy, zz, xy, xz, yz
    energy: Array  # (R,) J, up to a constant: its slope over r is the pull
    ok: NDArray[np.bool_]  # (R,) found


def _log_ratio(a: Array, b: Array) -> Array:
    """(asinh b - asinh a)/(b - a), b > a, without cancellation."""
    flip = a + b < 0
    a, b = np.where(flip, -b, a), np.where(flip, -a, b)
    Ta, Tb = np.hypot(1.0, a), np.hypot(1.0, b)
    # 1/(a + Ta), which is Ta - a: each where it does not cancel
    slope = (1 + (a + b) / (Ta + Tb)) * np.where(a < 0, Ta - a, 1 / (np.abs(a) + Ta))
    y = slope * (b - a)
    return np.asarray(slope * np.where(y > 1e-8, np.log1p(y) / np.where(y > 0, y, 1.0), 1 - y / 2))


def _span(H: Array, V: Array, rope: Ropes) -> tuple[Array, Array]:
    """Level and vertical distance of the ends [m] for pulls (H, V), H > 0."""
    T0, T1 = _end_tensions(H, V, rope)
    half = 0.5 * rope.w * rope.L0
    x = rope.L0 * (H / rope.EA + _log_ratio((V - half) / H, (V + half) / H))
    z = rope.L0 * V * (1 / rope.EA + 2 / (T0 + T1))
    return x, z


def _end_tensions(H: Array, V: Array, rope: Ropes) -> tuple[Array, Array]:
    half = 0.5 * rope.w * rope.L0
    return np.hypot(H, V - half), np.hypot(H, V + half)


def _complementary_energy(H: Array, V: Array, rope: Ropes) -> Array:
    """Integral of T + T^2/(2 EA) along the rope [J]; its slope over (H, V) is `_span`."""
    T0, T1 = _end_tensions(H, V, rope)
    W = rope.w * rope.L0
    log = _log_ratio((V - W / 2) / H, (V + W / 2) / H)
    length = 0.5 * rope.L0 * (2 * V * V / (T0 + T1) + 0.5 * (T0 + T1) + H * log)
    return length + rope.L0 * (H * H + V * V + W * W / 12) / (2 * rope.EA)


_X, _WEIGHT = np.polynomial.legendre.leggauss(20)


def _flexibility(H: Array, V: Array, rope: Ropes) -> tuple[Array, Array, Array]:
    """dx/dH, dx/dV = dz/dH and dz/dV [m/N].

    dx/dH = L0/EA + integral of V(s)^2/T^3; for a flat rope by Gauss's rule (exact to rounding where
    |V| <= H along it), since its closed form is a difference of nearly equal numbers there.
    """
    T0, T1 = _end_tensions(H, V, rope)
    half = 0.5 * rope.w * rope.L0
    level = _log_ratio((V - half) / H, (V + half) / H) / H
    cross = -2 * H * V / ((T0 + T1) * T0 * T1)
    product = T0 * T1
    rest = (H**4 + H * H * (2 * V * V + 2 * half**2) - 2 * (V * half) ** 2 + half**4) / (product + V * V)
    upright = (H * H + half**2 + rest) / ((T0 + T1) * product)
    flat = np.abs(V) + half <= H
    v = V + np.outer(_X, half)
    by_rule = 0.5 * (_WEIGHT @ (v * v / np.hypot(H, v) ** 3))
    xx = np.where(flat, by_rule, level - upright)
    return rope.L0 * (1 / rope.EA + xx), rope.L0 * cross, rope.L0 * (1 / rope.EA + upright)


def _guess(x: Array, z: Array, rope: Ropes) -> tuple[Array, Array]:
    """Pulls to start from: a taut or slightly sagging parabola, or the inextensible catenary."""
    chord = np.hypot(x, z)
    W = rope.w * rope.L0
    strain = chord / rope.L0 - 1
    q = (W * x / chord) ** 2 / 24
    T = rope.EA * np.maximum(strain, 0.0) + np.cbrt(q * rope.EA) + 1e-300
    for _ in range(20):
        T = np.maximum(T - (T / rope.EA - q / T**2 - strain) / (1 / rope.EA + 2 * q / T**3), 0.1 * T)
    ratio = np.sqrt(np.maximum((rope.L0 - z) * (rope.L0 + z), 0.0)) / x
    lam = np.where(ratio < 3, np.sqrt(6 * np.maximum(ratio - 1, 1e-12)), np.log(2 * ratio + 1) + 1.5)
    for _ in range(20):
        lam = lam - (np.log(np.sinh(lam) / lam / np.maximum(ratio, 1 + 1e-12))) / (1 / np.tanh(lam) - 1 / lam)
        lam = np.clip(lam, 1e-6, 700.0)
    sagging = strain < -1e-2
    H = np.where(sagging, 0.5 * rope.w * x / lam, T * x / chord)
    V = np.where(sagging, 0.5 * rope.w * z / np.tanh(lam), T * z / chord)
    return H, V


def _pulls(x: Array, z: Array, rope: Ropes) -> tuple[Array, Array, NDArray[np.bool_]]:
    """(H, V) [N] that span (x, z), x > 0, by a damped Newton on the convex complementary energy."""
    H, V = _guess(x, z, rope)
    scale = rope.L0 + x + np.abs(z)
    left = np.ones(H.size, dtype=bool)  # ropes still iterated
    for _ in range(100):
        some, at = rope.some(left), (x[left], z[left])
        gap = np.stack(at) - np.stack(_span(H[left], V[left], some))
        going = np.abs(gap).max(axis=0, initial=0.0) > 2 * EPS * scale[left]
        left[left] = going
        if not left.any():
            break
        some, gap = some.some(going), gap[:, going]
        moved = _newton_step(H, V, gap, x, z, some, left)
        left[left] = moved
    gap = np.stack([x, z]) - np.stack(_span(H, V, rope))
    return H, V, np.abs(gap).max(axis=0) <= 1e-11 * scale


def _newton_step(
    H: Array, V: Array, gap: Array, x: Array, z: Array, some: Ropes, left: NDArray[np.bool_]
) -> NDArray[np.bool_]:
    """Improve H and V in place where ``left``; which of those moved."""
    a, b, c = _flexibility(H[left], V[left], some)
    det = a * c - b * b
    dH, dV = (c * gap[0] - b * gap[1]) / det, (a * gap[1] - b * gap[0]) / det
    H[left], V[left], moved = _damped(H[left], V[left], dH, dV, x[left], z[left], some)
    return moved


def _damped(
    H: Array, V: Array, dH: Array, dV: Array, x: Array, z: Array, rope: Ropes
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """A step down for each rope, H kept above zero; where neither energy nor gap falls, none."""

    def judge(h: Array, v: Array) -> tuple[Array, Array]:
        sx, sz = _span(h, v, rope)
        return _complementary_energy(h, v, rope) - h * x - v * z, np.hypot(x - sx, z - sz)

    energy, gap = judge(H, V)
    share = np.where(H + dH > 0.1 * H, 1.0, -0.9 * H / np.where(dH == 0, 1.0, dH))
    waiting = np.ones(H.size, dtype=bool)
    for _ in range(60):
        h, v = np.where(waiting, H + share * dH, H), np.where(waiting, V + share * dV, V)
        new_energy, new_gap = judge(h, v)
        good = waiting & ((new_gap < gap) | (new_energy < energy))
        H, V = np.where(good, h, H), np.where(good, v, V)
        waiting &= ~good
        if not waiting.any():
            break
        share = np.where(waiting, 0.5 * share, share)
    return H, V, ~waiting


VERTICAL = 1e-7  # of L0: nearer to the plumb line than this a rope is taken as at this distance


def hang(rope: Ropes, r: Array) -> Hung:
    """Equilibrium of each rope between its ends.

    Parameters
    ----------
    r : (3, R)
        Vector from start to end [m].
    """
    rise = -(rope.down * r).sum(axis=0)
    level = r + rope.down * rise
    x = np.sqrt((level * level).sum(axis=0))
    x_used = np.maximum(x, VERTICAL * rope.L0)
    H, V, ok = _pulls(x_used, rise, rope)
    a, b, c = _flexibility(H, V, rope)
    det = a * c - b * b
    xx, xz, zz = c / det, -b / det, a / det
    turn = H / x_used  # stiffness across, and everywhere level for a rope in its plumb line
    u = level / x_used
    pull = H * u - rope.down * V
    energy = H * x_used + V * rise - _complementary_energy(H, V, rope)
    energy -= 0.5 * turn * (x_used**2 - x**2)
    return Hung(H, V, pull, _blocks(u, x / x_used, rope.down, xx, xz, zz, turn), energy, ok)


def _blocks(u: Array, share: Array, down: Array, xx: Array, xz: Array, zz: Array, turn: Array) -> Array:
    """dpull/dr (6, R): along the level direction u, up, and across."""
    up, out = -down, []
    for c, d in ((0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2)):
        value = (xx - turn) * u[c] * u[d] + turn * ((c == d) - up[c] * up[d])
        value = value + xz * (u[c] * up[d] + up[c] * u[d]) + zz * up[c] * up[d]
        out.append(value)
    return np.stack(out)


def end_tensions(rope: Ropes, hung: Hung) -> tuple[Array, Array]:
    """Tension at the start and at the end (R,) [N]: the mean pull and half of the load, either way."""
    half = 0.5 * rope.w * rope.L0 * rope.down
    start, end = hung.pull + half, hung.pull - half
    return np.sqrt((start * start).sum(axis=0)), np.sqrt((end * end).sum(axis=0))


def greatest_tension(rope: Ropes, hung: Hung) -> Array:
    """Greatest tension along each rope (R,) [N]: always at an end."""
    return np.maximum(*end_tensions(rope, hung))


def point(rope: Ropes, hung: Hung, share: Array | float) -> Array:
    """Where a share of the unstressed length is: level and vertical distance from the start (2, R) [m]."""
    share = np.broadcast_to(np.asarray(share, dtype=float), rope.L0.shape)
    some = np.maximum(share, EPS)
    V = hung.V - 0.5 * rope.w * rope.L0 * (1 - some)
    found = np.stack(_span(hung.H, V, rope._replace(L0=some * rope.L0)))
    return np.asarray(np.where(share > 0, found, 0.0))


def _placed(rope: Ropes, start: Array, r: Array, at: Array) -> Array:
    """Points (3, R) [m] from their level and vertical distances (2, R) from the start."""
    rise = -(rope.down * r).sum(axis=0)
    level = r + rope.down * rise
    x = np.sqrt((level * level).sum(axis=0))
    along = np.where(x > 0, at[0], 0.0) / np.where(x > 0, x, 1.0)
    return np.asarray(start + along * level - rope.down * at[1])


def curve(rope: Ropes, hung: Hung, start: Array, r: Array, count: int) -> Array:
    """Points along each rope at equal unstressed distances, ends included, (R, count, 3) [m].

    ``start`` (3, R) is where the ropes start [m], ``r`` (3, R) the vector to their ends.
    """
    shares = np.linspace(0.0, 1.0, count)
    return np.stack([_placed(rope, start, r, point(rope, hung, s)).T for s in shares], axis=1)


def lowest_point(rope: Ropes, hung: Hung, start: Array, r: Array) -> Array:
    """Lowest point of each rope (3, R) [m]: where its vertical pull is zero, or its lower end."""
    share = np.clip(0.5 - hung.V / (rope.w * rope.L0), 0.0, 1.0)
    return _placed(rope, start, r, point(rope, hung, share))
