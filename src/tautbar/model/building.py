"""From the words of a model to its parts, with every mistake noted on the way."""

from __future__ import annotations

from array import array
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from tautbar.model.acting import Actions
from tautbar.model.asking import Questions
from tautbar.model.checking import Checker
from tautbar.model.format import MODEL, PLANES
from tautbar.model.format_structure import JOINT_COLUMNS, MEMBER_COLUMNS
from tautbar.model.inquiry import Site
from tautbar.model.loadings import Loads, build_loadings
from tautbar.model.lookup import Finder
from tautbar.model.materials import build_materials, build_sections
from tautbar.model.mistakes import Mistakes, nearest
from tautbar.model.parts import AXES, Parts
from tautbar.model.positions import Path
from tautbar.model.presence import Presence, Things
from tautbar.model.prestress import check_lengths
from tautbar.model.soundness import Soundness
from tautbar.model.source import Source
from tautbar.model.spec import Quantity, Spec
from tautbar.model.starting import Starts
from tautbar.model.structure import Drawing
from tautbar.model.tables import Columns, read_columns
from tautbar.units import NUMBER, TIME, BadQuantity, Units, unit_factor

_NAMED = (
    "units", "tables", "joints", "members", "materials", "sections", "supports", "masses", "load_cases",
    "combinations", "events",
)  # fmt: skip
_PULSE_COLUMNS: dict[str, Spec] = {
    "time": Quantity(dimension=TIME, at_least=0, required=True),
    "factor": Quantity(dimension=NUMBER, required=True),
}


@dataclass
class Built:
    """A model that has no mistake, and the paths its joints and members came from."""

    parts: Parts
    drawing: Drawing


def build(source: Source) -> Built:
    """The parts of a model. Raises `ModelError` with every mistake in it."""
    mistakes = Mistakes()
    words = source.words
    checker = Checker(_units(words.get("units"), mistakes), _axes(words, mistakes), mistakes)
    checked = checker.check(MODEL, dict(words), ())
    if checked["format"] not in (None, 1):
        mistakes.add(
            ("format",), f"format {checked['format']} is not known to this version", "write format = 1"
        )
    if any(checked.get(key, "") is None or _misspelt(words, key) for key in _NAMED):
        # every name in it would seem unknown
        mistakes.raise_any(source)
    built = _Builder(source, checker, checked).build()
    source.aliases = {
        "joints": dict(zip(built.drawing.joint_names, built.drawing.joint_paths, strict=True)),
        "members": dict(zip(built.drawing.names, built.drawing.paths, strict=True)),
    }
    mistakes.raise_any(source)
    return built


def _axes(words: Mapping[str, Any], mistakes: Mistakes) -> tuple[int, ...]:
    """The axes that coordinates are given in; where the plane is wrong those that were meant."""
    plane, joints = words.get("plane"), words.get("joints")
    given = {len(p) for p in joints.values() if isinstance(p, list)} if isinstance(joints, dict) else set()
    if plane is None:
        if given == {2}:
            what = "every joint has two coordinates, three are wanted in space"
            mistakes.add(("joints",), what, 'for a plane structure add plane = "xz" above all tables')
            return 0, 2
        return 0, 1, 2
    if given == {3} and plane in PLANES:
        what = f"the model is in the plane {plane}, but every joint has three coordinates"
        mistakes.add(("plane",), what, "leave plane out, or give two coordinates")
        return 0, 1, 2
    letters = tuple(i for i, axis in enumerate(AXES) if axis in str(plane))
    return letters if len(letters) == 2 else (0, 2)


def _misspelt(words: Mapping[str, Any], key: str) -> bool:
    """Is there a table whose name is nearly this?"""
    return any(nearest(other, MODEL.fields) == key for other in words if other not in MODEL.fields)


def _units(given: Any, mistakes: Mistakes) -> Units:
    factors: dict[str, float] = {}
    names: dict[str, str] = {}
    for base, text in given.items() if isinstance(given, Mapping) else ():
        if base in MODEL.fields["units"].fields and isinstance(text, str):  # type: ignore[attr-defined]
            try:
                factors[base], names[base] = unit_factor(text, base), text
            except BadQuantity as error:
                mistakes.add(("units", base), str(error))
    return Units(factors, names)


@dataclass
class _Builder:
    source: Source
    checker: Checker
    checked: dict[str, Any]

    def build(self) -> Built:
        words, mistakes = self.checked, self.checker.mistakes
        materials = build_materials(self._of("materials"))
        sections = build_sections(self._of("sections"), materials, set(self._of("materials")), mistakes)
        drawing = self._draw({name: i for i, name in enumerate(sections)})
        joints, members = drawing.finish()
        drawn = len(joints) - sum(len(h.joints) for h in members.hanging)
        unsure = tuple(drawing.unsure)
        inner = tuple(start for start in unsure if start.endswith("@"))
        find_joints = Finder("joint", joints.index, mistakes, drawn=drawn, unsure=inner)
        find_members = Finder("member", members.index, mistakes, members.groups, unsure=unsure)
        wholes, axes = drawing.all_wholes(), self.checker.axes
        acting = Actions(mistakes, find_joints, find_members, wholes, axes, words.get("temperature"))
        supports = acting.supports(words.get("supports") or [])
        masses = acting.masses(words.get("masses") or [])
        cases = acting.load_cases(self._of("load_cases"))
        loadings = build_loadings(cases, self._of("combinations"), mistakes)
        up = self._up()
        site = Site(
            find_joints,
            find_members,
            wholes,
            members,
            supports,
            tuple(sections.values()),
            axes,
            (joints.x, joints.y, joints.z)[up],
            words.get("temperature"),
        )
        questions = Questions(
            mistakes,
            site,
            Loads(mistakes, cases, loadings),
            Things(mistakes, find_members, [s.name for s in supports], [m.name for m in masses]),
            Starts(mistakes, Presence.first(members, supports, masses), self._wrong_analyses()),
            self._of("events"),
        )
        parts = Parts(
            words["title"],
            joints,
            members,
            tuple(sections.values()),
            tuple(materials.values()),
            supports,
            masses,
            cases,
            loadings,
            acting.events(self._of("events"), self._pulse_tables()),
            questions.build(words.get("analyses") or []),
            self._held_axis(),
            up,
            words["gravity"],
            words.get("temperature"),
            words.get("unsupported") == "allowed",
            words.get("note") or "",
            words.get("source") or "",
        )
        Soundness(parts, drawing, mistakes, self._asked()).check()
        check_lengths(parts, drawing, mistakes)
        return Built(parts, drawing)

    def _asked(self) -> list[list[str]]:
        """The events that each analysis names, as written, so that a wrong one still uses them."""
        entries = self.source.words.get("analyses")
        checked = self.checked.get("analyses") or ()
        if any(made is not None and made.get("events", ()) is None for made in checked):
            return []  # wrong: any event may have been meant
        named = [e.get("events") for e in entries if isinstance(e, dict)] if isinstance(entries, list) else []
        return [events if isinstance(events, list) else [] for events in named]

    def _wrong_analyses(self) -> set[str]:
        """Names of analyses that cannot be made."""
        given, checked = self.source.words.get("analyses"), self.checked.get("analyses")
        if not isinstance(given, list) or not checked:
            return set()
        named = [
            e.get("name") for e, made in zip(given, checked, strict=True) if isinstance(e, dict) and not made
        ]
        return {name for name in named if isinstance(name, str)}

    def _of(self, key: str) -> dict[str, Any]:
        return self.checked.get(key) or {}

    def _draw(self, sections: dict[str, int]) -> Drawing:
        axes = self.checker.axes
        joint_columns = {k: of for k, of in JOINT_COLUMNS.items() if k not in AXES or AXES.index(k) in axes}
        drawing = Drawing(self.checker.mistakes, sections)
        drawing.add_joints(self._of("joints"), self._table("joints", joint_columns), axes)
        drawing.add_members(self.checked.get("members") or [], self._table("members", MEMBER_COLUMNS))
        return drawing

    def _table(self, key: str, columns: dict[str, Spec]) -> Columns | None:
        name = self._of("tables").get(key)
        return None if name is None else self._columns(name, columns, ("tables", key))

    def _columns(self, name: str, columns: dict[str, Spec], path: Path) -> Columns | None:
        try:
            text = self.source.load(name)
        except UnicodeDecodeError as error:
            self.checker.wrong(path, f"'{name}' is not in UTF-8: {error.reason}", "save it as UTF-8")
        except OSError as error:
            self.checker.wrong(path, f"'{name}' cannot be read: {error.strerror}")
        else:
            return read_columns(self.checker, text, columns, path)
        return None

    def _pulse_tables(self) -> dict[str, tuple[array[float], array[float]]]:
        found = {}
        for name, event in self._of("events").items():
            file = event.get("table") if event is not None else None
            if isinstance(file, str):
                columns = self._columns(file, _PULSE_COLUMNS, ("events", name, "table"))
                empty = array("d")
                numbers = columns.numbers if columns is not None else {}
                found[name] = (numbers.get("time", empty), numbers.get("factor", empty))
        return found

    def _held_axis(self) -> int | None:
        return None if len(self.checker.axes) == 3 else 3 - sum(self.checker.axes)

    def _up(self) -> int:
        axes = self.checker.axes
        given = self.checked.get("up")
        if given is None:
            return axes[-1] if len(axes) == 2 else 2
        up = AXES.index(given)
        if up not in axes:
            self.checker.wrong(("up",), f"'{given}' is not in the plane of this model")
        return up
