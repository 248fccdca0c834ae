"""Members as straight two-way lines: what stretches when joints move, and how tension holds them sideways.

The compatibility matrix C (b, n) gives the stretch [m] of every line for moves of the free unknowns [m]; its
transpose is the equilibrium matrix. Lines are the members present and the springs to ground. A hanging
member is one line between its ends, in pieces or not; the joints between its pieces are left out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array, csr_array, diags_array, vstack
from scipy.sparse.csgraph import connected_components

from tautbar.mechanics.freedom import Freedom
from tautbar.mechanics.structure import Structure
from tautbar.model.parts import Hanging

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True)
class Lines:
    """L lines between joints, then springs to ground, over n free unknowns.

    Attributes
    ----------
    member : (N,) line of each member, -1 where it is not present
    first : (L,) a member of each line
    unit : (3, L) direction
    length : (L,) m
    T : (3J, n) displacement of joints from the free unknowns; rows of left-out joints are empty
    apart : (3L, n) relative displacement of the ends of lines
    C : (b, n) stretch, L rows of lines and then those of springs
    """

    member: Index
    first: Index
    start: Index
    end: Index
    unit: Array
    length: Array
    T: csr_array
    apart: csr_array
    C: csr_array

    @property
    def count(self) -> int:
        """Number of lines between joints."""
        return int(self.first.size)

    @property
    def springs(self) -> int:
        return int(self.C.shape[0]) - self.count

    def sideways(self, V: Array) -> Array:
        """How far the ends of each line move apart across it (3, L, k) for unknowns (n, k)."""
        du = (self.apart @ V).reshape(3, self.count, V.shape[1])
        along = np.einsum("cl,clk->lk", self.unit, du)
        return np.asarray(du - self.unit[:, :, None] * along)

    def joint_moves(self, V: Array) -> Array:
        """Displacements of joints (k, 3, J) for unknowns (n, k)."""
        return np.asarray((self.T @ V).T.reshape(V.shape[1], 3, self.T.shape[0] // 3))

    def tension_form(self, force: Array) -> csr_array:
        """(n, n) matrix of sum N/l |sideways|^2 for forces (L,) [N]."""
        across = csr_array(_diagonal(np.tile(force / self.length, 3)))
        along = csr_array(_diagonal(force / self.length))
        C = self.C[: self.count]
        return csr_array(self.apart.T @ across @ self.apart - C.T @ along @ C)


def lines(structure: Structure, freedom: Freedom, hanging: tuple[Hanging, ...]) -> Lines:
    """The lines of a structure at its stage, as drawn."""
    s = structure
    start, end, own = s.start.copy(), s.end.copy(), np.arange(s.members)
    inner = np.zeros(s.joints, dtype=bool)
    for rope in hanging:
        own[rope.members] = rope.members[0]
        start[rope.members[0]], end[rope.members[0]] = rope.start, rope.end
        inner[rope.joints] = True
    first = np.unique(own[s.present])
    member = np.full(s.members, -1, dtype=np.intp)
    member[s.present] = np.searchsorted(first, own[s.present])
    T = _without(freedom.T, np.tile(inner, 3))
    r = s.position[:, end[first]] - s.position[:, start[first]]
    length = np.sqrt((r * r).sum(axis=0))
    unit = r / length
    J, L = s.joints, first.size
    rows, one = np.arange(L), np.ones(L)
    ends = np.concatenate([end[first], start[first]])
    incidence = coo_array((np.concatenate([one, -one]), (np.tile(rows, 2), ends)), shape=(L, J)).tocsr()
    apart = [csr_array(incidence @ T[c * J : (c + 1) * J]) for c in range(3)]
    stretch = sum((csr_array(_diagonal(unit[c]) @ apart[c]) for c in range(3)), csr_array((L, T.shape[1])))
    grounded = T[np.flatnonzero(freedom.spring.diagonal())]
    grounded = grounded[np.flatnonzero(np.diff(grounded.indptr))]
    C = csr_array(vstack([stretch, grounded], format="csr"))
    return Lines(
        member, first, start[first], end[first], unit, length, T, csr_array(vstack(apart, format="csr")), C
    )


def _diagonal(values: Array) -> csr_array:
    return csr_array(diags_array(values))


def _without(T: csr_array, rows: NDArray[np.bool_]) -> csr_array:
    """T without the unknowns that move any of the rows given."""
    if not rows.any():
        return T
    moved = np.unique(T[np.flatnonzero(rows)].indices)
    kept = np.setdiff1d(np.arange(T.shape[1]), moved)
    return csr_array(T.tocsc()[:, kept])


def rigid_motions(lined: Lines, position: Array, rounding: float = 1e-9) -> Array:
    """Motions (n, r) in which connected lines move as rigid bodies past all that holds them.

    ``position`` (3, J) [m]. Three translations and three rotations of each body about its middle; those
    combinations remain that no held direction and no spring resists, to a share ``rounding`` of the move.
    """
    J = position.shape[1]
    link = coo_array((np.ones(lined.count), (lined.start, lined.end)), shape=(J, J))
    body = connected_components(link, directed=False)[1]
    body[np.setdiff1d(np.arange(J), np.concatenate([lined.start, lined.end]))] = -1
    R = _six_motions(position, body)
    held = (R - lined.T @ (lined.T.T @ R)).reshape(3, J, 6)
    grams = np.zeros((body.max(initial=-1) + 1, 6, 6))
    there = body >= 0
    np.add.at(grams, body[there], np.einsum("cjk,cjl->jkl", held, held)[there])
    loose = np.linalg.eigvalsh(grams)[:, 0] <= rounding if len(grams) else np.zeros(0)
    members = np.unique(body[there])
    found = [
        _unresisted(lined, R, held, body == b, rounding)
        for b in members[np.asarray(loose[members], dtype=bool)]
    ]
    return np.hstack([np.zeros((lined.T.shape[1], 0)), *found])


def _six_motions(position: Array, body: NDArray[np.int_]) -> Array:
    """Translations and rotations (3J, 6) of every joint with its body, about the body's middle."""
    J = position.shape[1]
    count = np.maximum(np.bincount(body[body >= 0], minlength=J), 1)
    p = np.zeros((3, J))
    for c in range(3):
        middle = np.bincount(body[body >= 0], position[c, body >= 0], minlength=J) / count
        p[c] = np.where(body >= 0, position[c] - middle[body], 0.0)
    p /= np.sqrt((p * p).sum(axis=0).max(initial=0.0)) or 1.0
    x, y, z = p
    R = np.zeros((3, J, 6))
    R[[0, 1, 2], :, [0, 1, 2]] = 1.0
    R[1, :, 3], R[2, :, 3] = -z, y
    R[2, :, 4], R[0, :, 4] = -x, z
    R[0, :, 5], R[1, :, 5] = -y, x
    R[:, body < 0] = 0.0
    return R.reshape(3 * J, 6)


def _unresisted(lined: Lines, R: Array, held: Array, mine: NDArray[np.bool_], rounding: float) -> Array:
    """Rigid motions (n, r) of one body that nothing resists."""
    own = R * np.tile(mine, 3)[:, None]
    _, s, Vt = np.linalg.svd(own, full_matrices=False)
    basis = Vt[s > rounding * s[0]].T / s[s > rounding * s[0]]
    moves = lined.T.T @ own
    resisting = np.vstack([held[:, mine].reshape(-1, 6), lined.C[lined.count :] @ moves]) @ basis
    _, s, Vt = np.linalg.svd(resisting)
    free = np.append(s, np.zeros(len(Vt) - s.size)) <= rounding
    return np.asarray(moves @ _reduced(basis @ Vt[free].T))


def _reduced(K: Array) -> Array:
    """The same columns (6, r) combined: plain translations first, then rotations, as far as may be."""
    K = K / (np.abs(K).max(initial=0.0) or 1.0)
    waiting, order = list(range(K.shape[1])), []
    for row in K:
        if waiting and np.abs(row[waiting]).max() > 1e-6:
            chosen = max(waiting, key=lambda c: abs(row[c]))
            waiting.remove(chosen)
            order.append(chosen)
            K[:, chosen] /= row[chosen]
            others = np.arange(K.shape[1]) != chosen
            K[:, others] -= np.outer(K[:, chosen], row[others])
    return K[:, order + waiting]
