"""What a static analysis refuses to call an answer, and what it says instead."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar import AnalysisFailed, ModelError, solve_static
from tautbar.analyses.job import prepare

NUMBERS = ("displacement", "axial_force", "reaction", "end_tension", "loose_length")


def failed(described, loads="dead", **settings):
    """The failure and its record."""
    with pytest.raises(AnalysisFailed) as caught:
        solve_static(structures.build(described), loads, **settings)
    assert caught.value.exit_code == 3
    assert str(caught.value).startswith("NOT A RESULT")
    assert caught.value.record.status == "failed"
    return caught.value.record


def column(**extra):
    """Two bars in line, one on the other, with nothing beside the joint between them."""
    return structures.words(
        {"A": (0, 0, 0), "B": (0, 0, 2), "C": (0, 0, 4)},
        [member("lower", "A", "B"), member("upper", "B", "C")],
        supports=[held("A"), {"joints": ["C"], "fixed": ["x", "y"]}],
        **extra,
    )


def test_a_column_of_two_bars_in_line_is_unstable():
    record = failed(column())
    assert "the equilibrium is unstable" in record.outcome
    assert record["audit/negative_pivots"][0] == 2
    assert "stability: FAILED for dead" in record.audit_lines
    for path in NUMBERS:
        assert np.isnan(record[path]).all(), path


def test_what_gives_way_in_an_unstable_column_is_named():
    assert "(2 negative pivots): joint B gives way in" in failed(column()).outcome


def test_the_same_column_hung_up_is_stable():
    described = column()
    described["supports"] = [held("C")]
    a = solve_static(structures.build(described), "dead")
    assert a.axial_force("upper")[0] == pytest.approx(1.5 * structures.LINE * 2 * 9.80665, rel=1e-6)


def test_a_failed_loading_has_no_numbers_and_the_others_keep_theirs():
    described = column(
        load_cases={"lift": {"forces": [{"joints": ["C"], "force": [0, 0, 900.0]}]}},
        combinations={"both": {"in_turn": [{"lift": 1.0, "dead": 1.0}]}},
    )
    record = failed(described, "both")
    assert list(record["converged"]) == [1, 0]
    for path in NUMBERS:
        values = record[path]
        assert np.isfinite(values[0]).all()
        assert np.isnan(values[1]).all()
    assert "envelope/max" not in record.fields
    assert record.outcome.splitlines()[0].startswith("NOT A RESULT, both: dead 1")


def test_a_loose_joint_is_named_and_harmless():
    """A middle joint of two slack ties that nothing pulls can lie anywhere."""
    described = structures.words(
        {"A": (0, 0, 0), "B": (4, 0, 0), "M": (2, 0, 0), "C": (2, 2, 0)},
        [
            member("a", "A", "M", kind="tension-only", slack=0.1),
            member("b", "M", "B", kind="tension-only", slack=0.1),
            member("ac", "A", "C"),
            member("bc", "B", "C"),
        ],
        supports=[held("A", "B"), {"joints": ["C"], "fixed": ["z"]}],
        load_cases={"push": {"forces": [{"joints": ["C"], "force": [0, -500.0, 0]}]}},
    )
    a = solve_static(structures.build(described), "push")
    assert a["audit/zero_pivots"][0] == 3
    assert any("joint M is loose" in w for w in a.record.warnings)
    assert not any("joint C" in w for w in a.record.warnings)
    assert a.axial_force("ac")[0] == pytest.approx(-250 * np.sqrt(2), rel=1e-3)


def test_a_joint_held_by_second_order_is_said_so():
    """Two bars in line, free of force, hold their middle sideways only once it has moved."""
    described = structures.words(
        {"A": (0, 0, 0), "B": (4, 0, 0), "M": (2, 0, 0)},
        [member("a", "A", "M"), member("b", "M", "B")],
        supports=[held("A", "B"), {"joints": ["M"], "fixed": ["y"]}],
        load_cases={"rest": {"forces": [{"joints": ["M"], "force": [0, 0, 0]}]}},
    )
    a = solve_static(structures.build(described), "rest")
    assert any("joint M is held in z only once it has moved" in w for w in a.record.warnings)


def test_a_mechanism_under_small_geometry_names_joint_and_direction():
    described = structures.words(
        {"A": (0, 0, 0), "B": (4, 0, 0), "C": (0, 0, 3), "D": (4, 0, 3)},
        [member("left", "A", "C"), member("right", "B", "D"), member("top", "C", "D")],
        supports=[held("A", "B"), {"joints": ["C", "D"], "fixed": ["y"]}],
    )
    model = structures.build(described)
    with pytest.raises(ModelError, match=r"a mechanism: nothing holds joint [CD] in x") as caught:
        solve_static(model, "dead", geometry="small")
    assert caught.value.exit_code == 2
    described["analyses"] = [{"name": "s", "kind": "static", "loads": "dead", "geometry": "small"}]
    with pytest.raises(ModelError, match="nothing holds joint") as caught:
        prepare(structures.build(described))
    assert 'analysis "s"' in caught.value.mistakes[0].path


def test_a_symmetric_mast_leaves_its_saddle_and_says_so():
    """Upright between slack guys the mast balances, unstably; it leans until guys hold it."""
    a = solve_static(structures.build(structures.guyed_mast(slack=0.05)), "dead")
    assert a["audit/negative_pivots"][0] == 0
    top = a.displacement("top")[0]
    lean = np.hypot(top[0], top[1])
    # Guys at 39 degrees with 50 mm too much: the top leans some 0.1 to 0.2 m before they hold.
    assert 0.05 < lean < 0.3
    assert a["taut"][0].sum() == 3
    assert any("the balance reached first was unstable" in w for w in a.record.warnings)


def test_both_sides_of_a_saddle_are_tried_and_the_nearer_is_reported():
    """A mast between two guys of unequal slack: it leans to the side of less way."""
    described = structures.words(
        {"foot": (0, 0), "top": (0, 5), "L": (-4, 0), "R": (4, 0)},
        [
            member("mast", "foot", "top"),
            member("left", "L", "top", kind="tension-only", slack=0.02),
            member("right", "R", "top", kind="tension-only", slack=0.06),
        ],
        supports=[{"joints": ["foot", "L", "R"], "fixed": ["x", "y"]}],
        masses=[{"joints": ["top"], "mass": 50.0}],
        plane="xy",
    )
    a = solve_static(structures.build(described), "dead")
    # Leaning right tightens the left guy, which has less slack: by slack over the cosine of its angle,
    # and some 6 % more by the curve that the top goes on and the guy's stretch.
    assert a.displacement("top")[0, 0] == pytest.approx(0.02 * np.hypot(4, 5) / 4, rel=0.1)
    assert a.axial_force("left")[0] > 0 == a.axial_force("right")[0]


def test_a_folded_structure_is_refused_unless_meant():
    """A bar on one pin falls and hangs: a perfectly stable balance that is not the structure drawn."""
    described = structures.words(
        {"A": (0, 0, 0), "B": (2, 0, 0.5)},
        [member("arm", "A", "B")],
        supports=[held("A"), {"joints": ["B"], "fixed": ["y"]}],
    )
    record = failed(described)
    assert "the structure folded: arm turned 104 degrees" in record.outcome
    assert 'folding = "allowed"' in record.outcome
    assert record["audit/greatest_turn"][0] == pytest.approx(np.pi / 2 + np.arctan2(0.5, 2), abs=1e-4)
    assert np.isnan(record["axial_force"]).all()
    a = solve_static(structures.build(described), "dead", folding=True)
    assert a.displacement("B")[0] == pytest.approx([-2, 0, -0.5 - np.hypot(2, 0.5)], abs=1e-4)


def test_no_equilibrium_is_said_with_the_place():
    """A load that no member can carry: a joint on slack ties pulled away with nothing to hold it."""
    described = structures.words(
        {"A": (0, 0, 0), "B": (2, 0, 0)},
        [member("strut", "A", "B", kind="compression-only")],
        supports=[held("A"), {"joints": ["B"], "fixed": ["y", "z"]}],
        load_cases={"pull": {"forces": [{"joints": ["B"], "force": [100.0, 0, 0]}]}},
    )
    record = failed(described, "pull")
    assert "no equilibrium found; still out of balance by 100 N at joint B in x" in record.outcome
    assert "stability: not judged" in "\n".join(record.audit_lines)
    assert np.isnan(record["displacement"]).all()


def test_later_analyses_cannot_start_from_a_failed_one():
    described = column(analyses=[{"name": "s", "kind": "static", "loads": "dead"}])
    job = prepare(structures.build(described))
    assert job.run("s").status == "failed"
    assert "s" not in job.context.states
