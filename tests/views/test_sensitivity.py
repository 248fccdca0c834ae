"""Frequencies and tensions against pretension, gathered over the analyses of a file."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fake_ropes import FORCE, FakeBridge, hanging_record, pieces_record
from results_files import write
from tautbar.errors import InputError
from tautbar.records.fields import Field
from tautbar.store import open_results
from tautbar.views.gallery import draw, plots_of
from tautbar.views.sensitivity import levels

CALM, STORM = "night: calm: 1 dead", "night: storm: 1 dead + 1 wind"
LONG = "firm, a state of the bridge with a name so long that the title takes two lines"


def tightened(name: str, factor: float, row: int = 0):
    """A state of one loading with all forces times a factor; the prop is there only in row 1."""
    record = hanging_record(name)
    one = {path: replace(f, values=f.values[:1]) for path, f in record.fields.items() if path[:4] != "rope"}
    one["axial_force"] = Field(factor * FORCE[row : row + 1], "N", "axial force", ("loading", "member"))
    return replace(record, fields=one)


def with_all_present(record):
    """Modes that say that every member is there, the prop too."""
    present = Field(np.ones(5, dtype=np.int8), "1", "there", ("member_with_pieces",))
    return replace(record, fields={**record.fields, "present": present})


@pytest.fixture(scope="module")
def results(tmp_path_factory):
    path = tmp_path_factory.mktemp("levels") / "bridge.h5"
    records = [
        hanging_record(),
        tightened("tight", 3.0),
        tightened(LONG, 2.0),
        tightened("propped", 2.5, row=1),
        pieces_record("m tight", "tight", CALM, scale=2.0),
        pieces_record("m calm", "hanging", CALM),
        pieces_record("m firm", LONG, CALM, scale=1.2),
        pieces_record("m firm again", LONG, CALM, scale=1.2),
        pieces_record("m storm", "hanging", STORM, scale=1.3),
        with_all_present(pieces_record("m propped", "propped", CALM, scale=1.4)),
        with_all_present(pieces_record("m propped since", "tight", CALM, scale=1.4)),
        pieces_record("m drawn", "the drawing"),
    ]
    with open_results(write(path, FakeBridge(), *records)) as results:
        yield results


def test_each_state_is_a_level_once_among_those_that_differ_by_pretension(results) -> None:
    found = {level.state: level for level in levels(results["m calm"])}
    assert set(found) == {"tight", "hanging (calm)", LONG}  # neither the storm nor the prop
    np.testing.assert_array_equal(found["tight"].force, 3.0 * FORCE[0])
    np.testing.assert_allclose(found["tight"].frequency, [3.0, 5.0])
    assert {level.acting for level in found.values()} == {"1 dead"}


@pytest.mark.parametrize("name", ["m storm", "m propped", "m propped since", "m drawn"])
def test_other_loads_or_other_members_are_not_joined(results, name) -> None:
    assert len(levels(results[name])) <= 1
    assert "sensitivity" not in plots_of(results[name])


def test_the_title_stays_on_the_page(results) -> None:
    figure = draw(results["m calm"], "sensitivity")
    figure.draw_without_rendering()
    (title,) = (
        t for t in figure.axes[0].get_children() if "at 3 states under 1 dead" in getattr(t, "_text", "")
    )
    assert title.get_window_extent().x1 <= figure.bbox.x1


def test_the_lines_go_through_the_levels_in_order_of_tension(results) -> None:
    figure = draw(results["m calm"], "sensitivity")
    upper, lower = figure.axes
    first = upper.get_lines()[0]
    # main.2 changes most among the ties: once, twice and three times 6 kN
    assert lower.get_xlabel() == "axial force of main.2, tension + [kN]"
    np.testing.assert_allclose(first.get_xdata(), [6.0, 12.0, 18.0])
    np.testing.assert_allclose(first.get_ydata(), [1.5, 1.8, 3.0])
    assert "mode 1: 1.50 to 3.00 Hz" in [line.get_label() for line in upper.get_lines()]
    tensions = {line.get_label(): line.get_ydata() for line in lower.get_lines()}
    np.testing.assert_allclose(tensions["main.1"], [5.0, 10.0, 15.0])
    assert "prop" not in tensions  # it never pulls


def test_a_mode_and_a_member_are_choices(results) -> None:
    figure = draw(results["m calm"], "sensitivity", mode=2, member="main.1")
    (line,) = figure.axes[0].get_lines()
    np.testing.assert_allclose(line.get_xdata(), [5.0, 10.0, 15.0])
    np.testing.assert_allclose(line.get_ydata(), [2.5, 3.0, 5.0])
    assert "of main.1" in draw(results["m calm"], "sensitivity", member="main").axes[1].get_xlabel()


def test_it_takes_two_levels(results, tmp_path) -> None:
    assert "sensitivity" in plots_of(results["m calm"])
    assert "sensitivity" not in plots_of(results["hanging"])
    with open_results(write(tmp_path / "a.h5", FakeBridge(), hanging_record(), pieces_record())) as one:
        assert "sensitivity" not in plots_of(one["modes"])


@pytest.mark.parametrize(
    ("choices", "message"),
    [
        ({"mode": 3}, "mode 3: there are modes 1 to 2"),
        ({"member": "mian"}, 'no member "mian"'),
        ({"member": "prop"}, 'member "prop" is not there in these states'),
    ],
)
def test_what_cannot_be_drawn_is_said(results, choices, message) -> None:
    with pytest.raises(InputError) as told:
        draw(results["m calm"], "sensitivity", **choices)
    assert message in str(told.value)
