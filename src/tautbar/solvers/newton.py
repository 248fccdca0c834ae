"""The iteration inside one time step: a factor kept while it serves, made anew when it does not."""

from __future__ import annotations

from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from tautbar.algebra.solver import Factor, NotPositiveDefinite
from tautbar.solvers.motion import StepNotConverged

Array = NDArray[np.float64]
FAST = 0.3  # a kept factor serves while the residual falls by this each solve
SYMMETRIC_ITERATIONS = 6
MOST_ITERATIONS = 30


class Balance(Protocol):
    """One trial of a step: what is out of balance, and how little would do."""

    residual: Array
    enough: float


class Trial(Protocol):
    """A step being solved: evaluate at an increment, and factor the matrix there."""

    def balance(self, dq: Array) -> Balance: ...
    def symmetric_factor(self) -> Factor: ...
    def exact_factor(self) -> Factor: ...


class KeptFactor:
    """A factor with the step length and taut set it was made for."""

    def __init__(self) -> None:
        self.factor: Factor | None = None
        self.key: object = None

    def serving(self, key: object) -> Factor | None:
        """The factor, if it was made for this ``key``."""
        return self.factor if self.key == key else None

    @staticmethod
    def key_of(dt: float, on: NDArray[np.bool_]) -> tuple[str, bytes]:
        """Step length, to the digits that rounding of times leaves it, and the taut set."""
        return f"{dt:.9e}", on.tobytes()

    def put(self, factor: Factor, key: object) -> Factor:
        self.factor, self.key = factor, key
        return factor


def solve_step(trial: Trial, dq: Array, kept: KeptFactor, key: object) -> tuple[Array, int]:
    """Increment of the displacement that balances the step, and the iterations it took.

    The symmetric matrix first; after six iterations the exact one, which need not be symmetric.

    Raises
    ------
    StepNotConverged
        Not within `MOST_ITERATIONS`, or not finite.
    """
    before = np.inf
    factor = kept.serving(key)
    for iteration in range(MOST_ITERATIONS + 1):
        now = trial.balance(dq)
        size = float(np.abs(now.residual).max(initial=0.0))
        if size <= now.enough:
            return dq, iteration
        if not np.isfinite(size):
            break
        if factor is None or size > FAST * before:
            factor = kept.put(_new_factor(trial, iteration), key)
        before = size
        dq = dq + factor.solve(now.residual)
    raise StepNotConverged


def _new_factor(trial: Trial, iteration: int) -> Factor:
    if iteration < SYMMETRIC_ITERATIONS:
        try:
            return trial.symmetric_factor()
        except NotPositiveDefinite:
            pass
    return trial.exact_factor()
