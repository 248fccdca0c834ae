"""Catenaries all at once: pulls, stiffness and energy against many digits, and every kind of rope found."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest

import plain
from tautbar.mechanics import hanging, members
from tautbar.mechanics.hanging import Ropes, hang

# Unstressed length [m], axial stiffness over weight, weight per length [N/m], level and rise [m].
KINDS = {
    "level": (21.0, 1e4, 12.0, 20.0, 0.0),
    "inclined": (30.0, 1e4, 12.0, 20.0, 16.0),
    "inclined, taut": (25.6, 1e4, 12.0, 20.0, -16.0),
    "vertical": (30.0, 1e4, 12.0, 0.0, 30.5),
    "vertical, head down": (30.0, 1e4, 12.0, 0.0, -30.5),
    "doubled back": (30.0, 1e4, 12.0, 0.0, 7.0),
    "doubled back, slanting": (30.0, 1e4, 12.0, 0.4, -7.0),
    "ends in one place": (30.0, 1e4, 12.0, 0.0, 0.0),
    "very slack": (1000.0, 1e4, 12.0, 20.0, 3.0),
    "nearly inextensible, slack": (25.7, 1e12, 12.0, 20.0, 16.0),
    "nearly inextensible, taut": (25.612, 1e12, 12.0, 20.0, 16.0),
    "very stretchy": (4.0, 0.5, 12.0, 20.0, 3.0),
    "weight 1e-6": (20.1, 1e9, 1e-6, 20.0, 4.0),
    "weight 1e-12": (20.1, 1e15, 1e-12, 20.0, 4.0),
    "weight 1e-12, slack": (20.9, 1e15, 1e-12, 20.0, 4.0),
}


def one(name, turn=0.3):
    """The rope of a kind, its plane turned about the vertical, and the vector between its ends."""
    L0, stiff, w, x, z = KINDS[name]
    rope = ropes([L0], [stiff * w * L0], [w])
    return rope, np.array([[x * np.cos(turn)], [x * np.sin(turn)], [z]])


def ropes(L0, EA, w):
    down = np.zeros((3, len(L0)))
    down[2] = -1.0
    return Ropes(np.array(L0, float), np.array(EA, float), np.array(w, float), down)


def numbers(rope, hung, i=0):
    return hung.H[i], hung.V[i], rope.L0[i], rope.EA[i], rope.w[i]


def used_level(rope, r):
    """The level distance that is solved for: at the plumb line a hair beside it."""
    return np.maximum(np.hypot(r[0], r[1]), hanging.VERTICAL * rope.L0)


def gap(rope, hung, r, i=0):
    """How far the span of the pulls found is from the ends [m], to 60 digits."""
    with mpmath.workdps(60):
        span = plain.catenary_span(*(mpmath.mpf(float(v)) for v in numbers(rope, hung, i)))
        return float(max(abs(span[0] - used_level(rope, r)[i]), abs(span[1] - r[2, i])))


@pytest.mark.parametrize("name", KINDS)
def test_pulls_span_the_distance(name):
    """To rounding of the lengths: 20 eps of them, what sums and the last Newton step leave."""
    rope, r = one(name)
    hung = hang(rope, r)
    assert hung.ok.all()
    assert gap(rope, hung, r) <= 20 * hanging.EPS * (rope.L0[0] + np.abs(r).sum())


@pytest.mark.parametrize("name", KINDS)
def test_flexibility_against_many_digits(name):
    """Every entry to 1e-10 of the two it lies between; 5e-11 is met a hair beside the plumb line."""
    rope, r = one(name)
    hung = hang(rope, r)
    found = hanging._flexibility(hung.H, hung.V, rope)
    exact = plain.catenary_flexibility(*numbers(rope, hung))
    size = [float(exact[0]), float(mpmath.sqrt(exact[0] * exact[2])), float(exact[2])]
    for a, b, of in zip(found, exact, size, strict=True):
        assert a[0] == pytest.approx(float(b), abs=1e-10 * of)


@pytest.mark.parametrize("name", ["level", "inclined", "doubled back, slanting", "very stretchy"])
def test_flexibility_by_complex_step(name):
    """The textbook span in complex numbers, where it does not cancel: no differences of near numbers."""
    rope, r = one(name)
    hung = hang(rope, r)
    H, V, L0, EA, w = numbers(rope, hung)
    J = plain.jacobian(lambda pulls: plain.catenary_span(*pulls, L0, EA, w), [H, V])
    a, b, c = (v[0] for v in hanging._flexibility(hung.H, hung.V, rope))
    assert np.array([[a, b], [b, c]]) == pytest.approx(J, rel=1e-9, abs=1e-12 * np.abs(J).max())


def matrix(blocks, i=0):
    xx, yy, zz, xy, xz, yz = blocks[:, i]
    return np.array([[xx, xy, xz], [xy, yy, yz], [xz, yz, zz]])


@pytest.mark.parametrize("name", KINDS)
def test_stiffness_is_the_inverse_of_the_flexibility(name):
    """In the rope's plane the inverse to many digits; across it H/x; positive definite always.

    The determinant cancels as much as the stiffness along the chord exceeds that across it: eps times
    their ratio, no more than 1e-8 here (taut, nearly inextensible).
    """
    rope, r = one(name)
    hung = hang(rope, r)
    a, b, c = plain.catenary_flexibility(*numbers(rope, hung))
    with mpmath.workdps(60):
        det = a * c - b * b
        k = np.array([[float(c / det), float(-b / det)], [float(-b / det), float(a / det)]])
    x = np.hypot(r[0, 0], r[1, 0])
    u = np.array([np.cos(0.3), np.sin(0.3), 0.0])
    across, up = np.array([-u[1], u[0], 0.0]), np.array([0.0, 0.0, 1.0])
    K = matrix(hung.stiffness)
    turn = hung.H[0] / used_level(rope, r)[0]
    if x > 0:
        assert u @ K @ u == pytest.approx(k[0, 0], abs=1e-8 * k.max())
        assert u @ K @ up == pytest.approx(k[0, 1], abs=1e-8 * k.max())
    else:
        assert u @ K @ u == pytest.approx(turn, rel=1e-12), "in the plumb line alike in all level directions"
    assert up @ K @ up == pytest.approx(k[1, 1], rel=1e-8)
    assert across @ K @ across == pytest.approx(turn, rel=1e-10)
    assert across @ K @ up == pytest.approx(0.0, abs=1e-12 * k.max())
    assert np.linalg.eigvalsh(K).min() > 0


def along(rope, r, step, count=40):
    """Work of the pull and of the stiffness over a straight move of the end, by Gauss's rule."""
    s, weight = np.polynomial.legendre.leggauss(count)
    work, change = 0.0, np.zeros(3)
    for share, part in zip(0.5 + 0.5 * s, 0.5 * weight, strict=True):
        hung = hang(rope, r + share * step)
        work += part * float((hung.pull * step).sum())
        change += part * members.block_times(hung.stiffness, step)[:, 0]
    return work, change


# Moves of a part in a hundred of the rope, oblique to its plane; shorter for stiff ropes, whose pulls
# change too fast for the rule otherwise.
MOVES = dict.fromkeys(KINDS, 1e-2) | {
    "nearly inextensible, taut": 1e-6,
    "nearly inextensible, slack": 1e-4,
    "vertical": 1e-4,
    "vertical, head down": 1e-4,
    "weight 1e-6": 1e-4,
    "weight 1e-12": 1e-4,
    "inclined, taut": 1e-3,
}
PLUMB = ("vertical", "vertical, head down", "doubled back", "ends in one place")


@pytest.mark.parametrize("name", [n for n in KINDS if n not in PLUMB])
def test_energy_and_pull_are_the_integrals_of_what_is_called_their_slopes(name):
    """Energy over the pull and pull over the stiffness, along a finite move: 1e-9 of what they change by.

    Beside that, the rounding of what is subtracted: eps times energy and pull, and times stiffness by length.
    """
    rope, r = one(name)
    step = MOVES[name] * rope.L0[0] * np.array([[0.5], [-0.7], [0.4]])
    start, end = hang(rope, r), hang(rope, r + step)
    work, change = along(rope, r, step)
    eps = 50 * hanging.EPS
    pull = np.abs(end.pull - start.pull).max()
    rounding = eps * (np.abs(start.pull).max() + np.abs(start.stiffness).max() * rope.L0[0])
    assert end.pull[:, 0] - start.pull[:, 0] == pytest.approx(change, abs=1e-9 * pull + rounding)
    rounding = eps * abs(start.energy[0]) + rounding * np.abs(step).max()
    assert end.energy[0] - start.energy[0] == pytest.approx(work, abs=1e-9 * abs(work) + rounding)


@pytest.mark.parametrize("name", PLUMB)
def test_energy_is_smooth_through_the_plumb_line(name):
    """Within a hair of the plumb line the level pull is taken as linear: its work is still the energy."""
    rope, r = one(name)
    step = np.array([[0.6], [0.0], [0.0]]) * hanging.VERTICAL * rope.L0
    a, b = r - step, r + 0.5 * step
    work, _ = along(rope, a, b - a)
    change = hang(rope, b).energy[0] - hang(rope, a).energy[0]
    assert change == pytest.approx(work, abs=4 * hanging.EPS * abs(hang(rope, a).energy[0]))
    assert hang(rope, a).pull[0, 0] == pytest.approx(-2 * hang(rope, b).pull[0, 0], rel=1e-9)


def test_without_weight_it_is_the_tie():
    """Pull and stiffness of a taut rope as its weight goes to nothing: EA e/L0 along n, N/l across."""
    L0, EA = 20.1, 5e6
    r = np.array([[16.0], [12.0], [5.0]])
    l = np.sqrt((r * r).sum())
    n = r[:, 0] / l
    N = EA * (l - L0) / L0
    tie = EA / L0 * np.outer(n, n) + N / l * (np.eye(3) - np.outer(n, n))
    for w in (1e-3, 1e-6, 1e-9, 1e-12):
        hung = hang(ropes([L0], [EA], [w]), r)
        # The rope's own part is (w L0/N)^2/24 of the strain, 1e-13 at the heaviest here.
        assert hung.pull[:, 0] == pytest.approx(N * n, rel=1e-10)
        assert matrix(hung.stiffness) == pytest.approx(tie, rel=1e-9, abs=1e-9 * EA / L0)
        stored = N * N * L0 / (2 * EA)
        assert hung.energy[0] == pytest.approx(stored, rel=1e-8)


def test_the_order_of_ropes_does_not_matter():
    """Each rope for itself: alone, together and in another order the same to the last digit."""
    both = [one(name) for name in KINDS]
    rope = Ropes(*(np.concatenate([b[0][k] for b in both], axis=-1) for k in range(4)))
    r = np.concatenate([b[1] for b in both], axis=1)
    together = hang(rope, r)
    back = hang(Ropes(*(v[..., ::-1] for v in rope)), r[:, ::-1])
    assert (together.pull == back.pull[:, ::-1]).all()
    for i, (single, at) in enumerate(both):
        assert hang(single, at).pull[:, 0] == pytest.approx(together.pull[:, i], rel=1e-12, abs=1e-12)


def random_ropes(seed, count):
    """Of all lengths, stiffnesses of 0.1 to 1e12 times the weight, slack to taut, level to plumb."""
    rng = np.random.default_rng(seed)
    L0, w = 10 ** rng.uniform(-1, 3, count), 10 ** rng.uniform(-3, 3, count)
    EA = 10 ** rng.uniform(-1, 12, count) * w * L0
    near = 10 ** rng.uniform(-8, 0, count)
    share = np.choose(
        rng.integers(0, 4, count), [rng.uniform(0.01, 1, count), 1 - near, 1 + near, 0.01 * near]
    )
    angle = rng.uniform(-np.pi / 2, np.pi / 2, count)
    for start, exactly in enumerate((np.pi / 2, -np.pi / 2, 0.0, np.pi / 2 - 1e-8)):
        angle[start::50] = exactly
    way = rng.uniform(0, 2 * np.pi, count)
    level = L0 * share * np.cos(angle)
    r = np.stack([level * np.cos(way), level * np.sin(way), L0 * share * np.sin(angle)])
    r[:2, 0::50] = r[:2, 1::50] = 0.0
    return ropes(L0, EA, w), r


def test_twenty_thousand_random_ropes_are_all_found():
    rope, r = random_ropes(1, 20_000)
    hung = hang(rope, r)
    assert hung.ok.all()
    assert (hung.H > 0).all()
    reach = rope.L0 + np.abs(r).sum(axis=0)
    # 1e-11 is what the program itself calls found, by its own span; here by another, to 60 digits.
    for i in range(0, 20_000, 25):
        assert gap(rope, hung, r, i) <= 1e-11 * reach[i]
    xx, yy, zz, xy, xz, yz = hung.stiffness
    K = np.moveaxis(np.array([[xx, xy, xz], [xy, yy, yz], [xz, yz, zz]]), 2, 0)
    assert np.linalg.eigvalsh(K).min() > 0


# ---- shape ----


def test_tension_along_the_rope_is_greatest_at_an_end_and_h_at_the_lowest_point():
    for name in ("level", "inclined", "very stretchy"):
        rope, r = one(name)
        hung = hang(rope, r)
        start, end = (t[0] for t in hanging.end_tensions(rope, hung))
        assert hanging.greatest_tension(rope, hung)[0] == max(start, end)
        # Vertical balance and the level pull, from the ends alone.
        low, high = np.sqrt(start**2 - hung.H[0] ** 2), np.sqrt(end**2 - hung.H[0] ** 2)
        weight = rope.w[0] * rope.L0[0]
        assert min(abs(high - low), abs(high + low), key=lambda v: abs(v - weight)) == pytest.approx(weight)


def test_lowest_point_is_the_lowest_of_many():
    origin = np.array([[3.0], [-1.0], [2.0]])
    for name in ("level", "inclined", "inclined, taut", "very stretchy", "doubled back, slanting"):
        rope, r = one(name)
        hung = hang(rope, r)
        low = hanging.lowest_point(rope, hung, origin, r)[:, 0]
        curve = hanging.curve(rope, hung, origin, r, 2001)[0]
        lowest = curve[curve[:, 2].argmin()]
        # Between 2000 points along the rope the true one is lower by at most a piece's sagitta.
        assert low[2] <= lowest[2] + 1e-12
        assert low == pytest.approx(lowest, abs=rope.L0[0] / 1500 * max(1.0, np.abs(r).max() / rope.L0[0]))
        assert low[2] == pytest.approx(lowest[2], abs=1e-3)


def test_curve_starts_and_ends_at_the_ends():
    origin = np.array([[3.0], [-1.0], [2.0]])
    for name in KINDS:
        rope, r = one(name)
        curve = hanging.curve(rope, hang(rope, r), origin, r, 9)[0]
        assert curve[0] == pytest.approx(origin[:, 0], abs=1e-14)
        assert curve[-1] == pytest.approx((origin + r)[:, 0], abs=1e-11 * rope.L0[0])
