"""Hanging members as curves, ropes in pieces, members that are not there."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fake_ropes import FORCE, JOINTS, MOVED, SAG, FakeBridge, along, hanging_record, pieces_record
from results_files import write
from tautbar.errors import InputError
from tautbar.store import open_results
from tautbar.views.gallery import draw, plots_of, save
from tautbar.views.ropes import _sides, curves


@pytest.fixture(scope="module")
def results(tmp_path_factory):
    path = tmp_path_factory.mktemp("ropes") / "bridge.h5"
    records = [hanging_record(), pieces_record(), hanging_record("straight", curves=False)]
    with open_results(write(path, FakeBridge(), *records)) as results:
        yield results


def words_of(figure) -> str:
    texts = [text.get_text() for axes in figure.axes for text in axes.texts]
    texts += [axes.get_title(loc="left") for axes in figure.axes]
    legends = [axes.get_legend() for axes in figure.axes if axes.get_legend()]
    return "\n".join(texts + [text.get_text() for legend in legends for text in legend.get_texts()])


@pytest.mark.parametrize("scale", [0.0, 1.0, 20.0])
def test_curves_go_with_their_ends_and_keep_their_sag(results, scale) -> None:
    bent = curves(results["hanging"], 0, MOVED, scale)
    place = np.array(list(JOINTS.values())) + scale * MOVED
    assert set(bent) == {0, 1}
    np.testing.assert_allclose(bent[0][[0, -1]], place[[0, 2]], atol=1e-12)
    chord = (place[0] + place[2]) / 2.0
    np.testing.assert_allclose(bent[0][16], chord - [0.0, 0.0, SAG["main.1"]], atol=1e-12)
    if scale == 1.0:
        np.testing.assert_allclose(bent[1], along("main.2"), atol=1e-12)


def test_hanging_members_are_drawn_as_curves(results) -> None:
    for what in ("structure", "displaced"):
        figure = draw(results["hanging"], what)
        lengths = {len(path.vertices) for c in figure.axes[0].collections for path in c.get_paths()}
        assert lengths == {2, 33}, what
    straight = draw(results["straight"], "displaced")
    assert {len(p.vertices) for c in straight.axes[0].collections for p in c.get_paths()} == {2}


def test_a_member_that_is_not_there_is_not_drawn(results) -> None:
    figure = draw(results["hanging"], "displaced", loading="night: calm")
    coloured = next(c for c in figure.axes[0].collections if c.get_array() is not None)
    np.testing.assert_allclose(sorted(coloured.get_array()), [2.0, 5.0, 6.0])
    rest = figure.axes[0].collections[0]
    assert len(rest.get_paths()) == 3
    assert "slack" not in words_of(figure)


def test_the_family_of_all_loadings_is_left_out_of_the_title(results) -> None:
    assert "hanging: storm\n" in words_of(draw(results["hanging"], "displaced", loading="night: storm"))


def test_sag_lowest_point_and_tensions_of_a_rope(results) -> None:
    (side,) = _sides(results["hanging"], "main.1", "night: storm")
    assert side.sag == pytest.approx(SAG["main.1"], rel=1e-12)  # the drop of a parabola is a parabola
    assert side.ends == ("W", "M")
    assert side.tension == (FORCE[1, 0] - 100.0, FORCE[1, 0] + 100.0)
    assert side.lowest[1] == along("main.1")[:, 2].min()
    assert side.along[[0, -1]] == pytest.approx([0.0, 4.01])
    text = words_of(draw(results["hanging"], "rope-curve", member="main.1", loading="night: storm"))
    assert "storm: sag 400 mm, lowest point at " in text
    assert "6.90 kN at W, 7.10 kN at M" in text


def test_the_rope_that_sags_most_is_the_default_for_all_loadings(results) -> None:
    text = words_of(draw(results["hanging"], "rope-curve"))
    assert "hanging: 2 loadings\nmain.1 from the side" in text
    assert "calm: sag 400 mm" in text
    assert "storm: sag 400 mm" in text


def test_a_group_of_ropes_is_drawn_for_one_loading(results) -> None:
    figure = draw(results["hanging"], "rope-curve", member="main")
    text = words_of(figure)
    assert "hanging: calm\n2 ropes from the side" in text
    assert "main.2: sag 250 mm" in text
    deepest = [line.get_ydata().max() for line in figure.axes[1].get_lines()]
    np.testing.assert_allclose(deepest, [400.0, 250.0])


def test_a_rope_blown_above_its_chord_says_so(tmp_path) -> None:
    record = hanging_record()
    blown = np.stack([along(name) + [0.0, 0.0, 2.0] * bow(SAG[name]) for name in SAG])
    curve = record.fields["rope_curve/position"]
    fields = {**record.fields, "rope_curve/position": replace(curve, values=np.stack([blown, blown]))}
    with open_results(write(tmp_path / "a.h5", FakeBridge(), replace(record, fields=fields))) as results:
        (side,) = _sides(results["hanging"], "main.1", "night: calm")
        assert side.sag == pytest.approx(-SAG["main.1"], rel=1e-12)  # the mirrored parabola
        figure = draw(results["hanging"], "rope-curve")  # the one farthest from its chord
    text = words_of(figure)
    assert "calm: blown above its chord by 400 mm, lowest point" in text
    assert "sag" not in text
    assert figure.axes[1].get_ylabel() == "below the chord, above - [mm]"
    np.testing.assert_allclose(figure.axes[1].get_lines()[0].get_ydata().min(), -400.0)


def bow(sag: float) -> np.ndarray:
    """Rise (P, 1) [m] of a parabola over its chord."""
    share = np.linspace(0.0, 1.0, 33)[:, np.newaxis]
    return 4.0 * sag * share * (1.0 - share)


def test_what_does_not_hang_has_no_curve(results) -> None:
    with pytest.raises(InputError, match='no hanging member or group of them "hanger"'):
        draw(results["hanging"], "rope-curve", member="hanger")
    assert "rope-curve" not in plots_of(results["straight"])


def test_modes_with_ropes_in_pieces_are_drawn_where_the_pieces_are(results) -> None:
    figure = draw(results["modes"], "mode", mode=1)
    lines = figure.axes[0].collections[0]
    drawn = {tuple(point) for path in lines.get_paths() for point in path.vertices.tolist()}
    assert (2.0, 3.1) in drawn  # the joint between the pieces, seen square on
    assert len(lines.get_paths()) == 5


def test_results_with_pieces_answer_by_name(results) -> None:
    result = results["modes"]
    assert result.axes("shape") == ("mode", "joint", "direction")
    np.testing.assert_array_equal(result.shape("main.1@1")[0], [0.0, 0.0, 2.0])
    assert result.members_of("main.1") == ("main.1.1", "main.1.2")
    assert result.joints[-1] == "main.1@1"
    assert results["hanging"].joints == tuple(JOINTS)


@pytest.mark.parametrize("what", ["structure", "displaced", "forces", "rope-curve"])
def test_plots_of_ropes_are_the_same_bytes_twice(results, tmp_path, what) -> None:
    for name in "ab":
        save(draw(results["hanging"], what), tmp_path / f"{name}.png")
    assert (tmp_path / "a.png").read_bytes() == (tmp_path / "b.png").read_bytes()


@pytest.mark.parametrize("view", ["front", "side", "top", "30 20"])
def test_the_view_is_a_choice_and_the_axes_are_shown(results, view) -> None:
    axes = draw(results["hanging"], "displaced", view=view).axes[0]
    shown = {text.get_text() for text in axes.texts}
    assert {"front": {"x", "z"}, "side": {"y", "z"}, "top": {"x", "y"}}.get(view, {"x", "y", "z"}) <= shown
    assert any(text.endswith("m" if view != "30 20" else "m across the view") for text in shown)
