"""Erection and loss: members, supports and masses that come and go between analyses."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar import Model
from tautbar.analyses.job import prepare
from tautbar.mechanics import catenary

G = 9.80665
EA = 8e5
W = 2000.0  # N


def hoist(analyses, **late):
    """A load that rods hold in one line, up and down only: each closed form is one of springs in series.

    "one" is there from the start; "two" is put in later, with what ``late`` says of its length; "prop"
    is a support for later, "bag" a mass.
    """
    return Model(**structures.words(
        {"T": (0, 0, 4), "U": (0, 0, 5), "B": (0, 0, 0)},
        [member("one", "T", "B", section="rod"),
         member("two", "U", "B", kind="tension-only", section="rod", absent=True, **late)],
        sections={"rod": {"axial_stiffness": EA, "mass_per_length": 0.0}},
        supports=[held("T", "U"), {"joints": ["B"], "fixed": ["x", "y"]},
                  {"name": "prop", "joints": ["B"], "fixed": ["z"], "absent": True}],
        masses=[{"name": "crate", "joints": ["B"], "mass": W / G},
                {"name": "bag", "joints": ["B"], "mass": 50.0, "absent": True}],
        load_cases={"P": {"forces": [{"joints": ["B"], "force": [0, 0, -700.0]}]},
                    "jack": {"movements": [{"joints": ["B"], "move": [0, 0, 0.003]}]}},
        analyses=analyses,
    ))  # fmt: skip


def static(name, loads, **more):
    return {"name": name, "kind": "static", "loads": loads, **more}


def run(model):
    """All analyses in their order, by name; each must hold."""
    job = prepare(model)
    records = {a.name: job.run(a.name) for a in model.parts.analyses}
    for record in records.values():
        assert record.status == "complete", record.outcome
    return job, records


def force(record, member_at, loading=0):
    return record["axial_force"][loading, member_at]


FIRST = W * 4 / EA  # m, what the load stretches rod "one" by: 10 mm
K1 = EA / 4


@pytest.mark.parametrize(
    ("late", "at_once", "length"),
    [
        ({}, 0.0, 5 + FIRST),
        ({"pretension": 900.0}, 900.0, (5 + FIRST) / (1 + 900 / EA)),
        ({"slack": 0.002}, 0.0, 5 + FIRST + 0.002),
        ({"unstressed_length": 5.005}, EA * (FIRST - 0.005) / 5.005, 5.005),
    ],
)
def test_a_rope_put_in_later_takes_the_geometry_of_the_moment(late, at_once, length):
    """Its key holds where the joints are then, stretched by the load, not where they were drawn.

    Put in it shares what comes after it, and what its own pretension lifts.
    """
    model = hoist([
        static("first", {"dead": 1.0}),
        static("put in", {"dead": 1.0}, **{"from": "first", "with": ["two"]}),
        static("loaded", {"dead": 1.0, "P": 1.0}, **{"from": "put in"}),
    ], **late)  # fmt: skip
    job, records = run(model)
    assert records["first"]["displacement"][0, 2, 2] == pytest.approx(-FIRST, rel=1e-9)
    assert np.isnan(force(records["first"], 1))
    assert force(records["first"], 0) == pytest.approx(W, rel=1e-9)
    L0 = job.context.states["put in"][0].scene.structure.L0[1]
    assert pytest.approx(length, rel=1e-10) == L0
    k2 = EA / L0
    loose = max(L0 - 5 - FIRST, 0.0)
    lifted = at_once / (K1 + k2)
    assert records["put in"]["displacement"][0, 2, 2] == pytest.approx(-FIRST + lifted, abs=1e-10)
    assert force(records["put in"], 1) == pytest.approx(at_once - k2 * lifted, abs=1e-5)
    # Down by `loose` on rod one alone, then on both.
    down = (700.0 - K1 * loose) / (K1 + k2) + loose
    assert records["loaded"]["displacement"][0, 2, 2] == pytest.approx(-FIRST + lifted - down, abs=1e-10)
    assert force(records["loaded"], 1) == pytest.approx(at_once - k2 * (lifted - down + loose), abs=1e-4)
    assert force(records["loaded"], 0) + force(records["loaded"], 1) == pytest.approx(W + 700, rel=1e-8)


def test_replacing_a_rope_moves_its_load_over():
    """The new one in without force, the old one out: the load comes down on the new one, from where it is."""
    _, records = run(hoist([
        static("old", {"dead": 1.0}),
        static("both", {"dead": 1.0}, **{"from": "old", "with": ["two"]}),
        static("new", {"dead": 1.0}, **{"from": "both", "without": ["one"]}),
        static("all in one", {"dead": 1.0}, **{"from": "old", "with": ["two"], "without": ["one"]}),
    ]))  # fmt: skip
    for name in ("new", "all in one"):
        record = records[name]
        assert np.isnan(force(record, 0))
        assert force(record, 1) == pytest.approx(W, rel=1e-9)
        assert record["displacement"][0, 2, 2] == pytest.approx(-FIRST - W * (5 + FIRST) / EA, abs=1e-10)
        assert list(record["taut"][0]) == [0, 1]
    assert records["new"].settings["without"] == ["one"]
    assert records["both"].settings["with"] == ["two"]
    assert "with" not in records["old"].settings


def test_a_member_taken_out_and_put_in_again_is_cut_anew():
    """It goes in without force where the joints are then, not with the length it once had."""
    _, records = run(hoist([
        static("a", {"dead": 1.0}),
        static("b", {"dead": 1.0}, **{"from": "a", "with": ["two"]}),
        static("c", {"dead": 1.0}, **{"from": "b", "without": ["one"]}),
        static("d", {"dead": 1.0}, **{"from": "c", "with": ["one"]}),
    ]))  # fmt: skip
    assert force(records["d"], 0) == pytest.approx(0.0, abs=1e-5)
    assert force(records["d"], 1) == pytest.approx(W, rel=1e-8)
    assert records["d"]["displacement"][0, 2, 2] == pytest.approx(
        records["c"]["displacement"][0, 2, 2], abs=1e-10
    )


def test_a_support_put_in_holds_the_joint_where_it_is():
    """Propped under load nothing changes; unloaded it holds the joint down; taken out it springs back."""
    _, records = run(hoist([
        static("hangs", {"dead": 1.0}),
        static("propped", {"dead": 1.0}, **{"from": "hangs", "with": ["prop"]}),
        static("more", {"dead": 1.0, "P": 1.0}, **{"from": "propped"}),
        static("emptied", {}, **{"from": "more", "without": ["crate"]}),
        static("let go", {}, **{"from": "emptied", "without": ["prop"]}),
    ]))  # fmt: skip
    for name, reaction in (("propped", 0.0), ("more", 700.0), ("emptied", -W)):
        assert records[name]["displacement"][0, 2, 2] == pytest.approx(-FIRST, abs=1e-12)
        assert records[name]["reaction"][0, 2, 2] == pytest.approx(reaction, abs=1e-5)
        assert force(records[name], 0) == pytest.approx(W, rel=1e-8), "the rod keeps its stretch"
    assert records["let go"]["displacement"][0, 2, 2] == pytest.approx(0.0, abs=1e-9)
    assert force(records["let go"], 0) == pytest.approx(0.0, abs=1e-4)


def test_a_held_joint_that_was_let_go_and_held_again_stays_where_it_went():
    """The movement of a support counts from where its support took hold."""
    model = hoist([
        static("hangs", {"dead": 1.0}),
        static("propped", {"dead": 1.0}, **{"from": "hangs", "with": ["prop"]}),
        static("free", {"dead": 1.0, "P": 1.0}, **{"from": "propped", "without": ["prop"]}),
        static("propped again", {"dead": 1.0}, **{"from": "free", "with": ["prop"]}),
        static("jacked", {"dead": 1.0, "jack": 1.0}, **{"from": "propped again"}),
    ])  # fmt: skip
    _, records = run(model)
    low = FIRST * (1 + 700 / W)
    assert records["free"]["displacement"][0, 2, 2] == pytest.approx(-low, rel=1e-9)
    assert records["propped again"]["displacement"][0, 2, 2] == pytest.approx(-low, rel=1e-9)
    assert records["propped again"]["reaction"][0, 2, 2] == pytest.approx(-700.0, rel=1e-6)
    assert records["jacked"]["displacement"][0, 2, 2] == pytest.approx(-low + 0.003, rel=1e-9)
    assert records["jacked"]["reaction"][0, 2, 2] == pytest.approx(-700 + K1 * 0.003, rel=1e-6)


def test_masses_come_and_go_with_their_weight_and_their_inertia():
    _, records = run(hoist([
        static("crate", {"dead": 1.0}),
        static("and bag", {"dead": 1.0}, **{"from": "crate", "with": ["bag"]}),
        static("bag", {"dead": 1.0}, **{"from": "and bag", "without": ["crate"]}),
        {"name": "f crate", "kind": "modes", "from": "crate", "count": 1},
        {"name": "f bag", "kind": "modes", "from": "bag", "count": 1},
        {"name": "f both", "kind": "modes", "from": "bag", "with": ["crate"], "count": 1},
    ]))  # fmt: skip
    for name, weight in (("crate", W), ("and bag", W + 50 * G), ("bag", 50 * G)):
        assert force(records[name], 0) == pytest.approx(weight, rel=1e-9)
    for name, mass in (("f crate", W / G), ("f bag", 50.0), ("f both", W / G + 50)):
        assert records[name]["frequency"][0] == pytest.approx(np.sqrt(K1 / mass) / (2 * np.pi), rel=1e-8)


def guyed(analyses):
    """A mast on four guys, one for later, and a shelf that hangs from its top only later."""
    described = structures.guyed_mast(pretension=2500.0)
    described["joints"] |= {"spare": [0.0, -8.0, 0.0], "shelf": [0.5, 0.0, 7.0]}
    described["supports"] = [held("foot", "anchor0", "anchor1", "anchor2", "spare")]
    described["members"] += [
        member(
            "spare guy", "spare", "top", kind="tension-only", section="guy", pretension=1500.0, absent=True
        ),
        member("hanger", "top", "shelf", kind="tension-only", section="guy", absent=True),
    ]
    described["masses"].append({"name": "goods", "joints": ["shelf"], "mass": 80.0, "absent": True})
    described["load_cases"] |= {
        "east": {"forces": [{"joints": ["top"], "force": [900.0, 0, 0]}]},
        "north": {"forces": [{"joints": ["top"], "force": [0, 900.0, 0]}]},
    }
    described["combinations"] = {"winds": {"always": {"dead": 1.0}, "in_turn": [{"east": 1.0, "north": 1.0}]}}
    return Model(**described | {"analyses": analyses})


def test_a_joint_without_members_is_not_there_until_one_comes():
    """The shelf waits where it is drawn, weightless and unmoved; hung on later it hangs under the top."""
    _, records = run(guyed([
        static("up", "dead"),
        static("shelf", "dead", **{"from": "up", "with": ["hanger", "goods"]}),
    ]))  # fmt: skip
    assert (records["up"]["displacement"][0, 6] == 0).all()
    assert (records["up"]["reaction"][0, 6] == 0).all()
    hangs = records["shelf"]["displacement"][0, 6] + [0.5, 0, 7.0]
    top = records["shelf"]["displacement"][0, 1] + [0, 0, 10.0]
    assert hangs[:2] == pytest.approx(top[:2], abs=1e-6), "plumb below the top"
    rope = 0.5 * np.hypot(0.5, 3.0) * G / 2
    assert force(records["shelf"], 5) == pytest.approx(80 * G + rope, rel=1e-3)
    assert np.isnan(force(records["shelf"], 4))


def test_losing_each_member_in_turn_starts_from_the_whole():
    """Names, not-a-number for the lost one, and the same answer as taking it away by hand."""
    _, records = run(guyed([
        static("up", "dead"),
        static("losses", ["dead"], **{"from": "up", "lose_in_turn": ["guy0", "guy2"], "folding": "allowed"}),
        static("without guy0", "dead", **{"from": "up", "without": ["guy0"], "folding": "allowed"}),
        static("both winds", "winds", **{"from": "up", "lose_in_turn": ["guy1"], "folding": "allowed"}),
    ]))  # fmt: skip
    losses = records["losses"]
    assert list(losses["loads"]) == ["dead, without guy0", "dead, without guy2"]
    names = guyed([]).parts.members.names
    for row, lost in enumerate(("guy0", "guy2")):
        at = names.index(lost)
        gone = np.isnan(losses["axial_force"][row])
        assert gone[at]
        assert gone.sum() == 3, "the lost one, and the two that are not there yet"
        assert losses["taut"][row, at] == 0
    alone = records["without guy0"]
    assert losses["axial_force"][0] == pytest.approx(alone["axial_force"][0], rel=1e-6, nan_ok=True)
    assert losses["displacement"][0] == pytest.approx(alone["displacement"][0], abs=1e-6)
    assert np.isnan(losses["envelope/max"]).tolist() == [False] * 4 + [True, True]
    kept = losses["axial_force"][:, names.index("guy1")]
    assert losses["envelope/max"][names.index("guy1")] == kept.max()
    assert losses["envelope/max"][names.index("guy0")] == losses["axial_force"][1, names.index("guy0")]
    assert list(records["both winds"]["loads"]) == [f"winds: {w} 1, without guy1" for w in ("east", "north")]


def test_from_each_goes_on_from_every_loading():
    """Two winds, and from each of both the spare guy goes in where the top then is."""
    job, records = run(guyed([
        static("blown", "winds"),
        static("guyed again", "dead", **{"from": {"analysis": "blown", "loads": "each"},
                                         "with": ["spare guy"]}),
        static("one of them", "dead", **{"from": {"analysis": "blown", "loads": "winds: north 1"},
                                         "with": ["spare guy"]}),
        static("kept", None, **{"from": {"analysis": "blown", "loads": "each"}}),
    ]))  # fmt: skip
    each = records["guyed again"]
    assert each["axial_force"].shape == (2, 6)
    assert each["axial_force"][1] == pytest.approx(
        records["one of them"]["axial_force"][0], abs=1e-3, nan_ok=True
    )
    # The guy was cut to 1.5 kN at the top as each wind left it: two lengths.
    lengths = [state.scene.structure.L0[4] for state in job.context.states["guyed again"]]
    for state, blown, L0 in zip(
        job.context.states["blown"], records["blown"]["displacement"], lengths, strict=True
    ):
        top = np.array([0, 0, 10.0]) + blown[1]
        l = np.linalg.norm(top - [0, -8.0, 0])
        assert pytest.approx(l / (1 + 1500 / 5e6), rel=1e-12) == L0
        assert state.loading.name.startswith("winds: ")
    assert abs(lengths[0] - lengths[1]) > 1e-4
    kept = records["kept"]
    assert kept["axial_force"] == pytest.approx(records["blown"]["axial_force"], abs=1e-3, nan_ok=True)


def test_a_hanging_rope_put_in_later_hangs_by_its_key_from_the_joints_of_the_moment():
    """Its sag is measured where its ends are once the mast has moved."""
    described = dict(guyed([]).words)
    described["members"].append(
        member("line", "spare", "top", kind="hanging", section="guy", sag=0.4, absent=True)
    )
    described["analyses"] = [
        static("blown", {"dead": 1.0, "north": 3.0}),
        static("line", {"dead": 1.0, "north": 3.0}, **{"from": "blown", "with": ["line"]}),
    ]
    job, records = run(Model(**described))
    curve = records["line"]["rope_curve/position"][0, 0]
    middle = curve[[0, -1]].mean(axis=0)
    y = curve[:, 1]
    below = middle[2] - np.interp(middle[1], y, curve[:, 2])
    moved = records["line"]["displacement"][0, 1] - records["blown"]["displacement"][0, 1]
    assert np.abs(moved).max() < 2e-3
    assert np.abs(records["blown"]["displacement"][0, 1]).max() > 5e-3
    # The line pulls the top a little, and 33 points see the sag to a millimetre.
    assert below == pytest.approx(0.4, abs=0.02)
    ends = np.array([0, 0, 10.0]) + records["blown"]["displacement"][0, 1] - [0, -8.0, 0]
    wanted = catenary.length_for_sag(0.4, 5e6, 0.5 * G, float(np.hypot(*ends[:2])), float(ends[2]))
    assert job.context.states["line"][0].scene.structure.L0[6] == pytest.approx(wanted, rel=1e-12)


def test_a_spring_put_in_later_has_the_stiffness_of_its_section():
    words = dict(hoist([
        static("first", {"dead": 1.0}),
        static("loaded", {"dead": 1.0, "P": 1.0}, **{"from": "first", "with": ["two"]}),
    ]).words)  # fmt: skip
    words["sections"]["spring"] = {"stiffness": 3e5, "mass_per_length": 0.0}
    words["members"][1]["section"] = "spring"
    _, records = run(Model(**words))
    assert force(records["loaded"], 1) == pytest.approx(3e5 * 700 / (K1 + 3e5), rel=1e-6)
