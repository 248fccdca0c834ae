"""Free unknowns: which directions of which joints move, and what holds the others.

A displacement of all joints is U = T q + held, q (n,) the free unknowns, T (3J, n) with orthonormal
columns: unit axes, or rotated ones at joints held along an inclined direction.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array, csr_array, identity, kron

from tautbar.mechanics.product import Product
from tautbar.mechanics.structure import Stage, Structure
from tautbar.model.parts import Parts, Support

Array = NDArray[np.float64]
Index = NDArray[np.intp]
Flags = NDArray[np.bool_]


class Freedom:
    """Free directions, member incidence and springs to ground.

    Attributes
    ----------
    T : (3J, n) sparse
        Displacement of all joints from the free unknowns.
    GT : (3N, n) sparse
        Relative displacement of member ends from the free unknowns.
    spring : (3J, 3J) sparse
        Supports on springs [N/m].
    """

    def __init__(self, T: csr_array, incidence: csr_array, spring: csr_array) -> None:
        self.T, self.spring = T, spring
        G = csr_array(T.T @ kron(identity(3), incidence, format="csr"))
        self.GT = csr_array(G.T)
        self._T, self._T_back = Product(T), Product(csr_array(T.T))
        self._G, self._GT = Product(G), Product(self.GT)
        self._incidence, self._incidence_back = Product(incidence), Product(csr_array(incidence.T))
        self._spring = Product(spring)

    @property
    def n(self) -> int:
        return int(self.T.shape[1])

    def spread(self, q: Array) -> Array:
        """Displacement of all joints (3, J) from the free unknowns, without what is held."""
        return (self._T @ q).reshape(3, -1)

    def gather(self, force: Array) -> Array:
        """Free components (n,) of joint forces (3, J)."""
        return self._T_back @ force.ravel()

    def held_part(self, vector: Array) -> Array:
        """The part of a joint vector (3, J) in held directions."""
        return vector - self.spread(self.gather(vector))

    def apart(self, q: Array) -> Array:
        """How far the ends of each member move apart (3, N) for free unknowns (n,)."""
        return (self._GT @ q).reshape(3, -1)

    def apart_of_joints(self, displacement: Array) -> Array:
        """The same for displacements of all joints (3, J)."""
        return (self._incidence_back @ displacement.T).T

    def pull(self, ends: Array) -> Array:
        """Force on the free unknowns (n,) of end forces (3, N): plus at the end, minus at the start."""
        return self._G @ ends.ravel()

    def joint_pull(self, ends: Array) -> Array:
        """The same at all joints (3, J)."""
        return (self._incidence @ ends.T).T

    def grounded(self, displacement: Array) -> Array:
        """Force that displaced joints (3, J) [m] put into the springs to ground (3, J) [N]."""
        return (self._spring @ displacement.ravel()).reshape(3, -1)

    def reaction(self, needed: Array, load: Array, stretched: Array) -> Array:
        """Forces of supports on the structure (3, J) [N], springs included.

        Parameters
        ----------
        needed, load : (3, J)
            What the members (and inertia and damping) need at each joint, and what acts there [N].
        stretched : (3, J)
            How far each joint is from where its springs are without force [m].
        """
        spring = self.grounded(stretched)
        return self.held_part(needed - load + spring) - spring


def free_directions(parts: Parts, structure: Structure, stage: Stage, pushing: Flags) -> Freedom:
    """Directions that supports leave free, numbered joint by joint.

    ``pushing`` (3, J) are the directions in which supports that only push hold now. A joint at which
    no member is present is held: it is not there yet, or no more.
    """
    supports = tuple(s for s, there in zip(parts.supports, stage.supports, strict=True) if there)
    gone = np.ones(structure.joints, dtype=bool)
    gone[structure.start[stage.members]] = gone[structure.end[stage.members]] = False
    held = pushing.T | gone[:, None]
    if parts.held_axis is not None:
        held[:, parts.held_axis] = True
    N = structure.members
    one = np.ones(N)
    rows = np.concatenate([structure.start, structure.end])
    cols = np.tile(np.arange(N), 2)
    # (J, N): -1 at the start of a member, +1 at its end.
    incidence = coo_array((np.concatenate([-one, one]), (rows, cols)), shape=(structure.joints, N)).tocsr()
    return Freedom(_basis(supports, held), incidence, _springs(supports, structure.joints))


def _basis(supports: tuple[Support, ...], held: Flags) -> csr_array:
    for support in supports:
        held[np.ix_(np.array(support.joints, dtype=np.intp), np.array(support.fixed, dtype=np.intp))] = True
    inclined = _inclined(supports)
    free = ~held
    free[list(inclined)] = False
    joint, axis = np.nonzero(free)
    joints, axes, values = [joint], [axis], [np.ones(joint.size)]
    for j, normals in inclined.items():
        basis = _complement(np.vstack([np.eye(3)[held[j]], *normals]))
        joints.append(np.full(basis.size, j))
        axes.append(np.tile(np.arange(3), len(basis)))
        values.append(basis.ravel())
    entries = np.concatenate(joints), np.concatenate(axes), np.concatenate(values)
    return _numbered(*entries, int(free.sum()), len(held))


def _numbered(joint: Index, axis: Index, value: Array, plain: int, J: int) -> csr_array:
    """T with its unknowns in the order of the joints; inclined ones come in threes of entries."""
    own = np.concatenate([np.arange(plain), plain + (np.arange(value.size - plain)) // 3])
    first = np.concatenate([joint[:plain], joint[plain::3]])
    number = np.empty(first.size, dtype=np.intp)
    number[np.argsort(first, kind="stable")] = np.arange(first.size)
    T = csr_array((value, (axis * J + joint, number[own])), shape=(3 * J, first.size))
    T.eliminate_zeros()
    return T


def _inclined(supports: tuple[Support, ...]) -> dict[int, list[Array]]:
    found: dict[int, list[Array]] = {}
    for support in supports:
        if support.along is not None:
            for joint in support.joints:
                found.setdefault(joint, []).append(np.array([support.along]))
    return found


def _complement(held: Array) -> Array:
    """Orthonormal directions (k, 3) at right angles to all held ones (m, 3)."""
    _, s, Vt = np.linalg.svd(held)
    return np.asarray(Vt[int((s > 1e-12).sum()) :])


def _springs(supports: tuple[Support, ...], J: int) -> csr_array:
    rows, values = [], []
    for support in supports:
        for axis, k in support.springs:
            rows += [axis * J + j for j in support.joints]
            values += [k] * len(support.joints)
    at = np.array(rows, dtype=np.intp)
    return coo_array((np.array(values, dtype=float), (at, at)), shape=(3 * J, 3 * J)).tocsr()


def pushers(parts: Parts, stage: Stage, J: int) -> Flags:
    """Directions (3, J) with a support that only pushes: along its axis, upwards or positive."""
    out = np.zeros((3, J), dtype=bool)
    for support, there in zip(parts.supports, stage.supports, strict=True):
        if there and support.only_pushes is not None:
            out[support.only_pushes, list(support.joints)] = True
    return out
