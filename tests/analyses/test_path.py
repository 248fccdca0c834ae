"""Equilibrium paths: switches, critical points, stops, starts, and what is handed on."""

from __future__ import annotations

import numpy as np
import pytest

import path_models as models
from tautbar.analyses.context import Context
from tautbar.model.parts import (
    LoadCase,
    Loading,
    Mass,
    Modes,
    Parts,
    Section,
    StartFrom,
    StopAt,
    Support,
)
from tautbar.records.fields import Record

DOWN = StopAt(joint=2, axis=2, displacement=-1.5)


def kinds(record: Record) -> list[str]:
    return list(record["critical_points/type"])


def caught_toggle(gap: float = 0.5) -> Parts:
    """A toggle whose apex a tie from above catches once it has sunk by the gap."""
    return models.toggle(more=[models.member("DC", "tension-only", slack=gap)], D=(0, 0, 4))


def test_limit_point_and_kink_are_both_found() -> None:
    """A tie engages past the limit point: fixed steps see no change of inertia and miss both."""
    record = models.path(caught_toggle(), DOWN)
    assert kinds(record) == ["limit point", "kink"]
    limit = 2 * 1e6 * (1 - (10 / np.hypot(10, 1)) ** (2 / 3)) ** 1.5  # N01
    caught = float(models.toggle_load(np.array(0.5)))
    assert record["critical_points/load_factor"][0] == pytest.approx(limit, rel=1e-10)
    # Landed to 1e-12 of the size (20 m), where the load falls by 250 N/m: 1e-8 N.
    assert record["critical_points/load_factor"][1] == pytest.approx(caught, abs=1e-8)
    assert caught == pytest.approx(371.5, abs=0.1)
    assert "kink 1" in record.outcome
    assert "the load factor turns there" in record.outcome


def test_every_state_of_a_caught_toggle_is_in_balance() -> None:
    """Closed form of the toggle plus that of the tie, whichever way the arc went."""
    record = models.path(caught_toggle(), DOWN)
    z = 1.0 + record["displacement"][:, 2, 2]
    tie = 1e6 / 3.5 * np.maximum(4.0 - z - 3.5, 0.0)
    wanted = models.toggle_load(z) + tie
    np.testing.assert_allclose(record["load_factor"], wanted, atol=1e-9 * 1e5)  # bars carry 1e5 N
    np.testing.assert_allclose(record["axial_force"][:, 2], tie, atol=1e-9 * 1e5)
    assert record["audit/force_residual"].max() < 1e-9
    assert record["slack_onset"][2] == 0.0
    assert "slack from the start: DC\nno member goes slack on the way" in record.outcome
    assert np.isnan(record["slack_onset"][:2]).all()


def soft_toggle(k: float) -> Parts:
    """A toggle pressed through a soft spring: joint D (3) is loaded, C moves with a snap."""
    return models.structure(
        {"A": (-10, 0, 0), "B": (10, 0, 0), "C": (0, 0, 1), "D": (0, 0, 5)},
        [models.member("AC"), models.member("BC"), models.member("CD", section=1)],
        [Support("feet", (0, 1), fixed=(0, 1, 2)), Support("guide", (3,), fixed=(0, 1))],
        {"growing": models.push(3, (0, 0, -1))},
        [Section("bar", axial_stiffness=1e6), Section("soft", axial_stiffness=4 * k)],
    )


@pytest.mark.parametrize("k", [2000.0, 200.0])
def test_snap_back(k: float) -> None:
    """Springs in series: w_D = w_C + P/k. The softer one makes D go back while the load falls."""
    record = models.path(soft_toggle(k), StopAt(load_factor=500.0))
    assert record.status == "complete"
    f, U = record["load_factor"], record["displacement"]
    np.testing.assert_allclose(f, models.toggle_load(1.0 + U[:, 2, 2]), atol=1e-7)  # 1e-12 of the bars' 1e5 N
    np.testing.assert_allclose(U[:, 3, 2], U[:, 2, 2] - f / k, atol=1e-12)
    assert f[-1] == 500.0
    falling = np.diff(f) < 0
    back = np.diff(U[:, 3, 2])[falling] > 0
    assert back.any() == (k == 200.0)
    assert kinds(record) == ["limit point", "limit point"]


@pytest.mark.parametrize("target", [-0.31, -0.9, -1.0, -2.2])
def test_a_displacement_is_landed_on(target: float) -> None:
    record = models.path(models.toggle(), StopAt(joint=2, axis=2, displacement=target))
    assert record["displacement"][-1, 2, 2] == pytest.approx(target, abs=1e-14)  # rounding of one metre


@pytest.mark.parametrize("target", [100.0, 381.0, 900.0, -150.0])
def test_a_load_factor_is_landed_on(target: float) -> None:
    record = models.path(models.toggle(), StopAt(load_factor=target))
    assert record["load_factor"][-1] == pytest.approx(target, rel=1e-14)
    if target == 900.0:  # beyond the limit load the path has to snap through
        assert record["displacement"][-1, 2, 2] < -2.0
    if target < 0:
        assert "the other way round" in record.warnings[-1]


def test_a_path_ends_at_the_limit_point_asked_for() -> None:
    one, two = (models.path(models.toggle(), StopAt(limit_points=n)) for n in (1, 2))
    for n, record in ((1, one), (2, two)):
        assert kinds(record) == ["limit point"] * n
        np.testing.assert_array_equal(record["critical_points/displacement"][-1], record["displacement"][-1])
    assert one["negative_pivots"].max() == 0


def test_a_path_has_the_steps_asked_for() -> None:
    assert models.path(models.toggle(), StopAt(steps=12))["load_factor"].shape == (13,)


def test_the_first_step_is_the_one_asked_for() -> None:
    """Of the load factor along the tangent: what is missing is its curvature."""
    record = models.path(models.toggle(), StopAt(steps=1), step=4.0)
    assert record["load_factor"][1] == pytest.approx(4.0, rel=0.01)


def column(EA: float, spring: float = 1000.0) -> Parts:
    """Two bars in line, held sideways at the hinge B by a spring, guided at the top C."""
    return models.structure(
        {"A": (0, 0, 0), "B": (0, 0, 1), "C": (0, 0, 2)},
        [models.member("AB"), models.member("BC")],
        [
            Support("foot", (0,), fixed=(0, 1, 2)),
            Support("guide", (2,), fixed=(0, 1)),
            Support("side", (1,), springs=((0, spring),)),
        ],
        {
            "growing": models.push(2, (0, 0, -1)),
            "constant": LoadCase("constant", forces=(((2,), (0, 0, -100.0)),)),
        },
        [Section("bar", axial_stiffness=EA)],
    )


@pytest.mark.parametrize("EA", [1e4, 1e9])
def test_bifurcation_of_a_hinged_column(EA: float) -> None:
    """Spring k against 2 P/l with l = 1 - P/EA shortened: P = (k/2)/(1 + k/(2 EA))."""
    record = models.path(column(EA), StopAt(load_factor=900.0))
    assert kinds(record) == ["bifurcation"]
    assert record["critical_points/load_factor"][0] == pytest.approx(500 / (1 + 500 / EA), rel=1e-10)
    np.testing.assert_allclose(record["critical_points/direction"][0, 1], [1, 0, 0], atol=1e-12)
    assert "joint B in x" in record.outcome
    # The path stays upright: nothing pushes sideways.
    assert np.abs(record["displacement"][:, 1, 0]).max() < 1e-12
    assert list(np.unique(record["negative_pivots"])) == [0, 1]
    assert any("beyond the bifurcation" in w for w in record.warnings)


def ring_dome() -> Parts:
    """A six-fold star dome, exactly symmetric, its ring loaded: some critical points are double."""
    c, s = np.sqrt(3) / 2, 0.5
    ring = [(1, 0), (s, c), (-s, c), (-1, 0), (-s, -c), (s, -c)]
    rim = [(c, s), (0, 1), (-c, s), (-c, -s), (0, -1), (c, -s)]
    joints: dict[str, tuple[float, float, float]] = {"A": (0, 0, 0.08216)}
    joints |= {n: (0.25 * x, 0.25 * y, 0.06216) for n, (x, y) in zip("BCDEFG", ring, strict=True)}
    joints |= {n: (0.5 * x, 0.5 * y, 0.0) for n, (x, y) in zip("HIJKLM", rim, strict=True)}
    bars = [*("A" + b for b in "BCDEFG"), "BC", "CD", "DE", "EF", "FG", "GB"]
    bars += ["BH", "BM", "CI", "CH", "DJ", "DI", "EK", "EJ", "FL", "FK", "GM", "GL"]
    return models.structure(
        joints,
        [models.member(b) for b in bars],
        [Support("rim", tuple(range(7, 13)), fixed=(0, 1, 2))],
        {"growing": LoadCase("growing", forces=((tuple(range(1, 7)), (0, 0, -1.0)),))},
        [Section("bar", axial_stiffness=960510.0)],
        plane=False,
    )


def test_double_bifurcations_are_one_point_and_do_not_depend_on_the_step() -> None:
    """Two directions at once: rounding, magnified along them, must not split or shift the point."""
    stop = StopAt(limit_points=1)
    fine, coarse = (models.path(ring_dome(), stop, step=step) for step in (7.0, 120.0))
    assert kinds(fine) == kinds(coarse)
    assert kinds(fine) == ["bifurcation"] * 3 + ["limit point"]
    factor = fine["critical_points/load_factor"]
    np.testing.assert_allclose(factor, coarse["critical_points/load_factor"], rtol=2e-9)  # 1e-8 is asked for
    assert "negative pivots 1 to 3" in fine.outcome
    # Still on the primary branch: the six ring joints move alike.
    assert np.ptp(fine["displacement"][:, 1:7, 2], axis=1).max() < 1e-9


def test_constant_loads_stand_beside_the_growing_ones() -> None:
    record = models.path(column(1e9), StopAt(load_factor=900.0), constant=models.CONSTANT)
    assert record["critical_points/load_factor"][0] == pytest.approx(400.0, rel=1e-6)  # 1/(1 + 500/EA)
    assert record["reaction"][0, 0, 2] == pytest.approx(100.0)
    assert record.acting == ("constant: 1 constant", "times the load factor: 1 growing")


def tied_mast(T: float = 1000.0) -> Parts:
    """A joint between two ties in line, each pulled to T; the load pushes it towards the lower one."""
    return models.structure(
        {"A": (0, 0, 0), "C": (0, 0, 2), "B": (0, 0, 5)},
        [
            models.member("AC", "tension-only", pretension=T),
            models.member("CB", "tension-only", pretension=T),
        ],
        [Support("ends", (0, 2), fixed=(0, 1, 2))],
        {"growing": models.push(1, (0, 0, -1))},
        [Section("tie", axial_stiffness=1e6)],
    )


def test_onset_of_slack_against_its_closed_form() -> None:
    """The lower tie, EA/L0 and T, goes slack at u = T/k1; the upper one then carries T + k2 u."""
    record = models.path(tied_mast(), StopAt(load_factor=4000.0), step=100.0)
    L1, L2 = (l / (1 + 1e-3) for l in (2.0, 3.0))
    u = 1000.0 * L1 / 1e6
    onset = 1000.0 + 1e6 / L2 * u
    assert record["slack_onset"][0] == pytest.approx(onset, rel=1e-9)  # landed to 1e-12 of 5 m, k 5e5 N/m
    assert np.isnan(record["slack_onset"][1])
    assert kinds(record) == []  # the upper tie still holds it
    assert "went slack on the way: AC" in record.outcome
    assert record["axial_force"][-1, 1] == pytest.approx(4000.0, rel=1e-12)
    assert record["axial_force"][-1, 0] == 0.0


def test_both_ties_of_a_pair_go_slack_together() -> None:
    """A switch of two members at once, by symmetry: one landing, both onsets."""
    parts = models.structure(
        {"A": (-1, 0, 0), "B": (1, 0, 0), "C": (0, 0, 1), "D": (0, 0, 3)},
        [
            models.member("AC", "tension-only", pretension=500.0),
            models.member("BC", "tension-only", pretension=500.0),
            models.member("DC", "tension-only", pretension=500.0 * np.sqrt(2)),
        ],
        [Support("ends", (0, 1, 3), fixed=(0, 1, 2))],
        {"growing": models.push(2, (0, 0, -1))},
        [Section("tie", axial_stiffness=1e6)],
    )
    record = models.path(parts, StopAt(load_factor=5000.0), step=100.0)
    assert record.status == "complete", record.outcome
    onset = record["slack_onset"]
    assert onset[0] == pytest.approx(onset[1], rel=1e-9)
    k = 1e6 / (2.0 / (1 + 500 * np.sqrt(2) / 1e6))
    l0 = np.sqrt(2) / (1 + 5e-4)  # slack once the apex is so near that the chord is l0
    u = 1.0 - np.sqrt(l0 * l0 - 1)
    assert onset[0] == pytest.approx(500 * np.sqrt(2) + k * u, rel=1e-9)


@pytest.mark.parametrize("factor", [0.3, 1.0, 2.5, 5.0])
def test_path_against_static(factor: float) -> None:
    """The same net by the static solver, which takes the load at once."""
    parts = tied_net()
    end = models.path(parts, StopAt(load_factor=factor), step=0.1)
    alone = models.static(parts, factor)
    assert alone.status == "complete", alone.outcome
    # The static analysis balances to 1e-9 of the forces; displacements of 0.1 m follow.
    np.testing.assert_allclose(end["displacement"][-1], alone["displacement"][0], atol=1e-8)
    np.testing.assert_allclose(end["axial_force"][-1], alone["axial_force"][0], atol=1e-8 * 1e4)
    np.testing.assert_allclose(end["reaction"][-1], alone["reaction"][0], atol=1e-8 * 1e4)


def tied_net() -> Parts:
    """A pretensioned cross of ties on a post, pulled sideways: some go slack."""
    return models.structure(
        {"A": (-4, 0, 0), "B": (4, 0, 0), "C": (0, 0, 3), "D": (0, 0, 0), "E": (-3, 0, 5), "F": (3, 0, 5.5)},
        [
            models.member("DC"),
            models.member("AC", "tension-only", section=1, pretension=800.0),
            models.member("BC", "tension-only", section=1, pretension=800.0),
            models.member("CE", "tension-only", section=1, pretension=500.0),
            models.member("CF", "tension-only", section=1, pretension=500.0),
        ],
        [Support("ends", (0, 1, 3, 4, 5), fixed=(0, 1, 2))],
        {"growing": models.push(2, (1500.0, 0, -600.0)), "constant": LoadCase("constant")},
        [Section("post", axial_stiffness=2e7), Section("tie", axial_stiffness=1e6)],
    )


def random_net(seed: int) -> Parts:
    """One to three joints on ties of random pretension, held by a weight before the load grows."""
    rng = np.random.default_rng(seed)
    free = int(rng.integers(1, 4))
    joints = {c: rng.normal((0, 0, 2), 1.0) for c in "ABC"[:free]}
    angles = np.arange(6) * np.pi / 3 + rng.normal(0, 0.2, 6)
    joints |= {
        c: (6 * np.cos(a), 6 * np.sin(a), rng.normal(6, 1)) for c, a in zip("PQRSTU", angles, strict=True)
    }
    ties = [
        models.member(a + b, "tension-only", pretension=float(rng.uniform(50, 2000)))
        for a in "ABC"[:free]
        for b in "PQRSTU"
    ]
    held = tuple(range(free, free + 6))
    growing = LoadCase("growing", forces=tuple(((i,), tuple(rng.normal(0, 1500, 3))) for i in range(free)))
    weight = LoadCase("constant", forces=((tuple(range(free)), (0, 0, -3000.0)),))
    return models.structure(
        joints,
        ties,
        [Support("held", held, fixed=(0, 1, 2))],
        {"growing": growing, "constant": weight},
        [Section("tie", axial_stiffness=1e6)],
        plane=False,
    )


@pytest.mark.parametrize("seed", range(12))
def test_paths_of_random_nets_end_where_the_static_analysis_does(seed: int) -> None:
    """Ties only: the energy is convex, so there is one answer, whatever the way and its switches."""
    parts = random_net(seed)
    end = models.path(parts, StopAt(load_factor=1.0), step=0.1, constant=models.CONSTANT)
    assert end.status == "complete", end.outcome
    alone = models.static(parts, 1.0)
    # Static: balanced to 1e-9 of 1e4 N; the softest joints have 1e3 N/m.
    np.testing.assert_allclose(end["displacement"][-1], alone["displacement"][0], atol=1e-7)
    taut = end["axial_force"][-1] > 0
    np.testing.assert_array_equal(taut, alone["taut"][0] == 1)
    # Once slack at the end, a member has an onset; the static analysis traces it to second order only.
    assert np.isfinite(end["slack_onset"][~taut]).all()


def test_path_of_the_mirror_image_is_the_mirror_image() -> None:
    def push(x: float) -> Parts:
        return models.toggle(
            more=[models.member(ends, "tension-only", slack=0.02) for ends in ("DC", "EC")],
            case=models.push(2, (x, 0, -1)), D=(-3, 0, 4), E=(3, 0, 4),
        )  # fmt: skip

    right, left = (models.path(push(x), DOWN) for x in (0.4, -0.4))
    np.testing.assert_allclose(right["load_factor"], left["load_factor"], rtol=1e-8, atol=1e-8)
    flip = np.array([-1, 1, 1])
    np.testing.assert_allclose(right["displacement"][:, 2], left["displacement"][:, 2] * flip, atol=1e-9)
    np.testing.assert_allclose(right["slack_onset"], left["slack_onset"][[1, 0, 3, 2]], atol=1e-7)
    assert kinds(right) == kinds(left)


def test_states_are_handed_on_by_name() -> None:
    parts = caught_toggle()
    context = Context(parts)
    record = models.path_in(context, DOWN)
    names = [r.loading.name for r in context.states["path"]]
    assert sorted(names) == ["end", "kink 1", "limit point 1"]
    for name, at in (("limit point 1", 0), ("kink 1", 1)):
        rest = context.start(StartFrom("path", at=name))
        np.testing.assert_array_equal(rest.displacement.T, record["critical_points/displacement"][at])
        factor = record["critical_points/load_factor"][at]
        assert rest.loading.factors == {"growing": factor}
        assert rest.acting.force[2, 2] == pytest.approx(-factor)
    assert context.start(StartFrom("path")).loading.name == "end"


def test_modes_at_a_limit_point_have_a_zero_frequency() -> None:
    """The stiffness is lost there; an independent count by the modal analysis."""
    parts = models.toggle()
    heavy = Parts(
        **{f: getattr(parts, f) for f in parts.__slots__} | {"masses": (Mass(joints=(2,), mass=10.0),)}
    )
    context = Context(heavy)
    models.path_in(context, StopAt(limit_points=1))
    modes = models.run(context, Modes("modes", start=StartFrom("path", at="limit point 1"), count=2))
    value = modes["eigenvalue"]
    assert abs(value[0]) < 1e-7 * value[1]


def test_a_path_from_a_state_past_the_limit_goes_on_there() -> None:
    """From the end of another path, which is not stable: unloaded at the load factor zero of the first."""
    parts = models.toggle()
    context = Context(parts)
    first = models.path_in(context, StopAt(joint=2, axis=2, displacement=-1.0))
    assert first["load_factor"][-1] == pytest.approx(0.0, abs=1e-7)
    second = models.path_in(context, StopAt(joint=2, axis=2, displacement=-0.9), start=StartFrom("path"))
    assert second.status == "complete", second.outcome
    assert second["load_factor"][-1] == pytest.approx(float(models.toggle_load(np.array(0.1))), rel=1e-8)
    assert any("start state is not stable" in w for w in second.warnings)


def test_a_start_without_stiffness_is_refused_with_the_reason() -> None:
    slack = models.structure(
        {"A": (0, 0, 0), "B": (4, 0, 0), "C": (2, 0, -1)},
        [models.member("AC", "tension-only", slack=0.1), models.member("BC", "tension-only", slack=0.1)],
        [Support("ends", (0, 1), fixed=(0, 1, 2))],
        {
            "growing": models.push(2, (0, 0, -50.0)),
            "constant": LoadCase("constant", forces=(((2,), (0, 0, -5.0)),)),
        },
        [Section("tie", axial_stiffness=1e5)],
    )
    record = models.path(slack, StopAt(load_factor=2.0), step=0.1)
    assert record.status == "failed"
    assert record.outcome.startswith("NOT A RESULT: at the start nothing holds joint C in z (slack: AC, BC)")
    assert "constant loads" in record.outcome
    held = models.path(slack, StopAt(load_factor=2.0), step=0.1, constant=models.CONSTANT)
    assert held.status == "complete", held.outcome
    alone = models.static(slack, 2.0)
    np.testing.assert_allclose(held["axial_force"][-1], alone["axial_force"][0], rtol=1e-8)


def test_ties_drawn_exactly_at_their_length_are_sorted_by_the_load() -> None:
    """Neither taut nor slack in the drawing: the load takes up one and leaves the other."""
    parts = models.structure(
        {"A": (0, 0, 0), "B": (4, 0, 0), "C": (2, 0, 1), "D": (2, 0, 0)},
        [
            models.member("DC"),
            models.member("AC", "tension-only"),
            models.member("BC", "tension-only"),
        ],
        [Support("ends", (0, 1, 3), fixed=(0, 1, 2))],
        {"growing": models.push(2, (10.0, 0, -1.0))},
        [Section("tie", axial_stiffness=1e5)],
    )
    record = models.path(parts, StopAt(load_factor=5.0), step=0.1)
    assert record.status == "complete", record.outcome
    assert record["axial_force"][-1, 1] > 50.0
    assert record["axial_force"][-1, 2] == 0.0
    assert record["slack_onset"][2] == 0.0
    assert np.isnan(record["slack_onset"][1])


@pytest.mark.parametrize(
    ("growing", "said"),
    [
        (LoadCase("growing"), "no load grows"),
        (LoadCase("growing", forces=(((0,), (0, 0, -1.0)),)), "no load grows"),
    ],
)
def test_a_path_without_a_growing_load_is_refused(growing: LoadCase, said: str) -> None:
    record = models.path(models.toggle(case=growing), StopAt(load_factor=2.0))
    assert record.status == "failed"
    assert record.outcome.startswith(f"NOT A RESULT: {said}")


def test_no_balance_under_the_constant_loads_is_told() -> None:
    """The column's constant load alone is beyond its buckling load: upright it is not stable."""
    parts = column(1e9, spring=100.0)
    record = models.path(parts, StopAt(load_factor=1.0), constant=models.CONSTANT)
    assert record.status == "failed"
    assert "under the constant loads (1 constant)" in record.outcome


def test_a_path_that_loses_all_stiffness_ends_there() -> None:
    """A tie that the growing load lifts until it is slack: nothing holds the joint any more."""
    parts = models.structure(
        {"A": (0, 0, 5), "C": (0, 0, 2)},
        [models.member("AC", "tension-only")],
        [Support("top", (0,), fixed=(0, 1, 2))],
        {
            "growing": models.push(1, (0, 0, 10.0)),
            "constant": LoadCase("constant", forces=(((1,), (0, 0, -50.0)),)),
        },
        [Section("tie", axial_stiffness=1e5)],
    )
    record = models.path(parts, StopAt(load_factor=9.0), step=0.1, constant=models.CONSTANT)
    assert record.status == "failed"
    assert record["load_factor"][-1] == pytest.approx(5.0, rel=1e-9)
    assert "ends at load factor 5: beyond it nothing holds joint C" in record.outcome
    assert record["slack_onset"][0] == pytest.approx(5.0, rel=1e-9)


def test_a_support_that_only_pushes_bounds_the_path() -> None:
    parts = models.structure(
        {"A": (0, 0, 0), "B": (4, 0, 0), "C": (2, 0, 3)},
        [models.member("AC"), models.member("BC"), models.member("AB")],
        [Support("pin", (0,), fixed=(0, 1, 2)), Support("foot", (1,), fixed=(1,), only_pushes=2)],
        {
            "growing": models.push(2, (-10.0, 0, 0)),
            "constant": LoadCase("constant", forces=(((2,), (0, 0, -100.0)),)),
        },
        [Section("bar", axial_stiffness=1e7)],
    )
    # Moments about A: the foot carries 50 N less 7.5 N a factor, and lets go at 20/3.
    safe = models.path(parts, StopAt(load_factor=6.5), step=0.5, constant=models.CONSTANT)
    assert safe.status == "complete", safe.outcome
    lifted = models.path(parts, StopAt(load_factor=8.0), step=0.5, constant=models.CONSTANT)
    assert lifted.status == "failed"
    assert "a support that only pushes lifts off" in lifted.outcome


def test_fields_have_the_axes_of_the_results_file() -> None:
    record = models.path(caught_toggle(), DOWN)
    S = record["load_factor"].size
    shapes = {
        "displacement": (S, 4, 3),
        "axial_force": (S, 3),
        "reaction": (S, 4, 3),
        "negative_pivots": (S,),
        "slack_onset": (3,),
        "critical_points/load_factor": (2,),
        "critical_points/displacement": (2, 4, 3),
        "critical_points/direction": (2, 4, 3),
        "audit/force_residual": (S,),
    }
    for name, shape in shapes.items():
        field = record.fields[name]
        assert field.values.shape == shape, name
        assert len(field.axes) == len(shape), name
    assert np.isnan(record["critical_points/direction"][1]).all()  # a kink has none
    total = record["reaction"].sum(axis=1)
    np.testing.assert_allclose(total[:, 2], record["load_factor"], atol=1e-9 * 1e5)


def test_loadings_add_up_in_what_is_handed_on() -> None:
    parts = column(1e9)
    context = Context(parts)
    models.path_in(context, StopAt(load_factor=200.0), constant=models.CONSTANT)
    end = context.start(StartFrom("path"))
    assert end.loading == Loading("end", {"constant": 1.0, "growing": 200.0})
    assert end.acting.force[2, 2] == pytest.approx(-300.0)
