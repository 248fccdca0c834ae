"""Which state an analysis starts from, and what that state hands over."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from tautbar.model.format_asking import AS_DRAWN, EACH, END
from tautbar.model.mistakes import Mistakes, near
from tautbar.model.parts import Loading, StartFrom
from tautbar.model.positions import Path
from tautbar.model.presence import Presence

_NOT_YET = "is not available in this version"
_KINDS = ("static", "equilibrium-path", "tune", "form-finding")  # those that leave a state of rest
_EACH_KINDS = ("static",)
_POINT = re.compile(r"(limit point|bifurcation|kink) [1-9]\d*")


@dataclass(frozen=True)
class Left:
    """What an analysis leaves for later ones: a state for each loading, and who was there."""

    kind: str
    loadings: tuple[Loading, ...]
    presence: Presence


@dataclass
class Starts:
    """The analyses so far, by name, as starts of later ones."""

    mistakes: Mistakes
    first: Presence
    unsure: set[str] = field(default_factory=set)  # names of analyses that are wrong
    left: dict[str, Left] = field(default_factory=dict)

    def read(self, data: dict[str, Any], path: Path, later: Mapping[str, str]) -> StartFrom | None:
        """The state an analysis starts from; None is the drawing."""
        given, path = data.get("from"), (*path, "from")
        if given is None:
            return None
        if given == AS_DRAWN:
            if data["kind"] != "modes":
                self.mistakes.add(
                    path, f"'{AS_DRAWN}' is only for modes", "leave `from` out to start as drawn"
                )
            return StartFrom("", as_drawn=True)
        words = given if isinstance(given, dict) else {"analysis": given}
        name, loads, at = words["analysis"], words.get("loads"), words.get("at")
        if name is None:
            return None
        if name not in self.left:
            self._unknown(name, data["name"], path, later)
        elif self.left[name].kind not in _KINDS:
            what = f"starting from '{name}', which is of kind \"{self.left[name].kind}\", {_NOT_YET}"
            self.mistakes.add(path, what, "start from one of kind " + ", ".join(_KINDS))
        elif self.left[name].kind == "equilibrium-path":
            return self._of_path(name, loads, at, path)
        elif at is not None:
            self.mistakes.add((*path, "at"), f"'{name}' is no path: it has no points to start at")
        elif loads == EACH:
            if data["kind"] not in _EACH_KINDS:
                what = f"from each loading in turn start only {' and '.join(_EACH_KINDS)}"
                self.mistakes.add((*path, "loads"), what, "name one loading")
            return StartFrom(name, each=True)
        else:
            self._one_loading(name, loads, path)
        return StartFrom(name, loads)

    def _unknown(self, name: str, own: str | None, path: Path, later: Mapping[str, str]) -> None:
        if name == own:
            self.mistakes.add(path, "an analysis cannot start from itself")
        elif name in self.unsure:
            return
        elif name in later:
            self.mistakes.add(path, f"'{name}' comes later: an analysis starts from an earlier one")
        else:
            self.mistakes.add(path, f"there is no analysis '{name}'", near(name, self.left))

    def _of_path(self, name: str, loads: str | None, at: str | None, path: Path) -> StartFrom:
        if loads is not None:
            what = f"'{name}' is a path: its points are not named by loadings"
            self.mistakes.add((*path, "loads"), what, 'say at = "limit point 1", or leave it out for its end')
        if at is not None and at != END and not _POINT.fullmatch(at):
            what = f"'{at}' is no point of a path"
            hint = f'write "limit point 1", "bifurcation 1", "kink 1" or "{END}"'
            self.mistakes.add((*path, "at"), what, hint)
        return StartFrom(name, at=at or END)

    def _one_loading(self, name: str, loads: str | None, path: Path) -> None:
        """Which of the states of an analysis is meant must be plain."""
        names = [loading.name for loading in self.left[name].loadings]
        if loads is None and len(names) > 1:
            shown = ", ".join(f"'{n}'" for n in names[:12]) + (", ..." if len(names) > 12 else "")
            hint = f'write {{ analysis = "{name}", loads = ".." }} with one of {shown}'
            self.mistakes.add(path, f"'{name}' has {len(names)} loadings: say which", hint)
        elif loads is not None and loads not in names:
            self.mistakes.add((*path, "loads"), f"'{name}' has no loading '{loads}'", near(loads, names))
        elif loads is not None and names.count(loads) > 1:
            what = f"'{name}' has {names.count(loads)} states under '{loads}'"
            self.mistakes.add((*path, "loads"), what, f'start from one of them each: loads = "{EACH}"')

    def loadings(self, start: StartFrom | None) -> tuple[Loading, ...]:
        """What acts in the states started from, one loading each."""
        if start is None or start.as_drawn:
            return (Loading("nothing", {}),)
        left = self.left[start.analysis].loadings if start.analysis in self.left else ()
        return tuple(loading for loading in left if start.loads in (None, loading.name))

    def sure(self, start: StartFrom | None) -> bool:
        """Is it known what the state started from is like? Not where its analysis is wrong."""
        return start is None or start.analysis not in self.unsure

    def presence(self, start: StartFrom | None) -> Presence:
        """Who is there in the state started from."""
        left = self.left.get(start.analysis) if start is not None else None
        return self.first if left is None else left.presence
