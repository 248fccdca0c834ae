"""Joints and members from their checked words and tables: names to positions, chains and hanging
members to single ones."""

from __future__ import annotations

import math
from array import array
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from itertools import count, repeat
from operator import eq
from typing import Any

from tautbar.model.format_structure import LENGTH_KEYS
from tautbar.model.lookup import Whole, Wholes, groups_of
from tautbar.model.mistakes import Mistakes, near, nearest
from tautbar.model.parts import KINDS, Hanging, Joints, Members
from tautbar.model.positions import Path
from tautbar.model.tables import Columns

NAN = float("nan")
_HINTS = 50
_POSITIONS = {kind: position for position, kind in enumerate(KINDS)}


@dataclass
class Drawing:
    """Joints and members while they are gathered; ``paths`` say where each was given.

    A joint or section that is not known is -1.
    """

    mistakes: Mistakes
    sections: dict[str, int]
    joint_names: list[str] = field(default_factory=list)
    joint_paths: list[Path] = field(default_factory=list)
    joint_index: dict[str, int] = field(default_factory=dict)
    coordinates: tuple[array[float], array[float], array[float]] = field(
        default_factory=lambda: (array("d"), array("d"), array("d"))
    )
    names: list[str] = field(default_factory=list)
    paths: list[Path] = field(default_factory=list)
    taken: dict[str, Path] = field(default_factory=dict)
    start: array[int] = field(default_factory=lambda: array("q"))
    end: array[int] = field(default_factory=lambda: array("q"))
    kind: array[int] = field(default_factory=lambda: array("q"))
    section: array[int] = field(default_factory=lambda: array("q"))
    lengths: tuple[array[float], array[float], array[float], array[float]] = field(
        default_factory=lambda: (array("d"), array("d"), array("d"), array("d"))
    )  # in the order of LENGTH_KEYS
    hanging: list[Hanging] = field(default_factory=list)
    absent: list[int] = field(default_factory=list)
    wholes: list[Whole] = field(default_factory=list)
    unsure: list[str] = field(default_factory=list)  # beginnings of names that wrong entries may have meant
    unknown: int = 0  # joints that were named but are not there
    meant: set[str] = field(default_factory=set)  # joints that these names probably meant

    def add_joints(self, words: Mapping[str, Any], table: Columns | None, axes: tuple[int, ...]) -> None:
        """Joints of the model file, then those of the table."""
        for name, point in words.items():
            self._add_joint(name, point or (NAN, NAN, NAN), ("joints", name))
        if table is None or "joint" not in table.text:
            return
        missing = array("d", [NAN]) * len(table.rows)
        zero = array("d", bytes(8 * len(table.rows)))
        columns = [table.numbers.get("xyz"[a], missing) if a in axes else zero for a in range(3)]
        names = table.text["joint"]
        paths = [(*table.path, row) for row in table.rows]
        if self._all_new(names, self.joint_index):
            self.joint_index.update(zip(names, count(len(self.joint_names)), strict=False))
            self.joint_names += names
            self.joint_paths += paths
            for mine, column in zip(self.coordinates, columns, strict=True):
                mine.extend(column)
            return
        for path, name, *point in zip(paths, names, *columns, strict=True):
            if name:
                self._add_joint(name, point, path)

    @staticmethod
    def _all_new(names: list[str], taken: Mapping[str, Any]) -> bool:
        return len(set(names)) == len(names) and "" not in names and taken.keys().isdisjoint(names)

    def _add_joint(self, name: str, point: Any, path: Path) -> None:
        if name in self.joint_index:
            self.mistakes.add(path, f"the name '{name}' is used twice for joints")
        self.joint_index.setdefault(name, len(self.joint_names))
        self.joint_names.append(name)
        self.joint_paths.append(path)
        for column, value in zip(self.coordinates, point, strict=True):
            column.append(value)

    def add_members(self, entries: list[Any], table: Columns | None) -> None:
        """Members of the model file, then those of the table."""
        for i, entry in enumerate(entries):
            if entry is not None:
                self._add_entry(entry, ("members", i))
        if table is not None:
            self._add_table(table)

    def _add_entry(self, entry: dict[str, Any], path: Path) -> None:
        first = len(self.names)
        name = entry["name"] or f"member {path[-1] + 1}"  # type: ignore[operator]
        if entry["name"] is None:
            self.unsure.append("")
        ways = [way for way in ("chain", "pairs") if way in entry]
        single = "from" in entry or "to" in entry
        if len(ways) + single != 1:
            what = "says twice where it goes" if ways else "says nowhere where it goes"
            self.mistakes.add(path, what, "give one of: from and to, chain, pairs")
        elif single:
            for key in ("from", "to"):
                if key not in entry:
                    self.mistakes.add(path, f"'{key}' is missing", "joint at its other end")
            self._add(name, (entry.get("from"), entry.get("to")), entry, path, ("from", "to"))
        elif self._take(name, path):
            self._add_many(name, entry, path, ways[0])
        if entry.get("rope") and "chain" not in entry:
            self.mistakes.add((*path, "rope"), "rope = true is for a chain, one piece clamped at its joints")
        if entry.get("absent", False) is not False:  # None: wrong, but probably absent
            self.absent += range(first, len(self.names))

    def _add_many(self, name: str, entry: dict[str, Any], path: Path, way: str) -> None:
        """The members of a chain or of pairs; those of a rope have their shares of its length."""
        ends = list(_ends_of(entry, way))
        rope = way == "chain" and bool(entry.get("rope"))
        if rope and "sag" in entry:
            what = "a sag is of one span, a rope = true has several"
            self.mistakes.add((*path, "sag"), what, "give unstressed_length, slack or pretension")
        shares = self._shares([pair for pair, _ in ends]) if rope else [1.0] * len(ends)
        blocks = []
        for number, ((pair, keys), share) in enumerate(zip(ends, shares, strict=True), 1):
            own = {k: v * share if k in _SHARED and v is not None else v for k, v in entry.items()}
            before = len(self.names)
            self._add(f"{name}.{number}", pair, own, path, keys)
            if rope and len(self.names) > before:
                members = tuple(range(before, len(self.names)))
                blocks.append((members, share / len(members)))
        if blocks:
            self.wholes.append(Whole(name, tuple(blocks)))

    def _shares(self, pairs: list[tuple[Any, Any]]) -> list[float]:
        """Shares of the drawn length of a chain; NaN where a joint is not known."""

        def point(name: Any) -> tuple[float, ...]:
            found = self.joint_index.get(name, -1)
            return tuple(c[found] if found >= 0 else NAN for c in self.coordinates)

        lengths = [math.dist(point(start), point(end)) for start, end in pairs]
        total = sum(lengths)
        return [length / total if total else NAN for length in lengths]

    def _take(self, name: str, path: Path) -> bool:
        if name in self.taken:
            self.mistakes.add((*path, "name"), f"the name '{name}' is used twice for members")
            return False
        self.taken[name] = path
        return True

    def _add(self, name: str, ends: Any, entry: Mapping[str, Any], path: Path, keys: tuple[Any, Any]) -> None:
        """A single member, straight or hanging."""
        if not self._take(name, path):
            return
        start, end = (self._joint(j, path, k) for j, k in zip(ends, keys, strict=True))
        if start == end and start >= 0:
            self.mistakes.add(path, f"both its ends are at joint '{ends[0]}'", "a member joins two joints")
        section = self._section(entry.get("section"), path)
        given = [key for key in LENGTH_KEYS if key in entry]
        if len(given) > 1:
            self.mistakes.add(
                (*path, given[1]), f"{' and '.join(given)} are given", "give at most one of them"
            )
        kind = entry.get("kind")
        if kind == "hanging" or (kind is None and {"sag", "pieces"} & entry.keys()):  # None: a wrong one
            self._add_hanging(name, (start, end, section), entry, path)
            return
        for key in ("sag", "pieces"):
            if key in entry:
                self.mistakes.add((*path, key), f"'{key}' is only for members of kind \"hanging\"")
        position = _POSITIONS.get(kind or "", 0)
        self._append(name, (start, end, section, position), [_value(entry, k) for k in LENGTH_KEYS], path)

    def _append(self, name: str, where: tuple[int, int, int, int], lengths: list[float], path: Path) -> None:
        self.names.append(name)
        self.paths.append(path)
        for column, position in zip((self.start, self.end, self.section, self.kind), where, strict=True):
            column.append(position)
        for given, value in zip(self.lengths, lengths, strict=True):
            given.append(value)

    def _add_hanging(
        self, name: str, where: tuple[int, int, int], entry: Mapping[str, Any], path: Path
    ) -> None:
        """One catenary, or straight pieces."""
        start, end, section = where
        given = [key for key in LENGTH_KEYS if key in entry]
        if not given:
            self.mistakes.add(
                path, "a hanging member must say how long it is", "give one of sag, " + _HOW_LONG
            )
        if "pieces" not in entry:
            self._append(name, (*where, _POSITIONS["hanging"]), [_value(entry, k) for k in LENGTH_KEYS], path)
            return
        pieces = entry["pieces"]
        if pieces is None:  # a wrong number: what speaks of any piece may be right
            pieces, self.unsure = 2, [*self.unsure, f"{name}.", f"{name}@"]
        key = given[0] if given else ""
        members = range(len(self.names), len(self.names) + pieces)
        self.hanging.append(Hanging(name, start, end, members, range(0), key, _value(entry, key)))
        self.wholes.append(Whole(name, ((tuple(members), 1 / pieces),), in_pieces=True))
        for k in range(pieces):  # the joints between are numbered once all joints are known
            piece = f"{name}.{k + 1}"
            self._take(piece, path)
            ends = (start if k == 0 else -1, end if k == pieces - 1 else -1)
            self._append(piece, (*ends, section, _POSITIONS["tension-only"]), [NAN] * len(LENGTH_KEYS), path)

    def _joint(self, name: Any, path: Path, key: Any) -> int:
        if name is None:
            return -1
        found = self.joint_index.get(name, -1)
        if found < 0:
            where = (*path, *key) if isinstance(key, tuple) else (*path, key)
            self.mistakes.add(where, f"there is no joint '{name}'", self._near(name))
        return found

    def _near(self, name: str) -> str:
        """A hint, while there are few unknown joints: finding the nearest of many names takes long."""
        self.unknown += 1
        if self.unknown > _HINTS:
            return ""
        self.meant.add(nearest(name, self.joint_index))
        return near(name, self.joint_index)

    def _section(self, name: Any, path: Path) -> int:
        if name is None:
            return -1
        found = self.sections.get(name, -1)
        if found < 0:
            self.mistakes.add((*path, "section"), f"there is no section '{name}'", near(name, self.sections))
        return found

    def _add_table(self, table: Columns) -> None:
        """Members of a table: all at once where they are plain and right, else row by row."""
        if not {"member", "from", "to", "section"} <= table.text.keys():
            return
        paths = [(*table.path, row) for row in table.rows]
        kinds = table.text.get("kind", ["bar"] * len(paths))
        lengths = {k: c for k, c in table.numbers.items() if any(map(eq, c, c))}  # not all NaN
        if not self._add_plain(table.text, kinds, lengths, paths):
            self._add_rows(table, kinds, lengths, paths)

    def _add_plain(
        self,
        text: dict[str, list[str]],
        kinds: list[str],
        lengths: dict[str, array[float]],
        paths: list[Path],
    ) -> bool:
        names = text["member"]
        start, end = (array("q", map(self.joint_index.get, text[k], repeat(-1))) for k in ("from", "to"))
        section = array("q", map(self.sections.get, text["section"], repeat(-1)))
        if (
            not self._all_new(names, self.taken)
            or -1 in start
            or -1 in end
            or -1 in section
            or any(map(eq, start, end))
            or not set(kinds) <= _POSITIONS.keys() - {"hanging"}
            or not lengths.keys() <= set(LENGTH_KEYS[:3])
            or len(lengths) > 1
        ):
            return False
        kind = array("q", map(_POSITIONS.__getitem__, kinds))
        absent = array("d", [NAN]) * len(names)
        for mine, column in (
            (self.start, start), (self.end, end), (self.section, section), (self.kind, kind)
        ):  # fmt: skip
            mine.extend(column)
        for given, key in zip(self.lengths, LENGTH_KEYS, strict=True):
            given.extend(lengths.get(key, absent))
        self.names += names
        self.paths += paths
        self.taken.update(zip(names, paths, strict=True))
        return True

    def _add_rows(
        self, table: Columns, kinds: list[str], lengths: dict[str, array[float]], paths: list[Path]
    ) -> None:
        heads = (table.heads["from"], table.heads["to"])
        columns = (table.text[key] for key in ("member", "from", "to", "section"))
        for i, (name, start, end, section) in enumerate(zip(*columns, strict=True)):
            entry: dict[str, Any] = {"kind": kinds[i], "section": section or None}
            for key, column in lengths.items():
                if column[i] == column[i]:
                    entry[key] = int(column[i]) if key == "pieces" else column[i]
            if name:
                self._add(name, (start or None, end or None), entry, paths[i], heads)

    def all_wholes(self) -> Wholes:
        """Members that are one piece, the longest first."""
        return Wholes(tuple(sorted(self.wholes, key=lambda whole: -len(whole.members))))

    def finish(self) -> tuple[Joints, Members]:
        """The columns, with the joints between the pieces of hanging members at the end."""
        hanging = tuple(self._place_joints(h) for h in self.hanging)
        index = dict(zip(self.names, range(len(self.names)), strict=True))
        joints = Joints(tuple(self.joint_names), *self.coordinates, self.joint_index)
        members = Members(
            tuple(self.names),
            self.start,
            self.end,
            self.kind,
            self.section,
            *self.lengths,
            index,
            groups_of(self.names, index),
            hanging,
            tuple(self.absent),
        )
        return joints, members

    def _place_joints(self, h: Hanging) -> Hanging:
        pieces = len(h.members)
        first = len(self.joint_names)
        path = self.paths[h.members.start]
        whole = h.start >= 0 and h.end >= 0
        for k in range(1, pieces):
            share = k / pieces
            point = [c[h.start] * (1 - share) + c[h.end] * share if whole else NAN for c in self.coordinates]
            self._add_joint(f"{h.name}@{k}", point, path)
        for k, member in enumerate(h.members):
            if k > 0:
                self.start[member] = first + k - 1
            if k < pieces - 1:
                self.end[member] = first + k
        return Hanging(h.name, h.start, h.end, h.members, range(first, first + pieces - 1), h.given, h.value)


_SHARED = ("unstressed_length", "slack")  # keys of a rope that are of the whole
_HOW_LONG = ", ".join(key for key in LENGTH_KEYS if key != "sag")


def _value(entry: Mapping[str, Any], key: str) -> float:
    value = entry.get(key)
    return NAN if value is None else float(value)


def _ends_of(entry: dict[str, Any], way: str) -> Iterator[tuple[tuple[Any, Any], tuple[Any, Any]]]:
    """Pairs of joint names, and where in the entry each stands."""
    listed = entry[way] or []
    if way == "chain":
        for k in range(len(listed) - 1):
            yield (listed[k], listed[k + 1]), ((way, k), (way, k + 1))
        return
    for k, pair in enumerate(listed):
        if pair is not None:
            yield (pair[0], pair[1]), ((way, k, 0), (way, k, 1))
