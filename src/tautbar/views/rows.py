"""Members gathered into the rows of a table or plot: groups and ropes as one row, or opened."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

from tautbar.errors import InputError
from tautbar.store import Result
from tautbar.store.layout import UnknownName

OPEN = 24  # rows up to which members of groups have one each


@dataclass(frozen=True, slots=True)
class Row:
    """A member, or several that stand in one row: their places among the members given."""

    name: str
    places: tuple[int, ...]

    @property
    def label(self) -> str:
        """Name, and how many it stands for."""
        return f"{self.name} ({len(self.places)})" if len(self.places) > 1 else self.name


def gather(result: Result, members: Sequence[str], opened: str | None = None) -> list[Row]:
    """Rows for members, in their order.

    The pieces of a rope stand in one row; so do the members of a group where there would be more
    rows than can be read at a glance. ``opened`` names a group, rope or member to be shown alone, with a
    row for each of what it holds.

    Raises
    ------
    InputError
        If there is nothing of that name, or none of it is among ``members``.
    """
    rope_of = {piece: rope for rope, pieces in result.ropes.items() for piece in pieces}
    if opened is not None:
        return _opened(result, members, opened, rope_of)
    ropes = _rows(members, range(len(members)), rope_of)
    if len(ropes) <= OPEN:
        return ropes
    groups = _groups(result)
    unit = {name: groups.get(rope_of.get(name, name), rope_of.get(name, name)) for name in members}
    rows = _rows(members, range(len(members)), unit)
    return rows if len(rows) > 1 else ropes


def _groups(result: Result) -> Mapping[str, str]:
    """The group of each member that is in one."""
    groups = result.results.groups.items()
    return MappingProxyType({member: group for group, members in groups for member in members})


def inside(result: Result, members: Sequence[str], name: str) -> list[int]:
    """Places among members of those of a group, of the pieces of a rope, or of the member of that name."""
    named = {name, *result.members_of(name)}
    named |= {piece for rope in named for piece in result.ropes.get(rope, ())}
    return [k for k, member in enumerate(members) if member in named]


def _opened(result: Result, members: Sequence[str], name: str, rope_of: Mapping[str, str]) -> list[Row]:
    places = inside(result, members, name)
    if not places:
        known = {*members, *result.ropes, *result.results.groups}
        if name in known | set(result.results.members):
            raise InputError(f'"{name}" is in the model, but "{result.name}" has nothing of it to show')
        raise UnknownName("member or group", name, sorted(known))
    return _rows(members, places, {} if name in result.ropes else rope_of)


def _rows(members: Sequence[str], places: Sequence[int], unit: Mapping[str, str]) -> list[Row]:
    rows: dict[str, list[int]] = {}
    for place in places:
        rows.setdefault(unit.get(members[place], members[place]), []).append(place)
    return [Row(name, tuple(row)) for name, row in rows.items()]
