"""The record of an analysis: fields with units, axes and a long name, and its audit in words."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

STATUSES = ("running", "complete", "failed", "interrupted", "not run")


@dataclass(frozen=True, slots=True)
class Field:
    """One array of results.

    ``axes`` names each axis: "joint", "member", "direction", "loading", "mode", "time", "group",
    "end", "step" (those shared by the file have a dimension scale of that name) or a name of its own.
    """

    values: NDArray[np.generic]
    unit: str  # SI, "1" for a plain number
    long_name: str
    axes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Record:
    """What one analysis found. ``fields`` maps the path in the results file to the field.

    ``outcome`` is the answer in words, the failures first when ``status`` is "failed";
    ``audit_lines`` are the audit in words; ``warnings`` what the engineer should know.
    """

    name: str
    kind: str
    status: str
    outcome: str
    acting: tuple[str, ...] = ()
    settings: Mapping[str, object] = field(default_factory=dict)
    measured_from: str = "the joint positions of the model file"
    fields: Mapping[str, Field] = field(default_factory=dict)
    audit_lines: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
    sources: tuple[str, ...] = ()
    wall_time: float = 0.0

    def __getitem__(self, path: str) -> NDArray[np.generic]:
        """Values of a field by its path, e.g. ``record["axial_force"]``."""
        return self.fields[path].values
