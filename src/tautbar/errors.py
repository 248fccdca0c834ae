"""The errors an engineer can meet, each with the exit code of the command line."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Mistake:
    """One thing that is wrong in a model: where it stands, what it is, and what would be right.

    ``path`` is the place in the words of the model file, e.g. ``members[3].area``; ``line`` and
    ``column`` count from 1 and are 0 where the model did not come from a text.
    """

    path: str
    what: str
    hint: str = ""
    file: str = ""
    line: int = 0
    column: int = 0
    source_line: str = ""

    def __str__(self) -> str:
        place = ":".join(str(p) for p in (self.file, self.line, self.column) if p)
        head = ": ".join(p for p in (place, self.path, self.what) if p)
        text = f"{head} ({self.hint})" if self.hint else head
        if self.source_line:
            shown = self.source_line.rstrip()
            text += f"\n  {self.line:5d} | {shown}\n        | {' ' * (self.column - 1)}^"
        return text


class TautbarError(Exception):
    """Root of all errors that are told to the user in words; ``exit_code`` is the command's."""

    exit_code = 3


class ModelError(TautbarError):
    """The model is wrong; ``mistakes`` holds every one of them. Nothing was computed."""

    exit_code = 2

    def __init__(self, mistakes: Sequence[Mistake]) -> None:
        self.mistakes = tuple(mistakes)
        super().__init__("\n".join(str(m) for m in self.mistakes))


class InputError(TautbarError):
    """A file, name or option given to a command cannot be used."""

    exit_code = 2


class ResultsError(TautbarError):
    """A results file cannot be written or read."""

    exit_code = 3


class NotConverged(TautbarError):
    """An iteration or a time step did not reach balance; the message says how near it came."""


class AnalysisFailed(TautbarError):
    """An analysis in memory failed its audit; ``record`` holds what was found, marked as failed."""

    def __init__(self, message: str, record: object) -> None:
        self.record = record
        super().__init__(message)
