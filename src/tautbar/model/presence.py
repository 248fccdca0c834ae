"""Who is there: members, supports and masses come and go from analysis to analysis."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from tautbar.model.lookup import Finder, is_pattern
from tautbar.model.mistakes import Mistakes, near, several
from tautbar.model.parts import Change, Indices, Mass, Members, Parts, Support
from tautbar.model.positions import Path


@dataclass(frozen=True)
class Presence:
    """What is not there, of what the model has."""

    members: frozenset[int] = frozenset()
    supports: frozenset[str] = frozenset()
    masses: frozenset[str] = frozenset()

    @classmethod
    def first(cls, members: Members, supports: Iterable[Support], masses: Iterable[Mass]) -> Presence:
        """Before any analysis has put anything in."""
        return cls(
            frozenset(members.absent),
            frozenset(s.name for s in supports if s.absent),
            frozenset(m.name for m in masses if m.absent),
        )

    def changed(self, change: Change) -> Presence:
        """After an analysis took some away and put some in."""
        return Presence(
            (self.members | set(change.without_members)) - set(change.with_members),
            (self.supports | set(change.without_supports)) - set(change.with_supports),
            (self.masses | set(change.without_masses)) - set(change.with_masses),
        )


def presences(parts: Parts) -> dict[str, Presence]:
    """Who is there in each analysis, by its name."""
    first = Presence.first(parts.members, parts.supports, parts.masses)
    found: dict[str, Presence] = {}
    for analysis in parts.analyses:
        before = found.get(analysis.start.analysis, first) if analysis.start is not None else first
        found[analysis.name] = before.changed(analysis.change)
    return found


@dataclass
class Things:
    """Finds members, supports and masses by name, and reads what comes and what goes."""

    mistakes: Mistakes
    members: Finder
    supports: Collection[str]
    masses: Collection[str]

    def change(self, data: Mapping[str, Any], path: Path, before: Presence | None) -> Change:
        """What an analysis takes away (``without``) and puts in (``with``), of what was there (if known)."""
        out = self._named(data.get("without"), (*path, "without"), before, there=True)
        into = self._named(data.get("with"), (*path, "with"), before, there=False)
        return Change(*out, *into)

    def _named(
        self, names: list[str] | None, path: Path, before: Presence | None, there: bool
    ) -> tuple[Indices, tuple[str, ...], tuple[str, ...]]:
        members: dict[int, None] = {}
        others: tuple[dict[str, None], dict[str, None]] = ({}, {})
        for i, name in enumerate(names or ()):
            found, support, mass = self._look(name, (*path, i))
            wrong = []
            if before is not None:
                wrong += [self.members.names[m] for m in found if (m in before.members) == there]
                wrong += [name] if support and (name in before.supports) == there else []
                wrong += [name] if mass and (name in before.masses) == there else []
            if wrong:
                self._say_wrong(name, wrong, (*path, i), there)
            members.update(dict.fromkeys(found))
            others[0].update({name: None} if support else {})
            others[1].update({name: None} if mass else {})
        return tuple(members), tuple(others[0]), tuple(others[1])

    def _look(self, name: str, path: Path) -> tuple[Indices, bool, bool]:
        """The members of a name, and whether it is a support, a mass."""
        members, support, mass = self.members.look(name), name in self.supports, name in self.masses
        if bool(members) + support + mass > 1:
            kinds = ["a member"] * bool(members) + ["a support"] * support + ["a mass"] * mass
            self.mistakes.add(path, f"'{name}' is {' and '.join(kinds)}", "rename one of them")
            return (), False, False
        if not (members or support or mass or self.members.may_be(name)):
            known = [*self.members.all(), *self.supports, *self.masses]
            if is_pattern(name):
                what = f"the pattern '{name}' matches no member"
                self.mistakes.add(path, what, "patterns are for members; name supports and masses one by one")
            else:
                self.mistakes.add(path, f"there is no member, support or mass '{name}'", near(name, known))
        return members, support, mass

    def _say_wrong(self, name: str, wrong: list[str], path: Path, there: bool) -> None:
        which = f"'{name}'" if wrong == [name] else f"of '{name}', {several(wrong)}"
        verb = "is" if len(wrong) == 1 else "are"
        if there:
            self.mistakes.add(path, f"{which} {verb} not there, so cannot be taken away")
        else:
            hint = "`with` puts in what was declared absent = true, or taken away by the start analysis"
            self.mistakes.add(path, f"{which} {verb} there already", hint)
