"""Can a combination of symmetric matrices be positive definite? Answered with a proof either way.

Find a with G(a) = sum a_i G_i positive definite, where rows of ``sides`` ask for sides @ a >= 0. The least
eigenvalue of G(a) is concave in a: its maximum over |a_i| <= 1 is bounded from above by linear programs
with one row w^T G(a) w for each vector w met so far (Kelley 1960), and from below by each a tried.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.optimize import linprog

from tautbar.algebra.pattern import FloatArray

POSITIVE = 1e-6
"""Share of the largest form above which an eigenvalue is positive: ten times what the linear programs
(HiGHS, Huangfu & Hall 2018) leave open."""

_SLACK = 1e-7
_ROUNDS = 150


@dataclass(frozen=True, slots=True)
class Combination:
    """The combination found: ``factors`` (s,); ``positive`` (m,) for each unknown: True it is held by a
    positive part of G; False no combination that is nowhere negative holds it; None undecided."""

    factors: FloatArray
    positive: tuple[bool | None, ...]


def held_by(G: FloatArray) -> npt.NDArray[np.bool_]:
    """Which unknowns (m,) have no part in any direction in which a form G (m, m) is not positive."""
    value, vector = np.linalg.eigh(G)
    tolerance = POSITIVE * np.abs(value).max(initial=0.0)
    weak = vector[:, value <= tolerance]
    return np.asarray((weak * weak).sum(axis=1) <= POSITIVE)


def most_positive(forms: FloatArray, sides: FloatArray) -> Combination:
    """The combination of ``forms`` (s, m, m) that holds all unknowns, or as many as it finds.

    ``sides`` (c, s): combinations must have sides @ factors >= 0.
    """
    s, m = len(forms), forms.shape[1]
    size = float(np.abs(forms).max(initial=0.0))
    if size == 0.0 or s == 0:
        return Combination(np.zeros(s), (False,) * m)
    search = _Search(forms / size, _distinct(sides))
    all_held = search.definite()
    if all_held is not None:
        return Combination(all_held, (True,) * m)
    factors = search.semidefinite(search.trace())
    if factors is None:
        return Combination(np.zeros(s), (None,) * m)
    held = held_by(search.at(factors)) if np.abs(factors).max() > _SLACK else np.zeros(m, dtype=bool)
    return Combination(factors, tuple(True if h else search.undecided(k) for k, h in enumerate(held)))


class _Search:
    """Cutting planes: every vector met gives one row, a bound for all that follows."""

    def __init__(self, forms: FloatArray, sides: FloatArray) -> None:
        self.forms, self.sides = forms, sides
        self.rows = np.stack([np.diagonal(f) for f in forms], axis=1)  # (cuts, s): of the unit vectors

    def at(self, factors: FloatArray) -> FloatArray:
        return np.asarray(np.einsum("i,ijk->jk", factors, self.forms))

    def trace(self) -> FloatArray:
        return np.asarray(np.trace(self.forms, axis1=1, axis2=2))

    def definite(self) -> FloatArray | None:
        """Factors with all eigenvalues positive, or None: none was found."""
        for _ in range(_ROUNDS):
            factors, bound = self._highest_least()
            if bound <= POSITIVE:
                return None
            value = self._cut(factors, bound)
            if value > POSITIVE:
                return factors
        return None

    def semidefinite(self, gain: FloatArray) -> FloatArray | None:
        """Factors of the largest ``gain`` with no eigenvalue below zero; None where that takes too long."""
        for _ in range(_ROUNDS):
            factors = self._largest(gain)
            if self._cut(factors, 0.0) >= -POSITIVE:
                return factors
        return None

    def undecided(self, unknown: int) -> bool | None:
        """False if the rows prove that nothing holds an unknown, else None."""
        gain = np.asarray(self.forms[:, unknown, unknown])
        return False if float(gain @ self._largest(gain)) <= POSITIVE else None

    def _cut(self, factors: FloatArray, bound: float) -> float:
        """Least eigenvalue; eigenvectors below ``bound`` become rows."""
        value, vector = np.linalg.eigh(self.at(factors))
        below = vector[:, value < bound - 0.1 * _SLACK]
        self.rows = np.vstack([self.rows, np.einsum("jc,ijk,kc->ci", below, self.forms, below)])
        return float(value[0])

    def _highest_least(self) -> tuple[FloatArray, float]:
        """Factors that maximise the smallest row, and that smallest."""
        s = self.rows.shape[1]
        above = np.hstack([-self.rows, np.ones((len(self.rows), 1))])
        sides = np.hstack([-self.sides, np.zeros((len(self.sides), 1))])
        answer = _maximum(np.append(np.zeros(s), 1.0), np.vstack([above, sides]))
        return answer[:s], float(answer[s])

    def _largest(self, gain: FloatArray) -> FloatArray:
        return _maximum(gain, np.vstack([-self.rows, -self.sides]))


def _maximum(gain: FloatArray, rows: FloatArray) -> FloatArray:
    """x in [-1, 1] of the largest gain @ x with rows @ x <= 0."""
    found: Any = linprog(-gain, A_ub=rows, b_ub=np.zeros(len(rows)), bounds=(-1.0, 1.0), method="highs")
    if not found.success:  # x = 0 is allowed, so only the solver itself can fail
        raise ArithmeticError(f"a linear program was not solved: {found.message}")
    return np.asarray(found.x)


def _distinct(sides: FloatArray) -> FloatArray:
    """Rows scaled to one, those that say nothing and repetitions left out."""
    size = np.abs(sides).max(axis=1, initial=0.0)
    rows = sides[size > _SLACK] / size[size > _SLACK, None]
    return np.unique(np.round(rows, 9), axis=0) if len(rows) else rows
