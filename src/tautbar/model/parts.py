"""The parts of a checked model, in SI units (m, N, kg, s, K, rad), as frozen dataclasses.

Joints and members are columns (one value a joint or member), so that large models stay small and
fast; everything else is one object a thing. Names live here and nowhere below. Directions are
numbered x, y, z = 0, 1, 2; a plane model has all three, the third held at every joint.
"""

from __future__ import annotations

from array import array
from collections.abc import Mapping
from dataclasses import dataclass, field, fields

KINDS = ("bar", "tension-only", "compression-only", "hanging")  # `Members.kind` is a position in this
AXES = ("x", "y", "z")
Vector = tuple[float, float, float]
Indices = tuple[int, ...]  # of joints or members, in the order of `Joints` and `Members`


@dataclass(frozen=True, slots=True)
class Material:
    """Elastic material. Absent values are None."""

    name: str
    modulus: float  # Pa
    density: float | None = None  # kg/m3
    expansion: float | None = None  # 1/K
    yield_strength: float | None = None  # Pa
    hardening_modulus: float | None = None  # Pa
    retardation_time: float = 0.0  # s, Kelvin-Voigt: stress = E (strain + t d(strain)/dt)
    note: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True)
class Section:
    """What a member is made of. Values a material gives are already filled in here.

    Exactly one of ``axial_stiffness`` (EA) and ``stiffness`` (force per elongation) is a number.
    """

    name: str
    axial_stiffness: float | None = None  # N
    stiffness: float | None = None  # N/m
    material: str | None = None
    area: float | None = None  # m2
    mass_per_length: float | None = None  # kg/m of unstressed length; None: not given
    expansion: float | None = None  # 1/K; None: not given
    retardation_time: float = 0.0  # s
    yield_strength: float | None = None  # Pa
    radius_of_gyration: float | None = None  # m
    buckling_curve: str | None = None
    breaking_force: float | None = None  # N
    end_factor: float = 1.0
    wind_width: float | None = None  # m
    note: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True)
class Joints:
    """Columns over J joints: the ones given, then those between the pieces of hanging members.

    Coordinates of the joints between pieces are on the straight line between the ends; the
    mechanics puts them on the curve.
    """

    names: tuple[str, ...]
    x: array[float]  # m, (J,)
    y: array[float]
    z: array[float]
    index: Mapping[str, int] = field(repr=False)

    def __len__(self) -> int:
        return len(self.names)


@dataclass(frozen=True, slots=True)
class Hanging:
    """A hanging member as straight tension-only pieces, in order from ``start`` to ``end``."""

    name: str
    start: int  # joint
    end: int  # joint
    members: range  # its pieces
    joints: range  # the joints between them, one fewer
    given: str  # "pretension" (tension at the lower end), "unstressed_length", "slack" or "sag"
    value: float  # N or m, of the whole member


@dataclass(frozen=True, slots=True)
class Members:
    """Columns over N members, pieces of hanging members included.

    ``pretension``, ``unstressed_length``, ``slack`` and ``sag`` are NaN where not given (at most one
    is); for pieces all are NaN: `Hanging` says what was given. A member of kind "hanging" is one exact
    catenary. Chains clamped at their joints (``rope = true``) come with the share of each member.
    """

    names: tuple[str, ...]
    start: array[int]  # joint, (N,)
    end: array[int]
    kind: array[int]  # position in KINDS
    section: array[int]  # position in `Model.sections`
    pretension: array[float]  # N
    unstressed_length: array[float]  # m
    slack: array[float]  # m
    sag: array[float]  # m, of catenaries
    index: Mapping[str, int] = field(repr=False)
    groups: Mapping[str, Indices] = field(repr=False, default_factory=dict)
    hanging: tuple[Hanging, ...] = ()
    absent: Indices = ()  # not there until an analysis takes them in

    def __len__(self) -> int:
        return len(self.names)

    def __eq__(self, other: object) -> bool:
        """Equal columns; values that were not given (NaN) equal each other."""
        if not isinstance(other, Members):
            return NotImplemented
        return all(_same(getattr(self, f.name), getattr(other, f.name)) for f in fields(self))


def _same(mine: object, others: object) -> bool:
    if isinstance(mine, array) and isinstance(others, array):
        return mine.tobytes() == others.tobytes()
    return mine == others


@dataclass(frozen=True, slots=True)
class Support:
    """Held directions of some joints: axes, one direction (unit vector), or springs to ground."""

    name: str
    joints: Indices
    fixed: tuple[int, ...] = ()
    along: Vector | None = None
    springs: tuple[tuple[int, float], ...] = ()  # (axis, N/m)
    only_pushes: int | None = None  # axis: pushes the structure up along it, and cannot hold it down
    absent: bool = False
    note: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True)
class Mass:
    """A mass [kg] at each joint named, or [kg/m] of drawn length, half to each end, along members."""

    joints: Indices = ()
    members: Indices = ()
    mass: float = 0.0
    per_length: float = 0.0
    name: str = ""
    absent: bool = False
    note: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True)
class Wind:
    """Pressure [Pa] over height [m, along ``up``] on members: x width x sin^2, normal to the member."""

    members: Indices
    toward: Vector  # unit vector
    heights: tuple[float, ...]  # m, rising; one height: the same pressure everywhere
    pressures: tuple[float, ...]  # Pa


@dataclass(frozen=True, slots=True)
class Ice:
    """A coat of ice on members: weight, mass, and wider for the wind by twice its thickness."""

    members: Indices
    thickness: float  # m
    density: float  # kg/m3


@dataclass(frozen=True, slots=True)
class LoadCase:
    """What acts, for a factor of one."""

    name: str
    self_weight: float = 0.0
    masses: tuple[tuple[Indices, float], ...] = ()  # (joints, kg)
    forces: tuple[tuple[Indices, Vector], ...] = ()  # (joints, N)
    line_loads: tuple[tuple[Indices, Vector], ...] = ()  # (members, N/m of drawn length)
    temperature_change: tuple[tuple[Indices, float], ...] = ()  # (members, K)
    movements: tuple[tuple[Indices, Vector], ...] = ()  # (joints, m) of held directions
    take_up: tuple[tuple[Indices, float], ...] = ()  # (members, m)
    wind: tuple[Wind, ...] = ()
    ice: tuple[Ice, ...] = ()
    note: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True)
class Loading:
    """Load cases that act together, each times its factor."""

    name: str
    factors: Mapping[str, float]

    @property
    def acting(self) -> str:
        """In words: ``1.0 dead + 1.5 wind``."""
        return " + ".join(f"{f:g} {c}" for c, f in self.factors.items() if f) or "nothing"


@dataclass(frozen=True, slots=True)
class Pulse:
    """Joint forces times a pulse shape. ``times``, ``factors`` belong to the shape "table"."""

    name: str
    shape: str
    duration: float  # s
    start: float  # s
    forces: tuple[tuple[Indices, Vector], ...]  # (joints, N at the peak)
    rise: float = 0.0  # s, trapezoid
    fall: float = 0.0  # s, trapezoid
    decay: float = 0.0  # blast: modified Friedlander exponent
    times: array[float] = field(default_factory=lambda: array("d"))
    factors: array[float] = field(default_factory=lambda: array("d"))
    note: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True)
class StartFrom:
    """The state an analysis starts from.

    ``loads`` names one loading of it, None is its only one; ``each``: every loading in turn. ``at``
    names a critical point of a path ("limit point 1") or is "end".
    """

    analysis: str
    loads: str | None = None
    as_drawn: bool = False  # modes of a prestressed model about the drawing, insisted upon
    each: bool = False
    at: str | None = None


@dataclass(frozen=True, slots=True)
class Change:
    """What an analysis takes away and puts in, on top of what its start state has."""

    without_members: Indices = ()
    without_supports: tuple[str, ...] = ()
    without_masses: tuple[str, ...] = ()
    with_members: Indices = ()
    with_supports: tuple[str, ...] = ()
    with_masses: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Damping:
    """Rayleigh damping from ``ratio`` at one or two frequencies [Hz]."""

    ratio: tuple[float, ...]
    at: tuple[float, ...]
    mass_part: bool | None = None  # None: left out where anything can go slack or move freely


@dataclass(frozen=True, slots=True)
class Static:
    name: str
    start: StartFrom | None = None
    loads: tuple[Loading, ...] | None = None
    geometry: str = "large"  # or "small"
    steps: int | None = None  # None: as many as it takes
    tolerance: float = 1e-9
    folding: bool = False  # may bars turn more than 30 degrees?
    lose_in_turn: Indices = ()  # one loading a lost member
    pieces: int | None = None  # hanging members as this many straight pieces
    change: Change = field(default_factory=Change)
    note: str = ""
    source: str = ""
    kind = "static"


@dataclass(frozen=True, slots=True)
class Modes:
    name: str
    start: StartFrom | None = None
    count: int | None = 10
    up_to: float | None = None  # Hz, instead of count
    mass: str = "consistent"  # or "lumped"
    pieces: int | None = None
    change: Change = field(default_factory=Change)
    note: str = ""
    source: str = ""
    kind = "modes"


@dataclass(frozen=True, slots=True)
class Store:
    """What a history keeps: every k-th step, of these joints and members (None: all)."""

    every: int = 1
    joints: Indices | None = None
    members: Indices | None = None


@dataclass(frozen=True, slots=True)
class History:
    name: str
    duration: float  # s
    time_step: float  # s
    start: StartFrom | None = None
    events: tuple[str, ...] = ()
    loads: tuple[Loading, ...] | None = None  # at most one
    method: str | None = None  # "newmark", "energy-conserving"; None: chosen by the members
    beta: float = 0.25
    gamma: float = 0.5
    snap_loss: str = "capture"  # or "none"
    damping: Damping | None = None
    geometry: str = "large"
    mass: str | None = None  # None: lumped where members can go slack, else consistent
    store: Store = field(default_factory=Store)
    precision: str = "single"
    pieces: int | None = None
    change: Change = field(default_factory=Change)
    note: str = ""
    source: str = ""
    kind = "history"


@dataclass(frozen=True, slots=True)
class StopAt:
    """Where a path ends: exactly one of the four."""

    load_factor: float | None = None
    joint: int | None = None  # with axis and displacement
    axis: int = 0
    displacement: float = 0.0  # m, from the drawing
    limit_points: int | None = None
    steps: int | None = None


@dataclass(frozen=True, slots=True)
class EquilibriumPath:
    name: str
    loads: Loading  # times the load factor
    stop_at: StopAt
    start: StartFrom | None = None
    constant: Loading | None = None
    step: float = 0.1  # first step of the load factor
    change: Change = field(default_factory=Change)
    note: str = ""
    source: str = ""
    kind = "equilibrium-path"


@dataclass(frozen=True, slots=True)
class Buckling:
    name: str
    loads: Loading  # times the load factor
    start: StartFrom | None = None
    constant: Loading | None = None
    count: int = 5
    change: Change = field(default_factory=Change)
    note: str = ""
    source: str = ""
    kind = "buckling"


@dataclass(frozen=True, slots=True)
class TensionTarget:
    members: Indices
    tension: float  # N
    at: str | None = None  # of hanging ones: "from end", "to end", "greatest" (the default)
    loads: str | None = None  # the loading it holds under; None: the first


@dataclass(frozen=True, slots=True)
class PositionTarget:
    joint: int
    axis: int
    position: float  # m
    loads: str | None = None


@dataclass(frozen=True, slots=True)
class CutList:
    """How the lengths of adjusted members are to be marked."""

    marking_tension: float = 0.0  # N
    temperature: float | None = None  # K, of marking; None: the model's
    end_allowance: float = 0.0  # m, added to the marked length at each end


@dataclass(frozen=True, slots=True)
class Tune:
    name: str
    loads: tuple[Loading, ...]
    adjust: Indices
    start: StartFrom | None = None
    targets: tuple[TensionTarget | PositionTarget, ...] = ()
    together: tuple[Indices, ...] = ()  # one relative change of length a list
    keep_taut: Indices = ()
    margin: float = 0.0  # N
    cut_list: CutList | None = None
    change: Change = field(default_factory=Change)
    note: str = ""
    source: str = ""
    kind = "tune"


@dataclass(frozen=True, slots=True)
class FormFinding:
    name: str
    loads: Loading
    force_densities: tuple[tuple[Indices, float], ...]  # (members, N/m)
    start: StartFrom | None = None
    change: Change = field(default_factory=Change)
    note: str = ""
    source: str = ""
    kind = "form-finding"


Analysis = Static | Modes | History | EquilibriumPath | Buckling | Tune | FormFinding


@dataclass(frozen=True, slots=True)
class Parts:
    """A whole model, checked and in SI."""

    title: str
    joints: Joints
    members: Members
    sections: tuple[Section, ...]
    materials: tuple[Material, ...]
    supports: tuple[Support, ...]
    masses: tuple[Mass, ...]
    load_cases: Mapping[str, LoadCase]
    loadings: Mapping[str, tuple[Loading, ...]]  # load cases, combinations and families by name
    events: Mapping[str, Pulse]
    analyses: tuple[Analysis, ...]
    held_axis: int | None = None  # plane models: the direction held at every joint
    up: int = 2
    gravity: float = 9.80665  # m/s2
    temperature: float | None = None  # K, at which lengths are given
    floating: bool = False  # unsupported = "allowed"
    note: str = ""
    source: str = ""
