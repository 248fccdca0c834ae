"""Frequencies of ropes, strings and bars against their classical theories."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from published import HELD, Array, case, values
from scipy.optimize import brentq

import tautbar

G = 9.80665
B01, C07, C10 = (case(name) for name in ("B01", "C07", "C10"))


def circular(model: tautbar.Model, state: Any = None, **settings: Any) -> Array:
    """Circular frequencies [rad/s] of an analysis."""
    return 2 * np.pi * tautbar.find_modes(model, state, **settings)["frequency"]


# ---------------------------------------------------------------- bars along their length (B01, C10)


def bar(n: int, *, ends: str = "fix-free", end_mass: float = 0.0) -> tautbar.Model:
    """A bar of length, EA and mass 1 in n members, free along itself only."""
    names = [f"p{i}" for i in range(n + 1)]
    held = names[:1] + (names[-1:] if ends == "fix-fixed" else [])
    return tautbar.Model(
        sections={"bar": {"axial_stiffness": 1.0, "mass_per_length": 1.0}},
        joints={name: [i / n, 0, 0] for i, name in enumerate(names)},
        members=[{"name": "bar", "chain": names, "section": "bar"}],
        supports=[{"joints": held, "fixed": ["x"]}, {"joints": names, "fixed": ["y", "z"]}],
        masses=[{"joints": names[-1:], "mass": end_mass}] if end_mass else [],
    )


@pytest.mark.parametrize(
    "row",
    [pytest.param(r, id=f"{r['bc']} {r['n']} {r['mass']}") for r in B01["table"] if r["mass"] != "mean"],
)
def test_bar_frequencies_of_both_mass_models(row: dict[str, Any]) -> None:
    """CLOSED FORM (dispersion of the chain), 1e-10 on all frequencies: eigenvalues to rounding.

    The table keeps 11 digits of the first ones, which are as good as that.
    """
    n, fixed = row["n"], row["bc"] == "fix-fixed"
    found = circular(bar(n, ends=row["bc"]), count=n - fixed, mass=row["mass"])
    j = np.arange(1, n + (not fixed))
    theta = j * np.pi / n if fixed else (2 * j - 1) * np.pi / (2 * n)
    if row["mass"] == "consistent":
        expected = n * np.sqrt(6 * (1 - np.cos(theta)) / (2 + np.cos(theta)))
    else:
        expected = 2 * n * np.sin(theta / 2)
    np.testing.assert_allclose(found, expected, rtol=1e-10)
    kept = np.array(row["omega_L_over_c"])
    np.testing.assert_allclose(found[: kept.size], kept, rtol=1e-10)


@pytest.mark.parametrize(("mass", "sign"), [("consistent", 1), ("lumped", -1)])
@pytest.mark.parametrize("ends", ["fix-free", "fix-fixed"])
def test_error_of_bar_frequencies_falls_with_the_square_of_the_length(
    ends: str, mass: str, sign: int
) -> None:
    """CLOSED FORM: the error is +-theta^2/24 + theta^4/1920; the next term is below 1e-3 of the second."""
    for n in (10, 20, 40):
        theta = np.pi / n if ends == "fix-fixed" else np.pi / (2 * n)
        exact = np.pi if ends == "fix-fixed" else np.pi / 2
        error = circular(bar(n, ends=ends), count=1, mass=mass)[0] / exact - 1
        assert error == pytest.approx(sign * theta**2 / 24 + theta**4 / 1920, abs=2e-3 * theta**4)


def test_textbook_bar_of_two_members() -> None:
    """Input READ in Kim, Sankar and Kumar, Introduction to Finite Element Analysis and Design; answer OWN,
    11 digits kept: 1e-10."""
    data = B01["textbook_inputs"][0]
    model = tautbar.Model(
        sections={"bar": {"axial_stiffness": 1e6, "mass_per_length": 0.042}},
        joints={"a": [0, 0, 0], "b": [1, 0, 0], "c": [2, 0, 0]},
        members=[{"name": "bar", "chain": ["a", "b", "c"], "section": "bar"}],
        supports=[{"joints": ["a"], "fixed": HELD}, {"joints": ["b", "c"], "fixed": ["y", "z"]}],
    )
    for mass in ("consistent", "lumped"):
        np.testing.assert_allclose(circular(model, count=2, mass=mass), data[f"{mass}_rad_s"], rtol=1e-10)


def end_mass_root(ratio: float, number: int = 1) -> float:
    """Root beta of beta tan beta = bar mass / end mass."""
    low = (number - 1) * np.pi
    return float(brentq(lambda b: b * np.sin(b) - ratio * np.cos(b), low + 1e-9, low + np.pi / 2, xtol=1e-14))


RATIOS = [0.01, 0.1, 1.0, 10.0, 100.0]


@pytest.mark.parametrize("ratio", RATIOS)
def test_bar_with_end_mass(ratio: float) -> None:
    """RECALLED equation (S. S. Rao, Mechanical Vibrations), exact roots.

    Consistent mass lies above and lumped below the root, and extrapolation from 40 and 80 members is
    within 1e-6 of it, as the data ask of roots; Rao's table is rounded in the 4th digit: 2e-3.
    """
    exact = end_mass_root(ratio)
    row = values("C10")[next(q for q in values("C10") if q == f"beta1, ratio {ratio:g}")]
    assert row["computed"] == pytest.approx(exact, rel=1e-6)
    for mass, sign in (("consistent", 1), ("lumped", -1)):
        coarse, fine = (circular(bar(n, end_mass=1 / ratio), count=1, mass=mass)[0] for n in (40, 80))
        assert sign * (coarse - exact) > sign * (fine - exact) > 0
        assert (coarse - exact) / (fine - exact) == pytest.approx(4, rel=5e-3)  # second order
        assert fine + (fine - coarse) / 3 == pytest.approx(exact, rel=1e-6)
        assert fine == pytest.approx(row["published"], rel=2e-3)


def test_higher_modes_of_a_bar_with_end_mass() -> None:
    """RECALLED handbook roots, 5 digits printed: 2e-5 (their half digit is 1.5e-5)."""
    coarse, fine = (circular(bar(n, end_mass=1.0), count=3) for n in (40, 80))
    found = fine + (fine - coarse) / 3
    for k in (2, 3):
        row = values("C10")[f"beta{k}, ratio 1"]
        assert found[k - 1] == pytest.approx(row["published"], rel=2e-5)
        assert found[k - 1] == pytest.approx(end_mass_root(1.0, k), rel=2e-5)


# ---------------------------------------------------------------- strings and nets (C09)


def string(beads: int, tension: float, bead: float, pitch: float) -> tautbar.Model:
    names = [f"p{i}" for i in range(beads + 2)]
    return tautbar.Model(
        plane="xz",
        sections={"string": {"axial_stiffness": 1e3 * tension}},
        joints={name: [i * pitch, 0] for i, name in enumerate(names)},
        members=[
            {"name": "s", "chain": names, "section": "string", "kind": "tension-only", "pretension": tension}
        ],
        supports=[{"joints": [names[0], names[-1]], "fixed": ["x", "z"]}],
        masses=[{"joints": names[1:-1], "mass": bead}],
    )


@pytest.mark.parametrize("beads", [1, 2, 3, 7, 20])
def test_string_of_beads(beads: int) -> None:
    """CLOSED FORM 2 sqrt(T/(m a)) sin(n pi/(2 (N + 1))), 1e-10, for any number of beads."""
    T, m, a = 120.0, 0.4, 0.25
    n = np.arange(1, beads + 1)
    expected = 2 * np.sqrt(T / (m * a)) * np.sin(n * np.pi / (2 * (beads + 1)))
    found = circular(string(beads, T, m, a), count=beads)
    np.testing.assert_allclose(found, expected, rtol=1e-10)


def test_three_beads_as_printed() -> None:
    """READ (a printed answer quoted on a web page): cut to two digits after the point, hence 0.01.

    Against the frequency nu1 of the string with its mass M spread out; 8 digits of the computed ones.
    """
    T, M, L = 50.0, 0.6, 2.0
    found = circular(string(3, T, M / 3, L / 4), count=3) / (2 * np.pi) / np.sqrt(T / (4 * M * L))
    for k, ratio in enumerate(found, 1):
        row = values("C09")[f"mode {k} / nu1"]
        assert ratio == pytest.approx(row["published"], abs=0.01)
        assert ratio == pytest.approx(row["computed"], abs=1e-7)


def test_flat_net() -> None:
    """CLOSED FORM of the discrete membrane, sqrt(8T/(m a)) sin(pi/10): 1e-10; OWN number, 9 digits."""
    T, m, a, count = 100.0, 2.0, 1.0, 6
    name = [[f"j{i}{k}" for k in range(count)] for i in range(count)]
    edge = [n for i, row in enumerate(name) for k, n in enumerate(row) if {i, k} & {0, count - 1}]
    inner = [n for row in name for n in row if n not in edge]
    lines = name[1:-1] + [[row[k] for row in name] for k in range(1, count - 1)]
    model = tautbar.Model(
        sections={"string": {"axial_stiffness": 1e5}},
        joints={name[i][k]: [i * a, k * a, 0] for i in range(count) for k in range(count)
                if name[i][k] in inner or {i, k} & set(range(1, count - 1))},
        members=[
            {"name": f"line{i}", "chain": line, "section": "string", "kind": "tension-only", "pretension": T}
            for i, line in enumerate(lines)
        ],
        supports=[
            {"joints": [n for n in edge if n not in {name[i][k] for i in (0, -1) for k in (0, -1)}],
             "fixed": HELD},
            {"joints": inner, "fixed": ["x", "y"]},
        ],
        masses=[{"joints": inner, "mass": m}],
    )  # fmt: skip
    found = circular(model, count=16)
    assert found[0] == pytest.approx(np.sqrt(8 * T / (m * a)) * np.sin(np.pi / 10), rel=1e-10)
    row = values("C09")["flat 4x4 net omega1 (T=100,m=2,a=1)"]
    assert found[0] == pytest.approx(row["published"], abs=5e-9)
    s = np.sin(np.arange(1, 5) * np.pi / 10) ** 2
    every = 2 * np.sqrt(T / (m * a) * np.sort((s[:, None] + s[None, :]).ravel()))
    np.testing.assert_allclose(found, every, rtol=1e-10)


# ---------------------------------------------------------------- hanging chains (C08)


def chain(
    links: int, *, tip: float = 0.0, joint_mass: float | None = None, stiff: float = 1e6
) -> tautbar.Model:
    """A chain of length 1 m and mass 1 kg hanging down, its EA ``stiff`` times its weight.

    ``joint_mass``: massless links with that mass at each joint instead.
    """
    names = [f"p{i}" for i in range(links + 1)]
    m = 1.0 if joint_mass is None else 0.0
    masses = [{"joints": names[1:], "mass": joint_mass}] if joint_mass else []
    masses += [{"joints": names[-1:], "mass": tip}] if tip else []
    return tautbar.Model(
        plane="xz",
        sections={"link": {"axial_stiffness": stiff * G, "mass_per_length": m}},
        joints={name: [0, -i / links] for i, name in enumerate(names)},
        members=[{"name": "link", "chain": names, "section": "link", "kind": "tension-only"}],
        supports=[{"joints": names[:1], "fixed": ["x", "z"]}],
        masses=masses,
        load_cases={"weight": {"self_weight": 1.0}},
    )


def swing(model: tautbar.Model, count: int, mass: str = "lumped") -> Array:
    """omega sqrt(L/g) of the lowest modes about the chain hanging at rest."""
    state = tautbar.solve_static(model, "weight")
    return circular(model, state, count=count, mass=mass) / np.sqrt(G)


BESSEL = [values("C08")[f"j0{k}"]["computed"] for k in (1, 2, 3)]  # zeros of J0, READ to 5 digits


def test_hanging_chain_of_160_links() -> None:
    """READ zeros of J0 (D. Bernoulli 1732, Euler 1781): 2e-5, 2e-4, 7e-4, what 160 lumped links leave."""
    found = swing(chain(160), 3)
    for w, zero, limit in zip(found, BESSEL, (2e-5, 2e-4, 7e-4), strict=True):
        assert w == pytest.approx(zero / 2, rel=limit)
    for k in (1, 2):
        row = values("C08")[f"omega{k} sqrt(L/g), 160 " + ("lumped links" if k == 1 else "links")]
        assert found[k - 1] == pytest.approx(row["computed"], rel=1e-6)  # OWN; EA is 1e6 weights


def test_error_of_a_hanging_chain_falls_with_the_square_of_its_links() -> None:
    """The measured errors of mode 1 (C08 notes) to their printed digits, and order 2 to 1 %."""
    errors = [swing(chain(n, stiff=1e7), 1)[0] / (BESSEL[0] / 2) - 1 for n in (10, 20, 40, 80)]
    for error, printed, half in zip(
        errors, (-0.295, -0.074, -0.0185, -0.0046), (5e-4, 5e-4, 5e-5, 5e-5), strict=True
    ):
        assert 100 * error == pytest.approx(printed, abs=half)
    ratios = np.array(errors[:-1]) / np.array(errors[1:])
    np.testing.assert_allclose(ratios, 4, rtol=0.01)


@pytest.mark.parametrize(
    ("beads", "quantity"), [(2, "double pendulum omega^2 l/g low"), (3, "triple pendulum lowest")]
)
def test_chain_of_equal_pendulums(beads: int, quantity: str) -> None:
    """RECALLED: omega^2 l/g are the zeros of Laguerre's polynomial. 2e-8: 8 printed digits, and links that
    stretch by 1e-9 of their length for each mass below."""
    found = swing(chain(beads, joint_mass=1.0, stiff=1e9), beads) ** 2 / beads
    assert found[0] == pytest.approx(values("C08")[quantity]["published"], rel=2e-8)
    zeros = np.polynomial.laguerre.lagroots([0.0] * beads + [1.0])
    np.testing.assert_allclose(found, np.sort(zeros), rtol=2e-8)


def test_hanging_chain_with_equal_tip_mass() -> None:
    """OWN (Bessel J0, Y0). The limits of 160 lumped links above: 2e-5, 2e-4. Extrapolated from 80:
    2e-6, for the weight of chain and tip stretches the chain by 1.5e-6 of its length."""
    coarse, fine = swing(chain(80, tip=1.0), 2), swing(chain(160, tip=1.0), 2)
    quantities = ("chain + equal tip mass, omega1 sqrt(L/g)", "chain + equal tip mass, omega2")
    for k, quantity in enumerate(quantities):
        expected = values("C08")[quantity]["published"]
        assert fine[k] == pytest.approx(expected, rel=(2e-5, 2e-4)[k])
        assert fine[k] + (fine[k] - coarse[k]) / 3 == pytest.approx(expected, rel=2e-6)


# ---------------------------------------------------------------- suspended cables (C07)


def irvine_caughey(lambda2: float) -> float:
    """First symmetric in-plane root omega l sqrt(m/H)/pi of Irvine and Caughey's equation."""

    def f(w: float) -> float:
        h = w / 2
        return float(np.sin(h) - (h - 4 / lambda2 * h**3) * np.cos(h))

    return float(brentq(f, 1.001 * np.pi, 2.99 * np.pi, xtol=1e-13)) / np.pi


@pytest.mark.parametrize("key", ["1", "10", "20", "50", "100", "200", "400", "1000", "10000"])
def test_roots_of_irvine_and_caughey(key: str) -> None:
    """CLOSED FORM: the equation of these tests is that of the data, to its 10 digits."""
    assert irvine_caughey(float(key)) == pytest.approx(C07["extra"]["roots_over_pi"][key][0], abs=1e-9)


def suspended(sag_ratio: float, lambda2: float, pieces: int = 120) -> tuple[tautbar.Model, float]:
    """A level cable of span 100 m with that sag and lambda^2, and H [N]; 1 kg/m."""
    l, w = 100.0, 1.0 * G
    d = sag_ratio * l
    H = w * l**2 / (8 * d)
    Le = l * (1 + 8 * sag_ratio**2)
    EA = lambda2 * H * Le / ((w * l / H) ** 2 * l)
    model = tautbar.Model(
        plane="xz",
        sections={"rope": {"axial_stiffness": EA, "mass_per_length": 1.0}},
        joints={"A": [0, 0], "B": [l, 0]},
        members=[
            {"name": "rope", "from": "A", "to": "B", "kind": "hanging", "section": "rope", "sag": d,
             "pieces": pieces}
        ],
        supports=[{"joints": ["A", "B"], "fixed": ["x", "z"]}],
        load_cases={"weight": {"self_weight": 1.0}},
    )  # fmt: skip
    return model, H


@pytest.mark.parametrize(
    ("sag_ratio", "lambda2", "limit"),
    [
        (1 / 100, 20.0, 1e-3),
        (1 / 100, 99.98, 1e-3),
        (1 / 50, 20.0, 1e-3),
        (1 / 20, 400.0, 5e-3),
        (1 / 8, 9421.0, 3e-2),
    ],
)
def test_suspended_cable(sag_ratio: float, lambda2: float, limit: float) -> None:
    """RECALLED: Irvine and Caughey, Proc. R. Soc. A 341 (1974) 299-315, a linear theory of flat cables.

    Supporting: its own error grows with the sag, 1e-3 up to 1/50, 5e-3 up to 1/20, 3e-2 at 1/8.
    """
    model, H = suspended(sag_ratio, lambda2)
    state = tautbar.solve_static(model, "weight")
    modes = tautbar.find_modes(model, state, count=4, mass="lumped")
    inner = list(range(2, 2 + 119))
    vertical = modes["shape"][:, inner, 2]
    symmetric = np.abs(vertical - vertical[:, ::-1]).max(axis=1) < 1e-3 * np.abs(vertical).max(axis=1)
    assert symmetric.any()
    assert not symmetric.all()
    w = 2 * np.pi * modes["frequency"] * 100.0 * np.sqrt(1.0 / H) / np.pi
    assert w[symmetric][0] == pytest.approx(irvine_caughey(lambda2), rel=limit)


@pytest.mark.parametrize(("lambda2", "quantity"), [(20.0, "w1/pi lambda^2=20, chain model sag 1/100")])
def test_suspended_cable_against_another_program(lambda2: float, quantity: str) -> None:
    """OWN: an independent chain of 240 lumped bars; 1e-4, the links' own error (pi/240)^2/24 being less."""
    model, H = suspended(1 / 100, lambda2, pieces=240)
    state = tautbar.solve_static(model, "weight")
    f = tautbar.find_modes(model, state, count=1, mass="lumped")["frequency"][0]
    assert 2 * f * 100.0 / np.sqrt(H) == pytest.approx(values("C07")[quantity]["computed"], rel=1e-4)


@pytest.mark.parametrize("stiff", [1e7, 1e8])
def test_the_slow_sway_of_a_stiff_chain_is_no_mechanism(stiff: float) -> None:
    """C08 again, for ropes as stiff as real ones: a frequency must not be rounded to 0 Hz.

    1e-4: the discretisation error of mode 1 (2e-5) and what rounding of EA leaves in K.
    """
    model = chain(160, stiff=stiff)
    state = tautbar.solve_static(model, {"weight": 1.0})
    modes = tautbar.find_modes(model, state, count=2)
    assert 2 * np.pi * modes["frequency"][0] / np.sqrt(G) == pytest.approx(1.202412779, rel=1e-4)
    assert int(modes["audit/zero_modes"]) == 0
