"""Orders of elimination, found on the graph of unknowns merged where they have the same neighbours."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.sparse import coo_array, csc_array
from scipy.sparse.csgraph import reverse_cuthill_mckee
from scipy.sparse.linalg import splu

from tautbar.algebra.pattern import IntArray, SymmetricPattern

Order = npt.NDArray[np.intp]


def _groups(pattern: SymmetricPattern) -> IntArray:
    """(n,) group of each unknown: neighbours in the numbering with equal columns share one.

    Columns are compared by a 64-bit sum of fixed random numbers; a chance match would only cost a
    slightly worse order.
    """
    full = pattern.full
    marks = np.random.default_rng(1).integers(0, 2**63, pattern.n, dtype=np.uint64)
    sums = np.add.reduceat(marks[full.indices], full.indptr[:-1])
    return np.concatenate(([0], np.cumsum(np.diff(sums.astype(np.int64)) != 0)))


def _merged_graph(pattern: SymmetricPattern, group: IntArray) -> Any:
    """Adjacency of the groups, csc with ones."""
    full, m = pattern.full, int(group[-1]) + 1
    pairs = (group[full.indices].astype(np.int32), group[full.columns].astype(np.int32))
    graph = csc_array(coo_array((np.ones(full.indices.size), pairs), shape=(m, m)))
    graph.data[:] = 1.0
    return graph


def _spread(group_order: npt.NDArray[Any], group: IntArray) -> Order:
    """Order of the unknowns from an order of their groups."""
    rank = np.empty(group_order.size, np.intp)
    rank[group_order] = np.arange(group_order.size)
    return np.argsort(rank[group], kind="stable")


def narrow_order(pattern: SymmetricPattern) -> Order:
    """(n,) unknowns in an order of small bandwidth: reverse Cuthill-McKee (Cuthill & McKee 1969)."""
    if pattern.n == 0:
        return np.zeros(0, np.intp)
    group = _groups(pattern)
    graph = _merged_graph(pattern, group).tocsr()
    return _spread(reverse_cuthill_mckee(graph, symmetric_mode=True), group)


def sparse_order(pattern: SymmetricPattern) -> Order:
    """(n,) unknowns in an order of small fill: multiple minimum degree (Liu 1985), as in SuperLU."""
    if pattern.n == 0:
        return np.zeros(0, np.intp)
    group = _groups(pattern)
    graph = _merged_graph(pattern, group)
    graph.setdiag(np.diff(graph.indptr) + 1.0)
    factor = splu(graph, "MMD_AT_PLUS_A", 0.0, options={"SymmetricMode": True})
    return _spread(np.argsort(factor.perm_c), group)


def half_bandwidth(pattern: SymmetricPattern, order: Order) -> int:
    """Greatest distance from the diagonal of an entry of the reordered matrix."""
    place = np.empty_like(order)
    place[order] = np.arange(order.size)
    return int(np.abs(place[pattern.indices] - place[pattern.columns]).max(initial=0))
