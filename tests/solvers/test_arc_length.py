"""The path solver on its own: families with a fixed active set, corrections, arcs, eigenvalues."""

from __future__ import annotations

import numpy as np
import pytest

import path_models as models
from tautbar.algebra.pattern import SymmetricPattern
from tautbar.analyses.context import UNLOADED, Context
from tautbar.analyses.growing import Growing
from tautbar.mechanics.loads import nothing
from tautbar.model.parts import LoadCase, Parts
from tautbar.solvers.path import REACHED, STUCK, Stop, Trace, start_state, trace
from tautbar.solvers.path_arc import Arc
from tautbar.solvers.path_correct import Border, ahead, correct, examine
from tautbar.solvers.path_family import Family, factorise, nearest_zero


def growing(parts: Parts) -> Growing:
    scene = Context(parts).first_scene()
    acting = scene.acting(models.GROWING)
    return Growing(scene, UNLOADED, models.GROWING, nothing(scene.structure), acting, acting)


def family(parts: Parts) -> Family:
    return growing(parts).family()


def walk(parts: Parts, stop: Stop, step: float = 20.0) -> Trace:
    of = family(parts)
    start = start_state(of, np.zeros(of.system.n), 0.0)
    assert start is not None
    return trace(of, start, step, stop)


def test_a_fixed_set_is_smooth_where_a_tie_goes_slack() -> None:
    """A tie of the set pushes when it is too long; one outside carries nothing, however stretched."""
    parts = models.toggle(more=[models.member("CD", "tension-only")], D=(0, 0, 4))
    of = family(parts)
    up = np.zeros(of.system.n)
    up[-1] = 0.01  # towards D: the tie gets too long
    on = np.array([False, False, True])
    assert of.fixed(0.0, on).look(up).axial[2] == pytest.approx(-1e6 * 0.01 / 3)  # k e, exactly
    assert of.fixed(0.0, ~on).look(-up).axial[2] == 0.0
    assert of.at(0.0).look(up).axial[2] == 0.0


def test_slope_over_the_load_factor_is_exact_for_forces_and_close_otherwise() -> None:
    warm = LoadCase("growing", temperature_change=(((0, 1), 30.0),))
    for case in (models.push(2, (0.3, 0, -1)), warm):
        of = family(models.toggle(case=case))
        q, on = np.array([0.02, -0.1]), np.zeros(2, dtype=bool)
        up, down = (of.fixed(0.5 + d, on).look(q).residual for d in (1e-5, -1e-5))
        # Differences of forces of 1e4 N over 2e-5: 1e-7 N of rounding.
        np.testing.assert_allclose(of.load_rate(q, 0.5, on), (up - down) / 2e-5, atol=1e-6)


def test_rate_of_stretch_is_that_of_the_path() -> None:
    """Against differences of elongations along the path, with temperature growing too."""
    case = LoadCase("growing", forces=(((2,), (0.0, 0.0, -50.0)),), temperature_change=(((0, 1), -20.0),))
    of = family(models.toggle(case=case))
    start = start_state(of, np.zeros(2), 0.0)
    assert start is not None
    spots = [correct(of, start.spot.on, start.spot.q, 0.0, ahead(start, s)) for s in (1e-4, -1e-4)]
    assert spots[0] is not None
    assert spots[1] is not None
    slope = (spots[0].look.stretch.e - spots[1].look.stretch.e) / 2e-4
    np.testing.assert_allclose(start.stretching, slope, rtol=1e-6)  # central difference: (1e-4)^2


def test_a_condition_is_met_to_rounding() -> None:
    of = family(models.toggle())
    border = Border(np.array([0.0, 1.0]), 1e-4, -0.3)
    spot = correct(of, np.zeros(2, dtype=bool), np.array([0.0, -0.25]), 350.0, border)
    assert spot is not None
    assert abs(border.gap(spot.q, spot.f)) < 1e-15
    assert spot.f == pytest.approx(float(models.toggle_load(1.0 + spot.q[1])), rel=1e-10)


def test_correction_gives_up_where_there_is_nothing() -> None:
    of = family(models.toggle())
    assert (
        correct(of, np.zeros(2, dtype=bool), np.array([np.nan, 0.0]), 0.0, Border(np.ones(2), 0.0, 1.0))
        is None
    )


def test_points_on_an_arc_lie_on_the_path() -> None:
    of = family(models.toggle())
    start = start_state(of, np.zeros(2), 0.0)
    assert start is not None
    spot = correct(of, start.spot.on, 0.3 * start.along, 300.0, ahead(start, 0.3))
    assert spot is not None
    arc = Arc(of, start, examine(of, spot, start.along), 0.3)
    for s in (0.01, 0.15, 0.29):
        found = arc.at(s)
        assert found.f == pytest.approx(float(models.toggle_load(1.0 - s)), rel=1e-10)
    root = arc.root(lambda s: arc.at(s).f - 200.0, 0.0, 0.3)
    assert arc.at(root).f == pytest.approx(200.0, rel=1e-12)


def test_singular_tangents_are_counted_as_they_are_and_solved_nudged() -> None:
    """A joint that nothing holds: one zero pivot; the rest is solved as if it were held."""
    parts = models.toggle(more=[models.member("CD", "tension-only", slack=1.0)], D=(0, 0, 4))
    of = family(parts)
    potential = of.fixed(0.0, np.zeros(3, dtype=bool))
    lower = potential.curvature(potential.look(np.zeros(of.system.n)))
    lower[of.system.pattern.diagonal[0]] = 0.0
    K = of.system.pattern.to_csc(lower).toarray()
    K[0, :] = K[:, 0] = 0.0
    rows, cols = np.tril_indices(2)
    tangent = factorise(of.system, _lower_of(of.system.pattern, K))
    assert (tangent.zero, tangent.negative) == (1, 0)
    assert tangent.solve(np.array([0.0, 1.0]))[1] == pytest.approx(1 / K[1, 1], rel=1e-9)  # the nudge: 1e-10
    assert rows.size == cols.size


def _lower_of(pattern: SymmetricPattern, K: np.ndarray) -> np.ndarray:
    cols = np.repeat(np.arange(pattern.n), np.diff(pattern.indptr))
    return np.asarray(K[pattern.indices, cols])


def test_nearest_eigenvalues_against_a_dense_solution() -> None:
    of = family(models.toggle(rise=3.0))
    potential = of.fixed(0.0, np.zeros(2, dtype=bool))
    lower = potential.curvature(potential.look(np.array([0.3, -2.0])))
    K = of.system.pattern.to_csc(lower).toarray()
    value, vector = nearest_zero(of.system, factorise(of.system, lower), 1)
    wanted = np.linalg.eigvalsh(K)
    assert value[0] == pytest.approx(wanted[np.abs(wanted).argmin()], rel=1e-10)
    np.testing.assert_allclose(K @ vector[:, 0], value[0] * vector[:, 0], atol=1e-9 * np.abs(K).max())


def test_pivots_beside_a_limit_point_and_at_it() -> None:
    found = walk(models.toggle(), Stop(limit_points=2))
    assert found.ending == REACHED
    (first, second) = found.places
    assert found.negative[first] == 0
    assert found.negative[first + 1] == 1
    assert second == len(found.spots) - 1
    assert found.critical[0].negative == (0, 1)


@pytest.mark.parametrize("step", [1.0, 50.0, 1000.0])
def test_no_pair_of_limit_points_is_stepped_over(step: float) -> None:
    """With any first step, also one beyond the limit load."""
    found = walk(models.toggle(), Stop(Border(np.array([0.0, 1.0]), 0.0, -2.2)), step)
    assert [c.kind for c in found.critical] == ["limit point", "limit point"]


def test_steps_are_counted_with_the_critical_points() -> None:
    found = walk(models.toggle(), Stop(steps=17))
    assert len(found.spots) == 18
    assert len(found.negative) == 18
    assert all(place < 18 for place in found.places)


def test_a_path_that_cannot_go_on_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("tautbar.solvers.path.correct", lambda *_: None)
    assert walk(models.toggle(), Stop(steps=5)).ending == STUCK
