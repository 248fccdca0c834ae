"""Supports that only push: lifting off, setting down, sharing a load, and structures they do not hold."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import EA, held, member
from tautbar import AnalysisFailed, Model, solve_static
from tautbar.analyses.job import prepare

G = 9.80665


def hanger(**more):
    """A weight that stands on a block and hangs on a rod above it, moving straight up and down only."""
    return structures.words(
        {"top": (0, 0, 4), "foot": (0, 0, 0)},
        [member("rod", "top", "foot", section="rod", pretension=300.0)],
        sections={"rod": {"axial_stiffness": 8e5, "mass_per_length": 0.0}},
        supports=[held("top"), {"joints": ["foot"], "fixed": ["x", "y"]},
                  {"name": "block", "joints": ["foot"], "only_pushes": "z"}],
        load_cases={"W": {"forces": [{"joints": ["foot"], "force": [0, 0, -1000.0]}]},
                    "F": {"forces": [{"joints": ["foot"], "force": [0, 0, 100.0]}]}},
        **more,
    )  # fmt: skip


@pytest.mark.parametrize("factor", [0.0, 3.0, 6.99, 7.01, 9.0, 12.0])
def test_it_lifts_where_weight_less_pretension_is_reached(factor):
    """Block: R = 1000 - 300 - F while that pushes; beyond, the rod alone: u = (F + 300 - 1000)/k."""
    a = solve_static(structures.build(hanger()), {"W": 1.0, "F": factor})
    contact = 700.0 - 100 * factor
    R, u = a.joint("reaction", "foot")[0, 2], a.displacement("foot")[0, 2]
    L0 = 4 / (1 + 300 / 8e5)
    if contact > 0:
        assert u == 0.0
        assert pytest.approx(contact, rel=1e-9) == R
        assert a.axial_force("rod")[0] == pytest.approx(300.0, rel=1e-9)
    else:
        assert R == 0.0
        assert u == pytest.approx(-contact / (8e5 / L0), rel=1e-6)
        assert a.axial_force("rod")[0] == pytest.approx(1000.0 - 100 * factor, rel=1e-8)


def test_it_sets_down_again_and_keeps_nothing_of_having_been_lifted():
    model = structures.build(hanger())
    up = solve_static(model, {"W": 1.0, "F": 9.0})
    assert up.displacement("foot")[0, 2] > 1e-4
    down = solve_static(model, {"W": 1.0, "F": 2.0}, start=up)
    fresh = solve_static(model, {"W": 1.0, "F": 2.0})
    assert down.displacement("foot")[0, 2] == 0.0
    assert down.joint("reaction", "foot")[0] == pytest.approx(fresh.joint("reaction", "foot")[0], abs=1e-6)
    again = solve_static(model, {"W": 1.0, "F": 9.0}, start=down)
    assert again.displacement("foot")[0] == pytest.approx(up.displacement("foot")[0], rel=1e-9)


def test_a_block_that_is_lowered_lets_go_and_one_that_is_raised_carries_all():
    described = hanger()
    described["load_cases"]["sinks"] = {"movements": [{"joints": ["foot"], "move": [0, 0, -0.01]}]}
    model = structures.build(described)
    L0 = 4 / (1 + 300 / 8e5)
    free_fall = 700 / (8e5 / L0)  # what the weight stretches the rod by, left alone: 3.5 mm
    sunk = solve_static(model, {"W": 1.0, "sinks": 1.0})
    assert sunk.displacement("foot")[0, 2] == pytest.approx(-free_fall, rel=1e-6)
    assert sunk.joint("reaction", "foot")[0, 2] == 0.0
    less = solve_static(model, {"W": 1.0, "sinks": 0.1})
    assert less.displacement("foot")[0, 2] == pytest.approx(-0.001, rel=1e-12)
    assert less.joint("reaction", "foot")[0, 2] == pytest.approx(700 - 0.001 * 8e5 / L0, rel=1e-6)


def trestle():
    """A triangle on two feet that only push; A keeps it from sliding. It tips about B at H = 2 W/3."""
    return structures.words(
        {"A": (0, 0), "B": (4, 0), "C": (2, 3)},
        [member("ac", "A", "C"), member("bc", "B", "C"), member("ab", "A", "B")],
        supports=[{"joints": ["A"], "fixed": ["x"]},
                  {"name": "feet", "joints": ["A", "B"], "only_pushes": "y"}],
        plane="xy",
        load_cases={"W": {"forces": [{"joints": ["C"], "force": [0, -90.0]}]},
                    "H": {"forces": [{"joints": ["C"], "force": [90.0, 0]}]}},
    )  # fmt: skip


@pytest.mark.parametrize("H", [0.0, 0.3, 0.6, 0.66, -0.66])
def test_reactions_of_a_trestle_by_hand(H):
    """Moments about either foot; joints move by 1e-4 of their levers under these loads."""
    a = solve_static(structures.build(trestle()), {"W": 1.0, "H": H})
    up = a["reaction"][0, :2, 1]
    assert up == pytest.approx([45 - H * 90 * 3 / 4, 45 + H * 90 * 3 / 4], abs=0.02)
    assert a.joint("reaction", "A")[0, 0] == pytest.approx(-90 * H, abs=1e-6)
    assert (up >= 0).all()


@pytest.mark.parametrize("H", [0.67, 1.5])
def test_an_overturning_trestle_has_no_result(H):
    """Beyond the tipping load nothing holds it until it lies on its other side: told as folded."""
    with pytest.raises(AnalysisFailed, match=r"NOT A RESULT, .*the structure folded") as caught:
        solve_static(structures.build(trestle()), {"W": 1.0, "H": H})
    assert caught.value.exit_code == 3
    assert np.isnan(caught.value.record["reaction"]).all()


def table(feet=6):
    """A stiff frame on six feet, held sideways by soft springs: which of them stand depends on the load."""
    joints = {f"F{i}": (2.0 * (i % 3), 3.0 * (i // 3), 0) for i in range(feet)}
    joints |= {f"T{i}": (2.0 * (i % 3), 3.0 * (i // 3), 1.2) for i in range(feet)}
    pairs = [(f"F{i}", f"T{i}") for i in range(feet)]
    for layer in "FT":
        pairs += [(f"{layer}{i}", f"{layer}{i + 1}") for i in (0, 1, 3, 4)]
        pairs += [(f"{layer}{i}", f"{layer}{i + 3}") for i in range(3)]
        pairs += [(f"{layer}{i}", f"{layer}{i + 4}") for i in (0, 1)]
    pairs += [(f"F{i}", f"T{i + 1}") for i in (0, 1, 3, 4)] + [(f"F{i}", f"T{i + 3}") for i in range(3)]
    return structures.words(
        joints,
        [member(f"m{k}", a, b) for k, (a, b) in enumerate(pairs)],
        supports=[
            {"joints": ["F*"], "springs": {"x": 5e3, "y": 5e3}},
            {"name": "floor", "joints": ["F*"], "only_pushes": "z"},
        ],
    )


@pytest.mark.parametrize("seed", range(12))
def test_feet_push_or_are_up_and_never_both(seed):
    """Contact by its rules: no foot below the floor, none that pulls, none that pushes in the air."""
    rng = np.random.default_rng(seed)
    described = table()
    forces = [
        {"joints": [f"T{i}"], "force": [float(c) for c in rng.normal([0, 0, -150.0], [60, 60, 150.0])]}
        for i in range(6)
    ]
    described["load_cases"] = {"L": {"forces": forces}}
    a = solve_static(structures.build(described), "L")
    feet = [a.context.joint_names.index(f"F{i}") for i in range(6)]
    R, u = a["reaction"][0, feet, 2], a["displacement"][0, feet, 2]
    scale = np.abs(R).max()
    assert R.min() >= -1e-9 * scale
    assert (u >= 0).all()
    assert (R * u == 0).all()
    total = sum(np.array(f["force"]) for f in forces)
    assert a["reaction"][0].sum(axis=0) == pytest.approx(-total, abs=1e-6 * scale)
    UPS.append(int((u > 0).sum()))


UPS: list[int] = []


def test_some_of_those_feet_were_up_and_some_loads_left_all_standing():
    """Otherwise the draws above would prove nothing of contact."""
    if len(UPS) == 12:
        assert max(UPS) >= 2
        assert sum(up > 0 for up in UPS) >= 4


def test_all_loadings_of_a_family_find_their_own_contact():
    described = hanger(combinations={"lifts": {"always": {"W": 1.0}, "in_turn": [{"F": [2.0, 9.0, 3.0]}]}})
    a = solve_static(structures.build(described), "lifts")
    assert a["reaction"][:, 1, 2] == pytest.approx([500.0, 0.0, 400.0], abs=1e-6)
    assert (a["displacement"][:, 1, 2] > 0).tolist() == [False, True, False]


def test_contact_is_handed_on_to_later_analyses():
    """Lifted in the first, the modes about it know that the block holds nothing."""
    analyses = [
        {"name": "up", "kind": "static", "loads": {"W": 1.0, "F": 9.0}},
        {"name": "down", "kind": "static", "loads": {"W": 1.0}},
        {"name": "up modes", "kind": "modes", "from": "up", "count": 1},
        {"name": "down modes", "kind": "modes", "from": "down", "count": 1},
    ]
    described = hanger(analyses=analyses, masses=[{"joints": ["foot"], "mass": 50.0}])
    job = prepare(Model(**described))
    assert job.run("up").status == job.run("down").status == "complete"
    up, down = job.run("up modes"), job.run("down modes")
    L0 = 4 / (1 + 300 / EA * EA / 8e5)
    assert up["frequency"] == pytest.approx([np.sqrt(8e5 / L0 / 50) / (2 * np.pi)], rel=1e-9)
    assert down["frequency"].size == 0


def test_on_a_tie_alone_it_goes_up_until_the_tie_holds_it_from_below():
    """200 N too much: it passes its hook and hangs upwards, which is said as a move of the model's size."""
    described = hanger()
    described["members"][0] |= {"kind": "tension-only"}
    a = solve_static(structures.build(described), {"W": 1.0, "F": 12.0})
    L0 = 4 / (1 + 300 / 8e5)
    assert a.displacement("foot")[0, 2] == pytest.approx(4 + L0 * (1 + 200 / 8e5), rel=1e-9)
    assert any("joints move by 200 % of the model's size" in w for w in a.record.warnings)
