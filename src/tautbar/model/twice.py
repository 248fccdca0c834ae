"""Names that stand twice in a TOML text, or in a way that does not go with how they stand before."""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass

from tautbar.model.positions import Path, Positions

_MESSAGE = re.compile(r"Cannot (?:overwrite|declare|redefine|mutate)", re.I)
_NAME = r"(?:[A-Za-z0-9_-]+|\"(?:\\.|[^\"\\])*\"|'[^']*')"
_START = re.compile(rf"\s*(\[{{0,2}})\s*({_NAME}(?:\s*\.\s*{_NAME})*)\s*(\]{{0,2}}|=)")
_LISTS = ("members", "supports", "masses", "analyses")
_FAR = 500  # lines that one value may run over


@dataclass(frozen=True)
class Twice:
    """What stands twice, in words, the place (line, column) of the second, and what would be right."""

    what: str
    hint: str
    line: int
    column: int


def twice(message: str, lines: list[str], line: int) -> Twice | None:
    """What a message of `tomllib` about a name means; None if it is about something else.

    Parameters
    ----------
    message
        What `tomllib` says.
    lines
        The text.
    line
        Where it stopped, from 1: at the end of what is there twice.
    """
    if not _MESSAGE.match(message):
        return None
    for start in range(line, max(0, line - _FAR), -1):  # a value may run over several lines
        begin = _START.match(lines[start - 1])
        before = "\n".join(lines[: start - 1])
        if begin and _is_toml(before):
            column = len(lines[start - 1]) - len(lines[start - 1].lstrip()) + 1
            return Twice(*_told(begin, Positions(before)), start, column)
    return None


def _is_toml(text: str) -> bool:
    try:
        tomllib.loads(text)
    except tomllib.TOMLDecodeError:
        return False
    return True


def _told(begin: re.Match[str], before: Positions) -> tuple[str, str]:
    """What is wrong, and what would be right."""
    brackets, names, closing = begin.groups()
    path = _path(names)
    if not brackets:
        path = (*before.last, *path)
    shown = f"{brackets}{names}{closing}" if brackets else f"'{names}'"
    first, _ = before.of(path)
    if path not in before:
        return f"{shown} cannot add to what line {first} says already", "write all of it in one place"
    if path[0] in _LISTS and brackets and len(path) == 1:
        return f"{shown} is there already, in line {first}", f"write [[{names}]] above each of them"
    if brackets:
        hint = "put its keys into one table, or give one of them another name"
    else:
        hint = "leave one out" + (f", or begin another [[{path[0]}]] before it" if path[0] in _LISTS else "")
    return f"{shown} is there twice, first in line {first}", hint


def _path(names: str) -> Path:
    """The names as keys: ``("load_cases", "dead")`` of ``load_cases.dead``."""
    table, found = tomllib.loads(f"[{names}]"), []
    while table:
        (name,) = table
        found.append(name)
        table = table[name]
    return tuple(found)
