"""A structure with its free unknowns, its one fixed matrix pattern and the solver chosen for it."""

from __future__ import annotations

from copy import copy
from dataclasses import replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array, csr_array, identity, kron

from tautbar.algebra.pattern import SymmetricPattern
from tautbar.algebra.scatter import ScatterPlan
from tautbar.algebra.solver import Solver, choose_solver
from tautbar.mechanics.entries import GENERAL, SYMMETRIC, member_entries
from tautbar.mechanics.freedom import Flags, Freedom, free_directions, pushers
from tautbar.mechanics.loads import Acting
from tautbar.mechanics.mass import joint_mass_matrix
from tautbar.mechanics.product import Product
from tautbar.mechanics.structure import Stage, Structure, build
from tautbar.model.parts import Parts

Array = NDArray[np.float64]


class System:
    """All that solvers ask of a structure: positions, forces, and matrices on one pattern.

    ``n`` free unknowns q [m]; "lower" arrays are matrix data on the lower triangle of ``pattern``.
    """

    def __init__(self, structure: Structure, freedom: Freedom) -> None:
        self.structure = structure
        self.freedom = freedom
        entries = member_entries(freedom.GT, SYMMETRIC)
        spring = coo_array(freedom.T.T @ freedom.spring @ freedom.T)
        mass = coo_array(self._free(identity(structure.joints, format="csr")))
        self.pattern = SymmetricPattern.from_entries(
            freedom.n,
            np.concatenate([entries.row, spring.row, mass.row]),
            np.concatenate([entries.col, spring.col, mass.col]),
        )
        low = entries.row >= entries.col
        self._scatter = ScatterPlan(
            self.pattern.position(entries.row[low], entries.col[low]),
            entries.source[low],
            entries.coefficient[low],
            self.pattern.nnz,
            6 * structure.members,
        )
        self.spring = Product(csr_array(spring))
        self.spring_lower = self.lower_of(csr_array(spring))
        self.solver: Solver = choose_solver(self.pattern)

    @classmethod
    def of(cls, parts: Parts, stage: Stage | None = None, pushing: Flags | None = None) -> System:
        """The system of a checked model at a stage; ``pushing`` are the one-way supports that hold."""
        stage = Stage.first(parts) if stage is None else stage
        structure = build(parts, stage)
        if pushing is None:
            pushing = pushers(parts, stage, structure.joints)
        return cls(structure, free_directions(parts, structure, stage, pushing))

    def with_lengths(self, L0: Array, EA: Array | None = None) -> System:
        """The same with other unstressed lengths (N,) [m] (and EA [N]); pattern and plans are shared."""
        other = copy(self)
        s = self.structure
        other.structure = replace(s, L0=L0, stretch0=s.stretch0 + (s.L0 - L0), EA=s.EA if EA is None else EA)
        return other

    @property
    def n(self) -> int:
        return self.freedom.n

    def _free(self, between_joints: csr_array) -> csr_array:
        T = self.freedom.T
        return csr_array(T.T @ kron(identity(3), between_joints, format="csr") @ T)

    def lower_of(self, matrix: csr_array) -> Array:
        """Data on the lower triangle of the pattern of a symmetric (n, n) matrix within it."""
        coo = matrix.tocoo()
        low = coo.row >= coo.col
        out = np.zeros(self.pattern.nnz)
        np.add.at(out, self.pattern.position(coo.row[low], coo.col[low]), coo.data[low])
        return out

    def member_lower(self, blocks: Array) -> Array:
        """Matrix of member blocks (6, N), springs left out."""
        return self._scatter(blocks)

    def member_full(self, blocks: Array) -> Array:
        """Unsymmetric matrix data on the full pattern, of member blocks (9, N)."""
        return self._full_scatter(blocks)

    @cached_property
    def _full_scatter(self) -> ScatterPlan:
        # Only the exact Newton of a hard time step asks for this one.
        entries = member_entries(self.freedom.GT, GENERAL)
        position = self.pattern.full.position(entries.row, entries.col)
        size = self.pattern.full.indices.size
        return ScatterPlan(position, entries.source, entries.coefficient, size, 9 * self.structure.members)

    def apart(self, q: Array, held: Array | None = None) -> Array:
        """How far member ends moved apart (3, N) [m]; ``held`` (3, N) is the share of held joints."""
        du = self.freedom.apart(q)
        return du if held is None else du + held

    def apart_held(self, move: Array) -> Array:
        """Share of held displacements (3, J) in `apart`."""
        return self.freedom.apart_of_joints(move)

    def joint_mass(self, acting: Acting, lumped: bool) -> csr_array:
        """Mass between joints (J, J) [kg], masses and ice of the load cases included."""
        return joint_mass_matrix(self.structure, acting.mass, acting.coat, lumped)

    def free_mass(self, joint_mass: csr_array) -> csr_array:
        """Mass matrix over the free unknowns (n, n) [kg]."""
        return self._free(joint_mass)

    def greatest_joint_move(self, q: Array) -> float:
        """Largest displacement of any joint [m] in the free part ``q``."""
        U = self.freedom.spread(q)
        return float(np.sqrt((U * U).sum(axis=0).max(initial=0.0)))
