"""Where the onlooker stands: named views, angles, and the view that suits a structure."""

from __future__ import annotations

import numpy as np
import pytest

from tautbar.errors import InputError
from tautbar.views.viewpoint import viewpoint

X, Y, Z = np.eye(3)
CUBE = np.array([[x, y, z] for x in (0, 1) for y in (0, 1) for z in (0, 1)], dtype=float)


def rows(positions, up=2, view=None):
    return viewpoint(np.asarray(positions, dtype=float), up, view)[0]


@pytest.mark.parametrize(
    ("view", "right", "upward"),
    [("front", X, Z), ("side", Y, Z), ("top", X, Y), ("0 0", X, Z), ("90 0", Y, Z)],
)
def test_named_views_look_along_an_axis(view, right, upward) -> None:
    np.testing.assert_allclose(rows(CUBE, view=view), [right, upward], atol=1e-15)


@pytest.mark.parametrize(("up", "right", "upward"), [(0, Y, X), (1, X, Y), (2, X, Z)])
def test_up_is_up_in_front(up, right, upward) -> None:
    np.testing.assert_allclose(rows(CUBE, up, "front"), [right, upward], atol=1e-15)


@pytest.mark.parametrize("up", [0, 1, 2])
def test_a_view_by_angles_keeps_lengths_across_it(up) -> None:
    view = rows(CUBE, up, "30 20")
    np.testing.assert_allclose(view @ view.T, np.eye(2), atol=1e-15)
    assert view[1, up] == pytest.approx(np.cos(np.radians(20.0)))
    assert view[0, up] == 0.0


@pytest.mark.parametrize("word", ["left", "30", "30 20 10", "30,20", ""])
def test_other_views_are_refused(word) -> None:
    with pytest.raises(InputError, match=r'choose front, side, top, or azimuth and elevation .* "30 20"'):
        rows(CUBE, view=word)


@pytest.mark.parametrize("angle", [0.0, 4.0, 30.0, 90.0, 150.0])
def test_a_long_level_structure_stays_level(angle) -> None:
    """Its length lies level on paper, its height upright, whichever way it points in plan."""
    c, s = np.cos(np.radians(angle)), np.sin(np.radians(angle))
    gantry = CUBE * [30.0, 2.0, 3.0] @ np.array([[c, s, 0.0], [-s, c, 0.0], [0.0, 0.0, 1.0]])
    view, true_across = viewpoint(gantry, 2, None)
    assert true_across
    along = gantry[4] - gantry[0]
    seen = view @ along
    # within ten degrees of an axis that axis is level instead; its depth is drawn at half of 45 degrees
    tilt = np.sin(np.radians(angle)) * 0.5 * np.sqrt(0.5) if angle < 10.0 else 0.0
    assert abs(seen[1] / seen[0]) == pytest.approx(tilt, abs=2e-3 if tilt else 1e-12)
    np.testing.assert_allclose(view @ Z, [0.0, 1.0], atol=1e-15)


def test_others_are_seen_from_a_corner_a_little_above() -> None:
    view, true_across = viewpoint(CUBE * 5.0, 2, None)
    assert not true_across
    assert (view @ X)[0] > 0.5 < (view @ X)[0]
    assert (view @ Y)[1] > 0.1
    assert (view @ Z)[1] > 0.9


@pytest.mark.parametrize(("flat", "right", "upward"), [(1, X, Z), (0, Y, Z), (2, X, Y)])
def test_plane_structures_are_seen_square_on(flat, right, upward) -> None:
    plane = CUBE * [3.0, 2.0, 1.0]
    plane[:, flat] = 7.0
    np.testing.assert_allclose(rows(plane), [right, upward], atol=1e-15)


@pytest.mark.parametrize("positions", [np.zeros((0, 3)), np.zeros((1, 3)), [[0, 0, 0], [0, 0, 5]]])
def test_hardly_anything_is_seen_all_the_same(positions) -> None:
    assert np.isfinite(rows(np.reshape(positions, (-1, 3)))).all()
