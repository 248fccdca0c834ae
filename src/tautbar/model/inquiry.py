"""What the making of any analysis needs: its words, the structure as drawn, and who is there in it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from tautbar.model.loadings import Loads, acts
from tautbar.model.lookup import Finder, Wholes
from tautbar.model.mistakes import Mistakes, near, several
from tautbar.model.parts import AXES, KINDS, Indices, Loading, Members, Section, StartFrom, Support
from tautbar.model.positions import Path
from tautbar.model.presence import Presence
from tautbar.model.starting import Starts

_HANGING = KINDS.index("hanging")


@dataclass(frozen=True)
class Site:
    """The structure as drawn, for those who ask about it by name."""

    joints: Finder
    members: Finder
    wholes: Wholes
    columns: Members
    supports: tuple[Support, ...]
    sections: tuple[Section, ...]
    axes: tuple[int, ...]  # those of the model: two in a plane
    heights: Sequence[float]  # of the joints, m
    temperature: float | None

    def kind(self, member: int) -> str:
        """Kind of a member in words."""
        return KINDS[self.columns.kind[member]]

    def catenaries(self, presence: Presence) -> list[int]:
        """The members there that hang as one curve."""
        hanging = (i for i, kind in enumerate(self.columns.kind) if kind == _HANGING)
        return [i for i in hanging if i not in presence.members]

    def why_held(self, joint: int, axis: int, presence: Presence) -> str:
        """Why a joint cannot move along an axis; "" where it can."""
        there = (i for i in range(len(self.columns)) if i not in presence.members)
        if not any(joint in (self.columns.start[i], self.columns.end[i]) for i in there):
            return "no member goes to it here"
        for support in self.supports:
            along = support.along is not None and abs(support.along[axis]) == 1.0
            here = joint in support.joints and support.name not in presence.supports
            if here and (axis in support.fixed or along):
                return f"support '{support.name}' holds it in {AXES[axis]}"
        return ""


@dataclass(frozen=True)
class Inquiry:
    """One analysis while it is made; ``common`` are the values that all kinds have."""

    mistakes: Mistakes
    site: Site
    loads: Loads
    starts: Starts
    data: dict[str, Any]
    path: Path
    start: StartFrom | None
    presence: Presence
    common: dict[str, Any]

    def wrong(self, where: Path, what: str, hint: str = "") -> None:
        """Note a mistake below the path of the analysis."""
        self.mistakes.add((*self.path, *where), what, hint)

    def members(self, names: list[str] | None, *where: str | int) -> Indices:
        """Members by name, of groups and patterns those that are there; a mistake if there is none."""
        found: dict[int, None] = {}
        for i, name in enumerate(names or ()):
            named = self.site.members.one(name, (*self.path, *where, i))
            there = [member for member in named if member not in self.presence.members]
            if named and not there:
                self.wrong((*where, i), f"'{name}' is not there in this analysis")
            found.update(dict.fromkeys(there))
        return tuple(found)

    def joint(self, name: str | None, *where: str | int) -> int | None:
        """A joint by its name."""
        if name is None:
            return None
        found = self.site.joints.index.get(name)
        if found is None and not self.site.joints.may_be(name):
            self.wrong(where, f"there is no joint '{name}'", near(name, self.site.joints.index))
        return found

    def axis(self, joint: int | None, name: str | None, *where: str | int) -> int | None:
        """An axis in which a joint can move."""
        if name is None:
            return None
        axis = AXES.index(name)
        if axis not in self.site.axes:
            self.wrong(where, f"{name} is not a direction of this plane model")
        elif joint is not None:
            held = self.site.why_held(joint, axis, self.presence)
            if held:
                self.wrong(where, f"joint '{self.site.joints.names[joint]}' cannot move in {name}: {held}")
        return axis

    def carried(self) -> bool:
        """Does anything act in the state this one starts from?"""
        return any(acts(loading, self.loads.cases) for loading in self.starts.loadings(self.start))

    def one_loading(self) -> Loading:
        """The loading of an analysis that has one."""
        return self.loads.one(self.data["loads"], (*self.path, "loads"))

    def pieces(self, needed_by: str = "") -> int | None:
        """Into how many straight pieces this analysis parts hanging members."""
        catenaries = self.site.catenaries(self.presence)
        given: int | None = self.data.get("pieces")
        names = [self.site.members.names[i] for i in catenaries]
        if "pieces" not in self.data:
            if needed_by and names:
                what = f"{needed_by} needs hanging members in straight pieces, {several(names)} "
                what += "hangs as one curve" if len(names) == 1 else "hang as one curve each"
                self.wrong(
                    (),
                    what,
                    "give pieces = 16 to the analysis (its start state is then found again with them) "
                    "or to the member",
                )
        elif not names:
            self.wrong(("pieces",), "no hanging member of this analysis is one curve: leave it out")
        elif given is not None:
            for name in self._taken(names, given):
                self.wrong(("pieces",), f"the name '{name}' is that of a piece, but is used already")
        return given

    def _taken(self, ropes: list[str], pieces: int) -> Iterator[str]:
        for rope in ropes:
            numbers = range(1, pieces + 1)
            yield from (n for k in numbers if (n := f"{rope}.{k}") in self.site.members.index)
            yield from (n for k in numbers if (n := f"{rope}@{k}") in self.site.joints.index)
