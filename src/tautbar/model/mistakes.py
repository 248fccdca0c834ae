"""Collecting every mistake of a model before any is reported."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

from tautbar.errors import ModelError
from tautbar.model.positions import Path
from tautbar.model.source import Source

_MANY = 3000  # names
_SHOWN = 5


class Mistakes:
    """The mistakes found so far; each belongs to a path in the model."""

    def __init__(self) -> None:
        self.found: list[tuple[Path, str, str]] = []

    def add(self, path: Path, what: str, hint: str = "") -> None:
        """Note a mistake; the same one is noted once."""
        if (path, what, hint) not in self.found[-20:]:
            self.found.append((path, what, hint))

    def at(self, *path: str | int) -> bool:
        """Is there a mistake at or inside this path? Then what follows from it is not worth saying."""
        return any(found[: len(path)] == path for found, _, _ in self.found)

    def raise_any(self, source: Source) -> None:
        """Raise `ModelError` with all of them in the order of the files, if there are any."""
        if not self.found:
            return
        mistakes = [source.place(path).mistake(what, hint) for path, what, hint in self.found]
        raise ModelError(sorted(mistakes, key=lambda m: (m.file != source.file, m.file, m.line, m.column)))


def near(word: object, known: Iterable[str]) -> str:
    """A hint: the nearest known name, or some of the known ones."""
    names = list(dict.fromkeys(known))
    if not names:
        return "there are none"
    close = nearest(word, names)
    if close:
        return f"did you mean '{close}'?"
    return "known: " + ", ".join(names[:9]) + (", ..." if len(names) > 9 else "")


def nearest(word: object, known: Iterable[str]) -> str:
    """The known name that was probably meant; "" where none is near."""
    names, text = list(known), str(word)
    folded = [n for n in names if n.lower() == text.lower()]
    if len(names) > _MANY:  # comparing with all of a large model would take seconds
        names = [n for n in names if abs(len(n) - len(text)) <= 1 and n[:1] == text[:1]][:_MANY]
    close = folded or difflib.get_close_matches(text, names, 1, 0.6)
    return close[0] if close else ""


def several(names: list[str], shown: int = _SHOWN) -> str:
    """Some names, and how many more there are."""
    more = f" and {len(names) - shown} more" if len(names) > shown else ""
    return ", ".join(f"'{name}'" for name in names[:shown]) + more
