"""What a model was read from, and the place in it of a thing: for messages only."""

from __future__ import annotations

import csv
import io
import os
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

from tautbar.errors import Mistake
from tautbar.model.positions import Path, Positions

_SINGULAR = {
    "joints": "joint",
    "members": "member",
    "materials": "material",
    "sections": "section",
    "supports": "support",
    "masses": "mass",
    "load_cases": "load case",
    "combinations": "combination",
    "events": "event",
    "analyses": "analysis",
}


@dataclass(frozen=True, slots=True)
class Place:
    """A place in a model: its path in words, and where in which file (0: no file)."""

    path: str
    file: str = ""
    line: int = 0
    column: int = 0
    source_line: str = ""

    def mistake(self, what: str, hint: str = "") -> Mistake:
        """What is wrong there."""
        return Mistake(self.path, what, hint, self.file, self.line, self.column, self.source_line)


class _Sheet:
    """The lines of a CSV text; a row and its line differ where quoted cells run over several lines."""

    def __init__(self, text: str) -> None:
        self.lines = unix_lines(text).split("\n")
        self.heads, self.separator = separator_of(text)
        self._starts: list[int] | None = None
        if '"' in text:
            reader = csv.reader(io.StringIO(unix_lines(text)), delimiter=self.separator)
            self._starts = [1, *(reader.line_num + 1 for _ in reader)]

    def line_of(self, row: int) -> int:
        """Line, from 1, of a row; 0 is that of the heads."""
        return row + 1 if self._starts is None else self._starts[row]


@dataclass
class Source:
    """The words of a model with the texts they came from.

    ``text`` is None where the words came from Python; ``files`` are the CSV tables by the names the
    model gives them; ``aliases`` map ("members", "stay-1") to the path of what made it.
    """

    words: Mapping[str, Any]
    name: str = "model"
    file: str = ""
    folder: str = ""
    text: str | None = None
    files: dict[str, str] = field(default_factory=dict)
    aliases: dict[str, Mapping[str, Path]] = field(default_factory=dict)
    _sheets: dict[str, _Sheet] = field(default_factory=dict, repr=False)

    @cached_property
    def positions(self) -> Positions:
        """Positions in the text, found when the first message needs them."""
        return Positions(self.text or "")

    def load(self, name: str) -> str:
        """Text of a table named in the model. Raises OSError or UnicodeDecodeError."""
        if name not in self.files:
            with open(os.path.join(self.folder, name), encoding="utf-8-sig", newline="") as file:
                self.files[name] = file.read()
        return self.files[name]

    def shown(self, name: str) -> str:
        """A table's file as it is written in messages."""
        return os.path.join(os.path.dirname(self.file), name)

    def place(self, path: Path) -> Place:
        """The place of a path; entries of lists may be given by name as well as by position."""
        path = self._resolved(path)
        for depth, where in (
            (2, "tables"),
            (3, "events"),
        ):  # ("tables", "joints", 7), ("events", "e", "table", 7)
            if path[:1] == (where,) and len(path) > depth and isinstance(path[depth], int):
                table = self._at(path[:depth])
                if isinstance(table, str):
                    return self._row(table, path[:depth], path[depth:])
        words = describe(path, self.words)
        if self.text is None:
            return Place(words, self.file)
        line, column = self.positions.of(path)
        return Place(words, self.file, line, column, self.positions.line(line))

    def _resolved(self, path: Path) -> Path:
        if len(path) < 2 or not isinstance(path[1], str):
            return path
        made_by = self.aliases.get(str(path[0]), {}).get(path[1])
        if made_by is not None:
            return made_by + path[2:]
        entries = self.words.get(str(path[0]))
        if isinstance(entries, list):
            for i, entry in enumerate(entries):
                if isinstance(entry, dict) and entry.get("name") == path[1]:
                    return (path[0], i, *path[2:])
        return path

    def _at(self, path: Path) -> Any:
        """What stands at a path."""
        found: Any = self.words
        for key in path:
            found = found[key]
        return found

    def _row(self, name: str, table: Path, cell: Path) -> Place:
        """A cell of a CSV table: its data row from 0 (-1: the heads), perhaps its column."""
        if name not in self._sheets:
            self._sheets[name] = _Sheet(self.files[name])
        sheet = self._sheets[name]
        line = sheet.line_of(int(cell[0]) + 1)
        shown = sheet.lines[line - 1]
        cells = shown.split(sheet.separator)
        kind = _SINGULAR.get(str(table[1])) if table[0] == "tables" else None
        where = f'{kind} "{cells[0].strip()}"' if kind and line > 1 else describe(table, self.words)
        names = [bare_name(head) for head in sheet.heads]
        column, key = 1, bare_name(str(cell[1])) if len(cell) > 1 else ""
        if key in names:  # two columns of one name are told at the second
            position = len(names) - 1 - names[::-1].index(key) if line == 1 else names.index(key)
            column += sum(len(c) + 1 for c in cells[:position])
            where += f": {key}" if position else ""
        return Place(where, self.shown(name), line, column, shown)


def unix_lines(text: str) -> str:
    """The text with every line end written as one sign."""
    return text.replace("\r\n", "\n").replace("\r", "\n")


def separator_of(text: str) -> tuple[list[str], str]:
    """Column heads as written, and the separator (the commonest of ; tab , in the first line)."""
    first = unix_lines(text).split("\n", 1)[0]
    separator = max(";\t,", key=first.count)
    return [c.strip() for c in next(csv.reader([first], delimiter=separator), [])], separator


def rows_of(text: str, separator: str) -> list[list[str]]:
    """The rows below the heads, [] where a line is empty. Raises `csv.Error`."""
    return list(csv.reader(io.StringIO(unix_lines(text)), delimiter=separator))[1:]


def bare_name(head: str) -> str:
    """``x [mm]`` without its unit."""
    return head.split("[")[0].strip()


def describe(path: Path, words: Mapping[str, Any]) -> str:
    """A path in words: ``member "stay-1": pretension``."""
    if not path:
        return ""
    first, rest = path[0], path[1:]
    kind = _SINGULAR.get(str(first))
    if kind is None or not rest:
        return _joined(path)
    thing, rest = rest[0], rest[1:]
    if isinstance(thing, int):
        entries = words.get(str(first))
        entry = entries[thing] if isinstance(entries, list) and thing < len(entries) else None
        name = entry.get("name") if isinstance(entry, dict) else None
        head = f'{kind} "{name}"' if isinstance(name, str) else f"{kind} {thing + 1}"
    else:
        head = f'{kind} "{thing}"'
    return f"{head}: {_joined(rest)}" if rest else head


def _joined(path: Path) -> str:
    """``forces[2].joints``: list positions counted from 1, as an engineer would."""
    text = ""
    for item in path:
        if isinstance(item, int):
            text += f"[{item + 1}]"
        else:
            quoted = item if re.fullmatch(r"[\w-]+", item) else f'"{item}"'
            text += f".{quoted}" if text else quoted
    return text
