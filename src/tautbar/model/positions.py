"""Where each key and value of a TOML text stands.

The text must be one that `tomllib` has accepted, so that only its shape is followed here.
"""

from __future__ import annotations

import re
import tomllib
from bisect import bisect_right

Path = tuple[str | int, ...]  # keys and list positions, e.g. ("members", 12, "pretension")

_STRING = re.compile(
    r'"""(?:\\.|[^\\])*?"""(?:"{0,2}(?!"))'  # basic, several lines
    r"|'''.*?'''(?:'{0,2}(?!'))"  # literal, several lines
    r'|"(?:\\.|[^"\\\n])*"'  # basic
    r"|'[^'\n]*'",  # literal
    re.S,
)
_KEY = re.compile(r'[A-Za-z0-9_-]+|"(?:\\.|[^"\\\n])*"|\'[^\'\n]*\'')
_GAP = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_BLANK = re.compile(r"[ \t]*")
_BARE = re.compile(r"[^,\]}#\r\n]+")


class Positions:
    """Line and column, both from 1, of the things in a TOML text."""

    def __init__(self, text: str) -> None:
        self.text = text.replace("\r\n", "\n")
        self._found: dict[Path, int] = {(): 0}
        self._lines = [0, *(m.end() for m in re.finditer("\n", self.text))]
        self.last: Path = ()  # the table that is open at the end
        self._follow()

    def __contains__(self, path: Path) -> bool:
        return path in self._found

    def of(self, path: Path) -> tuple[int, int]:
        """Line and column of a path, or of the nearest thing around it."""
        while path not in self._found:
            path = path[:-1]
        at = self._found[path]
        line = bisect_right(self._lines, at)
        return line, at - self._lines[line - 1] + 1

    def line(self, number: int) -> str:
        """The text of a line, without its end."""
        start = self._lines[number - 1]
        end = self.text.find("\n", start)
        return self.text[start : end if end >= 0 else None]

    def _gap(self, at: int) -> int:
        return _end(_GAP.match(self.text, at))

    def _follow(self) -> None:
        table: Path = ()
        counts: dict[Path, int] = {}
        at = self._gap(0)
        while at < len(self.text):
            if self.text[at] == "[":
                table, at = self._header(at, counts)
            else:
                at = self._pair(at, table)
            at = self._gap(at)
        self.last = table

    def _header(self, start: int, counts: dict[Path, int]) -> tuple[Path, int]:
        many = self.text[start + 1] == "["
        keys, at = self._keys(start + 1 + many)
        table: Path = ()
        for k, (name, position) in enumerate(keys):
            table += (name,)
            self._found.setdefault(table, position)
            if many and k == len(keys) - 1:
                counts[table] = counts.get(table, -1) + 1
                table += (counts[table],)
                self._found[table] = start
            elif table in counts:
                table += (counts[table],)
        return table, at + 1 + many

    def _keys(self, at: int) -> tuple[list[tuple[str, int]], int]:
        keys = []
        while True:
            at = _end(_BLANK.match(self.text, at))
            end = _end(_KEY.match(self.text, at))
            keys.append((_unquoted(self.text[at:end]), at))
            at = _end(_BLANK.match(self.text, end))
            if self.text[at : at + 1] != ".":
                return keys, at
            at += 1

    def _pair(self, at: int, path: Path) -> int:
        keys, at = self._keys(at)
        for name, position in keys:
            path += (name,)
            self._found.setdefault(path, position)
        return self._value(self._gap(at + 1), path)  # `at` stands on "="

    def _value(self, at: int, path: Path) -> int:
        first = self.text[at]
        if first in "\"'":
            return _end(_STRING.match(self.text, at))
        if first == "[":
            return self._list(at, path)
        if first == "{":
            return self._inline_table(at, path)
        return _end(_BARE.match(self.text, at))

    def _list(self, at: int, path: Path) -> int:
        at, n = self._gap(at + 1), 0
        while self.text[at] != "]":
            self._found[(*path, n)] = at
            at = self._gap(self._value(at, (*path, n)))
            n += 1
            if self.text[at] == ",":
                at = self._gap(at + 1)
        return at + 1

    def _inline_table(self, at: int, path: Path) -> int:
        at = self._gap(at + 1)
        while self.text[at] != "}":
            at = self._gap(self._pair(at, path))
            if self.text[at] == ",":
                at = self._gap(at + 1)
        return at + 1


def _end(match: re.Match[str] | None) -> int:
    if match is None:
        raise AssertionError("the text is no TOML")
    return match.end()


def _unquoted(key: str) -> str:
    if key[0] == '"':
        return str(tomllib.loads(f"key = {key}")["key"]) if "\\" in key else key[1:-1]
    return key[1:-1] if key[0] == "'" else key
