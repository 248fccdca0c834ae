"""Form-finding: shapes that can be written down, what follows the shape, and what gives none."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar.analyses.job import Job
from tautbar.model.parts import FormFinding, Loading

g = 9.80665


def chain(count=8, span=12.0, EA=2e5, line=0.0, kind="tension-only", **more):
    """A chain of equal steps between two hooks, drawn crooked, its loads at the inner joints."""
    joints = {f"j{i}": (span * i / count, 0, 0.3 * (i % 2)) for i in range(count + 1)}
    joints["j0"], joints[f"j{count}"] = (0, 0, 0), (span, 0, 0)
    links = [member(f"t{i}", f"j{i}", f"j{i + 1}", kind=kind, section="link") for i in range(count)]
    return structures.words(
        joints,
        links,
        sections={"link": {"axial_stiffness": EA, "mass_per_length": line}},
        supports=[held("j0", f"j{count}")],
        load_cases={
            "loads": {"forces": [{"joints": [f"j{i}" for i in range(1, count)], "force": [0, 0, -50.0]}]},
        },
        **more,
    )


def found(words, density=40.0, loads="loads", **asked):
    """The record of a form-finding with one force density, and the job."""
    given = [{"members": [m["name"] for m in words["members"]], "value": density}]
    analysis = {"name": "f", "kind": "form-finding", "loads": loads, "force_densities": given} | asked
    words = words | {"analyses": [analysis, *words.get("analyses", [])]}
    job = Job(structures.build(words).parts)
    return job.run("f"), job


def test_a_chain_under_equal_loads_is_a_polygon_on_a_parabola():
    """z_i = -P i (n - i)/(2 q), x evenly spaced: second differences of z are P/q."""
    record, _ = found(chain())
    i = np.arange(9)
    expected = np.stack([1.5 * i, 0 * i, -50.0 * i * (8 - i) / (2 * 40)], axis=1)
    np.testing.assert_allclose(record["position"], expected, atol=1e-12 * 12)
    assert record.status == "complete"


def test_tensions_and_lengths_are_those_of_the_force_densities():
    record, _ = found(chain())
    l = np.linalg.norm(np.diff(record["position"], axis=0), axis=1)
    # Checked by a static solve: balanced to 1e-9 of the largest force.
    np.testing.assert_allclose(record["axial_force"][0], 40 * l, rtol=1e-8)
    np.testing.assert_allclose(record["unstressed_length"], l / (1 + 40 * l / 2e5), rtol=1e-14)
    assert record["force_density"].tolist() == [40.0] * 8


def test_weight_follows_the_lengths_found():
    """At every inner joint the pulls hold the load and half the weight of the lengths on either side."""
    record, _ = found(chain(line=2.0), loads={"loads": 1.0, "dead": 1.0}, density=60.0)
    assert record.status == "complete", record.outcome
    z, weight = record["position"][:, 2], 2.0 * g * record["unstressed_length"]
    pull = 60.0 * np.diff(np.diff(z))
    np.testing.assert_allclose(pull, 50.0 + 0.5 * (weight[:-1] + weight[1:]), rtol=1e-11)


def test_too_small_for_the_weight():
    record, _ = found(chain(line=20.0), loads={"dead": 1.0}, density=5.0)
    assert record.status == "failed"
    assert "too small for the weight" in record.outcome


def test_bars_may_push():
    """The same chain in compression is an arch, the parabola upside down; of hinged bars it is unstable."""
    record, _ = found(chain(kind="bar", EA=2e6), density=-40.0)
    assert record.status == "failed"
    assert "unstable" in record.outcome


def test_a_prop_between_ties():
    """One bar in compression holds two pairs of ties apart: q = -2 against 2 x 2 in a row of five joints."""
    words = structures.words(
        {"A": (0, 0, 0), "B": (6, 0, 0), "C": (2, 1, 0), "D": (2, -2, 0)},
        [
            *(member(f"t{a}{b}", a, b, kind="tension-only") for a in "AB" for b in "CD"),
            member("prop", "C", "D"),
        ],
        supports=[held("A", "B"), {"joints": ["C", "D"], "fixed": ["z"]}],
        load_cases={"pull": {"forces": [{"joints": ["C"], "force": [0, 90.0, 0]}]}},
    )
    given = [{"members": ["t*"], "value": 60.0}, {"members": ["prop"], "value": -45.0}]
    record, _ = found(words, loads="pull", force_densities=given)
    # By hand: C and D stay at x = 3; 120 y_C - 45 (y_C - y_D) = 90 and 120 y_D - 45 (y_D - y_C) = 0.
    K = np.array([[120 - 45, 45], [45, 120 - 45]])
    y = np.linalg.solve(K, [90.0, 0.0])
    np.testing.assert_allclose(record["position"][2:, 0], 3.0, rtol=1e-13)
    np.testing.assert_allclose(record["position"][2:, 1], y, rtol=1e-12)
    assert record.status == "complete", record.outcome
    assert record["axial_force"][0, 4] == pytest.approx(-45 * (y[0] - y[1]), rel=1e-8)


def test_later_analyses_start_from_the_shape():
    words = chain(
        line=0.5,
        analyses=[
            {"name": "s", "kind": "static", "from": "f"},
            {"name": "m", "kind": "modes", "from": "f", "count": 2},
        ],
    )
    shape, job = found(words)
    static = job.run("s")
    np.testing.assert_allclose(static["axial_force"], shape["axial_force"], rtol=1e-8)
    np.testing.assert_allclose(static["displacement"], shape["displacement"], atol=1e-9)
    modes = job.run("m")
    assert modes.status == "complete"
    assert modes["frequency"][0] > 0.1


def test_take_up_and_temperature_are_allowed_for():
    """The lengths are those at the model's temperature, without take-up; the shape is the same."""
    words = chain()
    words["sections"]["link"]["expansion"] = 1e-4
    plain, _ = found(words)
    words["load_cases"]["loads"] |= {
        "temperature_change": 40.0,
        "take_up": [{"members": ["t3"], "length": 0.1}],
    }
    record, _ = found(words)
    np.testing.assert_allclose(record["position"], plain["position"], atol=1e-12 * 12)
    expected = plain["unstressed_length"] / 1.004
    expected[3] += 0.1
    np.testing.assert_allclose(record["unstressed_length"], expected, rtol=1e-13)
    np.testing.assert_allclose(record["axial_force"], plain["axial_force"], rtol=1e-8)


def test_a_support_moved_and_one_inclined():
    """The free end slides along (1, 0, 1)/sqrt 2, held across it, and its hook has come down by 0.2 m."""
    words = structures.words(
        {"A": (0, 0, 0), "B": (4, 0, 0), "C": (2, 0, 5)},
        [member("ab", "A", "B", kind="tension-only"), member("bc", "B", "C", kind="tension-only")],
        supports=[held("A", "C"), {"joints": ["B"], "along": [1, 0, -1]}, {"joints": ["B"], "fixed": ["y"]}],
        load_cases={
            "loads": {
                "forces": [{"joints": ["B"], "force": [30.0, 0, 0]}],
                "movements": [{"joints": ["C"], "move": [0, 0, -0.2]}],
            }
        },
    )
    record, _ = found(words, density=25.0)
    x, _, z = record["position"][1]
    assert x - z == pytest.approx(4.0, abs=1e-12)
    # Along the way in: 25 (A - B) + 25 (C - B) + P has no part along (1, 0, 1).
    assert 25 * (-x - z) + 25 * (2 - x + 4.8 - z) + 30.0 == pytest.approx(0.0, abs=1e-10)


# What gives no shape.


def test_a_singular_net_names_the_joint_that_is_free():
    words = structures.words(
        {"A": (0, 0, 0), "B": (1, 0, 0), "C": (2, 0, 0)},
        [member("ab", "A", "B"), member("bc", "B", "C")],
        supports=[held("A", "C"), {"joints": ["B"], "fixed": ["y", "z"]}],
    )
    given = [{"members": ["ab"], "value": 2.0}, {"members": ["bc"], "value": -2.0}]
    record, job = found(words, loads="dead", force_densities=given)
    assert record.status == "failed"
    assert record.outcome.startswith("NOT A RESULT: the force densities give a singular net")
    assert "they leave joint B in x free" in record.outcome
    assert "f" not in job.context.states


def test_compression_that_leaves_no_length():
    words = structures.words(
        {"A": (0, 0, 0), "B": (1, 0, 0), "C": (2, 0, 0)},
        [member("ab", "A", "B"), member("bc", "B", "C")],
        supports=[held("A", "C"), {"joints": ["B"], "fixed": ["y", "z"]}],
    )
    given = [{"members": ["ab"], "value": 9e6}, {"members": ["bc"], "value": -3e6}]
    record, _ = found(words, loads="dead", force_densities=given)
    assert "bc: compression as large as the axial stiffness leaves no length" in record.outcome


def test_every_member_wants_a_force_density():
    words = chain(count=2)
    parts = structures.build(words).parts
    record = Job(parts).do(FormFinding("f", Loading("loads", {"loads": 1.0}), (((0,), 5.0),)))
    assert record.status == "failed"
    assert "no force density is given for t1" in record.outcome
