"""Mass matrices. Mass is the same in all directions, so one (J, J) matrix serves the three of them."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array, csr_array

from tautbar.mechanics.structure import Structure

Array = NDArray[np.float64]


def joint_mass_matrix(structure: Structure, added: Array, coat: Array, lumped: bool) -> csr_array:
    """Mass between joints [kg], (J, J).

    Consistent: (m L0/6)[[2, 1], [1, 2]] a member, so that every rigid translation has exactly the true
    mass; lumped: m L0/2 at each end. ``added`` (J,) [kg] are masses of load cases, beside the model's,
    ``coat`` (N,) [kg/m] ice on members, to their m.
    """
    s = structure
    whole = (s.m + coat * s.present) * s.L0
    own, cross = (whole / 2, np.zeros_like(whole)) if lumped else (whole / 3, whole / 6)
    joint = np.arange(s.joints)
    row = np.concatenate([s.start, s.end, s.start, s.end, joint])
    col = np.concatenate([s.start, s.end, s.end, s.start, joint])
    value = np.concatenate([own, own, cross, cross, s.joint_mass + added])
    M = coo_array((value, (row, col)), shape=(s.joints, s.joints)).tocsr()
    if lumped:
        M.eliminate_zeros()
    return M


def kinetic_energy_by_member(structure: Structure, coat: Array, velocity: Array, lumped: bool) -> Array:
    """Twice the kinetic energy of each member [J], (N,), for joint velocities (3, J) [m/s]."""
    s = structure
    v1, v2 = velocity[:, s.start], velocity[:, s.end]
    squares = (v1 * v1).sum(axis=0) + (v2 * v2).sum(axis=0)
    whole = (s.m + coat * s.present) * s.L0
    if lumped:
        return np.asarray(whole / 2 * squares)
    return np.asarray(whole / 3 * (squares + (v1 * v2).sum(axis=0)))
