"""The description of the model file, second part: load cases, combinations and events."""

from __future__ import annotations

from tautbar import units
from tautbar.model.format_structure import JOINTS, MEMBERS
from tautbar.model.spec import (
    ByKind,
    Combination,
    Either,
    Factors,
    Listed,
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
_FORCES = Listed(
    of=Table(
        fields={
            "joints": JOINTS,
            "force": Vector(dimension=units.FORCE, doc="force on each joint named", required=True),
        },
        synonyms={"value": "force", "load": "force"},
    ),
    doc="forces on joints",
)
_PRESSURE = Quantity(dimension=units.PRESSURE, at_least=0)
_WIND = Table(
    doc="pressure x width x sin^2, normal to each member",
    synonyms={"direction": "toward", "speed": "pressure", "value": "pressure"},
    fields={
        "members": MEMBERS,
        "toward": Vector(dimension=units.NUMBER, required=True, doc="where the wind blows; any length"),
        "pressure": Either(
            options=(
                _PRESSURE,
                Listed(of=Row(of=(Quantity(dimension=units.LENGTH), _PRESSURE)), at_least=1),
            ),
            required=True,
            doc="one, or a list of [height, pressure] with rising heights",
        ),
    },
)
_ICE = Table(
    doc="a coat of ice: weight, mass, and wider for the wind by twice the thickness",
    fields={
        "members": MEMBERS,
        "thickness": Quantity(dimension=units.LENGTH, above=0, required=True, doc="of the coat"),
        "density": Quantity(dimension=units.DENSITY, above=0, required=True, doc="of the ice"),
    },
)


def _on(where: Names, key: str, value: Spec) -> Table:
    return Table(fields={where.of: where, key: value}, synonyms={"value": key})


LOAD_CASE = Table(
    doc="what acts together, for a factor of one",
    fields={
        "self_weight": Quantity(default=0.0, doc="weight of members and masses, times this"),
        "masses": Listed(
            of=_on(JOINTS, "mass", Quantity(dimension=units.MASS, at_least=0, required=True)),
            doc="masses whose weight belongs to this case",
        ),
        "forces": _FORCES,
        "line_loads": Listed(
            of=_on(MEMBERS, "per_length", Vector(dimension=units.LINE_LOAD, required=True)),
            doc="forces per drawn length of members",
        ),
        "temperature_change": Either(
            options=(
                Quantity(dimension=units.TEMPERATURE_CHANGE),
                Listed(
                    of=_on(MEMBERS, "change", Quantity(dimension=units.TEMPERATURE_CHANGE, required=True))
                ),
            ),
            doc="of all members, or a list",
        ),
        "temperature": Quantity(dimension=units.TEMPERATURE, above=0, doc="of all members"),
        "movements": Listed(
            of=_on(JOINTS, "move", Vector(dimension=units.LENGTH, required=True)),
            doc="movements of held directions",
        ),
        "take_up": Listed(
            of=_on(MEMBERS, "length", Quantity(dimension=units.LENGTH, required=True)),
            doc="shortening of the unstressed length",
        ),
        "wind": Listed(of=_WIND, doc="wind on members whose section has wind_width"),
        "ice": Listed(of=_ICE, doc="ice on members whose section has wind_width"),
    },
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
    synonyms={"begin": "start", "at": "start", "force": "forces", "form": "shape"},
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
