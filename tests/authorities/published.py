"""The published cases in data/, and the few lines that turn their numbers into models."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

import tautbar

Array = NDArray[np.float64]
DATA = Path(__file__).parent / "data"
HELD = ["x", "y", "z"]


def case(name: str) -> Any:
    """A case by the start of its file's name."""
    (path,) = DATA.glob(f"{name}*.json")
    return json.loads(path.read_text(encoding="utf-8"))


def values(name: str) -> dict[str, dict[str, Any]]:
    """Rows of a case that lists its values, by what they are."""
    return {row["quantity"]: row for row in case(name)["values"]}


def half_digit(printed: float, digits: int) -> float:
    """Half a unit of the last of so many significant digits."""
    return float(0.5 * 10.0 ** (np.floor(np.log10(abs(printed))) - digits + 1))


def in_line(
    stiffness: list[float], masses: list[float], force: list[float], *, held_end: bool = True
) -> tautbar.Model:
    """Masses in a line with springs before, between and (``held_end``) behind them, free along it only.

    Joints are "m0" (held), "m1", ...; the load case "push" acts on the masses.
    """
    names = [f"m{i}" for i in range(len(stiffness) + 1)]
    moving = names[1 : len(masses) + 1]
    ends = [names[0], names[-1]] if held_end else [names[0]]
    return tautbar.Model(
        joints={name: [float(i), 0, 0] for i, name in enumerate(names)},
        sections={f"k{i}": {"stiffness": k} for i, k in enumerate(stiffness)},
        members=[
            {"name": f"k{i}", "from": names[i], "to": names[i + 1], "section": f"k{i}"}
            for i in range(len(stiffness))
        ],
        supports=[{"joints": ends, "fixed": HELD}, {"joints": moving, "fixed": ["y", "z"]}],
        masses=[{"joints": [name], "mass": m} for name, m in zip(moving, masses, strict=True)],
        load_cases={
            "push": {
                "forces": [{"joints": [n], "force": [p, 0, 0]} for n, p in zip(moving, force, strict=True)]
            }
        },
    )


def crossings(t: Array, x: Array, v: Array) -> Array:
    """Instants [s] at which a response x(t) with rate v passes zero, by cubic interpolation in the step."""
    found = []
    for i in np.flatnonzero(x[:-1] * x[1:] < 0):
        h = t[i + 1] - t[i]
        a, b, c, d = _cubic(x[i], x[i + 1], h * v[i], h * v[i + 1])
        roots = np.roots([a, b, c, d])
        real = roots[(np.abs(roots.imag) < 1e-9) & (roots.real > -1e-9) & (roots.real < 1 + 1e-9)].real
        found.append(t[i] + h * real[0])
    return np.array(found)


def peak(t: Array, x: Array, v: Array) -> float:
    """The largest value of a response, also between its steps, by cubic interpolation."""
    best = float(x.max())
    h = np.diff(t)
    a, b, c, d = _cubic(x[:-1], x[1:], h * v[:-1], h * v[1:])
    disc = b * b - 3 * a * c
    with np.errstate(divide="ignore", invalid="ignore"):
        s = -c / (b + np.where(b >= 0, 1, -1) * np.sqrt(disc))  # the root near 0 of 3 a s^2 + 2 b s + c
        other = (-b - np.where(b >= 0, 1, -1) * np.sqrt(disc)) / (3 * a)
    for root in (s, other):
        ok = np.isfinite(root) & (root > 0) & (root < 1)
        at = ((a[ok] * root[ok] + b[ok]) * root[ok] + c[ok]) * root[ok] + d[ok]
        best = max(best, float(at.max(initial=best)))
    return best


def _cubic(x0: Array, x1: Array, v0: Array, v1: Array) -> tuple[Array, Array, Array, Array]:
    """Coefficients over [0, 1], highest first, of the cubic with these end values and slopes."""
    return 2 * (x0 - x1) + v0 + v1, 3 * (x1 - x0) - 2 * v0 - v1, v0, x0


def extrapolated(coarse: Any, fine: Any) -> Any:
    """Richardson's extrapolation of a second-order result, steps of h and h/2."""
    return fine + (fine - coarse) / 3
