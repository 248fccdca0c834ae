"""What members can bear as far as the model says, for warnings: no limit is a limit unasked."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.scene import Scene
from tautbar.analyses.words import quantity
from tautbar.model.parts import Parts, Section

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Strength:
    """Forces [N] (N,) at which a member yields, breaks, or reaches its Euler load; infinite if not known."""

    yields: Array
    breaks: Array
    euler: Array

    @classmethod
    def of(cls, scene: Scene) -> Strength:
        parts, s = scene.parts, scene.structure
        radius = _of(parts, lambda sec: sec.radius_of_gyration)
        # L. Euler 1744, both ends hinged: pi^2 E I / l^2 with I = A i^2.
        euler = np.where(np.isfinite(radius), np.pi**2 * s.EA * (radius / s.length) ** 2, np.inf)
        return cls(_of(parts, _yield_force), _of(parts, _breaking_force), euler)

    def said(self, names: tuple[str, ...], greatest: Array, least: Array, when: str) -> list[str]:
        """Warnings for the greatest tension and compression met (N,) [N]; ``when`` ends the sentence."""
        push = -least
        out = []
        for force, limit, what in (
            (np.maximum(greatest, push), self.yields, "is above the yield strength of its section"),
            (greatest, self.breaks, "is above the breaking force at its end"),
            (push, self.euler, "is above the Euler load of a strut hinged at both ends"),
        ):
            use = np.where(np.isfinite(force) & np.isfinite(limit), force / limit, 0.0)
            if use.size and use.max() > 1.0:
                m = int(use.argmax())
                over = int((use > 1).sum()) - 1
                others = f"; {over} more members too" if over else ""
                bound = quantity(limit[m], "N")
                out.append(f"{quantity(force[m], 'N')} in {names[m]} {what} ({bound}){when}{others}")
        return out


def _of(parts: Parts, value: Callable[[Section], float | None]) -> Array:
    each = np.array([np.inf if (v := value(sec)) is None else v for sec in parts.sections])
    return np.asarray(each[np.array(parts.members.section, dtype=np.intp)]) if each.size else np.zeros(0)


def _yield_force(section: Section) -> float | None:
    if section.yield_strength is None or section.area is None:
        return None
    return section.yield_strength * section.area


def _breaking_force(section: Section) -> float | None:
    return None if section.breaking_force is None else section.breaking_force * section.end_factor
