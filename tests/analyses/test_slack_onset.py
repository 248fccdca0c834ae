"""At which share of the load each member that ends slack went slack, against closed forms."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar import Model, solve_static
from tautbar.analyses.job import prepare


def opposed(T0=1000.0, k=(4e5, 4e5), P=3000.0, kind="tension-only", **more):
    """A joint between two members in one line, pretensioned against each other, pulled along it by P."""
    sign = 1 if kind == "tension-only" else -1
    return structures.words(
        {"A": (0, 0, 0), "M": (2, 0, 0), "B": (5, 0, 0)},
        [member("left", "A", "M", kind=kind, section="left", pretension=sign * T0),
         member("right", "M", "B", kind=kind, section="right", pretension=sign * T0)],
        sections={name: {"stiffness": stiffness, "mass_per_length": 0.0}
                  for name, stiffness in zip(("left", "right"), k, strict=True)},
        supports=[held("A", "B"), {"joints": ["M"], "fixed": ["y", "z"]}],
        load_cases={"P": {"forces": [{"joints": ["M"], "force": [sign * P, 0, 0]}]},
                    "back": {"forces": [{"joints": ["M"], "force": [-sign * P, 0, 0]}]}},
        **more,
    )  # fmt: skip


# All forces are linear along the line until one is slack; the trace interpolates between states, so the
# factor is exact but for 1e-9 of balance.
EXACT = 1e-6


@pytest.mark.parametrize("kind", ["tension-only", "compression-only"])
def test_equal_members_go_slack_at_twice_their_pretension(kind):
    """N = T0 +- P/2: slack at P = 2 T0; the other tightens and has no such factor."""
    a = solve_static(structures.build(opposed(kind=kind)), "P")
    names = list(a.context.member_names)
    assert a["taut"][0].tolist() == [1, 0]
    onset = a["slack_onset"][0]
    assert onset[names.index("right")] == pytest.approx(2 * 1000 / 3000, rel=EXACT)
    assert np.isnan(onset[names.index("left")])
    # 3 kN on one spring, which had 1 kN: it moves by 2 kN/k, the slack one by T0/k less.
    assert a["loose_length"][0] == pytest.approx([0, 2000 / 4e5 - 1000 / 4e5], rel=1e-6)


@pytest.mark.parametrize("k", [(1e5, 4e5), (4e5, 1e5), (4e5, 3.7e5)])
def test_unequal_members_share_by_their_stiffness(k):
    """u = P/(k1 + k2), N2 = T0 - k2 u: slack at P = T0 (k1 + k2)/k2."""
    slack_at = 1000 * (k[0] + k[1]) / k[1]
    a = solve_static(structures.build(opposed(k=k, P=1.7 * slack_at)), "P")
    assert a["slack_onset"][0, 1] == pytest.approx(1 / 1.7, rel=EXACT)


def test_nothing_slack_has_no_factor():
    a = solve_static(structures.build(opposed(P=1900.0)), "P")
    assert np.isnan(a["slack_onset"]).all()
    assert (a["loose_length"] == 0).all()


def test_the_factor_counts_from_the_loading_of_the_start():
    """From a state with -0.5 P on (right the tighter) to P: P passes 2 T0 at (2000 + 1500)/(3000 + 1500)."""
    model = structures.build(opposed())
    start = solve_static(model, {"back": 0.5})
    a = solve_static(model, "P", start=start)
    assert a["slack_onset"][0, 1] == pytest.approx((2000 + 1500) / (3000 + 1500), rel=EXACT)


def test_what_starts_slack_is_slack_from_the_start():
    model = structures.build(opposed())
    start = solve_static(model, {"P": 0.9})
    a = solve_static(model, "P", start=start)
    assert a["slack_onset"][0].tolist()[1] == 0.0
    drawn = solve_static(structures.build(structures.guyed_mast(slack=0.05)), "dead")
    slack = drawn["taut"][0] == 0
    if slack.any():
        assert (drawn["slack_onset"][0, slack] == 0.0).all()


def test_one_that_is_slack_on_the_way_only_has_no_factor():
    """P on, then away again within one loading's way cannot be; over two analyses each tells its own."""
    model = structures.build(opposed())
    on = solve_static(model, "P")
    off = solve_static(model, {"P": 0.1}, start=on)
    assert np.isfinite(on["slack_onset"][0, 1])
    assert np.isnan(off["slack_onset"]).all()
    assert (off["taut"] == 1).all()


def tower(pretensions, stiff=1e12):
    """Storeys of stiff bars on X ties; each storey's ties have a pretension of their own."""
    joints, members, up = {"L0": (0, 0), "R0": (3, 0)}, [], len(pretensions)
    for i, T in enumerate(pretensions, start=1):
        joints |= {f"L{i}": (0, 2.0 * i), f"R{i}": (3, 2.0 * i)}
        tie = {"kind": "tension-only", "section": "tie", "pretension": T}
        members += [
            member(f"l{i}", f"L{i - 1}", f"L{i}"),
            member(f"r{i}", f"R{i - 1}", f"R{i}"),
            member(f"b{i}", f"L{i}", f"R{i}"),
            member(f"up{i}", f"L{i - 1}", f"R{i}", **tie),
            member(f"down{i}", f"R{i - 1}", f"L{i}", **tie),
        ]
    return structures.words(
        joints,
        members,
        sections={"s": {"axial_stiffness": stiff, "mass_per_length": 0.0},
                  "tie": {"axial_stiffness": 4e6, "mass_per_length": 0.0}},
        supports=[{"joints": ["L0", "R0"], "fixed": ["x", "y"]}],
        plane="xy",
        load_cases={"H": {"forces": [{"joints": [f"L{up}", f"R{up}"], "force": [2500.0, 0]}]}},
    )  # fmt: skip


def test_members_of_a_tower_go_slack_in_the_order_of_their_pretension():
    """Shear 5 kN in each storey, half of it taken from each tie's tension: T cos = H/2 at its factor.

    Ties lengthen by 1e-3 of themselves, which turns them by as much: the factor with it.
    """
    T = [2600.0, 1200.0, 1900.0, 700.0]
    a = solve_static(structures.build(tower(T)), "H")
    names, cos = list(a.context.member_names), 3 / np.sqrt(13)
    found = np.array([a["slack_onset"][0, names.index(f"down{i}")] for i in (1, 2, 3, 4)])
    expected = np.array(T) * cos / 2500.0
    assert found == pytest.approx(expected, rel=3e-3)
    assert list(np.argsort(found)) == [3, 1, 2, 0]
    others = [a["slack_onset"][0, i] for i, n in enumerate(names) if not n.startswith("down")]
    assert np.isnan(others).all()
    assert len(set(np.round(found, 6))) == 4


def test_close_together_they_are_told_apart():
    """Two factors within one of the ten states of the trace."""
    a = solve_static(structures.build(tower([1000.0, 1020.0])), "H")
    names, cos = list(a.context.member_names), 3 / np.sqrt(13)
    found = [a["slack_onset"][0, names.index(f"down{i}")] for i in (1, 2)]
    assert found == pytest.approx(np.array([1000.0, 1020.0]) * cos / 2500, rel=3e-3)
    assert found[0] < found[1]


def test_load_steps_asked_for_trace_as_finely():
    coarse = solve_static(structures.build(tower([2600.0, 1200.0])), "H", steps=3)
    fine = solve_static(structures.build(tower([2600.0, 1200.0])), "H", steps=40)
    assert coarse["slack_onset"] == pytest.approx(fine["slack_onset"], rel=1e-3, nan_ok=True)


def test_each_loading_has_its_own_factors():
    described = opposed(combinations={"both": {"in_turn": [{"P": 1.0, "back": 1.0}]}})
    described["analyses"] = [{"name": "s", "kind": "static", "loads": ["P", "back", {"P": 0.5}]}]
    job = prepare(Model(**described))
    onset = job.run("s")["slack_onset"]
    share = pytest.approx(2 / 3, rel=EXACT)
    assert onset[0, 1] == share
    assert onset[1, 0] == share
    assert np.isnan([onset[0, 0], onset[1, 1], *onset[2]]).all()
