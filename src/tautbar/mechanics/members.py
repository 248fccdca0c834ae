"""Forces, tangents and energies of straight members, all at once.

N = EA e/L0 with e = l - L0: engineering strain. Ties carry e > 0 only, struts e < 0 only. End force
N n; tangent (EA/L0) n nT while it carries + (N/l)(I - n nT). Arrays are (N,) or (3, N), SI.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tautbar.mechanics.structure import BAR, STRUT, Structure

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
NOT_THERE = 1e6  # m: how loose a member is that is not there
EXACT = 1e-12  # of the model's size: a tie this near its unstressed length is at it


class Springs(NamedTuple):
    """Members as springs under one loading, whose temperature and take-up set the lengths."""

    r0: Array  # (3, N) m, drawn
    l0: Array  # (N,) m, drawn
    L0: Array  # (N,) m, unstressed, now
    e0: Array  # (N,) m, l0 - L0 without cancellation
    k: Array  # (N,) N/m, EA/L0
    sigma: Array  # (N,) +1, or -1 for struts
    two_way: Flags  # (N,) bars
    at_length: float  # m, the state is taut from sigma e >= -at_length

    @property
    def members(self) -> int:
        return self.l0.size


class Stretch(NamedTuple):
    """Geometry of the members in one position of the joints."""

    e: Array  # (N,) m, elongation
    n: Array  # (3, N), unit vector from start to end
    l: Array  # (N,) m


def springs(structure: Structure, take_up: Array | None = None, heating: Array | None = None) -> Springs:
    """Springs with L0 = (L0 of the model - take-up)(1 + heating); heating is expansion x kelvin."""
    s = structure
    shorter = np.zeros(s.members) if take_up is None else take_up
    warmer = np.zeros(s.members) if heating is None else heating
    longer = (s.L0 - shorter) * warmer - shorter
    L0 = s.L0 + longer
    sigma = np.where(s.kind == STRUT, -1.0, 1.0)
    k = np.where(s.present, s.EA / L0, 0.0)  # EA is the section's: a rope cut shorter is stiffer
    e0 = np.where(s.present, s.stretch0 - longer, -sigma * NOT_THERE)
    return Springs(s.r0, s.length, L0, e0, k, sigma, (s.kind == BAR) & s.present, EXACT * s.size)


def stretch(sp: Springs, du: Array) -> Stretch:
    """Exact geometry after the ends moved apart by ``du`` (3, N) [m].

    e comes from e0 and du alone, ((2 r0 + du).du)/(l + l0) + e0, so that it keeps its digits where
    l - L0 would lose them (a stiff rod under a small load).
    """
    r = sp.r0 + du
    l = np.sqrt((r * r).sum(axis=0))
    e = ((r + sp.r0) * du).sum(axis=0) / (l + sp.l0) + sp.e0
    return Stretch(e, r / np.maximum(l, 1e-300), l)


def stretch_linear(sp: Springs, du: Array) -> Stretch:
    """Geometry linearised about the drawing, for ``geometry = "small"``."""
    n = sp.r0 / sp.l0
    return Stretch((n * du).sum(axis=0) + sp.e0, n, sp.l0)


def carried(sp: Springs, e: Array) -> Array:
    """The elongation that is carried [m]: all of it by bars, one sense of it by ties and struts."""
    return np.where(sp.two_way | (sp.sigma * e > 0), e, 0.0)


def taut(sp: Springs, e: Array) -> Flags:
    """The *state* taut: also where a tie is exactly at its length, to rounding."""
    return np.asarray(sp.two_way | (sp.sigma * e >= -sp.at_length))


def firmly_taut(sp: Springs, e: Array) -> Flags:
    """Taut, and not merely at the point of going slack."""
    return np.asarray(sp.two_way | (sp.sigma * e > sp.at_length))


def force(sp: Springs, e: Array) -> Array:
    """Axial force [N], tension positive."""
    return sp.k * carried(sp, e)


def energy(sp: Springs, e: Array) -> float:
    """Strain energy of all members [J]."""
    p = carried(sp, e)
    return float(0.5 * (sp.k * p) @ p)


def tangent(n: Array, along: Array, across: Array) -> Array:
    """Blocks ``along`` n nT + ``across`` (I - n nT) as their values xx, yy, zz, xy, xz, yz: (6, N)."""
    a = along - across
    x, y, z = n
    return np.stack(
        [a * x * x + across, a * y * y + across, a * z * z + across, a * x * y, a * x * z, a * y * z]
    )


def block_times(blocks: Array, v: Array) -> Array:
    """Symmetric blocks xx, yy, zz, xy, xz, yz (6, N) times vectors (3, N)."""
    xx, yy, zz, xy, xz, yz = blocks
    x, y, z = v
    return np.stack([xx * x + xy * y + xz * z, xy * x + yy * y + yz * z, xz * x + yz * y + zz * z])


def unsymmetric(left: Array, right: Array, factor: Array, diagonal: Array) -> Array:
    """Blocks factor left rightT + diagonal I as nine values, row by row: (9, N)."""
    b = (factor * left)[:, None, :] * right[None, :, :]
    for c in range(3):
        b[c, c] += diagonal
    return b.reshape(9, -1)
