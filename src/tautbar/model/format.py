"""The description of the model file, format 1: every key, what it may hold, what it means."""

from __future__ import annotations

from tautbar import units
from tautbar.model.format_asking import ANALYSIS
from tautbar.model.format_loads import COMBINATION, EVENT, LOAD_CASE
from tautbar.model.format_structure import MASS, MATERIAL, MEMBER, SECTION, SUPPORT
from tautbar.model.parts import AXES
from tautbar.model.spec import Count, Listed, Named, Quantity, Table, Text, Vector

PLANES = ("xy", "xz", "yz")

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
