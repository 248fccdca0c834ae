"""The plot of mechanisms: from the file alone, whatever the analysis, and only where there are any."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.text import Annotation

from structures import build, held, member, words
from tautbar.errors import InputError
from tautbar.run import run
from tautbar.views.drawing import Drawing
from tautbar.views.gallery import draw, plots_of, save

LINE = {"A": (0, 0, 0), "B": (2, 0, 0), "C": (5, 0, 0)}


def results_of(tmp_path, **more):
    """A line of two ties, joint B free: two mechanisms; it hangs under its weight."""
    members = [member("AB", "A", "B", "tension-only", **more), member("BC", "B", "C", "tension-only")]
    analysis = {"name": "hangs", "kind": "static", "loads": "dead"}
    model = build(words(LINE, members, supports=[held("A", "C")], analyses=[analysis], title="Tow line"))
    return run(model, tmp_path / "line.h5")


def arrows(figure):
    return [t for t in figure.axes[0].texts if isinstance(t, Annotation) and t.arrow_patch is not None]


def title(figure) -> str:
    return figure.axes[0].get_title(loc="left")


@pytest.mark.parametrize(("number", "axis"), [(1, 1), (2, 2)])
def test_the_mechanism_asked_for_is_drawn(tmp_path, number, axis) -> None:
    with results_of(tmp_path, pretension=800.0) as results:
        result = results["hangs"]
        figure = draw(result, "mechanism", mode=number, scale=2.0)
        assert title(figure) == (
            f"Tow line: mechanism {number} of 2\nthe pretension given stiffens it\n"
            "size of the move is arbitrary"
        )
        drawing = Drawing(result, as_modelled=True)
        move = np.zeros((3, 3))
        move[1, axis] = 2.0 * 0.08 * drawing.size
        (arrow,) = arrows(figure)
        np.testing.assert_allclose(arrow.xy, drawing.seen(drawing.positions + move)[1], atol=1e-12)
        paths = [p.vertices for p in figure.axes[0].collections[2].get_paths()]
        wanted = drawing.seen(drawing.positions + move)[drawing.ends]
        np.testing.assert_allclose(paths, wanted, atol=1e-12)
        names = [t.get_text() for t in figure.axes[0].texts]
        assert "B" in names
        assert "A" not in names


def test_without_pretension_it_says_so_and_counts_its_modes(tmp_path) -> None:
    with results_of(tmp_path) as results:
        assert "pretension could stiffen it, none is given" in title(draw(results["hangs"], "mechanism"))
        with pytest.raises(InputError, match="mechanisms and motions as rigid bodies 1 to 2"):
            draw(results["hangs"], "mechanism", mode=3)


def test_the_same_bytes_each_time(tmp_path) -> None:
    with results_of(tmp_path) as results:
        for name in ("a.png", "b.png"):
            save(draw(results["hangs"], "mechanism"), tmp_path / name)
    assert (tmp_path / "a.png").read_bytes() == (tmp_path / "b.png").read_bytes()


def triangle(tmp_path, *supports):
    joints = {"A": (0, 0), "B": (2, 0), "C": (0, 2)}
    members = [member(pair, *pair) for pair in ("AB", "BC", "CA")]
    analysis = {"name": "stands", "kind": "static", "loads": "dead"}
    more = {"plane": "xz", "unsupported": "allowed", "analyses": [analysis]}
    return run(build(words(joints, members, supports=list(supports), **more)), tmp_path / "triangle.h5")


def test_motions_as_rigid_bodies_come_after_the_mechanisms(tmp_path) -> None:
    with triangle(tmp_path, {"joints": ["A"], "fixed": ["x", "z"]}) as results:
        figure = draw(results["stands"], "mechanism")
        assert "motion as a rigid body 1 of 1" in title(figure)
        assert len(arrows(figure)) == 2


def test_a_structure_without_mechanisms_does_not_offer_the_plot(tmp_path) -> None:
    with triangle(
        tmp_path, {"joints": ["A"], "fixed": ["x", "z"]}, {"joints": ["B"], "fixed": ["z"]}
    ) as results:
        assert "mechanism" not in plots_of(results["stands"])
        with pytest.raises(InputError, match='cannot give the plot "mechanism"'):
            draw(results["stands"], "mechanism")
