"""The description of the model file, third part: the analyses."""

from __future__ import annotations

from tautbar import units
from tautbar.model.format_structure import MEMBERS, PIECES
from tautbar.model.parts import AXES
from tautbar.model.spec import (
    ByKind,
    Count,
    Either,
    Factors,
    Flag,
    Listed,
    Names,
    Quantity,
    Spec,
    Table,
    Text,
)

AS_DRAWN = "as drawn"
NONE = "none"
EACH = "each"
END = "end"
AT = ("from end", "to end", "greatest")  # where along a hanging member a tension is meant

_LOADS = Either(
    options=(
        Text(),
        Factors(),
        Listed(of=Either(options=(Text(), Factors())), at_least=1),
    ),
    doc="all that acts: a load case, a combination, an inline table of factors, or a list of them",
)
_ALL_LOADS = Either(options=_LOADS.options, required=True, doc=_LOADS.doc)
_ONE = (Text(), Factors())
_GROWING = Either(options=_ONE, required=True, doc="one loading, times the load factor")
_CONSTANT = Either(options=_ONE, doc='what acts all the while beside the growing loads, or "none"')
_FROM = Either(
    options=(
        Text(),
        Table(
            fields={
                "analysis": Text(required=True, doc="name of an earlier analysis"),
                "loads": Text(doc='which of its loadings, or "each": all of them in turn'),
                "at": Text(doc='of a path: "limit point 1", "bifurcation 1", "kink 1", or "end"'),
            },
        ),
    ),
    doc="the analysis whose end is the start of this one",
)
_THINGS = Names(of="members, supports or masses")
_GEOMETRY = Text(choices=("large", "small"), default="large", doc="large or small displacements")
_MASS_WORDS = ("consistent", "lumped")
_PIECES = Count(at_least=2, at_most=PIECES.at_most, doc="each hanging member as so many straight pieces here")


_SYNONYMS = {
    "type": "kind", "start": "from", "load": "loads", "event": "events", "dt": "time_step",
    "step": "time_step", "stop": "stop_at", "modes": "count", "number": "count",
}  # fmt: skip


def _asked(kind: str, doc: str, fields: dict[str, Spec], later: tuple[str, ...] = ()) -> Table:
    """An analysis: what all kinds have, and what this kind has."""
    common: dict[str, Spec] = {
        "name": Text(required=True, is_name=True, doc="name of the analysis"),
        "kind": Text(choices=(kind,), required=True),
        "from": _FROM,
        "without": Names(of=_THINGS.of, doc="members, supports and masses that are taken away"),
        "with": Names(of=_THINGS.of, doc="members, supports and masses that are put in"),
    }
    every = common | fields
    known = {word: key for word, key in _SYNONYMS.items() if key in every}
    return Table(doc=doc, fields=every, later=later, synonyms=known)


STATIC = _asked(
    "static",
    "equilibrium with large displacements and slack",
    {
        "loads": _LOADS,
        "geometry": _GEOMETRY,
        "steps": Count(doc="number of load steps; absent: as many as it takes"),
        "tolerance": Quantity(above=0, below=1, default=1e-9, doc="share of the forces left unbalanced"),
        "folding": Text(choices=("allowed",), doc="bars may turn more than 30 degrees"),
        "lose_in_turn": Names(of="members", doc="each of these is lost once, under every loading"),
        "pieces": _PIECES,
    },
    later=("yielding",),
)
MODES = _asked(
    "modes",
    "natural frequencies and shapes about a state",
    {
        "count": Count(doc="how many modes; absent: 10"),
        "up_to": Quantity(dimension=units.FREQUENCY, above=0, doc="all modes up to this frequency"),
        "mass": Text(choices=_MASS_WORDS, default="consistent", doc="how members' mass is spread"),
        "pieces": _PIECES,
    },
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
HISTORY = _asked(
    "history",
    "transient response",
    {
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
        "pieces": _PIECES,
    },
    later=("verify", "yielding", "lose_in_turn", "stop_when", "spectral_radius"),
)
STOP_AT = Table(
    doc="where a path ends: joint, direction and displacement, or one of the others",
    required=True,
    fields={
        "load_factor": Quantity(above=0, doc="load factor"),
        "joint": Text(doc="joint whose displacement is looked at"),
        "direction": Text(choices=AXES, doc="axis of the displacement"),
        "displacement": Quantity(dimension=units.LENGTH, doc="displacement from the drawing"),
        "limit_points": Count(doc="after so many limit points"),
        "steps": Count(doc="after so many steps"),
    },
)
PATH = _asked(
    "equilibrium-path",
    "the whole path of equilibrium through its limit points",
    {
        "loads": _GROWING,
        "constant": _CONSTANT,
        "stop_at": STOP_AT,
        "step": Quantity(above=0, default=0.1, doc="first step of the load factor"),
    },
    later=("yielding",),
)
BUCKLING = _asked(
    "buckling",
    "linearised critical load factors about a state",
    {"loads": _GROWING, "constant": _CONSTANT, "count": Count(default=5, doc="how many factors")},
)
TARGET = Table(
    doc="a wanted tension of members, or a wanted position of a joint",
    synonyms={"force": "tension", "value": "tension", "displacement": "position", "coordinate": "position"},
    fields={
        "members": Names(of="members", doc="members that shall have the tension"),
        "tension": Quantity(dimension=units.FORCE, doc="wanted tension"),
        "at": Text(choices=AT, doc="of hanging members; absent: the greatest"),
        "joint": Text(doc="joint that shall be somewhere"),
        "direction": Text(choices=AXES, doc="axis of the position"),
        "position": Quantity(dimension=units.LENGTH, doc="wanted coordinate along it"),
        "loads": Text(doc="the loading it holds under; absent: the first"),
    },
)
CUT_LIST = Table(
    doc="how the lengths of adjusted members are marked",
    fields={
        "marking_tension": Quantity(dimension=units.FORCE, at_least=0, default=0.0, doc="while marking"),
        "temperature": Quantity(dimension=units.TEMPERATURE, above=0, doc="while marking"),
        "end_allowance": Quantity(
            dimension=units.LENGTH, default=0.0, doc="added to the marked length at each end"
        ),
    },
)
TUNE = _asked(
    "tune",
    "unstressed lengths for wanted tensions or positions, or the least pretension that keeps members taut",
    {
        "loads": _ALL_LOADS,
        "adjust": Names(of="members", required=True, doc="members whose unstressed length may change"),
        "targets": Listed(of=TARGET, at_least=1, doc="what is wanted"),
        "together": Listed(of=MEMBERS, at_least=1, doc="lists of members with one relative change each"),
        "keep_taut": Names(of="members", doc="members that stay taut in every loading"),
        "margin": Quantity(dimension=units.FORCE, at_least=0, doc="least tension left in them"),
        "cut_list": CUT_LIST,
    },
)
FORM_FINDING = _asked(
    "form-finding",
    "equilibrium shape by force densities",
    {
        "loads": Either(options=_ONE, required=True, doc="one loading; {} if nothing acts"),
        "force_densities": Listed(
            of=Table(
                fields={
                    "members": MEMBERS,
                    "value": Quantity(
                        dimension=units.FORCE_DENSITY, required=True, doc="force over length; tension above 0"
                    ),
                },
                synonyms={"density": "value", "force_density": "value"},
            ),
            at_least=1,
            required=True,
            doc="force over length of every member",
        ),
    },
)
ANALYSIS = ByKind(
    kinds={
        "static": STATIC,
        "modes": MODES,
        "history": HISTORY,
        "equilibrium-path": PATH,
        "buckling": BUCKLING,
        "tune": TUNE,
        "form-finding": FORM_FINDING,
    },
    later=("frequency-response", "response-spectrum", "shock-spectrum"),
    doc="a question to be answered",
)
