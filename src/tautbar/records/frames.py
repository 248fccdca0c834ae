"""What a march over time hands out step by step, so that a history never has to fit in memory."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any, Protocol

from numpy.typing import NDArray

from tautbar.records.fields import Record

ENERGY = (
    "time",
    "kinetic",
    "strain",
    "load_potential",
    "event_work",
    "damped",
    "dissipated_by_method",
    "unaccounted",
)
ENERGY_NAMES = MappingProxyType(
    {
        "time": "time of each computed step",
        "kinetic": "kinetic energy",
        "strain": "strain energy of the members and support springs",
        "load_potential": "potential of the loads that stay",
        "event_work": "work done by the events so far",
        "damped": "energy taken by damping so far",
        "dissipated_by_method": "energy taken by the method so far, where slack members tighten",
        "unaccounted": "what the ledger leaves over",
    }
)


@dataclass(frozen=True, slots=True)
class StreamedField:
    """A field that grows by one row a stored step.

    ``axes`` starts with "time"; ``shape`` is that of one step, e.g. (J, 3). ``dtype`` is float32
    or float64.
    """

    unit: str
    long_name: str
    axes: tuple[str, ...]
    shape: tuple[int, ...]
    dtype: str = "float32"


@dataclass(frozen=True, slots=True)
class Frame:
    """One computed step of a march.

    ``time`` [s]; ``energy`` [s, then J] in the order of `ENERGY`; ``values`` by the path of each
    streamed field, None on a step that is not stored. The arrays are read before the march goes on.
    """

    time: float
    energy: tuple[float, ...]
    values: Mapping[str, NDArray[Any]] | None


class Marching(Protocol):
    """An analysis on its way through time; its first frame is that of time zero."""

    @property
    def name(self) -> str: ...
    @property
    def kind(self) -> str: ...
    @property
    def acting(self) -> tuple[str, ...]: ...
    @property
    def settings(self) -> Mapping[str, object]: ...
    @property
    def duration(self) -> float:
        """Time to cover [s]."""

    @property
    def streamed(self) -> Mapping[str, StreamedField]:
        """The fields that its frames carry, by their path."""

    def frames(self) -> Iterator[Frame]:
        """Each computed step in turn."""

    def record(self, status_if_cut: str | None = None) -> Record:
        """All fields but the streamed ones and the energies, once the frames ended or were cut."""
