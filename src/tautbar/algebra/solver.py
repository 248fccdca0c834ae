"""Which back end factorises the matrices of a pattern: the one with the smallest estimated time.

Another back end is one file and one row of ``_CHOICES``.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from tautbar.algebra.band import BandSolver
from tautbar.algebra.dense import DenseSolver
from tautbar.algebra.interface import (
    Factor,
    NotFinite,
    NotPositiveDefinite,
    Singular,
    Solver,
    SymmetricFactor,
)
from tautbar.algebra.ordering import Order, half_bandwidth, narrow_order
from tautbar.algebra.pattern import SymmetricPattern
from tautbar.algebra.superlu import SuperluSolver

__all__ = [
    "Factor",
    "NotFinite",
    "NotPositiveDefinite",
    "Singular",
    "Solver",
    "SymmetricFactor",
    "cheapest",
    "choose_solver",
]

_LARGEST_BAND = 2e9
"""Bytes; above this a band is not considered."""


@dataclass(frozen=True, slots=True)
class _Size:
    n: int
    half_band: int


# Seconds for one Cholesky factor, fitted to measurements on one core at about 20 GF/s.
def _dense_time(size: _Size) -> float:
    return 7e-6 + 3.4e-9 * size.n**2 + size.n**3 / 60e9


def _band_time(size: _Size) -> float:
    if 8.0 * size.n * size.half_band > _LARGEST_BAND:
        return np.inf
    return 8e-6 + size.n * (5.5e-9 * size.half_band + 0.02e-9 * size.half_band**2)


def _superlu_time(size: _Size) -> float:
    return 80e-6 + size.n * (0.9e-6 + 30e-9 * size.half_band)


@dataclass(frozen=True, slots=True)
class _Choice:
    seconds: Callable[[_Size], float]
    make: Callable[[SymmetricPattern, Order], Solver]


_CHOICES = {
    "dense": _Choice(_dense_time, lambda pattern, _: DenseSolver(pattern)),
    "band": _Choice(_band_time, BandSolver),
    "superlu": _Choice(_superlu_time, lambda pattern, _: SuperluSolver(pattern)),
}


def cheapest(n: int, half_band: int) -> str:
    """Name of the back end with the smallest estimated time for one factor of n unknowns.

    ``half_band`` is the half bandwidth after reverse Cuthill-McKee ordering.
    """
    size = _Size(n, half_band)
    return min(_CHOICES, key=lambda name: _CHOICES[name].seconds(size))


def choose_solver(pattern: SymmetricPattern, *, prefer: str | None = None) -> Solver:
    """The back end for this pattern.

    Parameters
    ----------
    pattern : where the entries of the matrices stand
    prefer : "dense", "band" or "superlu" to have that one whatever it costs

    Raises
    ------
    ValueError
        for another word.
    """
    order = narrow_order(pattern)
    name = cheapest(pattern.n, half_bandwidth(pattern, order)) if prefer is None else prefer
    if name not in _CHOICES:
        raise ValueError(f"no back end {name!r}; there are {', '.join(_CHOICES)}")
    return _CHOICES[name].make(pattern, order)
