"""The pieces a description of the model file is made of.

One description (`tautbar.model.format`) serves the checks, their messages and the JSON Schema. A
``doc`` says what a thing means; ``later`` lists words of the format that this version refuses.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, ClassVar

from tautbar import units


@dataclass(frozen=True, kw_only=True)
class Spec:
    """What may stand at a place. ``accepts`` are the Python types it can begin to read."""

    doc: str = ""
    required: bool = False
    default: Any = None
    accepts: ClassVar[tuple[str, ...]] = ("list",)


@dataclass(frozen=True, kw_only=True)
class Text(Spec):
    """Quoted text, perhaps one of a few words; ``is_name``: it must do for a name.

    ``meant`` says what to write for words that are none of the choices but likely to be tried.
    """

    choices: tuple[str, ...] = ()
    meant: Mapping[str, str] = field(default_factory=dict)
    later: tuple[str, ...] = ()
    is_name: bool = False
    accepts: ClassVar[tuple[str, ...]] = ("text",)


@dataclass(frozen=True, kw_only=True)
class Flag(Spec):
    """true or false."""

    accepts: ClassVar[tuple[str, ...]] = ("flag",)


@dataclass(frozen=True, kw_only=True)
class Count(Spec):
    """A whole number."""

    at_least: int = 1
    at_most: int | None = None
    accepts: ClassVar[tuple[str, ...]] = ("number",)


@dataclass(frozen=True, kw_only=True)
class Quantity(Spec):
    """A number or quoted quantity; the bounds are in SI."""

    dimension: units.Dimension = units.NUMBER
    above: float | None = None
    at_least: float | None = None
    below: float | None = None
    at_most: float | None = None
    later: tuple[str, ...] = ()
    accepts: ClassVar[tuple[str, ...]] = ("number", "text")


@dataclass(frozen=True, kw_only=True)
class Vector(Spec):
    """One quantity for each axis of the model: two in a plane model, else three."""

    dimension: units.Dimension


@dataclass(frozen=True, kw_only=True)
class Names(Spec):
    """A list of names or patterns, none twice."""

    of: str  # "joints" or "members"


@dataclass(frozen=True, kw_only=True)
class Listed(Spec):
    """A list of like things."""

    of: Spec
    at_least: int = 0
    at_most: int | None = None


@dataclass(frozen=True, kw_only=True)
class Row(Spec):
    """A list of as many unlike things as are given here."""

    of: tuple[Spec, ...]


@dataclass(frozen=True, kw_only=True)
class Table(Spec):
    """Keys and what they hold; ``note`` and ``source`` are always allowed.

    ``synonyms`` are words likely to be tried for a key.
    """

    fields: Mapping[str, Spec] = field(default_factory=dict)
    later: tuple[str, ...] = ()
    synonyms: Mapping[str, str] = field(default_factory=dict)
    accepts: ClassVar[tuple[str, ...]] = ("table",)


@dataclass(frozen=True, kw_only=True)
class Named(Spec):
    """A table of things by the user's names."""

    of: Spec
    accepts: ClassVar[tuple[str, ...]] = ("table",)


@dataclass(frozen=True, kw_only=True)
class Factors(Spec):
    """A table of numbers by the names of load cases; ``many``: lists of numbers too."""

    many: bool = False
    accepts: ClassVar[tuple[str, ...]] = ("table",)


@dataclass(frozen=True, kw_only=True)
class ByKind(Spec):
    """A table whose key ``kind`` says which other keys it has."""

    kinds: Mapping[str, Table]
    later: tuple[str, ...] = ()
    accepts: ClassVar[tuple[str, ...]] = ("table",)


@dataclass(frozen=True, kw_only=True)
class Either(Spec):
    """The first option that can begin to read what is there."""

    options: tuple[Spec, ...]

    accepts: ClassVar[tuple[str, ...]] = ("text", "number", "list", "table")


@dataclass(frozen=True, kw_only=True)
class Combination(Spec):
    """Factors, or a family of them (a table with ``always`` and ``in_turn``)."""

    plain: Factors
    family: Table
    accepts: ClassVar[tuple[str, ...]] = ("table",)
