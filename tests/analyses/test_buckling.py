"""Linearised buckling: against closed forms, the path, and a dense solution."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from scipy.linalg import eigh

import path_models as models
from tautbar.algebra.pattern import SymmetricPattern
from tautbar.algebra.solver import choose_solver
from tautbar.analyses.context import Context
from tautbar.model.parts import LoadCase, Parts, Section, StopAt, Support
from tautbar.solvers.buckling import DENSE_BELOW, buckle


def column(bars: int, EA: float = 1e9, spring: float = 1000.0, constant: float = -30.0) -> Parts:
    """A chain of upright bars of 1 m, guided at the top, each hinge held sideways by a spring."""
    letters = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"[: bars + 1]
    inner = tuple(range(1, bars))
    return models.structure(
        {c: (0, 0, i) for i, c in enumerate(letters)},
        [models.member(a + b) for a, b in pairwise(letters)],
        [
            Support("foot", (0,), fixed=(0, 1, 2)),
            Support("guide", (bars,), fixed=(0, 1)),
            Support("sides", inner, springs=((0, spring),)),
        ],
        {
            "growing": models.push(bars, (0, 0, -1)),
            "constant": LoadCase("constant", forces=(((bars,), (0, 0, constant)),)),
        },
        [Section("bar", axial_stiffness=EA)],
    )


def closed(bars: int, spring: float = 1000.0) -> np.ndarray:
    """k against P (2 - 2 cos(pi j/n))/l for the n - 1 shapes sin(pi j i/n)."""
    j = np.arange(1, bars)
    return np.sort(spring / (2 - 2 * np.cos(np.pi * j / bars)))


@pytest.mark.parametrize("bars", [2, 5, 20])
def test_column_on_springs_against_its_closed_form(bars: int) -> None:
    count = min(bars - 1, 6)
    record = models.buckling(column(bars), count=count)
    assert record.status == "complete", record.outcome
    # Bars shorten by 1e-6, which linearised buckling does not see at all.
    np.testing.assert_allclose(record["load_factor"], closed(bars)[:count], rtol=1e-10)
    assert record["audit/counted"] == count
    assert record["audit/residual"].max() < 1e-10
    assert record["shape"].shape == (count, bars + 1, 3)
    np.testing.assert_allclose(np.abs(record["shape"]).max(axis=(1, 2)), 1.0)


@pytest.mark.parametrize("bars", [3, 8])
def test_buckling_against_the_path(bars: int) -> None:
    """Straight until it buckles: both find the same factor but for the shortening, 1e-6 here."""
    lowest = models.buckling(column(bars))["load_factor"][0]
    record = models.path(column(bars), StopAt(load_factor=1.2 * lowest), step=50.0)
    assert record["critical_points/type"][0] == "bifurcation"
    assert record["critical_points/load_factor"][0] == pytest.approx(lowest, rel=3e-6)
    shape = models.buckling(column(bars))["shape"][0]
    np.testing.assert_allclose(np.abs(record["critical_points/direction"][0]), np.abs(shape), atol=1e-5)


def test_constant_loads_count_in_the_state() -> None:
    alone, loaded = (models.buckling(column(5), **more) for more in ({}, {"constant": models.CONSTANT}))
    np.testing.assert_allclose(loaded["load_factor"], alone["load_factor"] - 30.0, rtol=1e-7)  # shortening


def test_signs_are_kept_and_sizes_are_in_order() -> None:
    """A bar pulled from above and one pushed from below buckle under loads of either sign."""
    parts = column(4)
    parts.load_cases["growing"] = LoadCase(  # type: ignore[index]
        "growing", forces=(((4,), (0, 0, -1.0)), ((2,), (0, 0, 3.0)))
    )
    record = models.buckling(parts, count=3)
    factor = record["load_factor"]
    assert (factor > 0).any()
    assert (factor < 0).any()
    assert (np.diff(np.abs(factor)) >= 0).all()
    assert record["audit/counted"] == 3


def test_a_shallow_toggle_is_warned_of() -> None:
    """Linear 2 EA (h/L)^3 against the limit 2 EA (h/L)^3/(3 sqrt 3): 5.2 times."""
    record = models.buckling(models.toggle(span=100.0))
    assert record["load_factor"][0] == pytest.approx(2e6 * (1 / np.hypot(100, 1)) ** 3 * 1.0001, rel=1e-3)
    warned = next(w for w in record.warnings if "equilibrium-path governs" in w)
    assert "5.2 times" in warned
    limit = 2e6 * (1 - (100 / np.hypot(100, 1)) ** (2 / 3)) ** 1.5
    assert record["audit/path_load_factor"] == pytest.approx(limit, rel=1e-9)


def test_nothing_is_warned_of_where_the_path_agrees() -> None:
    record = models.buckling(column(5))
    assert record.warnings == ()
    assert record["audit/path_load_factor"] == pytest.approx(record["load_factor"][0], rel=1e-5)


def test_ties_count_with_their_state_at_the_start() -> None:
    """A hinge guyed by two ties, one of them slack: only the taut one holds it."""

    def guyed(slack: float) -> float:
        parts = models.structure(
            {"A": (0, 0, 0), "B": (0, 0, 1), "C": (0, 0, 2), "D": (-3, 0, 1), "E": (3, 0, 1)},
            [
                models.member("AB"),
                models.member("BC"),
                models.member("BD", "tension-only", section=1),
                models.member("BE", "tension-only", section=1, slack=slack),
            ],
            [Support("ends", (0, 3, 4), fixed=(0, 1, 2)), Support("guide", (2,), fixed=(0, 1))],
            {"growing": models.push(2, (0, 0, -1))},
            [Section("bar", axial_stiffness=1e9), Section("tie", axial_stiffness=3e3)],
        )
        record = models.buckling(parts)
        assert any("count as they are at the start" in w for w in record.warnings)
        return float(record["load_factor"][0])

    assert guyed(0.0) == pytest.approx(2 * 500.0, rel=1e-9)  # k = EA/l = 1000 N/m each
    assert guyed(0.1) == pytest.approx(500.0, rel=1e-9)


def test_hanging_ropes_hold_a_mast() -> None:
    """A mast on two catenary guys: the factor agrees with a difference of true tangents along the path."""
    parts = models.structure(
        {"A": (0, 0, 0), "B": (0, 0, 10), "D": (-8, 0, 0), "E": (8, 0, 0)},
        [
            models.member("AB"),
            models.member("DB", "hanging", section=1, pretension=2e3),
            models.member("EB", "hanging", section=1, pretension=2e3),
        ],
        [Support("ends", (0, 2, 3), fixed=(0, 1, 2))],
        {"growing": models.push(1, (0, 0, -1e3)), "constant": LoadCase("constant", 1.0)},
        [Section("post", axial_stiffness=1e11), Section("guy", axial_stiffness=2e6, mass_per_length=1.5)],
    )
    record = models.buckling(parts, count=1, constant=models.CONSTANT)
    assert record.status == "complete", record.outcome
    path = models.path(parts, StopAt(load_factor=2 * record["load_factor"][0]), 1.0, constant=models.CONSTANT)
    assert path["critical_points/type"][0] == "bifurcation"
    # The post shortens by 8e-6 before it gives way; the guys, stretched by 1e-3, slacken by 0.6 % of it.
    assert record["load_factor"][0] == pytest.approx(path["critical_points/load_factor"][0], rel=1e-2)


def test_an_unstable_or_loose_start_is_told() -> None:
    loose = column(2, spring=0.0)
    record = models.buckling(loose)
    assert record.status == "failed"
    assert record.outcome.startswith(
        "NOT A RESULT: the state to start from has no stiffness: joint B gives way in x"
    )


def test_what_does_not_grow_is_told() -> None:
    record = models.buckling(models.toggle(case=LoadCase("growing")))
    assert record.status == "failed"
    assert "no load grows" in record.outcome


def test_no_factor_at_all_is_an_answer() -> None:
    """A bar pulled sideways off nothing: forces change nothing that could buckle."""
    parts = models.structure(
        {"A": (0, 0, 0), "B": (1, 0, 0)},
        [models.member("AB")],
        [Support("foot", (0,), fixed=(0, 1, 2)), Support("guide", (1,), fixed=(1, 2))],
        {"growing": models.push(1, (1, 0, 0))},
        [Section("bar", axial_stiffness=1e6)],
    )
    record = models.buckling(parts)
    assert record.status == "complete"
    assert record["load_factor"].size == 0
    assert "no load factor of either sign" in record.outcome


def test_only_negative_factors_are_said_to_be_so() -> None:
    parts = column(3)
    parts.load_cases["growing"] = models.push(3, (0, 0, 1))  # type: ignore[index]
    record = models.buckling(parts)
    assert (record["load_factor"] < 0).all()
    assert "other way round" in record.outcome


@pytest.mark.parametrize("n", [DENSE_BELOW - 20, DENSE_BELOW + 120])
def test_lanczos_against_a_dense_solution(n: int) -> None:
    """Equal factors included: the pencil is doubled, and every copy has to come."""
    system = Context(column(2)).first_scene().system
    half = n // 2
    rows = np.concatenate([np.arange(n), np.arange(1, half), half + np.arange(1, half)])
    cols = np.concatenate([np.arange(n), np.arange(half - 1), half + np.arange(half - 1)])
    pattern = SymmetricPattern.from_entries(n, rows, cols)
    place = pattern.position(rows, cols)
    K0, Kg = np.zeros(pattern.nnz), np.zeros(pattern.nnz)
    K0[place] = np.concatenate([np.full(n, 3.0), np.full(n - 2, -1.0)])
    ramp = np.linspace(-1.0, 0.7, half)
    Kg[pattern.diagonal] = np.tile(ramp, 2)
    other = type(system).__new__(type(system))
    other.pattern = pattern
    other.freedom = type("Free", (), {"n": n})()
    other.solver = choose_solver(pattern)
    found = buckle(other, K0, Kg, other.solver.cholesky(K0), 7)
    mu = eigh(-pattern.to_csc(Kg).toarray(), pattern.to_csc(K0).toarray(), eigvals_only=True)
    wanted = 1 / mu[np.argsort(-np.abs(mu))][:7]
    np.testing.assert_allclose(np.sort(found.factor), np.sort(wanted), rtol=1e-9)
