"""The description of the model file, first part: materials, sections, joints, members, what holds them."""

from __future__ import annotations

from tautbar import units
from tautbar.model.parts import AXES, KINDS
from tautbar.model.spec import Count, Flag, Listed, Names, Quantity, Row, Spec, Table, Text, Vector

LENGTH_KEYS = ("pretension", "unstressed_length", "slack", "sag")  # at most one a member
JOINTS = Names(of="joints", doc="names or patterns of joints", required=True)
MEMBERS = Names(of="members", doc="names or patterns of members and groups", required=True)
PIECES = Count(at_least=2, at_most=10_000, doc="straight tension-only pieces of a hanging member")
_ABSENT = Flag(doc="true: not there until an analysis puts it in")

_TIE = 'a straight one that only pulls is "tension-only"'
_ROPE = _TIE + ', one that sags under its own weight "hanging"'
_STRUT = 'one that only pushes is "compression-only", one that pushes and pulls "bar"'
_MEANT = {
    **dict.fromkeys(("tie", "rod", "stay", "guy", "brace"), _TIE),
    **dict.fromkeys(("cable", "rope", "wire", "chain", "catenary", "strand"), _ROPE),
    **dict.fromkeys(("strut", "column", "post"), _STRUT),
    **dict.fromkeys(("truss", "axial", "pin-ended", "link"), 'axial force of both senses is "bar"'),
    **dict.fromkeys(("spring",), 'a "bar" whose section has a stiffness is a spring'),
    **dict.fromkeys(
        ("beam", "frame", "girder"), 'bending is not modelled; axial force of both senses is "bar"'
    ),
}

MATERIAL = Table(
    doc="an elastic material",
    synonyms={"E": "modulus", "rho": "density", "alpha": "expansion", "fy": "yield_strength"},
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
    synonyms={"A": "area", "diameter": "area", "EA": "axial_stiffness", "k": "stiffness"},
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
    "pieces": PIECES,
}
MEMBER = Table(
    doc="one member (from, to) or many (chain or pairs)",
    synonyms={"type": "kind", "start": "from", "end": "to", "length": "unstressed_length"},
    fields={
        "name": Text(required=True, is_name=True, doc="name; of a chain name.1, name.2, ..."),
        **_ENDS,
        "chain": Listed(of=Text(), at_least=2, doc="joints in order, a member between neighbours"),
        "pairs": Listed(of=Row(of=(Text(), Text())), at_least=1, doc="pairs of joints, a member each"),
        "kind": Text(choices=KINDS, meant=_MEANT, default="bar", doc="which forces it can carry"),
        "section": Text(required=True, doc="name of a section"),
        **_HOW_LONG,
        "rope": Flag(doc="true: a chain is one piece clamped at its joints; lengths are of the whole"),
        "absent": _ABSENT,
    },
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

_HELD = {
    **dict.fromkeys(("rx", "ry", "rz", "xx", "yy", "zz"), "joints are hinges: there is no rotation to hold"),
    **dict.fromkeys(("all", "xyz", "pinned", "fixed"), 'write "x", "y", "z"'),
}
SUPPORT = Table(
    doc="joints held in directions (fixed), along one direction, by springs, or only pushed",
    synonyms={"held": "fixed", "directions": "fixed"},
    fields={
        "name": Text(is_name=True, doc="name, for reactions"),
        "joints": JOINTS,
        "fixed": Listed(of=Text(choices=AXES, meant=_HELD), at_least=1, doc="directions that are held"),
        "along": Vector(dimension=units.NUMBER, doc="held along this direction only"),
        "springs": Table(
            fields={a: Quantity(dimension=units.STIFFNESS, above=0) for a in AXES}, doc="springs to ground"
        ),
        "only_pushes": Text(choices=AXES, doc="pushes the structure up along this axis, never holds it down"),
        "absent": _ABSENT,
    },
)
MASS = Table(
    doc="a mass at each joint named, or per length along members",
    fields={
        "name": Text(is_name=True, doc="name, to take it away or put it in"),
        "joints": Names(of="joints", doc="joints, each with the mass"),
        "mass": Quantity(dimension=units.MASS, at_least=0, doc="mass at each joint"),
        "members": Names(of="members", doc="members, each with the mass per length"),
        "per_length": Quantity(dimension=units.LINE_MASS, at_least=0, doc="mass per drawn length"),
        "absent": _ABSENT,
    },
)
