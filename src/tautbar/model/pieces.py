"""Catenaries as straight pieces: the same model, for analyses that want no member with a curve."""

from __future__ import annotations

from array import array
from collections.abc import Collection, Iterable, Mapping
from dataclasses import replace
from itertools import chain

from tautbar.model.lookup import groups_of
from tautbar.model.parts import KINDS, Hanging, Indices, Joints, LoadCase, Members, Parts

_NAN = float("nan")
_TIE = KINDS.index("tension-only")


def with_pieces(parts: Parts, pieces: int, lengths: Mapping[int, float], which: Collection[int]) -> Parts:
    """A model with catenaries replaced by straight tension-only pieces.

    Pieces are named ``name.1``, ..., the joints between them ``name@1``, ..., which are drawn on the
    straight line between the ends. Joints that were there keep their positions, members move up into
    the places of the catenaries (`places_with_pieces`), pieces follow at the end. There are no analyses
    in the new model: theirs speak of the members of the old one.

    Parameters
    ----------
    parts
        The model.
    pieces
        Number of pieces of each rope.
    lengths
        Unstressed length [m] of each rope to replace, by member.
    which
        Members to replace, all of kind "hanging".
    """
    ropes = sorted(which)
    places = places_with_pieces(parts, pieces, ropes)
    first = len(parts.joints)
    inner = [range(first + k * (pieces - 1), first + (k + 1) * (pieces - 1)) for k in range(len(ropes))]
    hung = tuple(_hung(parts, i, places[i], at, lengths[i]) for i, at in zip(ropes, inner, strict=True))
    return replace(
        parts,
        joints=_joints(parts, hung),
        members=_members(parts, hung, places),
        masses=tuple(replace(m, members=_moved(m.members, places)) for m in parts.masses),
        load_cases={name: _load_case(case, places) for name, case in parts.load_cases.items()},
        analyses=(),
    )


def places_with_pieces(parts: Parts, pieces: int, which: Collection[int]) -> tuple[Indices, ...]:
    """Where each member of a model is found once some are in pieces: one place, or one a piece."""
    gone = set(which)
    found, kept, end = [], 0, len(parts.members) - len(gone)
    for i in range(len(parts.members)):
        if i in gone:
            found.append(tuple(range(end, end + pieces)))
            end += pieces
        else:
            found.append((kept,))
            kept += 1
    return tuple(found)


def _hung(parts: Parts, rope: int, places: Indices, joints: range, length: float) -> Hanging:
    m = parts.members
    members = range(places[0], places[-1] + 1)
    return Hanging(m.names[rope], m.start[rope], m.end[rope], members, joints, "unstressed_length", length)


def _joints(parts: Parts, hung: tuple[Hanging, ...]) -> Joints:
    j = parts.joints
    names = (*j.names, *(f"{h.name}@{k + 1}" for h in hung for k in range(len(h.joints))))
    columns = [array("d", c) for c in (j.x, j.y, j.z)]
    for h in hung:
        for column in columns:
            start, end, n = column[h.start], column[h.end], len(h.members)
            column.extend(start * (1 - k / n) + end * (k / n) for k in range(1, n))
    index = {**j.index, **{name: len(j) + k for k, name in enumerate(names[len(j) :])}}
    return Joints(names, columns[0], columns[1], columns[2], index)


def _members(parts: Parts, hung: tuple[Hanging, ...], places: tuple[Indices, ...]) -> Members:
    m = parts.members
    ropes = [m.index[h.name] for h in hung]
    kept = [i for i in range(len(m)) if i not in set(ropes)]
    added = range(sum(len(h.members) for h in hung))
    names = (*(m.names[i] for i in kept), *(f"{h.name}.{k + 1}" for h in hung for k in range(len(h.members))))
    index = {name: i for i, name in enumerate(names)}

    def lengths(column: array[float]) -> array[float]:
        return array("d", chain((column[i] for i in kept), (_NAN for _ in added)))

    def whole(column: array[int], of_pieces: Iterable[int]) -> array[int]:
        return array("q", chain((column[i] for i in kept), of_pieces))

    return Members(
        names,
        whole(m.start, (joint for h in hung for joint in (h.start, *h.joints))),
        whole(m.end, (joint for h in hung for joint in (*h.joints, h.end))),
        whole(m.kind, (_TIE for _ in added)),
        whole(m.section, (m.section[i] for i, h in zip(ropes, hung, strict=True) for _ in h.members)),
        lengths(m.pretension),
        lengths(m.unstressed_length),
        lengths(m.slack),
        lengths(m.sag),
        index,
        groups_of(names, index),
        (*(_shifted(h, places) for h in m.hanging), *hung),
        _moved(m.absent, places),
    )


def _shifted(h: Hanging, places: tuple[Indices, ...]) -> Hanging:
    """A rope that was in pieces already: its members have moved up."""
    first = places[h.members.start][0]
    return replace(h, members=range(first, first + len(h.members)))


def _moved(members: Indices, places: tuple[Indices, ...]) -> Indices:
    return tuple(place for i in members for place in places[i])


def _load_case(case: LoadCase, places: tuple[Indices, ...]) -> LoadCase:
    return replace(
        case,
        line_loads=tuple((_moved(members, places), q) for members, q in case.line_loads),
        temperature_change=tuple((_moved(members, places), t) for members, t in case.temperature_change),
        take_up=tuple(part for entry in case.take_up for part in _take_up(*entry, places)),
        wind=tuple(replace(wind, members=_moved(wind.members, places)) for wind in case.wind),
        ice=tuple(replace(ice, members=_moved(ice.members, places)) for ice in case.ice),
    )


def _take_up(members: Indices, length: float, places: tuple[Indices, ...]) -> list[tuple[Indices, float]]:
    """Each piece takes an equal part of what its rope takes up."""
    straight = tuple(places[i][0] for i in members if len(places[i]) == 1)
    of_ropes = [(places[i], length / len(places[i])) for i in members if len(places[i]) > 1]
    return ([(straight, length)] if straight else []) + of_ropes
