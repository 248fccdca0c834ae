"""What later analyses start from: members and supports that came or went, ropes in pieces, loads put on."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import brentq

import structures
from structures import member
from tautbar import Model, ModelError, find_modes, run, solve_history, solve_static
from tautbar.analyses.history import HistoryRun
from tautbar.analyses.job import prepare
from tautbar.analyses.memory import _marched

G = 9.80665
STANDING = ["x", "z"]


def flat(joints, members, held, analyses=(), **more):
    """A model in the plane xz; ``held`` joints stand fast."""
    supports = [{"joints": list(held), "fixed": STANDING}, *more.pop("supports", [])]
    described = structures.words(joints, members, plane="xz", supports=supports, **more)
    return Model(**described, analyses=list(analyses))


def run_all(model):
    """Records of all analyses in their order, by name, histories marched."""
    job, out = prepare(model), {}
    for analysis in model.parts.analyses:
        done = job.run(analysis.name)
        out[analysis.name] = _marched(done) if isinstance(done, HistoryRun) else done
    return out


def static(name, loads=None, **more):
    return {"name": name, "kind": "static", **({"loads": loads} if loads else {}), **more}


# A lost hanger -----------------------------------------------------------------------------------------


def hung_load(analyses):
    """A load at D on one hanger alone, below two ties."""
    return flat(
        {"A": (0, 0), "B": (2, 0), "C": (1, -1), "D": (1, -3)},
        [member("a", "A", "C"), member("b", "B", "C"), member("h", "C", "D", kind="tension-only")],
        "AB",
        analyses,
        masses=[{"joints": ["C", "D"], "mass": 20.0}],
        load_cases={
            "p": {"forces": [{"joints": ["D"], "force": [0, -1e4]}]},
            "at C": {"forces": [{"joints": ["C"], "force": [0, -100.0]}]},
        },
    )


LOST = {
    "in turn": static("lost", "p", lose_in_turn=["h"]),
    "without": static("lost", "p", **{"from": "whole", "without": ["h"]}),
    "with the loads of the state": static("lost", **{"from": "whole", "without": ["h"]}),
    "path": {"name": "lost", "kind": "equilibrium-path", "loads": "p", "from": "whole", "without": ["h"],
             "constant": "none", "stop_at": {"load_factor": 1.5}},
    "history": {"name": "lost", "kind": "history", "from": "whole", "without": ["h"], "duration": 0.1,
                "time_step": 1e-3},
}  # fmt: skip


@pytest.mark.parametrize("way", LOST)
def test_a_load_on_a_joint_that_lost_its_last_member_is_a_fault_there(way):
    found = run_all(hung_load([static("whole", "p"), LOST[way]]))
    assert found["whole"].status == "complete"
    lost = found["lost"]
    assert lost.status == "failed"
    assert lost.outcome.startswith("NOT A RESULT")
    assert "no member is there to carry the load at D" in lost.outcome


def test_losing_a_member_that_leaves_another_is_no_fault():
    """Nothing acts on D: what is left at C balances by hand, N = F / (2 sin 45)."""
    model = hung_load(
        [static("whole", "at C"), static("lost", "at C", **{"from": "whole", "without": ["h"]})]
    )
    found = run_all(model)["lost"]
    assert found.status == "complete", found.outcome
    # The ties turn by 1e-4 under 100 N beside EA = 2 MN.
    assert found["axial_force"][0, :2] == pytest.approx(100 / np.sqrt(2), rel=1e-3)


# Ropes and small geometry ------------------------------------------------------------------------------


def test_end_tensions_of_a_rope_in_small_geometry_are_those_of_the_reactions():
    """At A only the rope is held; at B it takes what bars (half their weight at B) and load leave."""
    line, push = 10.0, 5e4
    model = flat(
        {"A": (0, 0), "B": (20, 0), "C": (20, -5), "D": (30, 0)},
        [member("rope", "A", "B", kind="hanging", pretension=2e4), member("b", "B", "C"),
         member("c", "B", "D")],
        "ACD",
        sections={"s": {"axial_stiffness": 1e6, "mass_per_length": line}},
        load_cases={"p": {"self_weight": 1.0, "forces": [{"joints": ["B"], "force": [push, 0]}]}},
    )  # fmt: skip
    found = solve_static(model, "p", geometry="small")
    at_A, at_B = found["end_tension"][0, 0]
    held = found.joint("reaction", "A")[0]
    assert at_A == pytest.approx(np.hypot(held[0], held[2]), rel=1e-7)
    N_b, N_c = found["axial_force"][0, 1:]
    weight = 0.5 * line * G * (5 + 10)  # of the bars, at B
    assert at_B == pytest.approx(np.hypot(push + N_c, weight + N_b), rel=1e-7)
    assert held[0] == pytest.approx(-push - N_c, rel=1e-7), "nothing acts along the rope in x"


# Modes after a loss ------------------------------------------------------------------------------------

EA_TIE, MASS = 1e6, 100.0


def string(analyses):
    """A mass on two massless tight ties, held up by a third."""
    tie = {"kind": "tension-only"}
    return flat(
        {"A": (0, 0), "B": (10, 0), "C": (5, 0), "D": (5, 5)},
        [member("l", "A", "C", pretension=1e4, **tie), member("r", "C", "B", pretension=1e4, **tie),
         member("d", "C", "D", pretension=5e3, **tie)],
        "ABD",
        analyses,
        sections={"s": {"axial_stiffness": EA_TIE, "mass_per_length": 0.0}},
        masses=[{"joints": ["C"], "mass": MASS}],
        load_cases={"p": {"self_weight": 1.0}, "q": {"self_weight": 2.0}},
    )  # fmt: skip


def sagged():
    """Frequencies of the mass on the two ties alone, about where its weight brings it [Hz]."""
    L0 = 5 / (1 + 1e4 / EA_TIE)

    def pull(z):
        l = np.hypot(5, z)
        return EA_TIE * (l - L0) / L0, l

    z = brentq(lambda z: 2 * pull(z)[0] * z / pull(z)[1] - MASS * G, 0, 3, xtol=1e-15)
    N, l = pull(z)
    s2 = (z / l) ** 2
    k = np.array([EA_TIE / L0 * s2 + N / l * (1 - s2), EA_TIE / L0 * (1 - s2) + N / l * s2])
    return np.sqrt(2 * k / MASS) / (2 * np.pi)


def test_modes_after_a_loss_are_those_about_the_state_of_rest_that_follows():
    """Brought to rest and said so; as from a static analysis between; 1e-8 for forces in balance to 1e-9."""
    after = {"kind": "modes", "count": 2}
    found = run_all(string([
        static("s", "p"),
        {"name": "m", "from": "s", "without": ["d"], **after},
        static("s2", **{"from": "s", "without": ["d"]}),
        {"name": "m2", "from": "s2", **after},
    ]))  # fmt: skip
    assert found["m"]["frequency"] == pytest.approx(sagged(), rel=1e-8)
    assert found["m2"]["frequency"] == pytest.approx(sagged(), rel=1e-8)
    said = "brought to rest after its changes"
    assert any(said in w for w in found["m"].warnings), found["m"].warnings
    assert not any(said in w for w in found["m2"].warnings)


def test_modes_about_each_loading_in_turn_are_a_mistake():
    each = {"name": "m", "kind": "modes", "from": {"analysis": "s", "loads": "each"}, "count": 1}
    with pytest.raises(ModelError, match=r"(?s)m.*from\.loads.*each loading in turn.*name one loading"):
        string([static("s", ["p", "q"]), each])


# Histories with pieces ---------------------------------------------------------------------------------


def guyed(pieces_on):
    """A mass between a rope in pieces, a hanger and a tie; a loss, and a load put on at once."""
    rope = {"pieces": 4} if pieces_on == "member" else {}
    own = {"pieces": 4} if pieces_on == "analysis" else {}
    step = {"kind": "history", "from": "s", "duration": 0.4, "time_step": 2e-3, "precision": "double", **own}
    return flat(
        {"A": (0, 0), "C": (10, -1), "D": (10, 8), "E": (20, 0)},
        [member("r", "A", "C", kind="hanging", pretension=5e3, **rope),
         member("d", "C", "D", kind="tension-only"),
         member("e", "C", "E", kind="tension-only", pretension=5e3)],
        "ADE",
        [static("s", "g"), {"name": "loss", "without": ["d"], **step},
         {"name": "put on", "loads": "gp", **step}],
        sections={"s": {"axial_stiffness": 1e6, "mass_per_length": 1.0}},
        masses=[{"joints": ["C"], "mass": 200.0}],
        load_cases={"g": {"self_weight": 1.0},
                    "gp": {"self_weight": 1.0, "forces": [{"joints": ["C"], "force": [0, -1e4]}]}},
    )  # fmt: skip


def test_pieces_on_the_analysis_march_as_pieces_on_the_member():
    """A loss and a load put on at once start from rest in the old state; the same motion both ways."""
    whole, own = run_all(guyed("member")), run_all(guyed("analysis"))
    for name in ("loss", "put on"):
        for found in (whole, own):
            assert found[name].status == "complete", found[name].outcome
        a, b = whole[name]["displacement"][:, 1, 2], own[name]["displacement"][:, 1, 2]
        # Start states in balance to 1e-9 of 5 kN, beside a stiffness across of some kN/m: micrometres.
        assert b == pytest.approx(a, abs=2e-6)
        assert np.ptp(a) > 0.05
        assert b[0] == pytest.approx(own["s"]["displacement"][0, 1, 2], abs=1e-3)  # pieces against catenary
        assert any("found again with r in 4 straight pieces" in w for w in own[name].warnings)
    assert whole["loss"].settings["without"] == own["loss"].settings["without"] == ["d"]
    assert own["loss"].settings["pieces"] == 4


@pytest.mark.parametrize("name", ["loss", "put on"])
def test_the_first_step_with_pieces_falls_by_what_is_out_of_balance(name):
    """Half a t^2, a = (tension less weight of the lost hanger, or load) / mass at C; 1 % for stiffness."""
    found, hanger = run_all(guyed("analysis")), 0.5 * 9.0  # kg, half of d
    tension = found["s"]["axial_force"][0, 1]
    force, with_d = (tension - hanger * G, 0.0) if name == "loss" else (1e4, hanger)
    mass = 200.0 + 0.5 * np.hypot(10, 1) * 1.25 + with_d  # half of e and of the last piece of r
    z = found[name]["displacement"][:2, 1, 2]
    assert z[0] - z[1] == pytest.approx(0.5 * force / mass * (2e-3) ** 2, rel=0.01)


# Stiffness of a section --------------------------------------------------------------------------------


def test_a_rope_by_stiffness_has_it_whole_and_in_pieces():
    """Elastic catenary between level hooks, EA = k L0; pieces come to it at second order."""
    k, line, span, slack = 5e4, 2.0, 20.0, 0.2
    L0 = span + slack
    W = line * G * L0
    H = brentq(lambda h: h / k + 2 * h * L0 / W * np.arcsinh(W / (2 * h)) - span, 10.0, 1e5, xtol=1e-10)

    def rope(pieces=None):
        given = {"slack": slack} | ({"pieces": pieces} if pieces else {})
        model = flat(
            {"A": (0, 0), "B": (span, 0)},
            [member("r", "A", "B", kind="hanging", section="k", **given)],
            "AB",
            sections={"k": {"stiffness": k, "mass_per_length": line}},
        )
        return solve_static(model, "dead").joint("reaction", "A")[0]

    whole = rope()
    assert whole[[0, 2]] == pytest.approx([-H, W / 2], rel=1e-7)
    off = [abs(rope(n)[0] + H) / H for n in (8, 16)]
    assert off[0] / off[1] == pytest.approx(4.0, rel=0.1)
    assert off[1] < 5e-3


def test_a_member_by_stiffness_put_in_later_has_it():
    """Put in at 5 kN below a rod in one line: it gives way by p / (k + k_rod) and keeps the rest."""
    k, k_rod, p, load = 1e5, 2.5e4, 5e3, 3e4
    described = structures.words(
        {"T": (0, 4), "B": (0, 0), "D": (0, -2)},
        [member("rod", "T", "B", section="rod"),
         member("late", "D", "B", section="k", pretension=p, absent=True)],
        sections={"rod": {"stiffness": k_rod, "mass_per_length": 0.0},
                  "k": {"stiffness": k, "mass_per_length": 0.0}},
        plane="xz",
        supports=[{"joints": ["T", "D"], "fixed": STANDING}, {"joints": ["B"], "fixed": ["x"]}],
        load_cases={"P": {"forces": [{"joints": ["B"], "force": [0, -load]}]}},
        analyses=[static("s", "P"), static("t", "P", **{"from": "s", "with": ["late"]})],
    )  # fmt: skip
    found = run_all(Model(**described))
    assert found["s"]["displacement"][0, 1, 2] == pytest.approx(-load / k_rod, rel=1e-8)
    down = load / k_rod + p / (k + k_rod)
    assert found["t"]["displacement"][0, 1, 2] == pytest.approx(-down, rel=1e-8)
    assert found["t"]["axial_force"][0] == pytest.approx([k_rod * down, p * k_rod / (k + k_rod)], rel=1e-7)


# Masses, gaps, pieces, small states --------------------------------------------------------------------


def test_a_mass_along_a_member_goes_with_it():
    """Weights by hand: of the members and of what is fixed along one of them."""
    l = np.sqrt(26.0)
    model = flat(
        {"A": (0, 0), "B": (10, 0), "C": (5, 1), "D": (5, -1)},
        [member("a", "A", "C"), member("b", "B", "C"), member("x", "C", "D")],
        "ABD",
        [static("whole", "dead"), static("lost", "dead", **{"from": "whole", "without": ["x"]}),
         static("turn", "dead", lose_in_turn=["x"])],
        masses=[{"members": ["x"], "per_length": 100.0}],
        sections={"s": {"axial_stiffness": 1e7, "mass_per_length": 1.0}},
    )  # fmt: skip
    found = run_all(model)
    for name, mass in {"whole": 2 * l + 2 + 200, "lost": 2 * l, "turn": 2 * l}.items():
        assert found[name].status == "complete", found[name].outcome
        assert found[name]["reaction"][0].sum(axis=0)[2] == pytest.approx(mass * G, rel=1e-7), name


@pytest.mark.parametrize("force", [99.0, 101.0, 300.0])
def test_a_strut_with_slack_touches_after_that_gap(force):
    """A strut 10 mm short beside a spring: before it touches the spring has all, then both share."""
    gap, spring, EA = 0.01, 1e4, 1e6
    model = flat(
        {"A": (0, 0), "B": (2, 0)},
        [member("gap", "A", "B", kind="compression-only", slack=gap)],
        "A",
        supports=[{"joints": ["B"], "fixed": ["z"], "springs": {"x": spring}}],
        sections={"s": {"axial_stiffness": EA, "mass_per_length": 0.0}},
        load_cases={"p": {"forces": [{"joints": ["B"], "force": [-force, 0]}]}},
    )
    strut = EA / (2 - gap)
    closed = force > spring * gap
    moved = (force + strut * gap) / (spring + strut) if closed else force / spring
    found = solve_static(model, "p")
    assert found.displacement("B")[0, 0] == pytest.approx(-moved, rel=1e-8)
    assert found.axial_force("gap")[0] == pytest.approx(-strut * max(moved - gap, 0), rel=1e-6)
    assert found["taut"][0, 0] == closed
    assert found["loose_length"][0, 0] == pytest.approx(max(gap - moved, 0), abs=1e-10)


def two_pieces(span, L0, EA, weight):
    """Force in each half of a rope in two pieces and its depth: half the weight is at the middle."""

    def pull(z):
        l = np.hypot(span / 2, z)
        return EA * (l - L0 / 2) / (L0 / 2), l

    z = brentq(lambda z: 2 * pull(z)[0] * z / pull(z)[1] - weight / 2, 0, span, xtol=1e-14)
    return pull(z)[0], z


@pytest.mark.parametrize("way", ["in memory", "in the model"])
def test_a_static_analysis_takes_pieces(way):
    span, slack, EA, line = 10.0, 0.5, 1e5, 3.0
    in_model = [static("s", "dead", pieces=2), static("next", "dead", **{"from": "s"})]
    model = flat(
        {"A": (0, 0), "B": (span, 0)},
        [member("r", "A", "B", kind="hanging", slack=slack)],
        "AB",
        in_model,
        sections={"s": {"axial_stiffness": EA, "mass_per_length": line}},
    )
    W = line * G * (span + slack)
    N, _ = two_pieces(span, span + slack, EA, W)
    if way == "in memory":
        found = solve_static(model, "dead", pieces=2).record
    else:
        found = run_all(model)["s"]
        catenary = solve_static(model, "dead")["axial_force"][0]
        after = run_all(model)["next"]["axial_force"][0]  # the state handed on is of the model itself
        assert after == pytest.approx(catenary, rel=1e-7)
        assert abs(catenary[0] / N - 1) > 0.1
    assert found["axial_force"][0] == pytest.approx([N, N], rel=1e-7)
    assert found["reaction"][0, :2, 2] == pytest.approx([W / 2, W / 2], rel=1e-7)


@pytest.mark.parametrize("geometry", ["small", "large"])
def test_a_history_from_a_state_of_small_geometry_warns(geometry):
    """It is not quite in balance, and swings about the state that is: from a state of large it rests."""
    model = flat(
        {"A": (0, 0), "B": (4, 0), "C": (2, 1)},
        [member("a", "A", "C"), member("b", "B", "C")],
        "AB",
        sections={"s": {"axial_stiffness": 5e5, "mass_per_length": 0.0}},
        masses=[{"joints": ["C"], "mass": 400.0}],
    )
    state = solve_static(model, "dead", geometry=geometry)
    exact = solve_static(model, "dead").displacement("C")[0, 2]
    off = abs(state.displacement("C")[0, 2] - exact)
    found = solve_history(model, state, duration=0.3, time_step=1e-3, method="energy-conserving")
    swing = np.ptp(found.displacement("C")[:, 2])
    warned = any('geometry = "small"' in w and "not quite in balance" in w for w in found.record.warnings)
    assert warned == (geometry == "small")
    assert swing == pytest.approx(2 * off, rel=0.05, abs=1e-8)
    assert (off > 1e-5) == (geometry == "small")


def test_a_point_that_a_path_does_not_have_stops_only_what_starts_there(tmp_path):
    model = flat(
        {"A": (0, 0), "B": (10, 0), "C": (5, 3)},
        [member("a", "A", "C"), member("b", "B", "C")],
        "AB",
        [{"name": "path", "kind": "equilibrium-path", "loads": "p", "stop_at": {"load_factor": 1.0}},
         static("there", "p", **{"from": {"analysis": "path", "at": "limit point 1"}}),
         static("later", "dead")],
        load_cases={"p": {"forces": [{"joints": ["C"], "force": [0, -1e3]}]}},
    )  # fmt: skip
    with run(model, tmp_path / "r.h5") as results:
        assert results["path"].status == "complete"
        assert results["there"].status == "failed"
        assert results["there"].outcome.startswith("NOT A RESULT: 'path' has no limit point 1")
        assert results["later"].status == "complete"
    assert find_modes(model, count=1)["frequency"].size == 1
