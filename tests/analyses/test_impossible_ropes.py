"""Ropes whose pretension no length gives: as drawn a mistake with its place, later a failed analysis."""

from __future__ import annotations

import pytest

from tautbar.analyses.job import prepare
from tautbar.errors import ModelError
from tautbar.model.reading import model_from_text
from tautbar.records.fields import Record

SOFT = """\
plane = "xz"
joints = { A = [0, 0], B = [10, 3] }
sections.s = { axial_stiffness = "2 kN", mass_per_length = 5 }
supports = [ { joints = ["A", "B"], fixed = ["x", "z"] } ]
[[members]]
name = "bar"
from = "A"
to = "B"
section = "s"
[[members]]
name = "rope"
from = "A"
to = "B"
kind = "hanging"
section = "s"
"""
LEAST = 276.389  # N, by `catenary.least_tension`, itself tested in tests/mechanics/test_least_tension.py


@pytest.mark.parametrize("how", ["", "pieces = 8\n", "absent = true\n", "pieces = 3\nabsent = true\n"])
def test_an_impossible_pretension_as_drawn_is_told_with_the_least_possible(how: str) -> None:
    """270 N is above what the model's check can rule out (250 N), below what the soft rope can have."""
    text = SOFT + how + 'pretension = "270 N"\n'
    with pytest.raises(ModelError) as caught:
        prepare(model_from_text(text, file="rope.toml"))
    (mistake,) = caught.value.mistakes
    assert mistake.path == 'member "rope": pretension'
    assert mistake.source_line == 'pretension = "270 N"'
    assert mistake.what.endswith(f"with these ends it is at least {LEAST} N")
    assert prepare(model_from_text(text.replace("270", "277")))


STAGES = """\
plane = "xz"
joints = { A = [0, 0], C = [5, 5], D = [10, 5], E = [10, 0] }
sections.s = { axial_stiffness = "20 MN", mass_per_length = 5 }
sections.soft = { axial_stiffness = "0.2 kN", mass_per_length = 0.001 }
members = [
 { name = "new", from = "A", to = "C", kind = "hanging", section = "s", absent = true, NEW },
 { name = "old", from = "A", to = "C", kind = "hanging", section = "s", OLD },
 { name = "bar", from = "E", to = "C", section = "soft" },
 { name = "bar2", from = "D", to = "C", section = "soft" },
]
supports = [ { joints = ["A", "C", "D", "E"], fixed = ["x", "z"] } ]
load_cases.moved = { self_weight = 1, movements = [ { joints = ["C"], move = [2, 0.5] } ] }
[[analyses]]
name = "moved"
kind = "static"
loads = "moved"
[[analyses]]
name = "put in"
kind = "static"
from = "moved"
with = ["new"]
"""


def put_in(new: str, old: str) -> Record:
    job = prepare(model_from_text(STAGES.replace("NEW", new).replace("OLD", old)))
    first = job.run("moved")
    assert isinstance(first, Record)
    assert first.status == "complete"
    record = job.run("put in")
    assert isinstance(record, Record)
    return record


@pytest.mark.parametrize("pieces", ["", ", pieces = 4"])
def test_a_rope_that_its_ends_do_not_allow_when_it_comes_fails_the_analysis(pieces: str) -> None:
    """168 N is possible as drawn (least 167 N), not between the ends that have moved (169 N)."""
    record = put_in("pretension = 168" + pieces, "pretension = 300")
    assert record.status == "failed"
    assert record.outcome.startswith("NOT A RESULT: new cannot be put in where its ends are by then")
    assert "at least 168.7" in record.outcome


@pytest.mark.parametrize("pieces", ["", ", pieces = 4"])
def test_ropes_that_are_there_keep_their_lengths_when_others_come(pieces: str) -> None:
    """The old rope's pretension was of the drawing; it is not asked for again between moved ends."""
    assert put_in("pretension = 300", "pretension = 168" + pieces).status == "complete"
