"""The plot of an equilibrium path and what else a path gives."""

from __future__ import annotations

import numpy as np
import pytest

from fake_ropes import FakeBridge, buckling_record, path_record
from results_files import write
from tautbar.errors import InputError
from tautbar.store import open_results
from tautbar.views.gallery import draw, plots_of, save
from tautbar.views.states import critical_names


@pytest.fixture(scope="module")
def results(tmp_path_factory):
    path = tmp_path_factory.mktemp("paths") / "bridge.h5"
    with open_results(write(path, FakeBridge(), path_record(), buckling_record())) as results:
        yield results


def test_what_a_path_and_a_buckling_give(results) -> None:
    assert set(plots_of(results["collapse"])) == {"structure", "displaced", "forces", "path"}
    assert set(plots_of(results["buckling"])) == {"structure", "mode"}


def test_the_path_of_the_joint_that_moves_most(results, tmp_path) -> None:
    figure = draw(results["collapse"], "path")
    axes = figure.axes[0]
    assert axes.get_xlabel() == "displacement of M in z [m]"
    stable, unstable = axes.get_lines()[:2]
    np.testing.assert_allclose(stable.get_xdata(), np.linspace(0.0, -0.5, 6), atol=1e-12)
    np.testing.assert_allclose(unstable.get_xdata(), np.linspace(-0.5, -1.0, 6), atol=1e-12)
    assert unstable.get_linestyle() != "-"
    for name in "ab":
        save(draw(results["collapse"], "path"), tmp_path / f"{name}.svg")
    assert (tmp_path / "a.svg").read_bytes() == (tmp_path / "b.svg").read_bytes()


def test_critical_points_are_marked_by_type_and_named(results) -> None:
    axes = draw(results["collapse"], "path").axes[0]
    marks = {line.get_label(): line for line in axes.get_lines()}
    assert marks["limit point (1)"].get_xdata().tolist() == [-0.5]
    assert marks["bifurcation (1)"].get_ydata().tolist() == pytest.approx([0.96])
    assert marks["limit point (1)"].get_marker() != marks["bifurcation (1)"].get_marker()
    assert {text.get_text() for text in axes.texts} == {"limit point 1, 1.000", "bifurcation 1, 0.9600"}
    assert critical_names(results["collapse"]) == ("limit point 1", "bifurcation 1")


@pytest.mark.parametrize(
    ("choices", "label"),
    [
        ({"joint": "Q"}, "displacement of Q in x [mm]"),
        ({"direction": "x"}, "displacement of Q in x [mm]"),
        ({"joint": "M", "direction": "x"}, "displacement of M in x"),
    ],
)
def test_another_displacement(results, choices, label) -> None:
    assert draw(results["collapse"], "path", **choices).axes[0].get_xlabel().startswith(label)


def test_the_displaced_shape_at_a_point_of_the_path(results) -> None:
    title = draw(results["collapse"], "displaced").axes[0].get_title(loc="left")
    assert title.startswith("collapse: at the end, load factor 0\ngreatest displacement 1.00 m")
    title = draw(results["collapse"], "displaced", at="bifurcation 1").axes[0].get_title(loc="left")
    assert title.startswith("collapse: the step nearest to bifurcation 1, load factor 0.9600\n")
    assert "608 mm" not in title
    assert "603 mm" in title or "600 mm" in title  # 0.6 m down; Q goes 0.06 m sideways


def test_the_range_of_forces_is_over_the_steps(results) -> None:
    axes = draw(results["collapse"], "forces").axes[0]
    assert "over 11 steps of the path" in axes.get_title(loc="left")
    assert any(text.get_text() == "load factor 1" for text in axes.texts)


def test_a_buckling_mode_has_its_load_factor(results) -> None:
    title = draw(results["buckling"], "mode", mode=2).axes[0].get_title(loc="left")
    assert title.startswith("buckling: buckling mode 2, load factor -4.000\n")


@pytest.mark.parametrize(
    ("what", "choices", "message"),
    [
        ("path", {"joint": "X"}, 'no joint "X"'),
        ("path", {"direction": "up"}, 'direction "up": choose x, y or z'),
        ("displaced", {"at": "limit point 2"}, 'no point of the path "limit point 2" (did you mean "limit'),
        ("displaced", {"loading": "calm"}, 'has no choice "loading": choose a point of the path'),
    ],
)
def test_what_cannot_be_drawn_is_said(results, what, choices, message) -> None:
    with pytest.raises(InputError) as told:
        draw(results["collapse"], what, **choices)
    assert message in str(told.value)
