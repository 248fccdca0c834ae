"""Members that are not there are not drawn as if they were."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.collections import LineCollection

from structures import build, held, member, words
from tautbar.run import run
from tautbar.views.drawing import Drawing
from tautbar.views.envelopes import envelope
from tautbar.views.gallery import draw

JOINTS = {"A": (0, 0, 0), "B": (4, 0, 0), "C": (2, 0, 1.5), "D": (6, 0, 1.5), "E": (2, 2, 0)}
LATE = 3  # the prop


@pytest.fixture(scope="module")
def results(tmp_path_factory):
    """Three legs hold C; the prop is absent, the tie is taken away by every analysis."""
    members = [
        member("west", "A", "C"),
        member("east", "B", "C"),
        member("north", "E", "C"),
        member("prop", "D", "C", absent=True),
        member("tie", "D", "C", "tension-only"),
    ]
    analyses = [
        {"name": "swings", "kind": "modes", "from": "as drawn", "without": ["tie"]},
        {"name": "buckles", "kind": "buckling", "loads": "dead", "count": 1, "without": ["tie"]},
        {"name": "pushed", "kind": "equilibrium-path", "loads": "dead", "without": ["tie"],
         "stop_at": {"load_factor": 2.0}},
        {"name": "propped", "kind": "modes", "from": "as drawn", "without": ["tie"], "with": ["prop"]},
    ]  # fmt: skip
    model = build(words(JOINTS, members, supports=[held("A", "B", "D", "E")], analyses=analyses))
    with run(model, tmp_path_factory.mktemp("there") / "legs.h5") as results:
        yield results


def lines(figure) -> list[LineCollection]:
    return [c for c in figure.axes[0].collections if isinstance(c, LineCollection)]


def labels(figure) -> list[str]:
    legend = figure.axes[0].get_legend()
    return [text.get_text() for text in legend.get_texts()]


@pytest.mark.parametrize(("name", "count"), [("swings", 3), ("propped", 4), ("buckles", 3)])
def test_a_mode_shows_only_members_that_are_there(results, name, count) -> None:
    assert [len(c.get_paths()) for c in lines(draw(results[name], "mode"))] == [count] * 3


def test_the_displaced_path_and_its_forces_leave_them_out(results) -> None:
    figure = draw(results["pushed"], "displaced")
    pale, *coloured = lines(figure)
    assert len(pale.get_paths()) == 3
    assert [len(c.get_paths()) for c in coloured] == [3]
    assert not any("slack" in label for label in labels(figure))
    np.testing.assert_array_equal(np.isnan(envelope(results["pushed"]).high), [0, 0, 0, 1, 1])


def test_the_model_shows_those_that_come_later_apart(results) -> None:
    figure = draw(results["swings"], "structure")
    assert {"bar (3)", "tension-only (1)", "not there at first (1)"} <= set(labels(figure))
    later = next(c for c in lines(figure) if c.get_label().startswith("not there"))
    drawing = Drawing(results["swings"], as_modelled=True)
    np.testing.assert_allclose(
        [p.vertices for p in later.get_paths()], drawing.seen(drawing.positions)[drawing.ends[[LATE]]]
    )
    (dash,) = later.get_linestyle()
    assert dash[1] is not None


def test_a_mechanism_moves_only_what_is_there_at_first(tmp_path) -> None:
    members = [member("west", "A", "C"), member("prop", "D", "C", absent=True)]
    analysis = {"name": "hangs", "kind": "static", "loads": "dead"}
    model = build(
        words({k: JOINTS[k] for k in "ACD"}, members, supports=[held("A", "D")], analyses=[analysis])
    )
    with run(model, tmp_path / "a.h5") as results:
        figure = draw(results["hangs"], "mechanism")
    assert [len(c.get_paths()) for c in lines(figure)] == [1, 1, 1, 1]
    assert "not there at first (1)" in labels(figure)
