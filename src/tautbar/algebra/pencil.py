"""Stiffness and mass taken together: shifted factors, and counts of eigenvalues below a value."""

from __future__ import annotations

from functools import cached_property
from typing import Any

import numpy as np

from tautbar.algebra.interface import Factor, NotPositiveDefinite, Singular, Solver
from tautbar.algebra.pattern import FloatArray, SymmetricPattern

ZERO_WIDTH = 1e-12
"""Share of the greatest eigenvalue within which one counts as zero: rounding leaves about 1e-16 of it,
and counts were right for widths from 1e-14 to 1e-10."""

SEPARATION = 1e-6
"""Relative distance above an eigenvalue at which the eigenvalues below are counted."""

_LANCZOS_STEPS = 8
_NUDGES = 4


class Pencil:
    """K - lambda M over one pattern; M positive definite but for unknowns without any mass.

    Attributes
    ----------
    stiffness, mass : scipy csr_array (n, n)
    finite : number of finite eigenvalues, one for each unknown that has mass
    greatest : upper estimate of the greatest finite eigenvalue
    zero_width : eigenvalues up to this size are zero
    """

    def __init__(
        self,
        stiffness_lower: FloatArray,
        mass_lower: FloatArray,
        pattern: SymmetricPattern,
        solver: Solver,
        greatest: float | None,
    ) -> None:
        self._stiffness_lower, self._mass_lower, self._solver = stiffness_lower, mass_lower, solver
        self.n = pattern.n
        # Symmetric, so the transpose is the same matrix, by rows: its products are the faster ones.
        self.stiffness, self.mass = pattern.to_csc(stiffness_lower).T, pattern.to_csc(mass_lower).T
        self.has_mass = mass_lower[pattern.diagonal] > 0.0
        self.finite = int(np.count_nonzero(self.has_mass))
        self.greatest = greatest or self._row_bound(mass_lower[pattern.diagonal]) or 1.0
        self.zero_width = ZERO_WIDTH * self.greatest

    def _row_bound(self, mass_diagonal: FloatArray) -> float:
        """Twice the greatest row sum of |K| over the mass (Gershgorin 1931); a bound for lumped mass.

        The factor two covers consistent mass, which is nowhere less than half its diagonal.
        """
        sums = abs(self.stiffness) @ self.has_mass.astype(float)
        return 2.0 * float((sums[self.has_mass] / mass_diagonal[self.has_mass]).max(initial=0.0))

    def shifted(self, shift: float) -> FloatArray:
        """Lower values of K + shift M."""
        return self._stiffness_lower + shift * self._mass_lower

    @cached_property
    def magnitude(self) -> Any:
        """|K|, for what rounding leaves in K x."""
        return abs(self.stiffness)

    def count_below(self, value: float) -> int | None:
        """Number of eigenvalues below a value by the negative pivots of K - value M (Sylvester 1852).

        A value that meets an eigenvalue, or a factor that grows, moves it up by 1e-6 of itself.
        None if no factor near it can be trusted.
        """
        for nudge in range(_NUDGES):
            factor = self._solver.symmetric(self.shifted(-value - nudge * SEPARATION * abs(value)))
            if factor.trusted and factor.zero == 0:
                return factor.negative
        return None

    def signs(self) -> tuple[int, int] | None:
        """Numbers of negative and of zero eigenvalues, from counts on both sides of zero.

        The width grows up to a hundredfold where a factor is too nearly singular to be counted.
        """
        for width in self.zero_width * np.array([1.0, 10.0, 100.0]):
            if self._definite_at(-width):
                return 0, 0
            below, above = self.count_below(-width), self.count_below(width)
            if below is not None and above is not None:
                return below, above - below
        return None

    def _definite_at(self, shift: float) -> bool:
        try:
            self._solver.cholesky(self.shifted(shift))
        except NotPositiveDefinite:
            return False
        return True

    def positive_shift(self) -> tuple[float, Factor]:
        """A shift s > 0 of the order of the lowest eigenvalue that is not zero, and a factor of K + s M.

        With negative eigenvalues s lies beyond the lowest. Raises Singular where no shift makes the
        sum positive definite.
        """
        shift, factor = self._definite(1e-8 * self.greatest, 100.0)
        lowest = self._lowest_nonzero(shift, factor)
        better = 3.0 * abs(lowest) if lowest < 0.0 else lowest
        if 0.1 * shift < better < 10.0 * shift:
            return shift, factor
        return self._definite(better, 4.0)

    def _definite(self, shift: float, step: float) -> tuple[float, Factor]:
        """The first of shift, step x shift, ... that makes K + s M positive definite, with its factor."""
        while shift <= 1e4 * self.greatest:
            try:
                return shift, self._solver.cholesky(self.shifted(shift))
            except NotPositiveDefinite:
                shift *= step
        raise Singular("an unknown without mass has no positive stiffness")

    def _lowest_nonzero(self, shift: float, factor: Factor) -> float:
        """Rough lowest eigenvalue that is not zero; a few Lanczos steps (Lanczos 1950) on (K + s M)^-1 M."""
        basis, images = np.zeros((self.n, 0)), np.zeros((self.n, 0))
        v = factor.solve(self.mass @ start_vector(self.n))
        for _ in range(min(_LANCZOS_STEPS, self.finite)):
            for _again in range(2):
                v = v - basis @ (basis.T @ (self.mass @ v))
            size = float(np.sqrt(v @ (self.mass @ v)))
            if size < 1e-12 / (self.greatest + shift):
                break
            basis = np.column_stack((basis, v / size))
            v = factor.solve(self.mass @ basis[:, -1])
            images = np.column_stack((images, v))
        inverse = np.linalg.eigvalsh(basis.T @ (self.mass @ images))
        values = 1.0 / inverse[inverse > 0.0] - shift
        clear = values[np.abs(values) > 10.0 * self.zero_width]
        return float(clear.min(initial=self.greatest))


def start_vector(n: int) -> FloatArray:
    """(n,) fixed vector that is not orthogonal to any mode of practical interest."""
    return np.random.default_rng(20).standard_normal(n)
