"""Lowest eigenpairs of K x = lambda M x, with a proof that none was missed."""

from __future__ import annotations

from dataclasses import dataclass
from inspect import signature

import numpy as np
from scipy.linalg import eigh
from scipy.sparse.linalg import ArpackNoConvergence, LinearOperator, eigsh

from tautbar.algebra.interface import Factor, Solver
from tautbar.algebra.pattern import FloatArray, SymmetricPattern
from tautbar.algebra.pencil import SEPARATION, Pencil, start_vector
from tautbar.algebra.solver import choose_solver

_SPARE = 1
"""Modes sought beyond those wanted, so that the last one wanted has settled."""

_DENSE_BELOW = 50
"""Finite modes up to which all are found at once: as quick, and Lanczos wants room."""

_ROUNDS = 12

_RESTARTS = {"rng": 20} if "rng" in signature(eigsh).parameters else {}
"""Newer scipy draws the vectors of a restart at random; a seed keeps every run the same."""


_ROUNDING = 64.0 * float(np.finfo(float).eps)
"""An eigenvalue within this share of |x|.|K||x| is zero: sums of up to a few dozen entries a row."""


@dataclass(frozen=True, slots=True, eq=False)
class Modes:
    """Eigenpairs in rising order and what proves them.

    Attributes
    ----------
    eigenvalue : (M,)
    shape : (n, M) with x^T M x = 1, the (first) largest component positive
    residual : (M,) |K x - lambda M x| / |K x|; for zero modes over the greatest eigenvalue times |M x|
    residual_floor : (M,) the residual that rounding of K x alone leaves, eps (1 + | |K| |x| | / |K x|)
    orthogonality : largest entry of |X^T M X - I|
    count_below : eigenvalues below a value just above the last (1e-6 above, or past its equals), from
        the negative pivots there. More than M only where the last is multiple and was cut by the count.
    complete : whether that count equals the number of eigenvalues found below that value
    zero, negative : numbers of such eigenvalues of the whole structure; -1 if they could not be counted
    """

    eigenvalue: FloatArray
    shape: FloatArray
    residual: FloatArray
    residual_floor: FloatArray
    orthogonality: float
    count_below: int
    complete: bool
    zero: int
    negative: int


@dataclass(frozen=True, slots=True)
class _Pairs:
    value: FloatArray
    shape: FloatArray


@dataclass(frozen=True, slots=True)
class _Inverse:
    """(K + s M)^-1 for one positive s."""

    pencil: Pencil
    shift: float
    factor: Factor

    def ritz(self, shapes: FloatArray) -> _Pairs:
        """One step of subspace iteration (Bathe & Wilson 1973), values from the inverse.

        1 / (lambda + s) is formed without K x, whose rounding would cost eps (greatest / lambda).
        """
        load = self.pencil.mass @ shapes
        y = self.factor.solve(load)
        size = np.sqrt(np.sum(y * (self.pencil.mass @ y), axis=0))
        y = y / size
        energy = y.T @ (load / size)
        inverse, mix = eigh(y.T @ (self.pencil.mass @ y), (energy + energy.T) / 2.0)
        rising = np.argsort(-inverse)
        inverse, mix = inverse[rising], mix[:, rising]
        return _Pairs(1.0 / inverse - self.shift, y @ mix / np.sqrt(inverse))


def lowest_modes(
    stiffness_lower: FloatArray,
    mass_lower: FloatArray,
    pattern: SymmetricPattern,
    count: int | None = None,
    up_to: float | None = None,
    solver: Solver | None = None,
    greatest: float | None = None,
) -> Modes:
    """Lowest eigenpairs of K x = lambda M x, proven complete by a count of pivots.

    Shift-and-invert Lanczos (Ericsson & Ruhe 1980) about -s with s > 0 of the order of the lowest
    eigenvalue, so that zero and negative eigenvalues come out as such. Eigenvalues the first search
    missed (equal ones) are sought among the vectors orthogonal to those found until the count agrees.

    Parameters
    ----------
    stiffness_lower, mass_lower : (nnz,) lower values; unknowns may lack mass where stiffness holds them
    pattern : where the values stand
    count : number of modes; fewer come if fewer unknowns have mass
    up_to : only eigenvalues below this one (all of them if ``count`` is left out)
    solver : back end to use, else the cheapest
    greatest : upper bound of the eigenvalues if one is known; sets how small counts as zero

    Raises
    ------
    Singular
        if unknowns without mass have no positive definite stiffness of their own.
    ValueError
        if neither ``count`` nor ``up_to`` is given.
    """
    if count is None and up_to is None:
        raise ValueError("give a count of modes or a highest eigenvalue")
    pencil = Pencil(stiffness_lower, mass_lower, pattern, solver or choose_solver(pattern), greatest)
    if pencil.finite == 0:
        return _judged(pencil, _nothing(pencil), 0, 0, True, 0.0)
    inverse = _Inverse(pencil, *pencil.positive_shift())
    wanted = pencil.finite if count is None else min(count, pencil.finite)
    below = None if up_to is None else pencil.count_below(up_to)
    if below is not None:
        wanted = min(wanted, below)
    if wanted == 0:
        return _judged(pencil, _nothing(pencil), 0, 0, up_to is None or below is not None, 0.0)
    return _judged(pencil, *_search(inverse, wanted), inverse.shift)


def _nothing(pencil: Pencil) -> _Pairs:
    return _Pairs(np.zeros(0), np.zeros((pencil.n, 0)))


def _search(inverse: _Inverse, wanted: int) -> tuple[_Pairs, int, int, bool]:
    """Pairs, how many of them are wanted, the count of pivots, and whether it agrees."""
    pencil, pairs, below = inverse.pencil, _nothing(inverse.pencil), -1
    more = min(wanted + _SPARE, pencil.finite)
    for _ in range(_ROUNDS):
        pairs = _extended(inverse, pairs, more)
        missing = wanted - len(pairs.value)
        if missing <= 0:
            apart, first, last, below = _counted(inverse, pairs, wanted)
            if below <= last:
                return pairs, wanted, below, below == last
            if _none_missed_before(pencil, pairs.value, apart, first, last):
                return pairs, wanted, below, True
            missing = min(below - last, wanted)
        more = missing + _SPARE
    return pairs, wanted, below, False


def _counted(inverse: _Inverse, pairs: _Pairs, wanted: int) -> tuple[FloatArray, int, int, int]:
    """Distances past rounding, the equals of the last pair wanted, and the pivots counted above them (or -1).

    Just above rounding in the mode's own shape; where pivots so near cannot be told from zero, farther.
    """
    narrow = _apart(inverse, pairs)
    for apart in (narrow, np.maximum(narrow, inverse.pencil.zero_width)):
        first, last = _equals(pairs.value, apart, wanted - 1)
        counted = inverse.pencil.count_below(pairs.value[last - 1] + apart[last - 1])
        if counted is not None:
            return apart, first, last, counted
    return apart, first, last, -1


def _rounding(pencil: Pencil, shape: FloatArray, shift: float) -> FloatArray:
    """What rounding of K makes of an eigenvalue, in the mode's own shape (M,)."""
    size = np.abs(shape)
    modal_mass = np.sum(shape * (pencil.mass @ shape), axis=0)
    own = np.sum(size * (pencil.magnitude @ size), axis=0) / np.where(modal_mass > 0, modal_mass, 1.0)
    width: FloatArray = _ROUNDING * (own + shift)
    return width


def _apart(inverse: _Inverse, pairs: _Pairs) -> FloatArray:
    """Distance above each eigenvalue (M,) that is past its rounding."""
    width = _rounding(inverse.pencil, pairs.shape, inverse.shift)
    return np.maximum(SEPARATION * np.abs(pairs.value), width)


def _equals(values: FloatArray, apart: FloatArray, index: int) -> tuple[int, int]:
    """First of the eigenvalues equal to this one but for rounding, and the first after them."""
    gap = np.diff(values) > 2.0 * apart[:-1]
    ends = np.concatenate(([0], np.flatnonzero(gap) + 1, [len(values)]))
    at = int(np.searchsorted(ends, index, side="right"))
    return int(ends[at - 1]), int(ends[at])


def _none_missed_before(pencil: Pencil, values: FloatArray, apart: FloatArray, first: int, last: int) -> bool:
    """Whether all eigenvalues before a multiple one are known, so that only some of its equals are not."""
    if values[last - 1] - values[first] > 2.0 * apart[first]:
        return False
    return pencil.count_below(values[first] - apart[first]) == first


def _extended(inverse: _Inverse, known: _Pairs, more: int) -> _Pairs:
    """The known pairs and the next ``more`` ones, in rising order."""
    total = len(known.value) + more
    if inverse.pencil.finite <= max(_DENSE_BELOW, 3 * total):
        return _all_pairs(inverse)
    fresh = _lanczos(inverse, known.shape, more)
    if len(known.value) == 0:
        return fresh
    return inverse.ritz(np.column_stack((known.shape, fresh.shape)))


def _lanczos(inverse: _Inverse, known: FloatArray, count: int) -> _Pairs:
    """Lowest pairs among vectors orthogonal (by mass) to the known ones."""
    pencil, n = inverse.pencil, inverse.pencil.n
    heavy = pencil.mass @ known

    def apply(load: FloatArray) -> FloatArray:
        x = inverse.factor.solve(load - heavy @ (known.T @ load))
        x -= known @ (heavy.T @ x)
        return x

    operator = LinearOperator((n, n), matvec=apply, dtype=float)
    start = apply(pencil.mass @ start_vector(n))
    settings = {"M": pencil.mass, "sigma": -inverse.shift, "OPinv": operator, "v0": start, "tol": 0.0}
    try:
        value, shape = eigsh(pencil.stiffness, count, **settings, **_RESTARTS)
    except ArpackNoConvergence as stopped:
        value, shape = stopped.eigenvalues, stopped.eigenvectors
    rising = np.argsort(value)
    return _Pairs(value[rising], shape[:, rising])


def _all_pairs(inverse: _Inverse) -> _Pairs:
    """Every finite pair by a dense solution, its lower part sharpened by the inverse.

    A dense solution errs by eps greatest, the inverse by eps (lambda + s)^2 / (lowest + s).
    """
    pencil = inverse.pencil
    some, none = np.flatnonzero(pencil.has_mass), np.flatnonzero(~pencil.has_mass)
    stiffness = pencil.stiffness.toarray()
    follow = -np.linalg.solve(stiffness[np.ix_(none, none)], stiffness[np.ix_(none, some)])
    condensed = stiffness[np.ix_(some, some)] + stiffness[np.ix_(some, none)] @ follow
    value, part = eigh((condensed + condensed.T) / 2.0, pencil.mass[some][:, some].toarray())
    shape = np.zeros((pencil.n, len(value)))
    shape[some], shape[none] = part, follow @ part
    beyond = value + inverse.shift
    low = int(np.count_nonzero(beyond**2 <= beyond[-1] * beyond[0]))
    low = _equals(value, _apart(inverse, _Pairs(value, shape)), max(low, 1) - 1)[1]
    sharp = inverse.ritz(shape[:, :low])
    return _Pairs(np.concatenate((sharp.value, value[low:])), np.column_stack((sharp.shape, shape[:, low:])))


def _judged(pencil: Pencil, pairs: _Pairs, wanted: int, below: int, complete: bool, shift: float) -> Modes:
    """The wanted pairs, normalised, with their residuals and counts."""
    value, shape = pairs.value[:wanted], _normalised(pencil, pairs.shape[:, :wanted])
    force = pencil.stiffness @ shape
    left = np.linalg.norm(force - (pencil.mass @ shape) * value, axis=0)
    largest = np.linalg.norm(pencil.magnitude @ np.abs(shape), axis=0)
    moved = np.linalg.norm(force, axis=0)
    heaviest = pencil.greatest * np.linalg.norm(pencil.mass @ shape, axis=0)
    width = _rounding(pencil, shape, shift)
    scale = np.where(np.abs(value) <= width, heaviest, moved)
    gram = shape.T @ (pencil.mass @ shape)
    negative, zero = _signs(pencil, value, width, complete)
    return Modes(
        eigenvalue=value,
        shape=shape,
        residual=left / scale,
        residual_floor=np.finfo(float).eps * (1.0 + largest / scale),
        orthogonality=float(np.abs(gram - np.eye(len(value))).max(initial=0.0)),
        count_below=below,
        complete=complete,
        zero=zero,
        negative=negative,
    )


def _signs(pencil: Pencil, value: FloatArray, width: FloatArray, complete: bool) -> tuple[int, int]:
    """Numbers of negative and of zero eigenvalues of the whole structure; -1 if not countable.

    One is zero where rounding of K alone would give as much in its own shape: a slow sway of a stiff
    rope is none, however great the greatest eigenvalue. Where only such ones are known, or some may
    be missing, pivots on both sides of zero count the rest.
    """
    if complete and value.size and value[-1] > width[-1]:
        return int(np.count_nonzero(value < -width)), int(np.count_nonzero(np.abs(value) <= width))
    return pencil.signs() or (-1, -1)


def _normalised(pencil: Pencil, shape: FloatArray) -> FloatArray:
    """Unit modal mass; positive at the first component within 1e-6 of the largest."""
    if shape.size == 0:
        return shape
    shape = shape / np.sqrt(np.sum(shape * (pencil.mass @ shape), axis=0))
    size = np.abs(shape)
    first = np.argmax(size >= (1.0 - 1e-6) * size.max(axis=0), axis=0)
    signs: FloatArray = np.sign(shape[first, np.arange(shape.shape[1])])
    shape *= signs
    return shape
