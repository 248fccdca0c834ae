"""The description of the model file, format 1: every key, what it may hold, what it means."""

from __future__ import annotations

from tautbar import units
from tautbar.model.spec import (
    ByKind,
    Combination,
    Count,
    Either,
    Factors,
    Flag,
    Listed,
    Named,
    Names,
    Quantity,
    Row,
    Spec,
    Table,
    Text,
    Vector,
)

PULSE_SHAPES = (
    "rectangle", "half-sine", "triangle", "sawtooth", "trapezoid", "versed-sine", "blast", "ramp", "table",
)  # fmt: skip
AXES = ("x", "y", "z")
PLANES = ("xy", "xz", "yz")
MEMBER_KINDS = ("bar", "tension-only", "compression-only", "hanging")
LENGTH_KEYS = ("pretension", "unstressed_length", "slack", "sag")  # at most one a member
AS_DRAWN = "as drawn"

_JOINTS = Names(of="joints", doc="names or patterns of joints", required=True)
_MEMBERS = Names(of="members", doc="names or patterns of members and groups", required=True)
_FORCES = Listed(
    of=Table(
        fields={
            "joints": _JOINTS,
            "force": Vector(dimension=units.FORCE, doc="force on each joint named", required=True),
        }
    ),
    doc="forces on joints",
)

MATERIAL = Table(
    doc="an elastic material",
    fields={
        "modulus": Quantity(dimension=units.STRESS, above=0, required=True, doc="elastic modulus"),
        "density": Quantity(dimension=units.DENSITY, at_least=0, doc="density; absent: no mass, no weight"),
        "expansion": Quantity(dimension=units.EXPANSION, doc="thermal expansion coefficient"),
        "yield_strength": Quantity(dimension=units.STRESS, above=0, doc="yield strength"),
        "hardening_modulus": Quantity(dimension=units.STRESS, at_least=0, doc="slope after yield"),
        "retardation_time": Quantity(
            dimension=units.TIME, at_least=0, default=0.0, doc="Kelvin-Voigt viscosity over modulus"
        ),
    },
)

SECTION = Table(
    doc="what members are made of: material and area, or axial_stiffness, or stiffness",
    fields={
        "material": Text(doc="name of a material"),
        "area": Quantity(dimension=units.AREA, above=0, doc="area of the section"),
        "axial_stiffness": Quantity(dimension=units.FORCE, above=0, doc="EA, given directly"),
        "stiffness": Quantity(dimension=units.STIFFNESS, above=0, doc="force per elongation"),
        "mass_per_length": Quantity(
            dimension=units.LINE_MASS, at_least=0, doc="mass per length; overrides density * area"
        ),
        "expansion": Quantity(dimension=units.EXPANSION, doc="overrides the material's"),
        "retardation_time": Quantity(dimension=units.TIME, at_least=0, doc="overrides the material's"),
        "radius_of_gyration": Quantity(dimension=units.LENGTH, above=0, doc="for strut buckling"),
        "buckling_curve": Text(choices=("a0", "a", "b", "c", "d"), doc="for the EN rule"),
        "breaking_force": Quantity(dimension=units.FORCE, above=0, doc="breaking force of the rope"),
        "end_factor": Quantity(
            above=0, at_most=1, default=1.0, doc="what the end fitting leaves of the breaking force"
        ),
        "wind_width": Quantity(dimension=units.LENGTH, at_least=0, doc="width for wind and ice"),
    },
)

_ENDS = {
    "from": Text(doc="joint at the start"),
    "to": Text(doc="joint at the end"),
}
_HOW_LONG = {
    "pretension": Quantity(dimension=units.FORCE, doc="force when the joints are where the model puts them"),
    "unstressed_length": Quantity(dimension=units.LENGTH, above=0, doc="length without force"),
    "slack": Quantity(dimension=units.LENGTH, at_least=0, doc="unstressed length less drawn length"),
    "sag": Quantity(
        dimension=units.LENGTH, above=0, doc="from the middle of the chord down to the rope; hanging only"
    ),
    "pieces": Count(at_least=2, at_most=10_000, doc="straight tension-only pieces of a hanging member"),
}
MEMBER = Table(
    doc="one member (from, to) or many (chain or pairs)",
    fields={
        "name": Text(required=True, is_name=True, doc="name; of a chain name.1, name.2, ..."),
        **_ENDS,
        "chain": Listed(of=Text(), at_least=2, doc="joints in order, a member between neighbours"),
        "pairs": Listed(of=Row(of=(Text(), Text())), at_least=1, doc="pairs of joints, a member each"),
        "kind": Text(choices=MEMBER_KINDS, default="bar", doc="which forces it can carry"),
        "section": Text(required=True, doc="name of a section"),
        **_HOW_LONG,
    },
    later=("rope", "absent"),
)
JOINT_COLUMNS: dict[str, Spec] = {
    "joint": Text(required=True, is_name=True),
    **{axis: Quantity(dimension=units.LENGTH, required=True) for axis in AXES},
}
MEMBER_COLUMNS: dict[str, Spec] = {
    "member": Text(required=True, is_name=True),
    "from": Text(required=True),
    "to": Text(required=True),
    "kind": MEMBER.fields["kind"],
    "section": Text(required=True),
    **_HOW_LONG,
}

SUPPORT = Table(
    doc="joints held in directions (fixed), along one direction, or by springs to ground",
    fields={
        "name": Text(is_name=True, doc="name, for reactions"),
        "joints": _JOINTS,
        "fixed": Listed(of=Text(choices=AXES), at_least=1, doc="directions that are held"),
        "along": Vector(dimension=units.NUMBER, doc="held along this direction only"),
        "springs": Table(
            fields={a: Quantity(dimension=units.STIFFNESS, above=0) for a in AXES}, doc="springs to ground"
        ),
    },
    later=("only_pushes", "absent"),
)
MASS = Table(
    doc="a mass at each joint named, or per length along members",
    fields={
        "joints": Names(of="joints", doc="joints, each with the mass"),
        "mass": Quantity(dimension=units.MASS, at_least=0, doc="mass at each joint"),
        "members": Names(of="members", doc="members, each with the mass per length"),
        "per_length": Quantity(dimension=units.LINE_MASS, at_least=0, doc="mass per drawn length"),
    },
    later=("absent",),
)


def _on(where: Names, key: str, value: Spec) -> Table:
    return Table(fields={where.of: where, key: value})


LOAD_CASE = Table(
    doc="what acts together, for a factor of one",
    fields={
        "self_weight": Quantity(default=0.0, doc="weight of members and masses, times this"),
        "masses": Listed(
            of=_on(_JOINTS, "mass", Quantity(dimension=units.MASS, at_least=0, required=True)),
            doc="masses whose weight belongs to this case",
        ),
        "forces": _FORCES,
        "line_loads": Listed(
            of=_on(_MEMBERS, "per_length", Vector(dimension=units.LINE_LOAD, required=True)),
            doc="forces per drawn length of members",
        ),
        "temperature_change": Either(
            options=(
                Quantity(dimension=units.TEMPERATURE_CHANGE),
                Listed(
                    of=_on(_MEMBERS, "change", Quantity(dimension=units.TEMPERATURE_CHANGE, required=True))
                ),
            ),
            doc="of all members, or a list",
        ),
        "temperature": Quantity(dimension=units.TEMPERATURE, above=0, doc="of all members"),
        "movements": Listed(
            of=_on(_JOINTS, "move", Vector(dimension=units.LENGTH, required=True)),
            doc="movements of held directions",
        ),
        "take_up": Listed(
            of=_on(_MEMBERS, "length", Quantity(dimension=units.LENGTH, required=True)),
            doc="shortening of the unstressed length",
        ),
    },
    later=("wind", "ice"),
)
COMBINATION = Combination(
    doc="load cases times factors, or a family (always, in_turn)",
    plain=Factors(doc="factor of each load case"),
    family=Table(
        doc="a loading for each choice of one entry from each table of in_turn",
        fields={
            "always": Factors(doc="what acts in each of them"),
            "in_turn": Listed(of=Factors(many=True), at_least=1, required=True, doc="tables to choose from"),
        },
    ),
)

PULSE = Table(
    doc="joint forces times a pulse shape",
    fields={
        "kind": Text(choices=("pulse",), required=True),
        "shape": Text(choices=PULSE_SHAPES, required=True, doc="shape of the pulse"),
        "duration": Quantity(dimension=units.TIME, above=0, doc="how long it lasts"),
        "start": Quantity(dimension=units.TIME, at_least=0, default=0.0, doc="when it starts"),
        "forces": Listed(of=_FORCES.of, at_least=1, required=True, doc="forces at the peak"),
        "rise": Quantity(dimension=units.TIME, at_least=0, doc="rising part of a trapezoid"),
        "fall": Quantity(dimension=units.TIME, at_least=0, doc="falling part of a trapezoid"),
        "decay": Quantity(at_least=0, doc="exponent of a blast (modified Friedlander); absent: 0"),
        "table": Either(
            options=(
                Text(),
                Listed(of=Row(of=(Quantity(dimension=units.TIME, at_least=0), Quantity())), at_least=2),
            ),
            doc="CSV file with columns time,factor, or a list of [time, factor]",
        ),
    },
)
EVENT = ByKind(
    kinds={"pulse": PULSE},
    later=(
        "harmonic", "base-acceleration", "support-motion", "member-loss", "falling-mass", "initial-velocity",
        "moving-load", "take-up",
    ),
    doc="something that happens in time",
)  # fmt: skip

_LOADS = Either(
    options=(
        Text(),
        Factors(),
        Listed(of=Either(options=(Text(), Factors())), at_least=1),
    ),
    doc="all that acts: a load case, a combination, an inline table of factors, or a list of them",
)
_FROM = Either(
    options=(
        Text(),
        Table(
            fields={
                "analysis": Text(required=True, doc="name of an earlier analysis"),
                "loads": Text(later=("each",), doc="which of its loadings"),
            },
            later=("at",),
        ),
    ),
    doc="the analysis whose end is the start of this one",
)
_NAME = Text(required=True, is_name=True, doc="name of the analysis")
_GEOMETRY = Text(choices=("large", "small"), default="large", doc="large or small displacements")
_MASS_WORDS = ("consistent", "lumped")
_LATER_ANYWHERE = ("without", "with")

STATIC = Table(
    doc="equilibrium with large displacements and slack",
    fields={
        "name": _NAME,
        "kind": Text(choices=("static",), required=True),
        "from": _FROM,
        "loads": _LOADS,
        "geometry": _GEOMETRY,
        "steps": Count(doc="number of load steps; absent: as many as it takes"),
        "tolerance": Quantity(above=0, below=1, default=1e-9, doc="share of the forces left unbalanced"),
        "folding": Text(choices=("allowed",), doc="bars may turn more than 30 degrees"),
    },
    later=(*_LATER_ANYWHERE, "yielding", "lose_in_turn"),
)
MODES = Table(
    doc="natural frequencies and shapes about a state",
    fields={
        "name": _NAME,
        "kind": Text(choices=("modes",), required=True),
        "from": _FROM,
        "count": Count(doc="how many modes; absent: 10"),
        "up_to": Quantity(dimension=units.FREQUENCY, above=0, doc="all modes up to this frequency"),
        "mass": Text(choices=_MASS_WORDS, default="consistent", doc="how members' mass is spread"),
    },
    later=_LATER_ANYWHERE,
)
_RATIO = Quantity(at_least=0, below=1)
DAMPING = Table(
    doc="Rayleigh damping",
    fields={
        "ratio": Either(
            options=(_RATIO, Listed(of=_RATIO, at_least=1, at_most=2)), required=True, doc="a ratio, or two"
        ),
        "at": Listed(
            of=Quantity(dimension=units.FREQUENCY, above=0),
            at_least=1,
            at_most=2,
            required=True,
            doc="one or two frequencies; the same ratio in every mode is not available in this version",
        ),
        "mass_part": Flag(doc="true insists on the mass-proportional part"),
    },
)
STORE = Table(
    doc="what a history keeps",
    fields={
        "every": Count(default=1, doc="every how many steps"),
        "joints": Names(of="joints", doc="only these joints"),
        "members": Names(of="members", doc="only these members"),
    },
)
HISTORY = Table(
    doc="transient response",
    fields={
        "name": _NAME,
        "kind": Text(choices=("history",), required=True),
        "from": _FROM,
        "loads": _LOADS,
        "events": Listed(of=Text(), doc="names of events"),
        "duration": Quantity(dimension=units.TIME, above=0, required=True, doc="how long"),
        "time_step": Quantity(
            dimension=units.TIME, above=0, required=True, later=("auto",), doc="length of a step"
        ),
        "method": Text(
            choices=("newmark", "energy-conserving"),
            later=("generalised-alpha", "central-difference", "modal"),
            doc="absent: energy-conserving where a member can go slack, else newmark",
        ),
        "beta": Quantity(at_least=0, at_most=1, doc="of newmark"),
        "gamma": Quantity(at_least=0.5, at_most=1, doc="of newmark"),
        "snap_loss": Text(choices=("capture", "none"), default="capture", doc="loss when a rope tightens"),
        "damping": DAMPING,
        "geometry": _GEOMETRY,
        "mass": Text(choices=_MASS_WORDS, doc="absent: lumped where members can go slack"),
        "store": STORE,
        "precision": Text(choices=("single", "double"), default="single", doc="of what is stored"),
    },
    later=(*_LATER_ANYWHERE, "verify", "yielding", "lose_in_turn", "stop_when", "spectral_radius"),
)
ANALYSIS = ByKind(
    kinds={"static": STATIC, "modes": MODES, "history": HISTORY},
    later=(
        "equilibrium-path", "buckling", "frequency-response", "response-spectrum", "shock-spectrum", "tune",
        "form-finding",
    ),
    doc="a question to be answered",
)  # fmt: skip

MODEL = Table(
    doc="a structure whose members carry axial force only",
    fields={
        "format": Count(default=1, doc="version of this format: 1"),
        "title": Text(default="", doc="title, printed on the record"),
        "plane": Text(choices=PLANES, doc="a plane structure; joints then have two coordinates"),
        "up": Text(choices=AXES, doc="the axis that points up; absent: z, in a plane model its second axis"),
        "gravity": Quantity(
            dimension=units.ACCELERATION,
            at_least=0,
            default=units.STANDARD_GRAVITY,
            doc="acting downwards",
        ),
        "temperature": Quantity(
            dimension=units.TEMPERATURE, above=0, doc="at which lengths and pretensions are given"
        ),
        "unsupported": Text(choices=("allowed",), doc="parts may float free"),
        "units": Table(fields={b: Text() for b in units.BASES}, doc="units of bare numbers"),
        "tables": Table(
            fields={"joints": Text(doc="CSV file"), "members": Text(doc="CSV file")}, doc="tables in files"
        ),
        "materials": Named(of=MATERIAL, doc="materials by name"),
        "sections": Named(of=SECTION, doc="sections by name"),
        "joints": Named(of=Vector(dimension=units.LENGTH), doc="coordinates of joints by name"),
        "members": Listed(of=MEMBER, doc="members"),
        "supports": Listed(of=SUPPORT, doc="supports"),
        "masses": Listed(of=MASS, doc="masses beside those of the members"),
        "load_cases": Named(of=LOAD_CASE, doc="load cases by name"),
        "combinations": Named(of=COMBINATION, doc="combinations by name"),
        "events": Named(of=EVENT, doc="events by name"),
        "analyses": Listed(of=ANALYSIS, doc="analyses, done in this order"),
    },
    later=("limits", "dashpots"),
)
