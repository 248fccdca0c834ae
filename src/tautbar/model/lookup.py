"""Finding joints and members by names, groups and patterns such as ``stay-*``."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from itertools import islice

from tautbar.model.mistakes import Mistakes, near
from tautbar.model.parts import Indices
from tautbar.model.positions import Path


def is_pattern(name: str) -> bool:
    """Does the name stand for all that match it?"""
    return "*" in name or "?" in name


def matching(pattern: str, names: Iterable[str]) -> list[str]:
    """The names that match; ``*`` is any text, ``?`` one sign."""
    text = "".join({"*": ".*", "?": "."}.get(sign, re.escape(sign)) for sign in pattern)
    fits = re.compile(text).fullmatch
    return [name for name in names if fits(name)]


@dataclass(frozen=True)
class Whole:
    """Members that are one piece: a rope in pieces, or one clamped at the joints of its chain.

    ``shares`` are members and the share of the whole length that each of them has.
    """

    name: str
    shares: tuple[tuple[Indices, float], ...]
    in_pieces: bool = False

    @cached_property
    def members(self) -> Indices:
        return tuple(member for members, _ in self.shares for member in members)


@dataclass(frozen=True)
class Wholes:
    """All of them, the longest first."""

    all: tuple[Whole, ...] = ()

    def named(self, names: Iterable[str]) -> list[Whole]:
        """Those that are named as a whole, by their names or by patterns."""
        by_name = {whole.name: whole for whole in self.all}
        found = {n for name in names for n in (matching(name, by_name) if is_pattern(name) else [name])}
        return [whole for name, whole in by_name.items() if name in found]


@dataclass
class Finder:
    """Positions of joints or of members by name.

    ``groups`` are positions by the name of a group; names from position ``drawn`` on (joints
    between the pieces of hanging members) are matched only by patterns that contain "@"; names that
    begin with one of ``unsure`` may belong to an entry that is wrong, so that they are not called unknown.
    """

    what: str  # "joint" or "member"
    index: Mapping[str, int]
    mistakes: Mistakes
    groups: Mapping[str, Indices] = field(default_factory=dict)
    drawn: int | None = None
    unsure: tuple[str, ...] = ()
    _known: dict[str, Indices] = field(default_factory=dict)

    def find(self, names: Iterable[str] | None, path: Path) -> Indices:
        """Positions of all that are named, each once, in the order they are named."""
        found: dict[int, None] = {}
        for i, name in enumerate(names or ()):
            found.update(dict.fromkeys(self.one(name, (*path, i))))
        return tuple(found)

    def one(self, name: str, path: Path) -> Indices:
        """Positions a single name, group or pattern stands for; a mistake if there are none."""
        found = self.look(name)
        if not found and not self.may_be(name):
            if is_pattern(name):
                self.mistakes.add(
                    path, f"the pattern '{name}' matches no {self.what}", near(name, self.all())
                )
            else:
                self.mistakes.add(path, f"there is no {self.what} '{name}'", near(name, self.all()))
        return found

    def may_be(self, name: str) -> bool:
        """May an unknown name belong to an entry that is wrong?"""
        return name.startswith(self.unsure)

    def look(self, name: str) -> Indices:
        """The same without a mistake."""
        if name not in self._known:
            self._known[name] = self._look(name)
        return self._known[name]

    def all(self) -> list[str]:
        """All names but those of joints between pieces, those of groups first."""
        return [*self.groups, *islice(self.index, self.drawn)]

    @cached_property
    def names(self) -> tuple[str, ...]:
        """Names by position."""
        return tuple(self.index)

    def _look(self, name: str) -> Indices:
        if name in self.index:
            return (self.index[name],)
        if name in self.groups:
            return self.groups[name]
        if not is_pattern(name):
            return ()
        last = self.drawn if self.drawn is not None and "@" not in name else len(self.index)
        found = {self.index[n] for n in matching(name, self.index)}
        for group in matching(name, self.groups):
            found.update(self.groups[group])
        return tuple(sorted(i for i in found if i < last))


def groups_of(names: Iterable[str], index: Mapping[str, int]) -> dict[str, Indices]:
    """Groups by dotted names: ``bottom`` is all of ``bottom.1``, ``bottom.2``, ..."""
    groups: dict[str, list[int]] = {}
    for position, name in enumerate(names):
        head = name
        while "." in head:
            head, _, number = head.rpartition(".")
            if not number.isdigit() or not head:
                break
            if head not in index:
                groups.setdefault(head, []).append(position)
    return {name: tuple(members) for name, members in groups.items()}
