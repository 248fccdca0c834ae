"""Pulse shapes over time, and the joint forces of events.

A shape is a list of smooth pieces between corners; steps land on corners, so that a value is always
asked for *inside* one piece: at a jump each side has its own.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.model.parts import Pulse

Array = NDArray[np.float64]
Curve = Callable[[Array], Array]
CURVE_STEPS = 10  # in a curved pulse at least: its impulse is then held to 1 %; common practice, no source
_GAUSS_X, _GAUSS_W = np.polynomial.legendre.leggauss(16)  # exact to rounding on every smooth piece below


@dataclass(frozen=True)
class Shape:
    """Factor over time; ``curves[i]`` holds between ``corners[i]`` and ``corners[i + 1]`` [s].

    Before the first corner the factor is 0, after the last ``afterwards``.
    """

    corners: Array
    curves: tuple[Curve, ...]
    afterwards: float = 0.0
    curved: bool = False  # else each piece is a straight line

    def at(self, t: Array | float, inside: float) -> Array:
        """Factor at times ``t`` [s], by the piece that holds at the time ``inside``."""
        t = np.asarray(t, dtype=float)
        piece = int(np.searchsorted(self.corners, inside, side="right")) - 1
        if piece < 0:
            return np.zeros_like(t)
        if piece >= len(self.curves):
            return np.full_like(t, self.afterwards)
        return self.curves[piece](t - self.corners[0])

    def mean(self, t0: float, t1: float) -> float:
        """Mean factor over a step [s] that crosses no corner: its impulse is exact."""
        middle, half = 0.5 * (t0 + t1), 0.5 * (t1 - t0)
        return float(0.5 * _GAUSS_W @ self.at(middle + half * _GAUSS_X, middle))


def shape_of(pulse: Pulse) -> Shape:
    """The shape of a pulse event.

    "blast" is the modified Friedlander wave (1 - t/T) exp(-b t/T), its positive phase only (G. F. Kinney
    and K. J. Graham, Explosive Shocks in Air, 2nd ed. 1985, from memory); "versed-sine" is
    (1 - cos 2 pi t/T)/2; "ramp" rises to 1 and stays; "table" is linear between its rows, 0 outside.
    """
    if pulse.shape == "table":
        return _table(pulse)
    T = pulse.duration
    breaks, curves, afterwards = _PIECES[pulse.shape](pulse, T)
    corners = pulse.start + np.array([0.0, *breaks, T])
    return Shape(corners, tuple(curves), afterwards, pulse.shape in _CURVED)


Pieces = tuple[list[float], list[Curve], float]


def _one_piece(curve: Callable[[Array], Array], afterwards: float = 0.0) -> Callable[[Pulse, float], Pieces]:
    """A shape without inner corner, from its curve over t/T."""

    def pieces(_pulse: Pulse, T: float) -> Pieces:
        return [], [lambda t: curve(t / T)], afterwards

    return pieces


def _triangle(_pulse: Pulse, T: float) -> Pieces:
    return [T / 2], [lambda t: 2 * t / T, lambda t: 2 * (1 - t / T)], 0.0


def _trapezoid(pulse: Pulse, T: float) -> Pieces:
    rise, fall = pulse.rise, pulse.fall
    flat = rise + fall < T
    pieces: list[tuple[bool, Curve]] = [
        (rise > 0, lambda t: t / rise),
        (flat, np.ones_like),
        (fall > 0, lambda t: (T - t) / fall),
    ]
    breaks = [(rise > 0 and (flat or fall > 0), rise), (flat and fall > 0, T - fall)]
    return [b for there, b in breaks if there], [c for there, c in pieces if there], 0.0


def _blast(pulse: Pulse, T: float) -> Pieces:
    return [], [lambda t: (1 - t / T) * np.exp(-pulse.decay * t / T)], 0.0


_PIECES: dict[str, Callable[[Pulse, float], Pieces]] = {
    "rectangle": _one_piece(np.ones_like),
    "half-sine": _one_piece(lambda s: np.sin(np.pi * s)),
    "versed-sine": _one_piece(lambda s: 0.5 * (1 - np.cos(2 * np.pi * s))),
    "sawtooth": _one_piece(lambda s: s),
    "ramp": _one_piece(lambda s: s, afterwards=1.0),
    "triangle": _triangle,
    "trapezoid": _trapezoid,
    "blast": _blast,
}


_CURVED = ("half-sine", "versed-sine", "blast")


def _table(pulse: Pulse) -> Shape:
    times, factors = np.array(pulse.times), np.array(pulse.factors)

    def curve(i: int) -> Curve:
        slope = (factors[i + 1] - factors[i]) / (times[i + 1] - times[i])
        return lambda t: factors[i] + slope * (t - (times[i] - times[0]))

    return Shape(pulse.start + times, tuple(curve(i) for i in range(times.size - 1)))


@dataclass(frozen=True)
class EventForces:
    """Joint forces of all events that act in one history."""

    shapes: tuple[Shape, ...]
    peak: Array  # (events, 3, J) N

    def at(self, t: float, inside: float) -> Array:
        """Joint forces (3, J) [N] at ``t``, by the pieces that hold at ``inside``."""
        return self._weighted([float(s.at(t, inside)) for s in self.shapes])

    def mean(self, t0: float, t1: float) -> Array:
        """Mean joint forces (3, J) [N] over a step that crosses no corner."""
        return self._weighted([s.mean(t0, t1) for s in self.shapes])

    def landings(self, time_step: float) -> Array:
        """All instants [s] on which steps land, rising: corners, and within curves too short for the step.

        A curved pulse is crossed in at least `CURVE_STEPS` steps: one that vanishes at both ends of a
        single step would not be met at all.
        """
        found = [np.zeros(0)]
        for shape in self.shapes:
            found.append(shape.corners)
            span = float(np.ptp(shape.corners))
            if shape.curved and span < CURVE_STEPS * time_step:
                found.append(np.linspace(shape.corners[0], shape.corners[-1], CURVE_STEPS + 1)[1:-1])
        return np.unique(np.concatenate(found))

    def _weighted(self, factors: list[float]) -> Array:
        return (
            np.tensordot(np.array(factors), self.peak, axes=1) if factors else np.zeros(self.peak.shape[1:])
        )


def event_forces(pulses: Sequence[Pulse], joints: int) -> EventForces:
    """Forces of pulse events on ``joints`` joints."""
    peak = np.zeros((len(pulses), 3, joints))
    for own, pulse in zip(peak, pulses, strict=True):
        for at, force in pulse.forces:
            np.add.at(own.T, np.array(at, dtype=np.intp), np.array(force))
    return EventForces(tuple(shape_of(p) for p in pulses), peak)
